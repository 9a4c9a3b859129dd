"""What methods learn from the record, learned each time without the part of the record that they are scored on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.days import Days
from basinrain.infill.leave_one_out.estimator import Estimator
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import NormalRatios, normals_from_record
from basinrain.infill.relations import Relations, relations_without_parts
from basinrain.rainfall import RainRecord

__all__ = ["PARTS", "CrossFit", "Fitted", "parts_of"]

PARTS: Final = 5
"""Parts of the record, one after the other in time, each estimated by what the others teach."""

_LOST: Final = 0.2
"""With more of the pairs' normals than this lost by leaving a part out, normals of the whole record are taken."""

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


def parts_of(n_days: int) -> Ints:
    """Return the part that every rainfall day belongs to, 0 to 4, as equal in size as can be.

    Examples
    --------
    >>> parts_of(7), parts_of(2)
    (array([0, 0, 1, 2, 2, 3, 4]), array([0, 2]))
    """
    return np.arange(n_days) * PARTS // max(n_days, 1)


@dataclass(frozen=True, eq=False)
class CrossFit:
    """The parts of a record with the relations and normals that the rest of it teaches.

    Parameters
    ----------
    record : RainRecord
        The whole record.
    network : GaugeNetwork
    days : Days
        Its rainfall days, or its steps where these are as long.
    ratios : NormalRatios or None
        Normals of the whole record, where normals are taken from it.

    Examples
    --------
    B always has twice A's rain, but for the last day. Its part learns from the others; theirs learn from it too.

    >>> from basinrain.infill.days import day_totals
    >>> ends = np.datetime64("2031-05-01", "s") + np.arange(1, 51) * np.timedelta64(86400, "s")
    >>> depth = np.outer(np.arange(1.0, 51.0), [1.0, 2.0])
    >>> depth[-1] = 60.0, 0.0
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1e3], y=[0.0, 0.0], crs="local")
    >>> record = RainRecord.from_depths(network.ids, ends - np.timedelta64(86400, "s"), ends, depth, step="1d")
    >>> fit = CrossFit(record, network, day_totals(record), None)
    >>> [round(float(relations.slope[1, 0]), 3) for relations in fit.relations]
    [1.835, 1.827, 1.808, 1.77, 2.0]
    """

    record: RainRecord
    network: GaugeNetwork
    days: Days
    ratios: NormalRatios | None

    @cached_property
    def reporting(self) -> npt.NDArray[np.bool_]:
        """Whether a gauge has a value of its own at any time, shape (n_gauges,)."""
        return np.asarray(self.record.reporting.any(axis=0))

    @cached_property
    def relations(self) -> tuple[Relations, ...]:
        """What the rest of the record teaches about pairs of gauges, one a part."""
        days = self.days
        return relations_without_parts(
            days.totals, self.network, days.months, parts_of(len(days.totals)), ratios=self.part_ratios
        )

    @cached_property
    def _left_out(self) -> tuple[NormalRatios, ...] | None:
        """Normals of the rest of the record, one a part; None where too few years would be left."""
        if self.ratios is None or not len(self.days.ends):
            return None
        part = parts_of(len(self.days.ends))
        known = np.isfinite(self.ratios.means)
        found = []
        for k in np.unique(part):
            mine = np.flatnonzero(part == k)
            rest = (self.record.ends <= self.days.starts[mine[0]]) | (self.record.starts >= self.days.ends[mine[-1]])
            if not rest.any():
                return None
            ratios, _ = normals_from_record(_steps(self.record, rest), self.network)
            if (known & ~np.isfinite(ratios.means)).sum() > _LOST * known.sum():
                return None
            found.append(ratios)
        return tuple(found) if len(found) == PARTS else None

    @property
    def part_ratios(self) -> Sequence[NormalRatios | None]:
        """Normals from the record for every part."""
        return self._left_out or (self.ratios,) * PARTS

    @property
    def normals_see_all(self) -> bool:
        """Whether normals from the record are those of the whole record, the part that is estimated included."""
        return self.ratios is not None and self._left_out is None


class Fitted:
    """Leave-one-out estimates by one method, by what each part of the record may know.

    Parameters
    ----------
    options : InfillOptions
        Method and numbers.
    fit : CrossFit
    distances : array of float, shape (n_gauges, n_gauges)
        m.

    Examples
    --------
    See :func:`basinrain.infill.leave_one_out.compare_infill`.
    """

    def __init__(self, options: InfillOptions, fit: CrossFit, distances: Floats) -> None:
        method = options.chosen_method
        further: list[dict[str, Any]] = [{} for _ in range(PARTS)]
        if method.needs_relations:
            for k, relations in enumerate(fit.relations):
                further[k]["relations"] = relations
        if method.needs_normals and fit.ratios is not None:
            for k, ratios in enumerate(fit.part_ratios):
                further[k]["ratios"] = ratios
        # One for all parts, with all that it has found out, where nothing is learned from the record.
        apart = method.needs_relations or (method.needs_normals and fit.ratios is not None and not fit.normals_see_all)
        made = [
            Estimator(fit.network, options, distances=distances, reporting=fit.reporting, **of_part)
            for of_part in further[: PARTS if apart else 1]
        ]
        self._estimators = made if apart else made * PARTS

    def estimates(self, depth: Floats, months: Ints, part: Ints) -> Floats:
        """Return the estimate of every value from the other gauges.

        Parameters
        ----------
        depth : array of float, shape (n, n_gauges)
            mm; NaN where there is no value.
        months : array of int, shape (n,)
            1 to 12, or 0.
        part : array of int, shape (n,)
            The part of the record that each row belongs to.

        Returns
        -------
        array of float, shape (n, n_gauges)
            mm; NaN where there is no value or there are too few donors.
        """
        result = np.full(depth.shape, np.nan)
        for k in np.unique(part):
            mine = part == k
            result[mine] = self._estimators[k].estimates(depth[mine], months[mine])
        return result


def _steps(record: RainRecord, keep: npt.NDArray[np.bool_]) -> RainRecord:
    return replace(
        record,
        starts=record.starts[keep],
        ends=record.ends[keep],
        depth=record.depth[keep],
        status=record.status[keep],
        labels=(),
    )
