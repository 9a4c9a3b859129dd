"""What no counter does, and what the reader of a counter's depths must know of its falls."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_name
from basinrain.errors import Problems
from basinrain.intervals import DAY
from basinrain.notes import Note
from basinrain.reading.counter_column import CounterColumn
from basinrain.reading.counter_rules import LEAST, CounterRules, Falls
from basinrain.reading.depths import greatest_depth

__all__ = ["check_falls", "check_reset", "check_rises", "notes_of"]

_OFTEN: Final = 0.25
_FEW: Final = 2
"""A counter that falls at more than this share of its readings, and more than a few times, is none, or a noisy one."""

_MANY: Final = 0.05
"""With falls at more than this share of the readings, it is first of all to be asked whether it is a counter."""

_STAYED: Final = 1.0
"""mm; that just this much fell again in the first step after a reset would be a coincidence."""

_LISTED: Final = 3


def check_reset(column: CounterColumn, rules: CounterRules, falls: Falls, problems: Problems) -> None:
    """Report readings that go on rising where the counter is declared to be set to 0.

    In one step as much can fall as in the whole day before, but not as a rule; each such reading would count twice.
    """
    if rules.reset is None:
        return
    values, rows = column.values, column.rows
    k = np.flatnonzero(column.anew)
    k = k[(k > 0) & (k < len(values) - 1)]
    k = k[(rows[k - 1] == rows[k]) & ~column.anew[k - 1] & (rows[k + 1] == rows[k] + 1)]
    k = k[values[k - 1] > rules.noise]
    before, after = values[k - 1], values[k + 1]
    on = after >= before - rules.noise
    fell, rose = int((~on).sum()), int(on.sum())
    stayed = on & (np.abs(after - before) <= LEAST) & (before >= _STAYED)
    if (not fell and rose and (stayed.any() or falls.resets)) or (rose >= _FEW + 1 and rose > fell):
        first = int(k[on][0])
        where = ""
        if falls.resets:
            reading = falls.resets[0][0]
            where = f"; it falls between {column.time(reading - 1)} and {column.time(reading)}"
        column.report(
            problems,
            first + 1,
            found=f"readings that do not fall after {_clock(rules.reset)} on {rose} of {rose + fell} days, such as "
            f"from {values[first - 1]:g} mm to {values[first + 1]:g} mm at {column.time(first + 1)}",
            expected="a counter that is set to 0 right after its reading at that time, as reset says",
            remedy=f"correct reset, or leave it out{where}",
        )


def check_falls(
    column: CounterColumn, rises: npt.NDArray[np.float64], falls: Falls, rules: CounterRules, problems: Problems
) -> None:
    """Report readings that only fall, fall too often, or fall by less than a reset takes away."""
    listed = sorted([reading for reading, _ in falls.resets] + falls.noise)
    n = column.n_read
    if len(listed) >= _FEW and not (rises > 0).any():
        column.report(
            problems,
            listed[0],
            found=f"readings that only fall, {len(listed)} times, first {column.said(listed[0])}",
            expected="readings that rise with the rain",
            remedy="correct layout, or the column: a depth to water or a draining store is no counter",
        )
        return
    returns = _returns(column, listed, rises, rules)
    if returns:
        column.report(
            problems,
            returns[0],
            found=f"falls to 0 after nearly every rise, {len(returns)} times, first {column.said(returns[0])}",
            expected="readings that rise with the rain, and stay",
            remedy="is this a depth per step? Then layout = 'wide' or 'long'; declare reset where a counter is set to "
            "0 at a fixed time of day",
        )
    elif falls.noise or len(listed) > _FEW + _OFTEN * n:
        some = falls.noise or listed
        greatest = max(float(column.values[k - 1] - column.values[k]) for k in some)
        many = len(listed) > max(_FEW, _MANY * n)
        declare = (
            f"declare jitter where they are noise (they fall by up to {greatest:g} mm), or rollover, or correct "
            "the readings"
        )
        if len(listed) >= _FEW and _daily(column, np.array(listed)):
            k = listed[0]
            clocks = (_clock(_time_of_day(column.time(j))) for j in (k - 1, k))
            declare = (
                f"declare reset, as all of them fall between {' and '.join(clocks)}, or {declare[len('declare ') :]}"
            )
            many = False
        column.report(
            problems,
            some[0],
            found=f"readings that fall {len(listed)} times among {n}, such as {column.said(some[0])}",
            expected="falls within the jitter, to the start after a reset, or past rollover",
            remedy=f"is this a counter? If not, correct layout, or the column; else {declare}" if many else declare,
        )


def _returns(
    column: CounterColumn, listed: Sequence[int], rises: npt.NDArray[np.float64], rules: CounterRules
) -> list[int]:
    """Return the falls to 0 where they show that the readings are depths of steps; none where they do not.

    A counter keeps its reading until it is set back, so that a fall directly after a rise is chance; a depth returns
    to 0 when the rain ends. A counter that is set back every day falls at one time of day.
    """
    falls = np.array([k for k in listed if column.values[k] <= rules.noise and k > 1], dtype=np.int64)
    if len(falls) < _FEW or len(falls) <= _OFTEN * (rises > 0).sum():
        return []
    moving = np.abs(column.values[falls - 1] - column.values[falls - 2]) > rules.noise
    return falls.tolist() if 2 * moving.sum() > len(falls) and not _daily(column, falls) else []


def _daily(column: CounterColumn, falls: npt.NDArray[np.int64]) -> bool:
    """Return whether all falls are at one time of day, of several at which the counter is read."""
    times = column.record.ends[column.rows].astype(np.int64)
    return len(np.unique(times[falls] % DAY)) == 1 and bool(np.median(np.diff(times)) < DAY)


def check_rises(column: CounterColumn, rises: npt.NDArray[np.float64], problems: Problems) -> None:
    """Report rises that have never been measured in such a time."""
    later = np.arange(1, len(rises))
    most = np.full(len(rises), np.inf)
    most[1:] = greatest_depth(column.hours(later))
    beyond = np.flatnonzero(rises > most)
    if len(beyond):
        first = int(beyond[0])
        more = f", and {len(beyond) - 1} more like it" if len(beyond) > 1 else ""
        column.report(
            problems,
            first,
            found=f"a rise of {rises[first]:g} mm until {column.time(first)}{more}",
            expected=f"at most {most[first]:.0f} mm, which hardly ever fell in such a time",
            remedy="declare missing the readings that are none, or correct unit",
        )


def notes_of(
    column: CounterColumn, faulty: npt.NDArray[np.bool_], sound: CounterColumn, falls: Falls
) -> tuple[Note, ...]:
    """Return what falls were taken for, and which readings were not used.

    Parameters
    ----------
    column
        All readings.
    faulty
        Which of them leap away and back.
    sound
        The others.
    falls
        What the falls among these were taken for.
    """
    notes = []
    gauge = column.gauge
    doubtful = set(falls.doubtful)
    resets = [reading for reading, _ in falls.resets if reading not in doubtful]

    def fall(reading: int) -> str:
        return f"{sound.values[reading - 1]:g} to {sound.values[reading]:g} mm at {sound.time(reading)}"

    if resets:
        one = len(resets) == 1
        first = sound.time(resets[0] - 1), sound.time(resets[0])
        clocks = {(_time_of_day(sound.time(k - 1)), _time_of_day(sound.time(k))) for k in resets}
        each = (
            "" if one or len(clocks) > 1 else f", each between {' and '.join(_clock(_time_of_day(t)) for t in first)}"
        )
        notes.append(
            Note(
                code="counter-reset",
                text=f"Gauge {gauge}: {_count(resets, 'fall')} of the counter taken as "
                f"{'a reset' if one else 'resets'}: "
                f"{_listed(resets, fall)}{each}. What fell there until the reset is not known, so that the steps are "
                "missing. If the counter is set to 0 at a fixed time of day, declare reset; if it starts again at a "
                "full scale, declare rollover.",
                gauge=gauge,
            )
        )
    if falls.rollovers:
        notes.append(
            Note(
                code="counter-rollover",
                text=f"Gauge {gauge}: {_count(falls.rollovers, 'fall')} of the counter taken as passing its rollover "
                f"value: {_listed(falls.rollovers, fall)}.",
                level="info",
                gauge=gauge,
            )
        )
    if doubtful:
        notes.append(
            Note(
                code="counter-doubtful",
                text=f"Gauge {gauge}: {_count(falls.doubtful, 'fall')} of the counter that may come from a faulty "
                f"reading as well as from a reset: {_listed(falls.doubtful, fall)}. What fell is not known, and the "
                "steps from the last reading before to the next one after it are missing.",
                gauge=gauge,
            )
        )
    if faulty.any():
        places = np.flatnonzero(faulty).tolist()
        notes.append(
            Note(
                code="counter-leap",
                text=f"Gauge {gauge}: {_count(places, 'reading')} of the counter not used, as the counter leaps away "
                f"and back: {_listed(places, lambda k: f'{column.values[k]:g} mm at {column.time(k)}')}. What fell "
                "meanwhile is known as a total of these steps.",
                gauge=gauge,
            )
        )
    return tuple(notes)


def _count(places: Sequence[int], noun: str) -> str:
    return f"{len(places)} {noun}{'' if len(places) == 1 else 's'}"


def _listed(places: Sequence[int], said: Callable[[int], str]) -> str:
    return ", ".join(said(place) for place in places[:_LISTED]) + (" ..." if len(places) > _LISTED else "")


def _time_of_day(time: np.datetime64) -> int:
    return int(time.astype("datetime64[s]").astype(np.int64)) % DAY


def _clock(seconds: int) -> str:
    return clock_name(seconds)[1:]
