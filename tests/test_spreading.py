"""Spreading totals over steps."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as stn

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.spreading import share_out, spread_totals

DAY = np.timedelta64(86400, "s")
ENDS = np.datetime64("2031-05-04T00:00:00") + np.arange(1, 4) * DAY


def network(*x: float, ids: tuple[str, ...] | None = None) -> GaugeNetwork:
    """Gauges on a line, x in m."""
    return GaugeNetwork(
        ids=ids or tuple(f"G{k}" for k in range(len(x))), x=np.array(x), y=np.zeros(len(x)), crs="local"
    )


def spread(gauges: GaugeNetwork, depth: npt.ArrayLike, mm: float, recorders: set[str] | None = None) -> Any:  # noqa: ANN401
    """Spread a 3-day total of the first gauge; return its depths, statuses in words, and the notes' texts."""
    record = RainRecord.from_depths(gauges.ids, ENDS - DAY, ENDS, depth, step="1d")
    if recorders is not None:
        record = RainRecord(
            record.gauges,
            record.starts,
            record.ends,
            record.depth,
            record.status,
            step="1d",
            recorders=frozenset(recorders),
        )
    total = KnownTotal(gauges.ids[0], record.starts[0], record.ends[2], mm)
    result, notes = spread_totals(record, gauges, [total])
    assert result.totals == (total,)
    return result.depth[:, 0], [Status(code).label for code in result.status[:, 0]], [note.text for note in notes]


NAN = np.nan


def test_three_day_total() -> None:
    """45 mm with a donor's 10, 0, 20 are 15, 0, 30."""
    depth, status, notes = spread(network(0, 1000), [[NAN, 10], [NAN, 0], [NAN, 20]], 45.0)
    np.testing.assert_allclose(depth, [15.0, 0.0, 30.0], rtol=1e-12)
    assert (status, notes) == (["spread"] * 3, [])


def test_dry_donors() -> None:
    """45 mm with dry donors are 15 each, and it is said."""
    depth, status, notes = spread(network(0, 1000), [[NAN, 0]] * 3, 45.0)
    np.testing.assert_allclose(depth, [15.0] * 3)
    assert status == ["spread"] * 3
    assert notes == [
        (
            "Gauge G0: 45 mm over 2031-05-04T00:00:00 to 2031-05-07T00:00:00 spread evenly over the steps, because "
            "none of the recording gauges near it has rain."
        )
    ]


@pytest.mark.parametrize(
    ("depth", "recorders"),
    [([[NAN, 10], [NAN, NAN], [NAN, 20]], None), ([[NAN, 10], [NAN, 0], [NAN, 20]], {"G0"}), ([[1, 2]] * 3, set())],
)
def test_no_complete_donor(depth: list[list[float]], recorders: set[str] | None) -> None:
    """A donor with a gap, or one that records no pattern, gives none: spread evenly, and it is said."""
    depths, _, notes = spread(network(0, 1000), depth, 45.0, recorders)
    np.testing.assert_allclose(depths, [15.0] * 3)
    assert [note.rsplit("because ", 1)[1] for note in notes] == ["no recording gauge is complete over it."]


def test_zero_total() -> None:
    """A total of zero is zero at every step, with nothing to say."""
    depth, status, notes = spread(network(0, 1000), [[NAN, 0]] * 3, 0.0)
    assert (depth.tolist(), status, notes) == ([0.0] * 3, ["zero"] * 3, [])


def test_weights_are_inverse_squares() -> None:
    """Donors at 1 and 2 km weigh 4 to 1: 4 x (10, 0, 0) + 1 x (0, 0, 10) is 40, 0, 10 of 50."""
    depth, _, _ = spread(network(0, 1000, 2000), [[NAN, 10, 0], [NAN, 0, 0], [NAN, 0, 10]], 100.0)
    np.testing.assert_allclose(depth, [80.0, 0.0, 20.0], rtol=1e-12)


def test_five_nearest_complete() -> None:
    """The sixth nearest complete gauge is not asked; an incomplete one makes room for the next."""
    gauges = network(0, 1000, -1000, 1100, 1200, 1300, 1400)
    first = [NAN, 1, 1, 1, 1, 1, 0]
    last = [NAN, 0, 0, 0, 0, 0, 1]
    depth, _, _ = spread(gauges, [first, [NAN] + [0] * 6, last], 10.0)
    np.testing.assert_array_equal(depth, [10.0, 0.0, 0.0])
    first[2] = NAN
    depth, _, _ = spread(gauges, [first, [NAN] + [0] * 6, last], 10.0)
    squares = 1 / np.array([1000.0, 1100, 1200, 1300, 1400]) ** 2
    np.testing.assert_allclose(
        depth, [10 * squares[:4].sum() / squares.sum(), 0, 10 * squares[4] / squares.sum()], rtol=1e-12
    )


def test_ties_go_by_id() -> None:
    """Of two gauges equally far, the one whose id sorts first is the fifth."""
    ids = ("T", "E", "D", "C", "B", "Z", "A")
    gauges = network(0, 100, 200, 300, 400, 500, -500, ids=ids)
    rows = [[NAN, 0, 0, 0, 0, 7, 0], [NAN] + [0] * 6, [NAN, 0, 0, 0, 0, 0, 7]]
    depth, _, _ = spread(gauges, rows, 10.0)
    np.testing.assert_array_equal(depth, [0.0, 0.0, 10.0])  # A, not Z


def test_rounding_does_not_break_a_tie() -> None:
    """Distances that differ in the twelfth digit are equal, and A comes before Z though it is a hair farther."""
    ids = ("T", "E", "D", "C", "B", "Z", "A")
    gauges = network(0, 100, 200, 300, 400, 500, -500 * (1 + 1e-12), ids=ids)
    rows = [[NAN, 0, 0, 0, 0, 7, 0], [NAN] + [0] * 6, [NAN, 0, 0, 0, 0, 0, 7]]
    depth, _, _ = spread(gauges, rows, 10.0)
    np.testing.assert_array_equal(depth, [0.0, 0.0, 10.0])


def test_a_daily_gauge_beside_a_recorder() -> None:
    """A recorder at the gauge's own place, or a hair from it, gives its pattern 1 : 0 : 2, whatever stands near."""
    for beside in (0.0, 0.004):
        rows = [[NAN, 1, 9], [NAN, 0, 9], [NAN, 2, 9]]
        depth, status, notes = spread(network(0, beside, 1000), rows, 45.0)
        np.testing.assert_allclose(depth, [15.0, 0.0, 30.0], atol=1e-6)
        assert (status, notes) == (["spread"] * 3, [])


def test_a_dry_recorder_at_the_same_place() -> None:
    """Where the recorder beside the gauge caught nothing, the next one gives the pattern."""
    depth, _, notes = spread(network(0, 0.0, 1000), [[NAN, 0, 1], [NAN, 0, 0], [NAN, 0, 2]], 45.0)
    np.testing.assert_allclose(depth, [15.0, 0.0, 30.0], rtol=1e-12)
    assert notes == []


def test_spread_values_are_no_donors() -> None:
    """A gauge whose own values were spread gives no pattern to another."""
    gauges = network(0, 1000, 2000)
    status = np.full((3, 3), Status.OBSERVED, dtype=np.uint8)
    status[:, 1] = Status.SPREAD
    record = RainRecord(
        gauges.ids, ENDS - DAY, ENDS, np.array([[1.0, 9, 1], [1.0, 0, 1], [1.0, 0, 1]]), status, step="1d"
    )
    result, _ = spread_totals(record, gauges, [KnownTotal("G0", record.starts[0], record.ends[2], 30.0)])
    np.testing.assert_allclose(result.depth[:, 0], [10.0] * 3)


def test_many_even_spreads_are_one_note() -> None:
    """A gauge's totals that were spread evenly for one reason are one note, three of them named."""
    ends = np.datetime64("2031-05-04T00:00:00") + np.arange(1, 11) * DAY
    gauges = network(0, 1000)
    record = RainRecord.from_depths(gauges.ids, ends - DAY, ends, [[NAN, 0]] * 10, step="1d")
    totals = [KnownTotal("G0", record.starts[k], record.ends[k + 1], 4.0) for k in range(0, 10, 2)]
    _, [note] = spread_totals(record, gauges, totals)
    assert (note.code, note.gauge) == ("spread-evenly", "G0")
    assert note.text.count("4 mm over") == 3
    assert " and 2 more spread evenly" in note.text


def test_no_totals() -> None:
    """Without totals the record is as it was."""
    gauges = network(0, 1000)
    record = RainRecord.from_depths(gauges.ids, ENDS - DAY, ENDS, [[1, 2]] * 3, step="1d")
    result, notes = spread_totals(record, gauges, [])
    np.testing.assert_array_equal(result.depth, record.depth)
    assert notes == ()


@pytest.mark.parametrize(
    ("parts", "of", "mm", "last"),
    [
        ([1, 3, 3, 1, 3, 1, 3], 15, 100.3, 6),
        ([1, 1, 1, 1, 1, 1, 1], 7, 12.7, 6),
        ([1, 1, 1, 0, 0, 0, 0], 3, 12.7, 2),
        ([1, 2, 2, 1, 2, 1, 0], 9, 10.1, 4),
    ],
)
def test_what_rounding_leaves_goes_to_the_last_of_the_largest_steps(
    parts: list[int], of: int, mm: float, last: int
) -> None:
    """The products of share and total miss the total by some bits; these go to one step, the rest are the products."""
    shares = np.array(parts) / of
    rounded = shares * mm
    given = share_out(np.array([mm]), shares[:, None])[:, 0]
    assert rounded.sum() != mm
    assert given.sum() == mm
    assert np.flatnonzero(given != rounded).tolist() == [last]


def test_shares_that_do_not_sum_to_one_keep_the_total() -> None:
    """Thirds with four digits leave 0.0001 of the total, which the last of the largest steps takes."""
    parts = share_out(np.array([90.0]), np.full((3, 1), 0.3333))
    np.testing.assert_allclose(parts.ravel(), [29.997, 29.997, 30.006], rtol=1e-12)


DEPTHS = stn.arrays(
    np.float64, st.tuples(st.integers(1, 40), st.integers(1, 5)), elements=st.one_of(st.just(0.0), st.floats(0.01, 500))
)


@settings(deadline=None)
@given(DEPTHS, st.floats(0, 2000))
def test_sharing_out_keeps_the_total(depths: npt.NDArray[np.float64], mm: float) -> None:
    """The parts sum to the total and none is negative."""
    mixed = depths.sum(axis=1)
    if mixed.any():
        parts = share_out(np.array([mm]), (mixed / mixed.sum())[:, None])
        assert parts.sum() == pytest.approx(mm, rel=1e-12, abs=1e-12)
        assert (parts >= 0).all()


@settings(deadline=None)
@given(DEPTHS, st.floats(0, 2000))
def test_spreading_keeps_the_total(depths: npt.NDArray[np.float64], mm: float) -> None:
    """Whatever the donors, the steps of a gauge sum to its total to 1e-9 mm, and the donors stay as they were."""
    n_steps, n_donors = depths.shape
    gauges = network(*(1000.0 * k for k in range(n_donors + 1)))
    ends = np.datetime64("2031-05-04T00:00:00") + np.arange(1, n_steps + 1) * DAY
    record = RainRecord.from_depths(
        gauges.ids, ends - DAY, ends, np.column_stack([np.full(n_steps, np.nan), depths]), step="1d"
    )
    result, notes = spread_totals(record, gauges, [KnownTotal("G0", record.starts[0], record.ends[-1], mm)])
    assert result.depth[:, 0].sum() == pytest.approx(mm, abs=1e-9)
    assert (result.depth >= 0).all()
    np.testing.assert_array_equal(result.depth[:, 1:], depths)
    assert bool(notes) == (mm > 0 and not depths.any())
