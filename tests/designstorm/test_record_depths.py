"""Depths by duration and frequency from the annual maxima of areas."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from invented_maxima import FREQUENCIES, MINUTES, annual_maxima, crossing_maxima
from scipy import stats

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.record_depths import RecordDepths, record_depths
from basinrain.errors import DataError, JobError, MethodError

Floats = npt.NDArray[np.float64]


def found_of(maxima: Floats, *, minutes: Floats = MINUTES, **options: object) -> RecordDepths:
    """Return the depths of areas A, B ... over the years from 1991."""
    areas = [chr(ord("A") + k) for k in range(maxima.shape[2])]
    asked: dict[str, object] = {"frequencies": FREQUENCIES, "resamples": 200, **options}
    return record_depths(maxima, np.arange(1991, 1991 + len(maxima)), minutes, areas, **asked)  # type: ignore[arg-type]


def assert_equal(one: RecordDepths, other: RecordDepths) -> None:
    """Make sure that two results are the same to the last digit."""
    assert one.remarks == other.remarks
    for name in one.fits:
        for part in ("quantiles", "depth", "lower", "upper", "ratio_error"):
            assert np.array_equal(getattr(one.fits[name], part), getattr(other.fits[name], part))
        assert np.array_equal(one.fits[name].goodness.p_value, other.fits[name].goodness.p_value)


def test_gumbel_by_hand() -> None:
    """Ten years 10, 12 ... 28 mm: mean 19, scale 11/3, so 10 years give 19 + (2.2504 - 0.5772) (11/3) / ln 2 mm.

    Half the mean difference of 1 to n is (n + 1) / 6, here times 2: 11/3.
    """
    maxima = np.arange(10.0, 30.0, 2.0)[[3, 9, 1, 0, 7, 5, 2, 8, 6, 4]][:, None, None]
    found = found_of(maxima, minutes=MINUTES[[1]])
    assert float(found.moments.mean[0, 0]) == pytest.approx(19)
    assert float(found.moments.scale[0, 0]) == pytest.approx(11 / 3)
    assert found.depths.depth[0, 0, 2] == pytest.approx(19 + (2.250367 - 0.577216) * (11 / 3) / 0.693147, abs=1e-4)


@pytest.mark.parametrize("distribution", ["gumbel", "gev"])
def test_quantiles_are_the_library_s_of_the_fitted_parameters(distribution: str) -> None:
    """All areas, durations and frequencies are scipy's quantiles of the parameters that stand beside them."""
    found = found_of(annual_maxima(30), distribution=distribution)
    for name, fit in found.fits.items():
        p = fit.parameters
        expected = stats.genextreme.ppf(
            [[[0.5, 0.8, 0.9, 0.95]]], p.shape[..., None], p.location[..., None], p.scale[..., None]
        )
        np.testing.assert_allclose(fit.quantiles, expected, rtol=1e-9)
        assert np.all(p.shape == 0) == (name == "gumbel")
    np.testing.assert_array_equal(found.depths.depth, found.fits[distribution].depth)
    np.testing.assert_array_equal([found.lower, found.upper], [found.fit.lower, found.fit.upper])


def test_the_table_says_where_it_comes_from() -> None:
    """The depths are areal, in an annual maximum series, with years and distribution in words."""
    depths = found_of(annual_maxima(30)).depths
    assert depths.areal
    assert depths.series == "annual-maximum"
    assert depths.points == ("A", "B")
    assert depths.source == "annual maxima of the record, 30 years, Gumbel distribution by L-moments"
    assert depths.date == "1991 to 2020"
    np.testing.assert_array_equal(depths.durations, MINUTES)
    np.testing.assert_array_equal(depths.return_periods, [2, 5, 10, 20])


@pytest.mark.parametrize(("years", "taken"), [(10, "gumbel"), (49, "gumbel"), (50, "gev"), (80, "gev")])
def test_gumbel_below_fifty_years(years: int, taken: str) -> None:
    """Up to 49 years Gumbel is taken unless asked otherwise, from 50 on GEV; the other stands beside it."""
    found = found_of(annual_maxima(years))
    assert found.distribution == taken
    assert list(found.fits) == ["gumbel", "gev"]
    assert np.isfinite([fit.depth for fit in found.fits.values()]).all()


def test_one_short_series_decides_for_all() -> None:
    """Of 60 years one series counts only 45: Gumbel is taken for all areas and durations."""
    maxima = annual_maxima(60)
    maxima[:15, 2, 1] = np.nan
    found = found_of(maxima)
    assert found.distribution == "gumbel"
    assert found.n_years.tolist() == [[60, 60, 60, 60], [60, 60, 45, 60]]
    assert found.depths.source.startswith("annual maxima of the record, 45 to 60 years, Gumbel")


def test_nine_years_are_refused() -> None:
    """Ten years of which one does not count at twelve hours are named by area, duration and years."""
    maxima = annual_maxima(10)
    maxima[6, 3, 1] = np.nan
    with pytest.raises(
        MethodError, match=r"^area B, 12 h: found 9 years with an annual maximum; expected 10 at least; take a longer"
    ):
        found_of(maxima)


def test_rare_and_short_are_told_together() -> None:
    """A record without years that count is refused with the frequencies that it cannot tell."""
    with pytest.raises(
        MethodError, match=r"^area A, 1 h: found 0 years(.|\n)*AEP 0\.5 \(1 in 2\): found a return period"
    ):
        found_of(np.full((12, 1, 1), np.nan), minutes=MINUTES[[1]])


def test_beyond_twice_the_record_only_when_asked() -> None:
    """1 in 61 from 30 years is refused and given with beyond_record; 1 in 60 is given anyway."""
    rare = [Frequency(61.0, "annual-maximum")]
    with pytest.raises(
        MethodError,
        match=r"^AEP 0\.01639 \(1 in 61\): found .* 2 times the 30 years of area A, 30 min; .*beyond_record = true$",
    ):
        found_of(annual_maxima(30), frequencies=rare)
    given = found_of(annual_maxima(30), frequencies=rare, beyond_record=True)
    assert given.depths.return_periods.tolist() == [61]
    assert found_of(annual_maxima(30), frequencies=[Frequency(60.0, "annual-maximum")]).depths.depth.shape == (2, 4, 1)


def test_frequencies_once_each_and_in_order() -> None:
    """Asked for in any order and twice, a frequency has one column, with the depths that it has alone."""
    turned = found_of(annual_maxima(30), frequencies=[*FREQUENCIES[::-1], FREQUENCIES[1]])
    assert_equal(turned, found_of(annual_maxima(30)))
    one = found_of(annual_maxima(30), frequencies=FREQUENCIES[2:3])
    np.testing.assert_allclose(one.fit.quantiles[..., 0], turned.fit.quantiles[..., 2], rtol=1e-14)
    np.testing.assert_allclose(one.depths.at(MINUTES, FREQUENCIES[2]), one.fit.depth[..., 0], rtol=1e-14)


def test_a_repeat_is_identical() -> None:
    """The same record gives the same bytes, another seed other intervals of the same depths; no input is touched."""
    maxima = annual_maxima(30)
    maxima[3, 1, 0] = np.nan
    before = maxima.copy()
    one = found_of(maxima)
    assert_equal(one, found_of(maxima))
    np.testing.assert_array_equal(maxima, before)
    other = found_of(maxima, seed=5)
    np.testing.assert_array_equal(other.depths.depth, one.depths.depth)
    assert not np.array_equal(other.upper, one.upper)


def test_years_that_count_nowhere_change_nothing() -> None:
    """A year without any maximum is no year of the record."""
    maxima = annual_maxima(30)
    longer = np.insert(maxima, [0, 12], np.nan, axis=0)
    longer = np.append(longer, np.full((1, 4, 2), np.nan), axis=0)
    found = record_depths(longer, np.arange(1990, 2023), MINUTES, ["A", "B"], frequencies=FREQUENCIES, resamples=200)
    assert_equal(found, found_of(maxima))
    assert found.depths.date == "1991 to 2021"


def test_intervals_hold_the_depths_and_shrink_with_years() -> None:
    """In every entry lower < depth < upper, and 45 years have narrower intervals than 15 by far."""
    short, long = found_of(annual_maxima(15)), found_of(annual_maxima(45))
    for found in (short, long):
        assert np.all(found.lower < found.depths.depth)
        assert np.all(found.depths.depth < found.upper)
    widths = [(found.upper - found.lower) / found.fit.parameters.scale[..., None] for found in (short, long)]
    assert 0.4 < np.median(widths[1] / widths[0]) < 0.75


def test_fits_that_cross_make_a_table_all_the_same() -> None:
    """The table of fits that cross agrees by duration, is nowhere below the fits, and says so."""
    found = found_of(crossing_maxima(), minutes=MINUTES[[1, 2]])
    depth, fitted = found.depths.depth[0], found.fit.quantiles[0]
    assert fitted[1, 3] < fitted[0, 3]
    assert depth[1, 3] == depth[0, 3] == fitted[0, 3]
    assert np.all(depth >= fitted)
    assert found.remarks[-1].startswith("Fits of different durations cross")


def test_dry_years_count_as_dry() -> None:
    """Maxima of 0 mm are depths like others: they lower the mean and are not missing."""
    maxima = annual_maxima(20, areas=1)
    dry = maxima.copy()
    dry[[2, 11]] = 0.0
    found = found_of(dry)
    assert found.n_years.tolist() == [[20] * 4]
    np.testing.assert_allclose(found.moments.mean[0], dry.mean(axis=0)[:, 0], rtol=1e-12)


def test_maxima_without_spread_are_refused() -> None:
    """Maxima that are all equal have no distribution, even where rounding would give them one."""
    maxima = annual_maxima(20, areas=1)
    maxima[:, 1, 0] = 0.1
    with pytest.raises(
        MethodError, match=r"^area A, 1 h: found annual maxima that are all 0\.1 mm; expected maxima that"
    ):
        found_of(maxima)


def test_one_wet_year_has_no_shape() -> None:
    """One wet year among dry ones is refused where GEV is asked for; Gumbel takes it."""
    maxima = np.zeros((20, 1, 1))
    maxima[5] = 30.0
    with pytest.raises(MethodError, match=r'all but one are equal; .* or write distribution = "gumbel"$'):
        found_of(maxima, minutes=MINUTES[[1]], distribution="gev", frequencies=FREQUENCIES[1:])
    found = found_of(maxima, minutes=MINUTES[[1]], frequencies=FREQUENCIES[1:])
    assert np.isnan(found.fits["gev"].depth).all()
    assert np.isnan(found.shape_p_value).all()


def test_depths_below_zero_are_refused() -> None:
    """A frequency at which the fitted distribution has no rain is refused by name."""
    with pytest.raises(
        MethodError, match=r"^area A, 1 h, AEP 0\.999 \(1 in 1\.001\): found -[0-9.]+ mm from the fitted distribution;"
    ):
        found_of(crossing_maxima(), minutes=MINUTES[[1, 2]], frequencies=[Frequency.of_aep(0.999)])


def test_what_cannot_be_asked() -> None:
    """Another series, another distribution and maxima that are none are refused before anything is fitted."""
    with pytest.raises(MethodError, match=r"^10-year, partial duration: found that it is not counted in an annual"):
        found_of(annual_maxima(30), frequencies=[Frequency(10.0, "partial-duration")])
    with pytest.raises(JobError, match=r"^distribution: found 'gumble'; .*did you mean 'gumbel'\?$"):
        found_of(annual_maxima(30), distribution="gumble")
    with pytest.raises(JobError, match=r"^resamples: found 10; expected 100 at least$"):
        found_of(annual_maxima(30), resamples=10)
    maxima = annual_maxima(30)
    maxima[2, 3, 1] = -1.0
    with pytest.raises(DataError, match=r"^area B, 12 h, 1993: found -1 mm; expected a finite depth"):
        found_of(maxima)


def test_a_partial_duration_frequency_comes_by_conversion() -> None:
    """10 years in a partial duration series are AEP 1 - exp(-1/10) = 0.0952, and that is the depth that it gets."""
    brought = Frequency(10.0, "partial-duration").to("annual-maximum")
    fit = found_of(annual_maxima(30), frequencies=[brought]).fit
    p = fit.parameters
    expected = stats.gumbel_r.isf(0.09516258, p.location, p.scale)
    np.testing.assert_allclose(fit.quantiles[..., 0], expected, rtol=1e-8)
