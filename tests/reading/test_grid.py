"""Sources on the common grid."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as stn

from basinrain.intervals import parse_interval
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.reading.grid import ABSENT, Grid, Source, off_bounds, place, relation

START = np.datetime64("2031-05-04T00:00:00")


def source(
    depth: npt.ArrayLike,
    interval: str = "1h",
    *,
    start: np.datetime64 = START,
    status: list[Status] | None = None,
    totals: tuple[KnownTotal, ...] = (),
) -> Source:
    """Return a source of one gauge A, from START."""
    step = parse_interval(interval)
    values = np.asarray(depth, dtype=float)[:, None]
    length = np.timedelta64(step.seconds or 0, "s")
    ends = start + np.arange(1, len(values) + 1) * length
    record = RainRecord.from_depths(("A",), ends - length, ends, values, step=step.label)
    codes = record.status if status is None else np.array(status, dtype=np.uint8)[:, None]
    return Source("source 1", step, ("A",), record.starts, record.ends, values, codes, totals)


def hours(first: int, last: int, mm: float) -> KnownTotal:
    """Return a total of hours, counted from START."""
    return KnownTotal("A", START + np.timedelta64(first, "h"), START + np.timedelta64(last, "h"), mm)


@pytest.mark.parametrize(
    ("step", "common", "expected"),
    [
        ("1h", "1h", "finer"),
        ("15min", "1h", "finer"),
        ("1d", "1h", "coarser"),
        ("7min", "1h", ""),
        ("2h", "3h", ""),
        ("1d", "1mo", "finer"),
        ("1h", "1mo", "finer"),
        ("7d", "1mo", ""),
        ("1mo", "1d", "coarser"),
        ("1mo", "5min", "coarser"),
        ("1mo", "7min", ""),
        ("1mo", "1mo", "finer"),
    ],
)
def test_relation(step: str, common: str, expected: str) -> None:
    """A step divides the common one, is a multiple of it, or does not fit; months cover whole days."""
    assert relation(parse_interval(step), parse_interval(common)) == expected


@settings(deadline=None)
@given(st.integers(-(10**9), 10**9), st.sampled_from(["5min", "1h", "1d", "1mo"]), st.integers(0, 86399))
def test_numbers_and_bounds(second: int, word: str, phase: int) -> None:
    """Every time lies between its bound and the next, and is exact only at a bound."""
    grid = Grid(parse_interval(word), phase)
    time = np.array([second]).astype("datetime64[s]")
    number, exact = grid.numbers(time)
    assert grid.bounds(number)[0] <= time[0] < grid.bounds(number + 1)[0]
    assert exact[0] == (grid.bounds(number)[0] == time[0])


def test_summing_by_hand() -> None:
    """Three hours make a step; one that lacks a part, or is not whole, is missing, never the sum of what is left."""
    part = place(source([1, 2, 0.5, 1, np.nan, 2, 0, 0, 0, 4]), Grid(parse_interval("3h"), 0))
    np.testing.assert_array_equal(part.depth[:, 0], [3.5, np.nan, 0.0, np.nan])
    assert part.status[:, 0].tolist() == [Status.OBSERVED, Status.MISSING, Status.ZERO, Status.MISSING]


@pytest.mark.parametrize(
    ("depth", "parts", "whole"),
    [
        ([0, 0], [Status.ZERO, Status.TRACE], Status.TRACE),
        ([0, 2], [Status.TRACE, Status.OBSERVED], Status.OBSERVED),
        ([0, 0], [Status.PRESUMED_ZERO, Status.ZERO], Status.PRESUMED_ZERO),
        ([1, 2], [Status.ESTIMATED, Status.OBSERVED], Status.ESTIMATED),
        ([1, 2], [Status.ADJUSTED, Status.OBSERVED], Status.ADJUSTED),
        ([np.nan, 2], [Status.REJECTED, Status.OBSERVED], Status.MISSING),
        ([np.nan, np.nan], [Status.NOT_INSTALLED, Status.NOT_INSTALLED], Status.NOT_INSTALLED),
        ([np.nan, 2], [Status.NOT_INSTALLED, Status.OBSERVED], Status.MISSING),
    ],
)
def test_status_of_a_sum(depth: list[float], parts: list[Status], whole: Status) -> None:
    """A sum is called what its least certain part is called, and is missing when a part is."""
    part = place(source(depth, status=parts), Grid(parse_interval("2h"), 0))
    assert part.status.tolist() == [[whole]]


def test_hours_into_months() -> None:
    """A month is the sum of its own days: 31 in May, 30 in June."""
    start = np.datetime64("2031-05-01T00:00:00")
    part = place(source(np.ones(24 * (31 + 30)), start=start), Grid(parse_interval("1mo"), 0))
    assert part.depth[:, 0].tolist() == [744.0, 720.0]


def test_days_into_steps() -> None:
    """A day becomes a total over its steps, or zeros; a missing or rejected day stays so, step by step."""
    part = place(
        source([6, 0, np.nan, np.nan], "1d", status=[Status.OBSERVED, Status.TRACE, Status.MISSING, Status.REJECTED]),
        Grid(parse_interval("12h"), 0),
    )
    assert part.status[:, 0].tolist() == [
        *[Status.ACCUMULATED] * 2,
        *[Status.TRACE] * 2,
        *[Status.MISSING] * 2,
        *[Status.REJECTED] * 2,
    ]
    np.testing.assert_array_equal(part.depth[:, 0], [np.nan, np.nan, 0, 0, *[np.nan] * 4])
    assert part.totals == (hours(0, 24, 6.0),)


def test_accumulation_within_a_step() -> None:
    """Where in a step an accumulation fell does not matter to the step's sum."""
    lost = Status.ACCUMULATED
    status = [Status.OBSERVED, lost, lost, Status.ZERO]
    part = place(
        source([1, np.nan, np.nan, 0], status=status, totals=(hours(1, 3, 5.0),)), Grid(parse_interval("4h"), 0)
    )
    assert (part.depth.tolist(), part.status.tolist(), part.totals) == ([[6.0]], [[Status.OBSERVED]], ())


def test_accumulation_across_steps() -> None:
    """An accumulation over two steps is known with the values beside it: 1 + 5 + 2 over both."""
    lost = Status.ACCUMULATED
    status = [Status.OBSERVED, lost, lost, Status.OBSERVED]
    fine = source([1, np.nan, np.nan, 2], status=status, totals=(hours(1, 3, 5.0),))
    part = place(fine, Grid(parse_interval("2h"), 0))
    assert (part.status[:, 0].tolist(), part.totals) == ([lost, lost], (hours(0, 4, 8.0),))
    # With one of the values beside it missing, the total over both steps is not known.
    status[3] = Status.MISSING
    fine = source([1, np.nan, np.nan, np.nan], status=status, totals=(hours(1, 3, 5.0),))
    part = place(fine, Grid(parse_interval("2h"), 0))
    assert (part.status[:, 0].tolist(), part.totals) == ([Status.MISSING] * 2, ())
    assert [(note.code, note.gauge, note.text) for note in part.notes] == [
        (
            "total-not-used",
            "A",
            (
                "Gauge A: 5 mm that accumulated from 2031-05-04T01:00:00 to 2031-05-04T03:00:00 are not used: other "
                "values in the 2h steps that they reach into are not known, so that these steps are missing."
            ),
        )
    ]


def test_accumulations_that_meet_in_a_step() -> None:
    """Two accumulations that share a step make one total over all of their steps."""
    lost = Status.ACCUMULATED
    fine = source(
        [1, np.nan, np.nan, np.nan, np.nan, 2],
        status=[Status.OBSERVED, lost, lost, lost, lost, Status.OBSERVED],
        totals=(hours(1, 3, 5.0), hours(3, 5, 7.0)),
    )
    part = place(fine, Grid(parse_interval("2h"), 0))
    assert (part.status[:, 0].tolist(), part.totals) == ([lost] * 3, (hours(0, 6, 15.0),))
    assert part.notes == ()


def test_accumulations_that_chain() -> None:
    """Totals that meet from step to step are one, and it is said; where the first step is not whole, none is left."""
    lost = Status.ACCUMULATED
    chain = tuple(hours(first, first + 2, 1.0) for first in (1, 3, 5))
    status = [Status.OBSERVED, *[lost] * 6, Status.OBSERVED]
    whole = place(source([1, *[np.nan] * 6, 2], status=status, totals=chain), Grid(parse_interval("2h"), 0))
    assert (whole.totals, whole.status[:, 0].tolist()) == ((hours(0, 8, 6.0),), [lost] * 4)
    assert [note.text for note in whole.notes] == [
        (
            "Gauge A: 3 accumulations meet within steps of 2h, and are one total of 6 mm from 2031-05-04T00:00:00 to "
            "2031-05-04T08:00:00; a shorter common step would keep them apart."
        )
    ]
    late = START + np.timedelta64(1, "h")
    cut = place(source([*[np.nan] * 6, 2], start=late, status=status[1:], totals=chain), Grid(parse_interval("2h"), 0))
    assert (cut.totals, cut.status[:, 0].tolist()) == ((), [Status.MISSING] * 4)
    assert [note.code for note in cut.notes] == ["total-not-used"]
    assert "3 mm that accumulated from 2031-05-04T01:00:00 to 2031-05-04T07:00:00" in cut.notes[0].text


def test_gaps_of_a_source_are_absent() -> None:
    """Steps that a source does not have are absent from it on the grid, too."""
    whole = source([1, 2, 3, 4])
    keep = [0, 3]
    holed = Source(
        "source 1",
        whole.interval,
        ("A",),
        whole.starts[keep],
        whole.ends[keep],
        whole.depth[keep],
        whole.status[keep],
        (),
    )
    assert place(holed, Grid(parse_interval("1h"), 0)).status[:, 0].tolist() == [0, ABSENT, ABSENT, 0]


@pytest.mark.parametrize(
    ("interval", "minutes", "common", "off"),
    [
        ("1h", 0, "1h", 0),
        ("1h", 30, "1h", 2),
        ("1h", 30, "30min", 0),
        ("1h", 30, "6h", 0),
        ("4h", 120, "12h", 0),
        ("6h", 180, "12h", 1),
    ],
)
def test_off_bounds(interval: str, minutes: int, common: str, off: int) -> None:
    """Intervals must begin and end on the grid's bounds, finer ones must not cross one."""
    two = source([1, 1], interval, start=START + np.timedelta64(minutes, "m"))
    assert len(off_bounds(two, Grid(parse_interval(common), 0))) == off


@settings(deadline=None)
@given(
    stn.arrays(np.float64, st.integers(1, 200), elements=st.one_of(st.just(0.0), st.floats(0.01, 100))),
    st.integers(1, 12),
)
def test_summing_keeps_the_total(depth: npt.NDArray[np.float64], k: int) -> None:
    """What whole steps hold is what fell in their parts."""
    part = place(source(depth, "5min"), Grid(parse_interval(f"{5 * k}min"), 0))
    n = (int(START.astype(np.int64)) // 300) % k  # parts of the first step that the source does not have
    first = (k - n) % k
    whole = depth[first : first + (len(depth) - first) // k * k] if len(depth) > first else depth[:0]
    assert np.nansum(part.depth) == pytest.approx(whole.sum(), rel=1e-12, abs=1e-12)
    assert np.count_nonzero(~np.isnan(part.depth)) == len(whole) // k
