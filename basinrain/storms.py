"""Storms: windows of the record, what times them, and how their totals came about."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from basinrain.basins import Basins
from basinrain.errors import JobError, MethodError, Problem, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.ground import distances
from basinrain.infill import Completed
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status

__all__ = [
    "MEAN",
    "NEAREST_RECORDER",
    "Storm",
    "borrowed_times",
    "hyetograph_shape",
    "status_of_total",
    "storm_window",
]

MEAN = "mean"
NEAREST_RECORDER = "nearest-recorder"


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

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A",), ends - 3600, ends, [[0.0], [4.0], [np.nan], [1.0]], step="1h")
    >>> storm = Storm("Quill", 1, 3, record.starts[1], record.ends[2])
    >>> storm.cut(record).depth.ravel(), storm.pattern
    (array([ 4., nan]), 'mean')
    """

    name: str
    first: int
    stop: int
    start: np.datetime64
    end: np.datetime64
    pattern: str = MEAN

    def cut(self, record: RainRecord) -> RainRecord:
        """Return the storm's window of a record.

        Parameters
        ----------
        record
            The record whose steps ``first`` and ``stop`` count.

        Returns
        -------
        RainRecord
            NaN and statuses as they are. The row of a record of storm totals, which has no times of its own, takes the
            storm's ``start`` and ``end`` where these are known.
        """
        window = record.window(self.first, self.stop)
        if record.labels and not np.isnat(self.end):
            return replace(window, starts=np.array([self.start]), ends=np.array([self.end]))
        return window


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

    Returns
    -------
    Storm
        The window as taken: whole steps. Without ``start`` and ``end`` the whole record; of storm totals the row of
        that name, with NaT for times that are not given.
    tuple of Note
        A note with code ``"window-widened"`` where the window was widened to whole steps, else none.

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
        begin, finish = (np.datetime64("NaT", "s") if time is None else time for time in (start, end))
    else:
        begin = record.starts[0] if start is None else start.astype("datetime64[s]")
        finish = record.ends[-1] if end is None else end.astype("datetime64[s]")
    window = f"{_minute(begin)} to {_minute(finish)}"
    if finish <= begin:
        raise JobError(
            Problem(
                item=f"storm {name}", found=window, expected="an end after the start", remedy="correct start or end"
            )
        )
    if record.labels:
        return Storm(name, row, row + 1, begin, finish, pattern), ()
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
        f"{_minute(storm.start)} to {_minute(storm.end)}. Write these two times to choose them yourself."
    )
    return storm, (Note(code="window-widened", text=text, storm=name),)


def _minute(when: np.datetime64) -> str:
    return str(when.astype("datetime64[m]"))


def hyetograph_shape(
    completed: Completed, storm: Storm, network: GaugeNetwork, basins: Basins
) -> list[tuple[str, npt.NDArray[np.float64] | None]]:
    """Return what times each basin's total.

    Parameters
    ----------
    completed
        The storm's window after infill.
    storm
        Its ``pattern`` says what times the totals.
    network, basins
        Positions for the nearest recorder, measured from each basin's centroid; equally near gauges go by id.

    Returns
    -------
    list of (str, array of shape (n_steps,) or None), one per basin
        The gauge whose pattern is used and its shares of the storm (summing to 1); ``("mean", None)`` where the basin
        mean keeps its own times, as it does in a storm that stayed dry.

    Raises
    ------
    MethodError
        The gauge named has no depth at some step even after infill, or no rain; or no recorder has the storm.

    Examples
    --------
    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B"), x=[2000.0, 9000.0], y=[5000.0, 5000.0], crs="local")
    >>> basins = Basins(ids=("square",), polygons=[shapely.box(0, 0, 1e4, 1e4)], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> wet = RainRecord.from_depths(network.ids, ends - 3600, ends, [[3.0, np.nan], [1.0, 8.0]], step="1h")
    >>> storm = Storm("Quill", 0, 2, wet.starts[0], wet.ends[-1], NEAREST_RECORDER)
    >>> hyetograph_shape(Completed(wet, (), ()), storm, network, basins)
    [('A', array([0.75, 0.25]))]
    >>> dry = RainRecord.from_depths(network.ids, ends - 3600, ends, np.zeros((2, 2)), step="1h")
    >>> hyetograph_shape(Completed(dry, (), ()), storm, network, basins)
    [('mean', None)]
    """
    record = completed.record
    totals = record.depth.sum(axis=0)
    if storm.pattern == MEAN or not (record.depth > 0).any():
        return [(MEAN, None)] * len(basins)
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


def borrowed_times(storm: Storm, completed: Completed) -> Iterator[Note]:
    """Yield a warning when the gauge that times a storm did not record all of it itself.

    Parameters
    ----------
    storm
        Its pattern may be a gauge's id.
    completed
        The storm's window after infill.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[4.0, 2.0], [6.0, 3.0]], step="1h")
    >>> storm = Storm("Quill", 0, 2, record.starts[0], record.ends[-1], "B")
    >>> list(borrowed_times(storm, Completed(record, (), ())))
    []
    """
    record = completed.record
    if storm.pattern not in record.gauges:
        return
    column = record.gauges.index(storm.pattern)
    lacking = int((~record.measured[:, column]).sum())
    if lacking:
        yield Note(
            code="pattern-borrowed",
            text=f"Gauge {storm.pattern} times the hyetographs, but did not record {lacking} of {len(record)} steps "
            f"itself; their times are those of other gauges.",
            storm=storm.name,
            gauge=storm.pattern,
        )


def status_of_total(record: RainRecord, column: int) -> str:
    """Return in words how a gauge's storm total came about.

    Parameters
    ----------
    record
        The storm's window after infill.
    column
        The gauge's place in ``record.gauges``.

    Returns
    -------
    str
        ``"not installed"`` throughout; ``"missing"`` where a step in service has no depth; ``"in service for part"``;
        ``"infilled"`` throughout, ``"partly infilled"``; ``"spread"``, ``"estimated"`` or ``"adjusted"`` where a step
        is, in this order; else ``"observed"``, a dry storm included.

    Examples
    --------
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[0.0, 2.0], [0.0, np.nan]], step="1h")
    >>> status_of_total(record, 0), status_of_total(record, 1)
    ('observed', 'missing')
    """
    status = record.status[:, column]
    if (status == Status.NOT_INSTALLED).all():
        return Status.NOT_INSTALLED.label
    if np.isnan(record.depth[status != Status.NOT_INSTALLED, column]).any():
        return Status.MISSING.label
    if (status == Status.NOT_INSTALLED).any():
        return "in service for part"
    if (status == Status.INFILLED).all():
        return Status.INFILLED.label
    if (status == Status.INFILLED).any():
        return "partly infilled"
    for told in (Status.SPREAD, Status.ESTIMATED, Status.ADJUSTED):
        if (status == told).any():
            return told.label
    return Status.OBSERVED.label
