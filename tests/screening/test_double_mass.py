"""The double-mass curve: the published example, hand arithmetic, plain least squares, and its size."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from basinrain.errors import DataError
from basinrain.screening.double_mass import DoubleMass, double_mass

FILE = Path(__file__).parents[1] / "data" / "published" / "double_mass_cases.csv"
CASE = next(csv.DictReader(FILE.read_text(encoding="utf-8").splitlines()))
YEARS = np.arange(1985, 1969, -1)
OWN = np.array([float(v) for v in CASE["station"].split(";")])
MEAN = np.array([float(v) for v in CASE["reference"].split(";")])


@pytest.mark.parametrize("break_after", [1978, None])
def test_punmia(break_after: int | None) -> None:
    """Punmia ex. 4.6 (seen): slopes 550/590 and 720/550, factor 0.7121 by chords, 0.7143 by lines; printed is 0.7051.

    Trap: the book accumulates from the newest year and reads its slopes off a graph, hence 1.5 % of tolerance. The
    break is found where the book has it, too.
    """
    curve = double_mass(OWN, MEAN, YEARS, break_after=break_after)
    assert (CASE["case"], curve.break_after, curve.older_until) == ("punmia_4_6", 1978, 1977)
    assert (curve.x[7], curve.y[7], curve.x[-1], curve.y[-1]) == (590, 550, 1140, 1270)
    assert curve.slopes == pytest.approx((550 / 590, 720 / 550), rel=1e-12)
    assert curve.ratio == pytest.approx(0.712100, abs=1e-6)
    assert curve.fitted_ratio == pytest.approx(0.714322, abs=1e-6)
    assert curve.ratio == pytest.approx(0.7051, rel=0.015)
    assert curve.fitted_ratio == pytest.approx(0.7051, rel=0.015)
    assert curve.significant
    assert curve.persists
    assert curve.found == (break_after is None)


def test_punmia_adjusted() -> None:
    """The older years times the factor are within 1.5 % of the book's, which are cut to whole cm; newer ones stay."""
    adjusted = double_mass(OWN, MEAN, YEARS).adjusted
    assert adjusted[:8].tolist() == OWN[:8].tolist()
    printed = np.array([66, 52, 63, 59, 66, 63, 70, 63])  # 1970 to 1977
    assert np.trunc(OWN[:7:-1] * 0.7051).tolist() == printed.tolist()
    assert adjusted[:7:-1] == pytest.approx(OWN[:7:-1] * 0.7051, rel=0.015)
    assert (np.abs(adjusted[:7:-1] - (printed + 0.5)) <= 0.5 + 0.015 * 70).all()


def test_direction_does_not_matter() -> None:
    """From the oldest year on, slopes change places and the break is named from its other side; the rest stays."""
    newest, oldest = double_mass(OWN, MEAN, YEARS), double_mass(OWN[::-1], MEAN[::-1], YEARS[::-1])
    assert oldest.slopes == pytest.approx(newest.slopes[::-1], rel=1e-12)
    assert (oldest.break_after, oldest.older_until) == (1977, 1977)
    assert oldest.ratio == pytest.approx(newest.ratio, rel=1e-12)
    # The origin is no point of the fit, so that lines depend on the direction a little.
    assert oldest.fitted_ratio == pytest.approx(newest.fitted_ratio, rel=0.01)
    assert oldest.f == pytest.approx(newest.f, rel=1e-9)
    assert oldest.adjusted[::-1] == pytest.approx(newest.adjusted, rel=1e-12)


def drawn(n: int, seed: int, step: float = 1.0) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return totals and reference of n years, the totals times ``step`` in the first half."""
    rng = np.random.default_rng(seed)
    reference = rng.normal(800, 120, n)
    totals = reference * 1.1 * (1 + 0.06 * rng.standard_normal(n)) * np.where(np.arange(n) < n // 2, step, 1.0)
    return totals, reference


def by_least_squares(totals: npt.NDArray[np.float64], reference: npt.NDArray[np.float64], stop: int) -> float:
    """Return F of two slopes against one, by numpy's least squares on rows weighted by 1/√x."""
    weight = 1 / np.sqrt(reference)
    early = np.arange(len(totals)) < stop
    designs = (reference[:, None], np.column_stack((reference * early, reference * ~early)))
    sums = [np.linalg.lstsq(design * weight[:, None], totals * weight, rcond=None)[1][0] for design in designs]
    return float((sums[0] - sums[1]) / (sums[1] / (len(totals) - 2)))


@pytest.mark.parametrize("seed", range(5))
def test_analysis_of_covariance(seed: int) -> None:
    """F equals the one of plain weighted least squares at the break that is given and is greatest at the one found."""
    totals, reference = drawn(24, seed, step=0.9)
    years = np.arange(2001, 2025)
    for stop in (5, 12, 19):
        given = double_mass(totals, reference, years, break_after=2000 + stop)
        assert given.f == pytest.approx(by_least_squares(totals, reference, stop), rel=1e-9)
        assert given.significance == pytest.approx(stats.f.sf(given.f, 1, 22), rel=1e-9)
    tried = {stop: by_least_squares(totals, reference, stop) for stop in range(5, 20)}
    found = double_mass(totals, reference, years)
    assert found.break_after == 2000 + max(tried, key=lambda stop: tried[stop])
    assert found.f == pytest.approx(max(tried.values()), rel=1e-9)
    assert found.significance == pytest.approx(min(1, 15 * stats.f.sf(found.f, 1, 22)), rel=1e-9)


def test_fitted_lines() -> None:
    """The second ratio is of scipy's regression lines through either part of the curve, the break's point in both."""
    totals, reference = drawn(24, 3, step=0.8)
    curve = double_mass(totals, reference, np.arange(2001, 2025), break_after=2012)
    older, newer = (stats.linregress(curve.x[part], curve.y[part]).slope for part in (slice(12), slice(11, None)))
    assert curve.fitted_ratio == pytest.approx(newer / older, rel=1e-9)


@pytest.mark.parametrize("n", [10, 20, 40, 80])
def test_size(n: int) -> None:
    """Of 2000 curves without a break at most 1 % are called significant, Bonferroni being strict, and some are."""
    years = np.arange(n)
    significant = [double_mass(*drawn(n, seed), years).significant for seed in range(2000)]
    # Three standard errors over 1 %.
    assert 0 < np.mean(significant) < 0.01 + 3 * np.sqrt(0.01 / 2000)


@pytest.mark.parametrize(("step", "least"), [(0.85, 0.9), (1.2, 0.95)])
def test_power(step: float, least: float) -> None:
    """Of 300 breaks in the middle of 30 years, where the ratio varies by 6 %, most are found, within three years."""
    curves = [double_mass(*drawn(30, seed, step), np.arange(1, 31)) for seed in range(300)]
    hits = [curve.significant and abs((curve.break_after or 99) - 15) <= 3 for curve in curves]
    assert np.mean(hits) > least


@given(
    own=st.lists(st.integers(1, 2000), min_size=10, max_size=20),
    unit=st.floats(0.01, 100),
)
def test_unit_does_not_matter(own: list[int], unit: float) -> None:
    """Depths in another unit change neither break, slopes nor significance."""
    reference, years = np.arange(500.0, 500.0 + len(own)), np.arange(len(own))
    plain = double_mass(own, reference, years)
    scaled = double_mass(np.array(own) * unit, reference * unit, years, break_after=plain.break_after)
    assert scaled.slopes == pytest.approx(plain.slopes, rel=1e-9)
    assert scaled.ratio == pytest.approx(plain.ratio, rel=1e-9)
    assert scaled.f == pytest.approx(plain.f, rel=1e-6, abs=1e-9)


@given(
    own=st.lists(st.integers(1, 2000), min_size=10, max_size=20),
)
def test_adjusted_record_has_one_slope(own: list[int]) -> None:
    """After the adjustment the chords of both parts have the newer one's slope."""
    reference, years = np.arange(500.0, 500.0 + len(own)), np.arange(len(own))
    curve = double_mass(own, reference, years)
    again = double_mass(curve.adjusted, reference, years, break_after=curve.break_after)
    assert again.slopes == pytest.approx((curve.slopes[1],) * 2, rel=1e-9)
    assert again.ratio == pytest.approx(1.0, rel=1e-9)


def straight(n: int, *, own: float = 90.0) -> DoubleMass:
    return double_mass(np.full(n, own), np.full(n, 100.0), np.arange(2001, 2001 + n))


def test_straight_line() -> None:
    """A gauge that keeps its proportion exactly has a break nowhere: F is 0."""
    curve = straight(12)
    assert (curve.f, curve.significance, curve.significant) == (0.0, 1.0, False)
    assert curve.ratio == pytest.approx(1.0, rel=1e-12)


def test_exact_break() -> None:
    """Two exact proportions leave nothing unexplained: F is infinite, the probability 0."""
    totals = np.repeat([90.0, 60.0], 6)
    curve = double_mass(totals, np.full(12, 100.0), np.arange(2001, 2013))
    assert (curve.break_after, curve.f, curve.significance) == (2006, np.inf, 0.0)
    assert curve.adjusted == pytest.approx(np.full(12, 60.0), rel=1e-12)


def test_too_few_years() -> None:
    """Nine years have a curve and one slope, but no break; without any year there is not even a slope."""
    curve = straight(9)
    assert (curve.break_after, curve.older_until, curve.slopes) == (None, None, (0.9, 0.9))
    assert np.isnan([curve.ratio, curve.fitted_ratio, curve.f, curve.significance]).all()
    assert (curve.significant, curve.persists) == (False, False)
    assert curve.adjusted.tolist() == [90.0] * 9
    none = double_mass([np.nan], [1.0], [2001])
    assert np.isnan(none.slopes).all()
    assert len(none.years) == 0


def test_two_years() -> None:
    """A break that is given between the only two years has slopes, and nothing to judge them by."""
    curve = double_mass([80.0, 60.0], [100.0, 100.0], [2001, 2002], break_after=2001)
    assert (curve.slopes, curve.significant) == ((0.8, 0.6), False)
    assert curve.ratio == pytest.approx(0.75)
    assert np.isnan([curve.f, curve.significance]).all()


def test_years_that_are_left_out() -> None:
    """A year without a total, without a reference or with a dry one takes no part."""
    totals, reference = np.full(14, 90.0), np.full(14, 100.0)
    totals[0], reference[3], reference[8] = np.nan, np.nan, 0.0
    curve = double_mass(totals, reference, np.arange(2001, 2015))
    assert sorted(set(range(2001, 2015)) - set(curve.years.tolist())) == [2001, 2004, 2009]
    assert curve.y[-1] == 11 * 90


def test_days_travel_with_the_totals() -> None:
    """Days are told for the years that took part, the calendar year's where none are given; sums do not use them."""
    totals, reference, years = np.full(12, 90.0), np.full(12, 100.0), np.arange(2001, 2013)
    totals[1] = np.nan
    told = double_mass(totals, reference, years, days=np.arange(350, 362))
    assert told.days.tolist() == [350, *range(352, 362)]
    plain = double_mass(totals, reference, years)
    assert plain.days.tolist() == [365, 365, 366, 365, 365, 365, 366, 365, 365, 365, 366]
    assert plain.y.tolist() == told.y.tolist()


def test_dry_part() -> None:
    """A gauge without rain after the break has no factor, and nothing is adjusted."""
    totals = np.repeat([90.0, 0.0], 6)
    curve = double_mass(totals, np.full(12, 100.0), np.arange(2001, 2013))
    assert curve.slopes == (0.9, 0.0)
    assert np.isnan(curve.ratio)
    assert curve.adjusted.tolist() == totals.tolist()


def test_break_that_does_not_persist() -> None:
    """A break that is given may leave fewer than five years; the result says so."""
    assert not double_mass(OWN, MEAN, YEARS, break_after=1982).persists


@pytest.mark.parametrize("year", [1969, 1970, 1986])
def test_break_outside(year: int) -> None:
    """A given break needs years on both sides."""
    text = (
        rf"gauge A: found a break after {year} and 1985 to 1970; expected the break after one of the years with values"
    )
    with pytest.raises(DataError, match=text):
        double_mass(OWN, MEAN, YEARS, gauge="A", break_after=year)


def test_break_without_years() -> None:
    """The same where no year has values."""
    with pytest.raises(DataError, match="double-mass curve: found a break after 2001 and no year with values"):
        double_mass([np.nan, 1.0], [1.0, 0.0], [2001, 2002], break_after=2001)


def test_input_that_does_not_fit() -> None:
    """Lengths that differ and years out of order are refused."""
    with pytest.raises(DataError, match="found 2 totals, 2 of the reference and 3 years; expected one of each a year"):
        double_mass([1.0, 2.0], [1.0, 2.0], [2001, 2002, 2003])
    with pytest.raises(DataError, match="gauge A: found years out of order; expected increasing or decreasing"):
        double_mass([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], [2001, 2003, 2002], gauge="A")
