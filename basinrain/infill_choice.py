"""Which infill method a job uses, and what that method learns from the record."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.infill.leave_one_out import Comparison, compare_infill
from basinrain.infill.normals import suspect_normal_units
from basinrain.infill.record_normals import NormalRatios, normals_from_record
from basinrain.infill.relations import Relations, relations_of_record
from basinrain.jobfile import Job
from basinrain.jobfile.fields import LEAVE_ONE_OUT
from basinrain.notes import Note
from basinrain.rainfall import RainRecord

__all__ = ["InfillChoice", "choose_infill", "compare"]

@dataclass(frozen=True, eq=False)
class InfillChoice:
    """The infill method of a run with what it needs to know.

    Parameters
    ----------
    options
        Method and numbers.
    relations
        Correlations and slopes of the whole record; None where it is too short for any.
    ratios
        Normals from the record, where the job asks for them.
    comparison
        The comparison that chose the method, where the job asks for that.
    notes
        What the normals and the comparison had to remark.
    """

    options: InfillOptions
    relations: Relations | None
    ratios: NormalRatios | None
    comparison: Comparison | None
    notes: tuple[Note, ...]

    def complete(
        self, window: RainRecord, network: GaugeNetwork, *, long: npt.NDArray[np.bool_] | None = None
    ) -> Completed:
        """Infill a window of the record; ``long`` as for :func:`basinrain.infill.complete`."""
        return complete(window, network, self.options, long=long, relations=self.relations, ratios=self.ratios)


def compare(job: Job, record: RainRecord, network: GaugeNetwork, say: Callable[[str], None]) -> Comparison:
    """Return every infill method scored on a job's record."""
    ratios, _ = _ratios(job, record, network)
    return compare_infill(record, network, options=_options(job), ratios=ratios, progress=say)


def choose_infill(
    job: Job,
    record: RainRecord,
    network: GaugeNetwork,
    say: Callable[[str], None],
    *,
    comparison: Comparison | None = None,
    whole_record: bool = False,
) -> InfillChoice:
    """Return the infill method of a job.

    Parameters
    ----------
    job, record, network
        The job, its whole record and its gauges.
    say
        Called with a few words before each part of the work.
    comparison
        The comparison of the methods, where it has been made.
    whole_record
        Whether all of the record is to be completed: then it is filled day by day unless the job gives a scale, since
        the total of a record is no storm's.

    Returns
    -------
    InfillChoice
    """
    ratios, notes = _ratios(job, record, network)
    options = _options(job)
    chosen = None
    if job.infill.method == LEAVE_ONE_OUT:
        if comparison is None:
            say("comparing")
            comparison = compare_infill(record, network, options=options, ratios=ratios, progress=say)
        chosen = comparison
        options = comparison.chosen_options
        notes = (*notes, *comparison.notes)
    if whole_record and options.scale is None and not record.labels:
        options = replace(options, scale="day")
    if options.chosen_method.needs_normals and ratios is None:
        notes = (*notes, *suspect_normal_units(network))
    return InfillChoice(options, relations_of_record(record, network, ratios=ratios), ratios, chosen, notes)


def _options(job: Job) -> InfillOptions:
    given = job.infill.model_dump(exclude={"normals"})
    if given["method"] == LEAVE_ONE_OUT:
        given["method"] = InfillOptions().method
    return InfillOptions(**given)


def _ratios(
    job: Job, record: RainRecord, network: GaugeNetwork
) -> tuple[NormalRatios | None, tuple[Note, ...]]:
    return normals_from_record(record, network) if job.infill.normals == "record" else (None, ())
