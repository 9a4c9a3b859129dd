"""Which infill method a job uses, and what that method learns from the record."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, Completed, InfillOptions, complete
from basinrain.infill.leave_one_out import Comparison, compare_infill
from basinrain.infill.normals import suspect_normal_units
from basinrain.infill.record_normals import NormalRatios, normals_from_record
from basinrain.infill.relations import Relations, relations_of_record
from basinrain.jobfile import Job
from basinrain.jobfile.fields import LEAVE_ONE_OUT
from basinrain.notes import Note
from basinrain.rainfall import RainRecord

__all__ = ["InfillChoice", "choose_infill", "compare", "infill_options"]


@dataclass(frozen=True, eq=False)
class InfillChoice:
    """The infill method of a run with what it needs to know.

    Parameters
    ----------
    record, network
        The whole record and its gauges.
    options
        Method and numbers.
    asked
        The job's own numbers, from which a comparison may have chosen: what other methods are to be tried with.
    ratios
        Normals from the record, where the job asks for them.
    comparison
        The comparison that chose the method, where the job asks for that.
    notes
        What the normals and the comparison had to remark.
    """

    record: RainRecord
    network: GaugeNetwork
    options: InfillOptions
    asked: InfillOptions
    ratios: NormalRatios | None
    comparison: Comparison | None
    notes: tuple[Note, ...]

    @cached_property
    def relations(self) -> Relations:
        """Correlations and slopes of the whole record, not of a storm alone, which has too few days."""
        return relations_of_record(self.record, self.network, ratios=self.ratios)

    @property
    def settings(self) -> dict[str, str | float]:
        """The options in the words of a job, with the method's defaults and without what it does not take."""
        options = self.options
        normals = "given" if self.ratios is None else "record"
        given = {
            "method": options.method,
            "scale": options.scale,
            "longest_gap": options.longest_gap,
            "nearest": options.donors_wanted,
            "radius": options.radius,
            "min_donors": options.donors_required,
            "elevation_limit": options.elevation_limit,
            "power": options.exponent,
            "normals": normals if options.chosen_method.needs_normals else None,
        }
        return {key: value for key, value in given.items() if value is not None}

    def complete(
        self, window: RainRecord, *, long: npt.NDArray[np.bool_] | None = None, trace: bool = True
    ) -> Completed:
        """Infill a window of the record; ``long`` and ``trace`` as for :func:`basinrain.infill.complete`."""
        relations = self.relations if self.options.chosen_method.needs_relations else None
        return complete(
            window, self.network, self.options, long=long, relations=relations, ratios=self.ratios, trace=trace
        )


def compare(job: Job, record: RainRecord, network: GaugeNetwork, say: Callable[[str], None]) -> Comparison:
    """Return every infill method scored on a job's record, whatever method the job names."""
    ratios, _ = _ratios(job, record, network)
    names = "with the infill method named" if job.infill.method == LEAVE_ONE_OUT else "which infills without comparing"
    return _compared(job, record, network, ratios, say, instead=f"use 'basinrain storm', {names}")


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

    Raises
    ------
    JobError
        An option is given that the method does not take; all of them together.
    """
    asked = options = infill_options(job)
    ratios, notes = _ratios(job, record, network)
    chosen = None
    if job.infill.method == LEAVE_ONE_OUT:
        if comparison is None:
            say("comparing")
            comparison = _compared(job, record, network, ratios, say, instead="name the infill method")
        chosen = comparison
        options = comparison.chosen_options
        notes = (*notes, *comparison.notes)
    if whole_record and options.scale is None and not record.labels:
        options = replace(options, scale="day")
    # Whatever the method: the others, which need normals, are set beside it.
    if network.normals is not None and ratios is None:
        notes = (*notes, *suspect_normal_units(network))
    asked = replace(asked, scale=options.scale)
    return InfillChoice(record, network, options, asked, ratios, chosen, notes)


def _compared(
    job: Job,
    record: RainRecord,
    network: GaugeNetwork,
    ratios: NormalRatios | None,
    say: Callable[[str], None],
    *,
    instead: str,
) -> Comparison:
    return compare_infill(
        record,
        network,
        options=infill_options(job),
        ratios=ratios,
        progress=say,
        depth_unit=job.job.depth_unit,
        instead=instead,
    )


def infill_options(job: Job) -> InfillOptions:
    """Return what a job says of infilling; the default method stands for the one that a comparison is to find.

    Raises
    ------
    JobError
        An option is given that the method does not take, or numbers do not fit together; all such problems together.
    """
    given = job.infill.model_dump(exclude={"normals"})
    named = given["method"]
    if named == LEAVE_ONE_OUT:
        given["method"] = InfillOptions().method
    wrong = []
    if job.infill.normals == "record" and named != LEAVE_ONE_OUT and not METHODS[named].needs_normals:
        needing = (method.name for method in METHODS.values() if method.needs_normals)
        wrong.append(
            Problem(
                item="[infill] normals",
                found=f"'record' beside method '{named}'",
                expected=f"one of the methods that need normals: {', '.join((*needing, LEAVE_ONE_OUT))}",
                remedy="remove normals, or choose one of these",
            )
        )
    try:
        options = InfillOptions(**given)
    except JobError as error:
        raise JobError([*error.problems, *wrong]) from None
    if wrong:
        raise JobError(wrong)
    return options


def _ratios(job: Job, record: RainRecord, network: GaugeNetwork) -> tuple[NormalRatios | None, tuple[Note, ...]]:
    return normals_from_record(record, network) if job.infill.normals == "record" else (None, ())
