"""Gaps: where, how long, over the peak."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.infill.gaps import gap_mask, longer_than, over_peak, steps_in_words
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def hourly(*columns: list[float], hours: int = 1) -> RainRecord:
    step = np.timedelta64(3600 * hours, "s")
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, len(columns[0]) + 1) * step
    return RainRecord.from_depths(
        tuple("ABCDEF"[: len(columns)]), ends - step, ends, np.array(columns).T, step=f"{hours}h"
    )


def test_what_is_a_gap() -> None:
    """Of all statuses only missing, rejected and accumulated are gaps; not installed is none."""
    ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    status = np.array([[int(s) for s in Status]], dtype=np.uint8)
    empty = [Status.MISSING, Status.ACCUMULATED, Status.REJECTED, Status.NOT_INSTALLED]
    depth = np.where(np.isin(status, [int(s) for s in empty]), NAN, 0.0)
    record = RainRecord(tuple(s.label for s in Status), ends - 3600, ends, depth, status, step="1h")
    assert [s for s in Status if gap_mask(record)[0, s]] == [Status.MISSING, Status.ACCUMULATED, Status.REJECTED]


def test_a_gap_of_the_limit_is_not_longer() -> None:
    """Two missing days are not longer than 2 days; three are; a value between them makes two gaps."""
    record = hourly([NAN, NAN, 1, 0], [NAN, NAN, NAN, 0], [NAN, 0, NAN, NAN], hours=24)
    long = longer_than(record, gap_mask(record), 2)
    assert long.T.tolist() == [[False] * 4, [True, True, True, False], [False] * 4]


def test_a_gap_to_the_end_is_measured_too() -> None:
    """The last step of the record closes a gap."""
    record = hourly([0, NAN, NAN, NAN], hours=24)
    assert longer_than(record, gap_mask(record), 2.5)[:, 0].tolist() == [False, True, True, True]


def test_totals_without_times_have_no_length() -> None:
    """However many are missing."""
    nat = np.full(3, "NaT", dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), nat, nat, [[NAN], [NAN], [1.0]], step="storm")
    assert not longer_than(record, gap_mask(record), 1e-6).any()


@pytest.mark.parametrize(("missing", "warned"), [(0, False), (1, True), (2, True), (3, True), (4, False)])
def test_gap_over_the_peak_or_next_to_it(missing: int, warned: bool) -> None:  # noqa: FBT001
    """The mean is greatest in the third hour: a gap in the second to fourth hides it, another does not."""
    column = [1.0, 3.0, 9.0, 3.0, 1.0]
    gappy = column.copy()
    gappy[missing] = NAN
    record = hourly(column, gappy)
    assert [note.gauge for note in over_peak(record, gap_mask(record), record.depth)] == (["B"] if warned else [])


def test_all_of_several_peaks_count() -> None:
    """Two hours are equally wet; a gap over the second is warned of."""
    record = hourly([9, 0, 0, 0, 9], [9, 0, 0, 0, NAN])
    assert [note.code for note in over_peak(record, gap_mask(record), record.depth)] == ["gap-over-peak"]


@pytest.mark.parametrize(
    ("completed", "said"),
    [
        ([9.0, 9.0], "what was infilled there may miss the peak."),
        ([NAN, NAN], "it stays missing there."),
        ([9.0, NAN], "what was infilled there may miss the peak, and in part it stays missing."),
    ],
)
def test_what_became_of_the_gap_is_said(completed: list[float], said: str) -> None:
    """One note for the gauge, whether its gap over the peak was infilled, left, or both."""
    record = hourly([1, 9, 9, 1], [1, NAN, NAN, 1])
    depth = record.depth.copy()
    depth[1:3, 1] = completed
    (note,) = over_peak(record, gap_mask(record), depth)
    assert note.text.split("; ")[1] == said


def test_windows_without_a_peak() -> None:
    """A dry window, one of a single step, totals without times, and one where nobody reports."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    totals = RainRecord.from_depths(("A", "B"), nat, nat, [[9.0, NAN], [8.0, 1.0]], step="storm")
    for record in (hourly([0, 0], [0, NAN]), hourly([5], [NAN]), totals, hourly([NAN, NAN])):
        assert over_peak(record, gap_mask(record), record.depth) == []


def test_steps_in_words() -> None:
    """Three runs are written out, the rest are counted."""
    record = hourly([0.0] * 12)
    assert steps_in_words(record, np.array([0, 2, 3, 5, 7, 9])) == (
        "6 of 12 steps (2031-05-04T00:00 to 2031-05-04T01:00, 2031-05-04T02:00 to 2031-05-04T04:00, "
        "2031-05-04T05:00 to 2031-05-04T06:00 and 2 more)"
    )


def test_totals_in_words() -> None:
    """By the storms' names where there are some, else by number."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), nat, nat, [[NAN], [1.0]], step="storm")
    assert steps_in_words(record, np.array([0])) == "1 of 2 totals (number 1)"
    named = RainRecord(
        ("A",), nat, nat, record.depth, record.status, step="storm", labels=("spring flood", "thunderstorm")
    )
    assert steps_in_words(named, np.array([0])) == "1 of 2 totals (spring flood)"
