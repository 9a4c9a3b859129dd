"""What the readings of one counter say about the rain: rises, and what every fall is taken for."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems
from basinrain.notes import Note
from basinrain.reading.counter_checks import check_falls, check_reset, check_rises, notes_of
from basinrain.reading.counter_column import CounterColumn
from basinrain.reading.counter_rules import LEAST, CounterRules, Falls
from basinrain.reading.depths import greatest_depth

__all__ = ["depth_rises"]

_RESET: Final = 0.5
"""A reset takes away at least this share of the reading."""

_DROPOUT: Final = 3
_LEAP: Final = 0.1
"""Low readings are faulty when they are so few, or the rise back is over this share of the greatest known depth."""

_LEAST_LEAP: Final = 30.0
"""mm; in a short step a tenth of the greatest known depth may have fallen."""

_FARTHEST: Final = 1000
"""So many readings are looked through for the end of a leap."""


def depth_rises(
    column: CounterColumn, rules: CounterRules, problems: Problems, notes: list[Note]
) -> tuple[CounterColumn, npt.NDArray[np.float64]]:
    """Return the depth since the reading before, for every reading that is not faulty.

    Parameters
    ----------
    column
        The readings.
    rules
        What they can do.
    problems
        Takes what no counter does.
    notes
        Takes what falls were taken for, and which readings were not used.

    Returns
    -------
    column : CounterColumn
        Without readings that leap away and back.
    rises : array of float, shape (n_readings,)
        mm; NaN where it is not known, and where the counter was set to 0.
    """
    values = column.values
    if rules.rollover is not None and (values > rules.rollover + LEAST).any():
        first = int(np.argmax(values > rules.rollover + LEAST))
        column.report(
            problems,
            first,
            found=f"a reading of {values[first]:g} mm at {column.time(first)}",
            expected=f"none above rollover, {rules.rollover:g} mm",
            remedy="correct rollover, which is in the source's unit",
        )
        return column, np.full(len(values), np.nan)
    faulty = _leaps(column, rules)
    sound = column.without(faulty)
    rises, falls = _judged(sound, rules)
    check_reset(sound, rules, falls, problems)
    check_falls(sound, rises, falls, rules, problems)
    bounds = sound.segments()
    for reading, before in falls.resets:
        within = int(np.searchsorted(bounds, reading, side="right"))
        segment = slice(int(bounds[within - 1]), int(bounds[within]))
        if _drop_doubtful(sound, rises, segment, reading, before=before, noise=rules.noise):
            falls.doubtful.append(reading)
    check_rises(sound, rises, problems)
    notes += notes_of(column, faulty, sound, falls)
    return sound, rises


def _leaps(column: CounterColumn, rules: CounterRules) -> npt.NDArray[np.bool_]:
    """Return which readings leap so far away and back that no rain explains it.

    Upwards, a few readings leap and the next one is where it was; downwards, level readings that end with the leap
    back. A fall to 0 after an upward leap may be a reset, and is left to the reset's rules.
    """
    values, noise = column.values, rules.noise
    faulty = np.zeros(len(values), dtype=bool)
    if len(values) < 3:
        return faulty
    later = np.arange(1, len(values))
    leap = np.full(len(values), np.inf)
    leap[1:] = np.maximum(_LEAP * greatest_depth(column.hours(later)), _LEAST_LEAP)
    leap[column.anew] = np.inf
    change = np.diff(values, prepend=values[0])
    bounds = column.segments()
    for k in np.flatnonzero(np.abs(change) > leap).tolist():
        if faulty[k - 1]:
            continue
        stop = int(bounds[np.searchsorted(bounds, k, side="right")])
        before = values[k - 1]
        if change[k] > 0:
            after = values[k + 1 : min(stop, k + 1 + _DROPOUT)]
            back = np.flatnonzero(after < values[k] - leap[k])
            if len(back) and after[back[0]] >= before - noise and after[back[0]] > noise:
                faulty[k : k + 1 + int(back[0])] = True
        else:
            after = values[k + 1 : min(stop, k + 1 + _FARTHEST)]
            back = np.flatnonzero(np.abs(after - values[k]) > noise)
            if len(back) and after[back[0]] >= before - noise and after[back[0]] - values[k] > leap[k + 1 + back[0]]:
                faulty[k : k + 1 + int(back[0])] = True
    return faulty


def _judged(column: CounterColumn, rules: CounterRules) -> tuple[npt.NDArray[np.float64], Falls]:
    """Return the rises, and what every fall is taken for."""
    values = column.values
    rises = np.full(len(values), np.nan)
    change = np.diff(values)
    change[column.anew[1:]] = np.nan
    rises[1:] = change
    falls = Falls()
    bounds = column.segments()
    fallen = np.unique(np.searchsorted(bounds, np.flatnonzero(change < 0) + 1, side="right"))
    for number in fallen.tolist():
        start, end = int(bounds[number - 1]), int(bounds[number])
        while start < end:
            stop, highest = _until_fall(values[:end], start, rules.noise)
            # Depths count from the highest reading so far.
            rises[start + 1 : stop] = np.diff(highest)
            if stop == end:
                break
            wrap = _wrapped(column, stop, float(highest[-1]), rules)
            if wrap is not None:
                rises[stop] = wrap
                falls.rollovers.append(stop)
            else:
                rises[stop] = np.nan
                if highest[-1] - values[stop] >= _RESET * highest[-1]:
                    falls.resets.append((stop, float(highest[-1])))
                else:
                    falls.noise.append(stop)
            start = stop
    return np.round(rises, 9), falls


def _until_fall(values: npt.NDArray[np.float64], start: int, noise: float) -> tuple[int, npt.NDArray[np.float64]]:
    """Return the first reading that falls by more than the noise, and the highest reading so far until then."""
    size = 256
    while True:
        part = values[start : start + size]
        highest = np.maximum.accumulate(part)
        falls = part < highest - noise
        if falls.any():
            n = int(np.argmax(falls))
            return start + n, highest[:n]
        if start + size >= len(values):
            return len(values), highest
        size *= 2


def _wrapped(column: CounterColumn, reading: int, before: float, rules: CounterRules) -> float | None:
    if rules.rollover is None:
        return None
    rise = rules.rollover - before + float(column.values[reading])
    most = float(greatest_depth(column.hours(np.array([reading])))[0])
    return max(0.0, rise) if rise < min(rules.rollover / 2, most) else None


def _drop_doubtful(
    column: CounterColumn,
    rises: npt.NDArray[np.float64],
    segment: slice,
    reading: int,
    *,
    before: float,
    noise: float,
) -> bool:
    """Take out, in place, the rise and fall of readings that may have been faulty and not those of a reset."""
    values = column.values
    dropped = False
    earlier = np.flatnonzero(rises[segment.start : reading] > 0)
    if len(earlier):
        rise = segment.start + int(earlier[-1])
        undone = values[reading] >= values[rise - 1] - noise
        # A fall to 0 undoes every first rise of the day: then only the reading just before it is in doubt.
        if undone and (values[reading] > noise or rise == reading - 1):
            rises[rise:reading] = np.nan
            dropped = True
    later = np.flatnonzero(rises[reading + 1 : segment.stop] > 0)
    if len(later):
        rise = reading + 1 + int(later[0])
        leap = rises[rise] > _LEAP * greatest_depth(column.hours(np.array([rise])))[0]
        if values[rise] >= before - noise and (leap or rise - reading <= _DROPOUT):
            rises[reading : rise + 1] = np.nan
            dropped = True
    return dropped
