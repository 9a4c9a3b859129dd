"""Storms: windows of the record, their basin totals, and where every millimetre of them came from."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from basinrain.basins import Basins
from basinrain.errors import JobError, MethodError, Problem, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.ground import distances
from basinrain.infill import Completed
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.weights import WeightTable

__all__ = [
    "MEAN",
    "NEAREST_RECORDER",
    "BasinDepths",
    "Storm",
    "average_storm",
    "hyetograph_shape",
    "spread_across_methods",
    "status_of_total",
    "storm_window",
]

MEAN = "mean"
NEAREST_RECORDER = "nearest-recorder"

Weigher = Callable[[npt.NDArray[np.bool_]], WeightTable]


@dataclass(frozen=True)
class Storm:
    """A named window of the record.

    Parameters
    ----------
    name
        The storm's name.
    first, stop
        Steps of the record, ``first`` included, ``stop`` not.
    start, end
        The window ``(start, end]`` in the record's clock; NaT for storm totals without times.
    pattern
        What times the basin total: ``"mean"``, ``"nearest-recorder"`` or a gauge's id.
    """

    name: str
    first: int
    stop: int
    start: np.datetime64
    end: np.datetime64
    pattern: str = MEAN


def storm_window(
    record: RainRecord,
    name: str,
    *,
    start: np.datetime64 | None = None,
    end: np.datetime64 | None = None,
    pattern: str = MEAN,
) -> tuple[Storm, tuple[Note, ...]]:
    """Return the steps of a record that a storm covers.

    Parameters
    ----------
    record
        The record; a record of storm totals has its storms' names as labels.
    name
        The storm's name.
    start, end
        The window ``(start, end]`` in the record's clock; where one is not given, the record's own. A step that lies in
        the window only in part is taken whole, and a note says so.
    pattern
        ``"mean"``, ``"nearest-recorder"`` or the id of a gauge of the record.

    Raises
    ------
    JobError
        The storm ends before it starts, lies outside the record, or its pattern is not known.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, np.ones((4, 1)), step="1h")
    >>> storm, notes = storm_window(
    ...     record, "Quill", start=np.datetime64("2031-05-04T01:00"), end=np.datetime64("2031-05-04T03:00")
    ... )
    >>> storm.first, storm.stop, notes
    (1, 3, ())
    >>> storm_window(record, "Quill", start=np.datetime64("2031-06-01"))
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: storm Quill: found 2031-06-01T00:00 to 2031-05-04T04:00; expected an end after the \
start; correct start or end
    """
    known = (MEAN, NEAREST_RECORDER, *record.gauges)
    if pattern not in known:
        raise JobError(
            Problem(
                item=f"storm {name} pattern",
                found=f"'{pattern}'",
                expected=f"'{MEAN}', '{NEAREST_RECORDER}' or the id of a gauge",
                remedy=nearest_name(pattern, known),
            )
        )
    if record.labels:
        if name not in record.labels:
            raise JobError(
                Problem(
                    item=f"storm {name}",
                    found="no totals of that storm",
                    expected="the name of a storm in the file",
                    remedy=nearest_name(name, record.labels),
                )
            )
        row = record.labels.index(name)
        return Storm(name, row, row + 1, record.starts[row], record.ends[row], pattern), ()
    begin = record.starts[0] if start is None else start.astype("datetime64[s]")
    finish = record.ends[-1] if end is None else end.astype("datetime64[s]")
    window = f"{_minute(begin)} to {_minute(finish)}"
    if finish <= begin:
        raise JobError(
            Problem(
                item=f"storm {name}", found=window, expected="an end after the start", remedy="correct start or end"
            )
        )
    if begin < record.starts[0] or finish > record.ends[-1]:
        raise JobError(
            Problem(
                item=f"storm {name}",
                found=window,
                expected=f"a window inside the record, {_minute(record.starts[0])} to {_minute(record.ends[-1])}",
                remedy="correct start or end, or add the rest of the record",
            )
        )
    first = int(np.searchsorted(record.ends, begin, side="right"))
    stop = int(np.searchsorted(record.starts, finish, side="left"))
    storm = Storm(name, first, stop, record.starts[first], record.ends[stop - 1], pattern)
    if (storm.start, storm.end) == (begin, finish):
        return storm, ()
    text = (
        f"The window {window} does not fall on steps of {record.step}; whole steps were taken, "
        f"{_minute(storm.start)} to {_minute(storm.end)}."
    )
    return storm, (Note(code="window-widened", text=text, storm=name),)


def _minute(when: np.datetime64) -> str:
    return str(when.astype("datetime64[m]"))


@dataclass(frozen=True, eq=False)
class BasinDepths:
    """What one averaging method gives for one storm, for all basins.

    Parameters
    ----------
    table : WeightTable
        The method's own weights with every gauge present that has a depth in the storm, observed or infilled.
    depth : array of float, shape (n_steps, n_basins)
        Basin means in mm; NaN where the method has no number.
    infilled : array of float, shape (n_basins,)
        mm of the total that rest on infilled values.
    reporting_only : array of float, shape (n_basins,)
        Total in mm with weights rebuilt at every step from the gauges that report; NaN where at some step none does.
    contribution : array of float, shape (n_basins, n_gauges)
        mm of the total that come from each gauge's own values, directly and through infill; rows sum to the total.
    least, most : array of float, shape (n_basins, n_gauges)
        Least and greatest weight of each gauge's own values over the steps, infill included.
    observed_share : array of float, shape (n_steps, n_basins)
        Share of the weight that lies on gauges which report at the step.
    rebuilt_steps : int
        Steps at which weights were rebuilt since a gauge had no depth even after infill.
    """

    table: WeightTable
    depth: npt.NDArray[np.float64]
    infilled: npt.NDArray[np.float64]
    reporting_only: npt.NDArray[np.float64]
    contribution: npt.NDArray[np.float64]
    least: npt.NDArray[np.float64]
    most: npt.NDArray[np.float64]
    observed_share: npt.NDArray[np.float64]
    rebuilt_steps: int = field(default=0)

    @property
    def total(self) -> npt.NDArray[np.float64]:
        """Storm totals in mm, shape (n_basins,); NaN where any step is: a total is never the sum of what is left."""
        return np.asarray(self.depth.sum(axis=0))


def average_storm(completed: Completed, weigher: Weigher) -> BasinDepths:
    """Average a completed storm over the basins by one method.

    Parameters
    ----------
    completed
        The storm's window after infill.
    weigher
        Makes the method's weights for any set of gauges that are present.

    Returns
    -------
    BasinDepths

    Notes
    -----
    With D the donor weights of a step, W the weights of the gauges that have a depth and p the reporting gauges' own
    depths, the basin mean of the step is ``W D p``. Hence the contribution of gauge i to basin b over the storm is the
    sum over steps of ``(W D)[b, i] p[i]``, and these sum to the mean exactly. Where the total of a day or storm was
    spread, p is the donors' total in the times of the gauge whose pattern was used.
    """
    record = completed.record
    has_depth = ~np.isnan(record.depth)
    reporting = record.reporting
    anywhere: npt.NDArray[np.bool_] = np.asarray(has_depth.any(axis=0))
    table = weigher(anywhere)
    n_steps, (n_basins, n_gauges) = len(record), table.weights.shape
    weigh = _Remembered(weigher)
    depth = np.full((n_steps, n_basins), np.nan)
    observed_share = np.zeros((n_steps, n_basins))
    infilled = np.zeros(n_basins)
    contribution = np.zeros((n_basins, n_gauges))
    least, most = np.full((n_basins, n_gauges), np.inf), np.full((n_basins, n_gauges), -np.inf)
    rebuilt = 0
    for steps, donors in completed.donor_tables():
        present = has_depth[steps[0]]
        if not present.any():
            contribution[:] = np.nan
            infilled[:] = np.nan
            continue
        rebuilt += len(steps) * int((present != anywhere).any())
        here = weigh(present)
        depth[steps] = here.apply(np.where(present, record.depth[steps], np.nan))
        influence = here.weights @ donors
        contribution += here.weights @ completed.sources(steps)
        least, most = np.minimum(least, influence), np.maximum(most, influence)
        estimated = np.where(present & ~reporting[steps[0]], record.depth[steps], 0.0).sum(axis=0)
        infilled += np.where(np.isnan(here.weights), np.nan, here.weights) @ estimated
        weight_sum = here.weights.sum(axis=1)
        observed_share[steps] = np.divide(
            here.weights @ reporting[steps[0]].astype(float),
            weight_sum,
            out=np.full(n_basins, np.nan),
            where=weight_sum != 0,
        )
    return BasinDepths(
        table=table,
        depth=depth,
        infilled=infilled,
        reporting_only=_reporting_only(record, weigh, n_basins),
        contribution=contribution,
        least=np.where(np.isinf(least), np.nan, least),
        most=np.where(np.isinf(most), np.nan, most),
        observed_share=observed_share,
        rebuilt_steps=rebuilt,
    )


def _reporting_only(record: RainRecord, weigh: Weigher, n_basins: int) -> npt.NDArray[np.float64]:
    patterns, group = np.unique(record.reporting, axis=0, return_inverse=True)
    total = np.zeros(n_basins)
    for k, pattern in enumerate(patterns):
        if not pattern.any():
            return np.full(n_basins, np.nan)
        try:
            table = weigh(pattern)
        except MethodError:
            # The gauges that happen to report do not reach the basin: this one figure has no number, the run goes on.
            return np.full(n_basins, np.nan)
        depth = np.where(pattern, record.depth[group == k], 0.0).sum(axis=0)
        total += table.apply(np.where(pattern, depth, np.nan))
    return total


class _Remembered:
    """Keeps the tables that were made, since few sets of present gauges recur at many steps."""

    def __init__(self, weigher: Weigher) -> None:
        self._weigher = weigher
        self._tables: dict[bytes, WeightTable] = {}

    def __call__(self, present: npt.NDArray[np.bool_]) -> WeightTable:
        key = present.tobytes()
        if key not in self._tables:
            self._tables[key] = self._weigher(present)
        return self._tables[key]


def hyetograph_shape(
    completed: Completed, storm: Storm, network: GaugeNetwork, basins: Basins
) -> list[tuple[str, npt.NDArray[np.float64] | None]]:
    """Return what times each basin's total.

    Returns
    -------
    list of (str, array of shape (n_steps,) or None), one per basin
        The gauge whose pattern is used and its shares of the storm (summing to 1); ``("mean", None)`` where the basin
        mean keeps its own times.

    Raises
    ------
    MethodError
        The gauge named has no complete record of the storm, or no rain in it; or no recorder has.
    """
    record = completed.record
    if storm.pattern == MEAN:
        return [(MEAN, None)] * len(basins)
    totals = record.depth.sum(axis=0)
    if storm.pattern != NEAREST_RECORDER:
        column = record.gauges.index(storm.pattern)
        if not totals[column] > 0:
            found = "no rain" if totals[column] == 0 else "steps without a depth"
            raise MethodError(
                Problem(
                    item=f"storm {storm.name} pattern",
                    found=f"{found} at gauge {storm.pattern} in the storm",
                    expected="a gauge that has the whole storm",
                    remedy="choose another gauge, or pattern = 'mean'",
                    gauge=storm.pattern,
                )
            )
        return [(storm.pattern, record.depth[:, column] / totals[column])] * len(basins)
    wet = record.measured.all(axis=0) & (totals > 0) & np.isin(record.gauges, list(record.recorders))
    if not wet.any():
        raise MethodError(
            Problem(
                item=f"storm {storm.name} pattern",
                found="no recording gauge with the whole storm and rain in it",
                expected="one at least",
                remedy="use pattern = 'mean'",
            )
        )
    shapes: list[tuple[str, npt.NDArray[np.float64] | None]] = []
    for polygon in basins.polygons:
        centre = polygon.centroid
        away = distances(np.array([centre.x]), np.array([centre.y]), network.x, network.y, basins.crs)[0]
        nearest = min(np.flatnonzero(wet), key=lambda g: (round(float(away[g]), 3), network.ids[g]))
        shapes.append((network.ids[nearest], record.depth[:, nearest] / totals[nearest]))
    return shapes


def status_of_total(record: RainRecord, column: int) -> str:
    """Return in words how a gauge's storm total came about."""
    status = record.status[:, column]
    if (status == Status.NOT_INSTALLED).all():
        return Status.NOT_INSTALLED.label
    if np.isnan(record.depth[:, column]).any():
        return Status.MISSING.label
    if (status == Status.INFILLED).all():
        return Status.INFILLED.label
    if (status == Status.INFILLED).any():
        return "partly infilled"
    if (status == Status.SPREAD).any():
        return Status.SPREAD.label
    return Status.OBSERVED.label


def spread_across_methods(totals: Mapping[str, float] | Sequence[float]) -> tuple[float, float, float, float]:
    """Return least, greatest, their difference and that difference in percent of the mean of the methods' totals.

    Methods without a number are left out; with fewer than two numbers the difference is NaN.

    Examples
    --------
    >>> spread_across_methods([20.0, 25.0, float("nan")])
    (20.0, 25.0, 5.0, 22.22222222222222)
    >>> spread_across_methods([20.0])
    (20.0, 20.0, nan, nan)
    """
    values = np.array(list(totals.values()) if isinstance(totals, Mapping) else totals, dtype=float)
    values = values[~np.isnan(values)]
    if len(values) == 0:
        return (np.nan,) * 4
    least, most = float(values.min()), float(values.max())
    if len(values) == 1:
        return least, most, np.nan, np.nan
    centre = float(values.mean())
    return least, most, most - least, 100 * (most - least) / centre if centre > 0 else 0.0
