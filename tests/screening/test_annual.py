"""Calendar years, which of them are complete, and a gauge's years beside those of its neighbours."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status
from basinrain.screening.annual import Beside, beside_neighbours, calendar_years

HOUR = np.timedelta64(3600, "s")
DAY = 24 * HOUR


def record_of(first: str, last: str, step: np.timedelta64, word: str, depths: npt.ArrayLike = 1.0) -> RainRecord:
    """Return gauge A's record from first to last, 1 mm a step unless told."""
    bounds = np.arange(np.datetime64(first, "s"), np.datetime64(last, "s") + step, step)
    values = np.broadcast_to(np.asarray(depths, float), (len(bounds) - 1,)).reshape(-1, 1)
    return RainRecord.from_depths(("A",), bounds[:-1], bounds[1:], values, step=word)


@pytest.mark.parametrize(
    ("first", "last", "years", "totals"),
    [
        ("2031-01-01", "2033-01-01", [2031, 2032], [365, 366]),
        # 95 % of 365 days are 346.75: 347 will do, 346 will not; of 366 days 348.
        ("2031-01-19", "2033-01-01", [2031, 2032], [347, 366]),
        ("2031-01-20", "2033-01-01", [2031, 2032], [np.nan, 366]),
        ("2031-01-01", "2032-12-14", [2031, 2032], [365, 348]),
        ("2031-01-01", "2032-12-13", [2031, 2032], [365, np.nan]),
        # Read at 08:00: the day that ends on 1 January is mostly the old year's.
        ("2031-01-01T08:00", "2032-01-01T08:00", [2031], [365]),
        # Read at 18:00: it is mostly the new year's.
        ("2030-12-31T18:00", "2031-12-31T18:00", [2031], [365]),
    ],
)
def test_days(first: str, last: str, years: list[int], totals: list[float]) -> None:
    """A year of days is complete with 95 % of its 365 or 366, wherever the others are absent."""
    found = calendar_years(record_of(first, last, DAY, "1d"))
    assert found.years.tolist() == years
    assert found.totals[:, 0] == pytest.approx(totals, nan_ok=True)


def test_hours() -> None:
    """The hour that ends at midnight of New Year is the old year's; a day counts where all its hours are there."""
    record = record_of("2031-01-01", "2033-01-01", HOUR, "1h")
    years = calendar_years(record)
    assert years.totals[:, 0].tolist() == [365 * 24, 366 * 24]
    assert years.ends.astype(str).tolist() == ["2032-01-01T00:00:00", "2033-01-01T00:00:00"]
    assert len(years) == 2
    record.depth[100], record.status[100] = np.nan, Status.MISSING
    less = calendar_years(record)
    assert (less.covered[0, 0], less.totals[0, 0]) == (364, 364 * 24)


@pytest.mark.parametrize("absent", range(12))
def test_months(absent: int) -> None:
    """A year that lacks any of its months is not complete, whether its step is missing or absent: 28 days are 7.7 %."""
    bounds = np.arange("2031-01", "2032-02", dtype="datetime64[M]").astype("datetime64[s]")
    starts, ends, depths = bounds[:-1], bounds[1:], np.full((12, 1), 50.0)
    assert calendar_years(RainRecord.from_depths(("A",), starts, ends, depths, step="1mo")).totals.tolist() == [[600.0]]
    keep = np.arange(12) != absent
    record = RainRecord.from_depths(("A",), starts[keep], ends[keep], depths[keep], step="1mo")
    assert np.isnan(calendar_years(record).totals).all()
    depths[absent] = np.nan
    record = RainRecord.from_depths(("A",), starts, ends, depths, step="1mo")
    assert np.isnan(calendar_years(record).totals).all()


@pytest.mark.parametrize(("absent", "total"), [(2, 500.0), (3, np.nan)])
def test_weeks(absent: int, total: float) -> None:
    """Of the 52 weeks two may be missing, which leaves 350 of 365 days; three leave 343."""
    record = record_of("2031-01-01", "2031-12-31", 7 * DAY, "7d", np.where(np.arange(52) < absent, np.nan, 10.0))
    assert calendar_years(record).totals[0, 0] == pytest.approx(total, nan_ok=True)


@pytest.mark.parametrize("status", Status)
def test_own_values_only(status: Status) -> None:
    """Days count whose value is the gauge's own; nineteen that are infilled, rejected or missing spoil the year."""
    record = record_of("2031-01-01", "2032-01-01", DAY, "1d")
    own = status in {
        Status.OBSERVED,
        Status.ZERO,
        Status.TRACE,
        Status.PRESUMED_ZERO,
        Status.SPREAD,
        Status.ESTIMATED,
        Status.ADJUSTED,
    }
    for n in (18, 19):
        record.status[90 : 90 + n] = status
        record.depth[90 : 90 + n] = 0.0 if own or status is Status.INFILLED else np.nan
        total = calendar_years(record).totals[0, 0]
        assert total == 365 - n if own or n == 18 else np.isnan(total)


def test_no_years() -> None:
    """An empty record and one of storm totals without times have no years."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    storms = RainRecord.from_depths(("A",), nat, nat, [[1.0], [2.0]], step="storm")
    for record in (storms, record_of("2031-01-01", "2031-02-01", DAY, "1d").window(0, 0)):
        years = calendar_years(record)
        assert years.totals.shape == years.complete.shape == (0, 1)
        assert len(years) == 0


LINE = GaugeNetwork(ids=tuple("TABCDEFG"), x=np.arange(8.0) * 1e3, y=np.zeros(8), crs="local")


def by_months(totals: npt.NDArray[np.float64]) -> RainRecord:
    """Return a record in which a year without a total has January to June only, and others twelve equal months."""
    depths = np.repeat(np.where(np.isnan(totals), 1.0, totals) / 12, 12, axis=0)
    depths[np.repeat(np.isnan(totals), 12, axis=0) & (np.arange(len(depths)) % 12 >= 6)[:, None]] = np.nan
    bounds = (np.datetime64("1991-01", "M") + np.arange(len(depths) + 1)).astype("datetime64[s]")
    return RainRecord.from_depths(LINE.ids, bounds[:-1], bounds[1:], depths, step="1mo")


def chosen(totals: npt.NDArray[np.float64], at_least: int = 10, **trusted: bool) -> str:
    """Return the ids of the group of the first gauge of the line."""
    mask = np.array([trusted.get(gauge, True) for gauge in LINE.ids])
    beside = beside_neighbours(
        calendar_years(by_months(totals)), LINE, 0, at_least=at_least, distances=LINE.distances(), trusted=mask
    )
    return "" if beside is None else "".join(LINE.ids[g] for g in beside.group)


def test_five_nearest() -> None:
    """With full records, the five nearest; a gauge that is not trusted is passed over, wherever it is."""
    assert chosen(np.ones((20, 8))) == "ABCDE"
    assert chosen(np.ones((20, 8)), B=False, E=False) == "ACDFG"
    assert chosen(np.ones((20, 8)), T=False) == "ABCDE"


def test_a_gauge_without_rain_is_no_neighbour() -> None:
    """One that is dry throughout has no proportion to anything."""
    totals = np.ones((20, 8))
    totals[:, 2] = 0.0
    assert chosen(totals) == "ACDEF"


def test_short_neighbours_are_passed_over() -> None:
    """B has 15 of 20 years, under 80 %; A and C have 18 each, C then 15 too; which years they lack need not agree."""
    totals = np.ones((20, 8))
    totals[:2, 1] = totals[:5, 2] = totals[-2:, 3] = np.nan
    assert chosen(totals) == "ACDEF"
    totals[5:8, 3] = np.nan
    assert chosen(totals) == "ADEFG"


def test_proportions_must_be_known() -> None:
    """A to E lack four years each, no two the same ones: with D there would be none left in which all are present."""
    totals = np.ones((20, 8))
    for g in range(5):
        totals[4 * g : 4 * g + 4, 1 + g] = np.nan
    # Without A and B 12 years are left, without C as well 8.
    assert chosen(totals) == "ABFG"


def test_fewer_years_where_it_must_be() -> None:
    """Where all neighbours have 12 of 20 years, 50 % will do; with 8 of 20 no ten are left."""
    totals = np.ones((20, 8))
    totals[:8, 1:] = np.nan
    assert chosen(totals) == "ABCDE"
    totals[:12, 1:] = np.nan
    assert not chosen(totals)
    assert chosen(totals, at_least=8) == "ABCDE"


def test_two_are_no_group() -> None:
    """Three neighbours are the fewest."""
    totals = np.ones((20, 8))
    totals[:, 3:] = np.nan
    assert not chosen(totals)
    totals[:, 7] = 1.0
    assert chosen(totals) == "ABG"


FIVE = GaugeNetwork(ids=tuple("TABCD"), x=np.arange(5.0) * 1e3, y=np.zeros(5), crs="local")


def beside_of(depths: npt.NDArray[np.float64]) -> Beside | None:
    """Return T in days from 2031 on, beside A to D, two years being enough."""
    bounds = (np.datetime64("2031-01-01") + np.arange(len(depths) + 1)).astype("datetime64[s]")
    record = RainRecord.from_depths(FIVE.ids, bounds[:-1], bounds[1:], depths, step="1d")
    return beside_neighbours(calendar_years(record), FIVE, 0, at_least=2, distances=FIVE.distances())


def two_years(seed: int = 4) -> npt.NDArray[np.float64]:
    """Return two years of days that are in proportion at all gauges: 1 at T, 0.5, 1, 1.5 and 2 of it at A to D."""
    weather = np.random.default_rng(seed).gamma(0.5, 8.0, (731, 1))
    return np.asarray(weather * [1.0, 0.5, 1.0, 1.5, 2.0])


def test_all_report() -> None:
    """Where nothing is missing the reference is the plain mean: 1.25 of T, over all days."""
    depths = two_years()
    beside = beside_of(depths)
    assert beside is not None
    sums = [depths[:365, 0].sum(), depths[365:, 0].sum()]
    assert beside.totals == pytest.approx(sums, rel=1e-12)
    assert beside.reference == pytest.approx(1.25 * np.array(sums), rel=1e-12)
    assert beside.days.tolist() == [365, 366]


def test_by_hand() -> None:
    """A day without D: (0.5 + 1 + 1.5) w over 3/5 of the levels is the mean of all four again.

    A day without T, and one with two neighbours only, is left out of both sums.
    """
    depths = two_years()
    whole = depths[:, 0].copy()
    depths[7, 4] = depths[50, 0] = depths[80, 1] = depths[80, 2] = np.nan
    beside = beside_of(depths)
    assert beside is not None
    left = np.ones(365, dtype=bool)
    left[[50, 80]] = False
    assert beside.days.tolist() == [363, 366]
    assert beside.totals[0] == pytest.approx(whole[:365][left].sum(), rel=1e-12)
    assert beside.reference[0] == pytest.approx(1.25 * whole[:365][left].sum(), rel=1e-12)


def loops(depths: npt.NDArray[np.float64]) -> tuple[list[float], list[float], list[int]]:
    """Return totals, reference and days of both years as the definition reads, day by day."""
    group = depths[:, 1:]
    common = [day for day in group if np.isfinite(day).all()]
    levels = [sum(day[g] for day in common) for g in range(4)]
    totals, reference, days = [], [], []
    for first, stop in ((0, 365), (365, 731)):
        own, other, n = 0.0, 0.0, 0
        for t in range(first, stop):
            there = [g for g in range(4) if np.isfinite(group[t, g])]
            if np.isnan(depths[t, 0]) or len(there) < 3:
                continue
            own, n = own + depths[t, 0], n + 1
            other += sum(group[t, g] for g in there) / sum(levels[g] for g in there) * sum(levels) / 4
        counts = n >= 0.9 * (stop - first)
        totals.append(own if counts else np.nan)
        reference.append(other if counts else np.nan)
        days.append(n)
    return totals, reference, days


@pytest.mark.parametrize("seed", range(4))
def test_against_loops(seed: int) -> None:
    """With days missing here and there, the sums are those of plain loops."""
    rng = np.random.default_rng(seed)
    depths = two_years(seed) * rng.uniform(0.5, 1.5, (731, 5))
    depths[rng.random((731, 5)) < 0.02] = np.nan
    beside = beside_of(depths)
    assert beside is not None
    totals, reference, days = loops(depths)
    assert beside.totals == pytest.approx(totals, rel=1e-9, nan_ok=True)
    assert beside.reference == pytest.approx(reference, rel=1e-9, nan_ok=True)
    assert beside.days.tolist() == days


@settings(max_examples=30, deadline=None)
@given(gaps=st.lists(st.tuples(st.integers(0, 730), st.integers(0, 4)), max_size=60))
def test_silent_gauges_move_no_ratio(gaps: list[tuple[int, int]]) -> None:
    """Where gauges keep their proportion, the ratio of every year is the same whichever of them is silent when."""
    depths = two_years()
    for t, g in gaps:
        depths[t, g] = np.nan
    beside = beside_of(depths)
    if beside is None:
        return
    counted = np.isfinite(beside.totals)
    assert counted.all()
    assert beside.totals / beside.reference == pytest.approx(np.full(2, 1 / 1.25), rel=1e-9)


def test_a_year_that_shares_too_little() -> None:
    """37 of 365 and of 366 days without neighbours spoil a year that the gauge has whole, 36 do not: 329 and 330."""
    depths = np.concatenate([two_years(), two_years(5)[:-1]])
    for first, lost in ((100, 36), (400, 36), (800, 37), (1100, 36)):
        depths[first : first + lost, 1:] = np.nan
    beside = beside_of(depths)
    assert beside is not None
    assert np.isnan(beside.totals).tolist() == [False, False, True, False]
    assert beside.days.tolist() == [329, 330, 328, 329]
