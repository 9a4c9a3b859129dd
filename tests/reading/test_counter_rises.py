"""Depths of counters that are set to 0 at a declared time of day."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.errors import JobError, ReadError
from basinrain.intervals import parse_interval
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.counter import counter_depths
from basinrain.reading.counter_rules import CounterRules

NAN = np.nan


def readings(column: list[float], start: str = "2031-05-03T22:00", step: str = "1h") -> RainRecord:
    """Return readings of gauge A, every hour unless the step says otherwise."""
    length = np.timedelta64(parse_interval(step).seconds or 0, "s")
    ends = np.datetime64(start, "s") + np.arange(len(column)) * length
    return RainRecord.from_depths(("A",), ends - length, ends, np.array([column]).T, step=step)


def midnight(column: list[float], *, start: str = "2031-05-03T22:00", **rules: float) -> tuple[str, list[float], str]:
    """Return depths, totals and the first letters of the statuses of a counter that is set to 0 at midnight."""
    record = counter_depths(readings(column, start), CounterRules(reset=0, **rules))
    marks = "".join(Status(code).label[0] for code in record.status[:, 0])
    return " ".join(f"{depth:g}" for depth in record.depth[:, 0]), [total.depth for total in record.totals], marks


def test_the_heaviest_hour_after_midnight() -> None:
    """12 mm in the first hour count 12, although the reading is higher than that of midnight: 4 mm."""
    assert midnight([2, 3, 4, 12, 13, 13]) == ("1 1 12 1 0", [], "ooooz")


def test_gaps_around_the_reset() -> None:
    """Without the reading of midnight, the steps until it are missing; the next reading counts from midnight."""
    assert midnight([2, 3, NAN, 5, 5.5]) == ("1 nan 5 0.5", [], "omoo")
    assert midnight([2, NAN, NAN, 5, 5.5]) == ("nan nan 5 0.5", [], "mmoo")
    assert midnight([2, 3, 4, NAN, 5, 5.5]) == ("1 1 nan nan 0.5", [5.0], "ooaao")
    assert midnight([2, 3, NAN, NAN, 5, 5.5]) == ("1 nan nan nan 0.5", [5.0], "omaao")
    assert midnight([2, 3, NAN, NAN, 0, 0.5]) == ("1 nan 0 0 0.5", [], "omzzo")
    assert midnight([NAN, NAN, NAN, 5, 6]) == ("nan nan 5 1", [], "mmoo")


def test_days_without_a_reading() -> None:
    """After days of silence nothing is known up to the last reset before the next reading."""
    column = [2, 3, 4, 1, *[NAN] * 49, 6, 6.5]
    depth, totals, marks = midnight(column)
    assert (totals, marks) == ([6.0], "ooo" + "m" * 47 + "aaao")
    assert depth.split()[:3] == ["1", "1", "1"]


def test_falls_at_another_time() -> None:
    """A fall that is not at the declared time is a reset of which nothing is known, as without a declared time."""
    record = counter_depths(readings([8, 9, 9.5, 0.2, 0.4, 1, 2, 0, 1]), CounterRules(reset=0))
    np.testing.assert_allclose(record.depth[:, 0], [1, 0.5, 0.2, 0.2, 0.6, 1, NAN, 1])
    assert [note.code for note in record.notes] == ["counter-reset"]


def test_a_leap_in_a_day() -> None:
    """Faulty readings are looked for between two resets, the 0 of the reset being where the leap began."""
    assert midnight([2, 3, 4, 90, 0.5, 0.7]) == ("1 1 nan nan 0.2", [0.5], "ooaao")


def test_jitter_and_rollover_between_resets() -> None:
    """They mean the same as without resets."""
    assert midnight([2, 3, 4, 0.5, 0.4, 0.8], jitter=0.2)[0] == "1 1 0.5 0 0.3"
    assert midnight([2, 3, 4, 9, 1, 2], rollover=10)[0] == "1 1 9 2 1"


def test_daily_readings_of_a_gauge_that_is_emptied() -> None:
    """A gauge that is emptied at its daily reading shows every day's depth."""
    record = counter_depths(readings([5, 3, 0, 7], "2031-05-03T08:00", "1d"), CounterRules(reset=8 * 3600))
    assert (record.depth[:, 0].tolist(), record.notes) == ([3, 0, 7], ())


@pytest.mark.parametrize(
    ("start", "step", "expected"),
    [
        ("2031-05-03T22:30", "1h", "a time of day at which the counters are read, such as 22:30"),
        ("2031-05-03T08:00", "1d", "a time of day at which the counters are read, such as 08:00"),
        ("2031-05-03T00:00", "7h", "none, as readings of every 7h are not taken at the same times every day"),
    ],
)
def test_times_without_a_reading(start: str, step: str, expected: str) -> None:
    """A reset inside a step would leave open what fell before it."""
    with pytest.raises(JobError) as caught:
        counter_depths(readings([1, 2, 3], start, step), CounterRules(reset=0), file="k.csv")
    assert str(caught.value) == f"k.csv: reset: found '00:00'; expected {expected}; correct it, or leave it out"


def test_a_counter_that_is_not_set_to_0_then() -> None:
    """Readings that go on rising after the declared time would count twice, and are refused."""
    with pytest.raises(
        ReadError,
        match=r"^gauge A: found readings that do not fall after 00:00 on 1 of 1 days, such as from 4 mm to 4 mm at "
        r"2031-05-04T01:00:00; expected a counter that is set to 0 right after its reading at that time, as reset "
        r"says; correct reset, or leave it out$",
    ):
        midnight([2, 3, 4, 4, 5])
    with pytest.raises(ReadError, match=r"it falls between 2031-05-04T03:00:00 and 2031-05-04T04:00:00$"):
        midnight([2, 3, 4, 4.2, 5, 6, 0, 0.2])
    # A drizzle before midnight says nothing of a single day; of three days it does.
    day = [0.2, 0.4, *[1.0] * 22]
    assert midnight([0.2, 0.2, 0.2, *day])[1] == []
    with pytest.raises(ReadError, match="do not fall after 00:00 on 3 of 3 days"):
        midnight([0.2, 0.2, 0.2, 0.4, *[0.4] * 23, 0.6, *[0.6] * 23, 0.8])


@given(
    tips=st.lists(st.integers(0, 30), min_size=30, max_size=90),
    gaps=st.sets(st.integers(0, 89)),
    hour=st.integers(0, 23),
)
def test_what_is_known_is_true(tips: list[int], gaps: set[int], hour: int) -> None:
    """Of rain that a counter adds up from its daily reset, every depth and total that is found is what fell."""
    ends = np.datetime64("2031-05-04T00:00:00") + np.arange(len(tips)) * np.timedelta64(1, "h")
    fell = np.array(tips) * 0.2
    shown, total = [], 0.0
    for end, mm in zip(ends, fell, strict=True):
        total += mm
        shown.append(total)
        if end.astype(object).hour == hour:
            total = 0.0
    shown = [NAN if k in gaps else value for k, value in enumerate(shown)]
    record = readings(shown, "2031-05-04T00:00")
    try:
        found = counter_depths(record, CounterRules(reset=hour * 3600))
    except ReadError as error:
        # By chance it rains more in the first hours than on the days before them.
        assert "do not fall after" in str(error)  # noqa: PT017 - one of two ends
        return
    known = ~np.isnan(found.depth[:, 0])
    np.testing.assert_allclose(found.depth[known, 0], fell[1:][known], atol=1e-8)
    for part in found.totals:
        inside = (ends > part.start) & (ends <= part.end)
        assert part.depth == pytest.approx(fell[inside].sum(), abs=1e-8)
    if not gaps:
        assert known.all()
