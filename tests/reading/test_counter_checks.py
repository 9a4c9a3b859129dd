"""What no counter does, and what is told of a counter's falls."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import ReadError
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.reading.counter import counter_depths
from basinrain.reading.counter_rules import CounterRules


def notes(column: list[float], **rules: float) -> list[Note]:
    """Return what is told of the hourly readings of gauge A from 09:00 of 4 May 2031."""
    ends = np.datetime64("2031-05-04T09:00:00") + np.arange(len(column)) * np.timedelta64(3600, "s")
    record = RainRecord.from_depths(("A",), ends - 3600, ends, np.array([column]).T, step="1h")
    return list(counter_depths(record, CounterRules(**rules)).notes)  # type: ignore[arg-type]


def refusal(column: list[float], **rules: float) -> str:
    """Return why such readings are refused."""
    with pytest.raises(ReadError) as caught:
        notes(column, **rules)
    return str(caught.value)


def test_nothing_to_tell() -> None:
    """Readings that rise need no note, nor does noise within the jitter."""
    assert notes([1, 1, 2, 4]) == notes([1, 0.9, 2, 4], jitter=0.2) == []


def test_resets_are_told() -> None:
    """How many, the first three of them with time and readings, what it means, and what could be declared."""
    [note] = notes([7, 8, 0, 0, 1, 2, 0.5, 0.6])
    assert (note.code, note.level, note.gauge) == ("counter-reset", "warning", "A")
    assert note.text == (
        "Gauge A: 2 falls of the counter taken as resets: 8 to 0 mm at 2031-05-04T11:00:00, 2 to 0.5 mm at "
        "2031-05-04T15:00:00. What fell there until the reset is not known, so that the steps are missing. If the "
        "counter is set to 0 at a fixed time of day, declare reset; if it starts again at a full scale, declare "
        "rollover."
    )
    day = [*[0.0] * 6, *[1.0] * 9, *[3.0] * 9]
    [note] = notes([*day, 3, *day, *day, *day, *day])
    assert note.text.startswith(
        "Gauge A: 4 falls of the counter taken as resets: 3 to 0 mm at 2031-05-05T10:00:00, 3 to 0 mm at "
        "2031-05-06T10:00:00, 3 to 0 mm at 2031-05-07T10:00:00 ..., each between 09:00 and 10:00. What"
    )


def test_resets_at_one_time_of_day() -> None:
    """Where all are between the same two hours, it is said, so that the time of the reset can be declared."""
    day = [*[0.0] * 6, *[2.0] * 18]
    [note] = notes([*day, *day, *day])
    assert "2 to 0 mm at 2031-05-06T09:00:00, each between 08:00 and 09:00. What fell" in note.text


def test_rollovers_are_told() -> None:
    """A rollover is for information."""
    [note] = notes([97.0, 99.5, 1.0, 1.5], rollover=100)
    assert (note.code, note.level) == ("counter-rollover", "info")
    assert note.text == (
        "Gauge A: 1 fall of the counter taken as passing its rollover value: 99.5 to 1 mm at 2031-05-04T11:00:00."
    )


def test_faulty_readings_are_told() -> None:
    """A reading that leaps is named; a fall that may be a reset as well is told from one that is."""
    [note] = notes([10, 10, 500, 11])
    assert note.code == "counter-leap"
    assert note.text == (
        "Gauge A: 1 reading of the counter not used, as the counter leaps away and back: 500 mm at "
        "2031-05-04T11:00:00. What fell meanwhile is known as a total of these steps."
    )
    [note] = notes([1, 1, 0, 1])
    assert note.code == "counter-doubtful"
    assert note.text == (
        "Gauge A: 1 fall of the counter that may come from a faulty reading as well as from a reset: 1 to 0 mm at "
        "2031-05-04T11:00:00. What fell is not known, and the steps from the last reading before to the next one after "
        "it are missing."
    )


def test_depths_of_steps() -> None:
    """Readings that return to 0 when the rain ends are depths; a day's reset, and one in a storm, are none."""
    said = refusal([0, 1, 2, 0, 0, 3, 0, 0, 0])
    assert said == (
        "gauge A: found falls to 0 after nearly every rise, 2 times, first from 2 mm to 0 mm at 2031-05-04T12:00:00; "
        "expected readings that rise with the rain, and stay; is this a depth per step? Then layout = 'wide' or "
        "'long'; declare reset where a counter is set to 0 at a fixed time of day"
    )
    fell = np.random.default_rng(5).choice([0, 0, 0, 0, 0.2, 0.6, 1.2, 3], size=480)
    assert "falls to 0 after nearly every rise" in refusal(fell.tolist())
    assert [note.code for note in notes([*range(1, 13), 0, *range(1, 12)])] == ["counter-reset"]
    day = [*[0.0] * 22, 1.0, 2.0]
    assert [note.code for note in notes([*day, *day, *day])] == ["counter-reset"]


def test_counters_that_only_fall() -> None:
    """A reading that never rises is a depth to water, a draining store or a wrong column."""
    assert refusal([9, 8, 7, 6]).startswith(
        "gauge A: found readings that only fall, 3 times, first from 9 mm to 8 mm at 2031-05-04T10:00:00; "
        "expected readings that rise with the rain; correct layout, or the column: a depth to water"
    )
    assert [note.code for note in notes([5.0, 5.0, 0.0, 0.0])] == ["counter-reset"]


def test_noise_that_is_not_declared() -> None:
    """Without jitter, small falls are neither resets nor rain: they are refused, with the jitter that would do."""
    assert refusal([10.0, 10.1, 10.0, 10.3, 10.1, 10.4]) == (
        "gauge A: found readings that fall 2 times among 6, such as from 10.1 mm to 10 mm at 2031-05-04T11:00:00; "
        "expected falls within the jitter, to the start after a reset, or past rollover; declare jitter where they are "
        "noise (they fall by up to 0.2 mm), or rollover, or correct the readings"
    )


def test_a_daily_reset_that_is_not_declared() -> None:
    """Falls at one time of day are those of a reset, even where the first hour's rain makes them small."""
    day = [0.4, *[0.6] * 23]
    said = refusal([0.4, *day[1:], *day, *day, *day, *day])
    assert "; declare reset, as all of them fall between 08:00 and 09:00, or jitter where they are noise" in said


def test_a_column_that_is_no_counter() -> None:
    """With falls at more than a twentieth of the readings, it is first asked whether the column is a counter."""
    warmth = 12 + 6 * np.sin(np.arange(96) * 2 * np.pi / 24)
    said = refusal(warmth.round(1).tolist(), jitter=2)
    assert "; is this a counter? If not, correct layout, or the column; else declare jitter" in said
    rare = [*np.arange(60.0) / 10, 5.8, 5.9, 5.8, 5.9, 5.8]
    assert "past rollover; declare jitter where they are noise" in refusal(rare)
