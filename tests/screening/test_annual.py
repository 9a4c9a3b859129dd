"""Annual totals of complete years, and the neighbours of a gauge."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status
from basinrain.screening.annual import AnnualTotals, annual_totals, reference_group

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
        ("2031-01-02", "2033-01-01", [2031, 2032], [np.nan, 366]),
        ("2031-01-01", "2032-12-31", [2031, 2032], [365, np.nan]),
        # Read at 08:00: the day that ends on 1 January is mostly the old year's.
        ("2031-01-01T08:00", "2032-01-01T08:00", [2031], [365]),
        ("2031-01-02T08:00", "2032-01-01T08:00", [2031], [np.nan]),
        ("2031-01-01T08:00", "2031-12-31T08:00", [2031], [np.nan]),
        # Read at 18:00: it is mostly the new year's.
        ("2030-12-31T18:00", "2031-12-31T18:00", [2031], [365]),
    ],
)
def test_days(first: str, last: str, years: list[int], totals: list[float]) -> None:
    """A year of days is complete when all of its 365 or 366 are there; one less, at either end, is not."""
    annual = annual_totals(record_of(first, last, DAY, "1d"))
    assert annual.years.tolist() == years
    assert annual.totals[:, 0] == pytest.approx(totals, nan_ok=True)


def test_hours() -> None:
    """The hour that ends at midnight of New Year belongs to the old year."""
    record = record_of("2031-01-01", "2033-01-01", HOUR, "1h")
    annual = annual_totals(record)
    assert annual.totals[:, 0].tolist() == [365 * 24, 366 * 24]
    assert annual.ends.astype(str).tolist() == ["2032-01-01T00:00:00", "2033-01-01T00:00:00"]
    assert len(annual) == 2


@pytest.mark.parametrize("absent", range(12))
def test_months(absent: int) -> None:
    """A year that lacks any of its months is not complete, whether its step is missing or absent."""
    bounds = np.arange("2031-01", "2032-02", dtype="datetime64[M]").astype("datetime64[s]")
    starts, ends, depths = bounds[:-1], bounds[1:], np.full((12, 1), 50.0)
    assert annual_totals(RainRecord.from_depths(("A",), starts, ends, depths, step="1mo")).totals.tolist() == [[600.0]]
    keep = np.arange(12) != absent
    record = RainRecord.from_depths(("A",), starts[keep], ends[keep], depths[keep], step="1mo")
    assert np.isnan(annual_totals(record).totals).all()
    depths[absent] = np.nan
    record = RainRecord.from_depths(("A",), starts, ends, depths, step="1mo")
    assert np.isnan(annual_totals(record).totals).all()


@pytest.mark.parametrize("status", Status)
def test_own_values_only(status: Status) -> None:
    """A year counts where every value is the gauge's own; one that is infilled, rejected or missing spoils it."""
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
    record.status[99] = status
    record.depth[99] = 0.0 if own or status is Status.INFILLED else np.nan
    total = annual_totals(record).totals[0, 0]
    assert total == 364.0 if own else np.isnan(total)


def test_no_years() -> None:
    """An empty record and one of storm totals without times have no years."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    storms = RainRecord.from_depths(("A",), nat, nat, [[1.0], [2.0]], step="storm")
    for record in (storms, record_of("2031-01-01", "2031-02-01", DAY, "1d").window(0, 0)):
        annual = annual_totals(record)
        assert annual.totals.shape == (0, 1)
        assert len(annual) == 0


LINE = GaugeNetwork(ids=tuple("TABCDEFG"), x=np.arange(8.0) * 1e3, y=np.zeros(8), crs="local")


def chosen(totals: npt.NDArray[np.float64], at_least: int = 10, **trusted: bool) -> str:
    """Return the ids of the group of the first gauge of the line."""
    years = np.arange(1991, 1991 + len(totals))
    annual = AnnualTotals(LINE.ids, years, totals, years.astype("datetime64[s]"))
    mask = np.array([trusted.get(gauge, True) for gauge in LINE.ids])
    group = reference_group(annual, LINE, 0, at_least=at_least, distances=LINE.distances(), trusted=mask)
    return "".join(LINE.ids[g] for g in group)


def test_five_nearest() -> None:
    """With full records, the five nearest; a gauge that is not trusted is passed over, wherever it is."""
    assert chosen(np.ones((20, 8))) == "ABCDE"
    assert chosen(np.ones((20, 8)), B=False, E=False) == "ACDFG"
    assert chosen(np.ones((20, 8)), T=False) == "ABCDE"


def test_short_neighbours_are_passed_over() -> None:
    """B would leave 15 of 20 years, under 80 %; A and C 18 each, but 16 together, which is 80 %."""
    totals = np.ones((20, 8))
    totals[:2, 1] = totals[:5, 2] = totals[-2:, 3] = np.nan
    assert chosen(totals) == "ACDEF"
    totals[5, 3] = np.nan
    assert chosen(totals) == "ADEFG"


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
