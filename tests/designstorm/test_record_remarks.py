"""Sentences that go with depths from the record."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from invented_maxima import FREQUENCIES, MINUTES, annual_maxima, crossing_maxima

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.record_depths import RecordDepths, record_depths

Floats = npt.NDArray[np.float64]


def found_of(maxima: Floats, *, minutes: Floats = MINUTES, **options: object) -> RecordDepths:
    """Return the depths of areas A, B ... over the years from 1991."""
    areas = [chr(ord("A") + k) for k in range(maxima.shape[2])]
    asked: dict[str, object] = {"frequencies": FREQUENCIES, "resamples": 400, **options}
    return record_depths(maxima, np.arange(1991, 1991 + len(maxima)), minutes, areas, **asked)  # type: ignore[arg-type]


def test_gumbel_says_its_bias_and_how_far_gev_differs() -> None:
    """Taken without being asked for, Gumbel is said to underestimate heavy tails, with both depths' difference."""
    found = found_of(annual_maxima(30))
    change = 100 * (found.fits["gev"].depth[..., -1] / found.fits["gumbel"].depth[..., -1] - 1)
    assert found.remarks[0] == (
        "The Gumbel distribution is fitted to annual maxima of 30 years by L-moments. Gumbel underestimates rare "
        "depths where the true upper tail is heavier. At AEP 0.05 (1 in 20) depths of the generalised extreme value "
        f"distribution differ from Gumbel's by {change.min():+.1f} to {change.max():+.1f} %."
    )


def test_gev_does_not_say_gumbel_s_bias() -> None:
    """From 50 years on GEV is said to be fitted, and nothing of Gumbel's bias."""
    first = found_of(annual_maxima(50)).remarks[0]
    assert first.startswith("The generalised extreme value distribution is fitted to annual maxima of 50 years")
    assert "underestimates" not in first


def test_heavy_and_light_tails_are_told_apart() -> None:
    """Where the test of the shape speaks against Gumbel, the series are named by the way they differ."""
    maxima = annual_maxima(48, areas=1)[:, :2]
    steps = (np.arange(48) + 0.5) / 48
    maxima[:, 0, 0] = 10 + (1 - steps) ** -0.4
    maxima[:, 1, 0] = 60 + 10 * np.sin(np.pi * (steps - 0.5))
    remarks = found_of(maxima, minutes=MINUTES[:2]).remarks
    assert "The test of the shape speaks against Gumbel at 5 %, heavier tail: A 30 min; lighter tail: A 1 h." in remarks
    assert (
        "The probability plot of the Gumbel distribution is less straight than 95 % of its own samples: A 30 min, "
        "A 1 h." in remarks
    )


def test_an_upper_bound_is_told() -> None:
    """GEV of a light tail names the series that it bounds and the lowest bound."""
    maxima = 40 + 10 * np.sin(np.pi * ((np.arange(30) + 0.5) / 30 - 0.5))[:, None, None] * np.array([[[1.0, 2.0]]])
    found = found_of(maxima, minutes=MINUTES[[1]], distribution="gev")
    bound = found.fit.parameters.bound[0, 0]
    assert bound < found.fit.parameters.bound[1, 0]
    assert (
        "The fitted distribution has an upper bound, which rain does not have to respect: A 1 h, B 1 h; the lowest is "
        f"{bound:.1f} mm (A 1 h)." in found.remarks
    )


def test_reaching_beyond_the_record_is_told() -> None:
    """Return periods over twice the years are named, those within are not."""
    asked = [*FREQUENCIES, Frequency(100.0, "annual-maximum"), Frequency(200.0, "annual-maximum")]
    remarks = found_of(annual_maxima(40), frequencies=asked, beyond_record=True).remarks
    assert "Beyond 2 times the 40 years of the shortest series: AEP 0.01 (1 in 100), AEP 0.005 (1 in 200)." in remarks
    assert not [remark for remark in found_of(annual_maxima(40)).remarks if remark.startswith("Beyond")]


def test_years_that_do_not_count_are_told() -> None:
    """Series with fewer years than the record are listed, six by name, and the one with the fewest."""
    maxima = annual_maxima(30)
    maxima[0, :, :] = np.nan
    maxima[1, :, :] = np.nan
    maxima[1, 3, 1] = 60.0
    maxima[4:6, 2, 1] = np.nan
    assert found_of(maxima).remarks[-1] == (
        "Not all of the 29 years count in A 30 min, A 1 h, A 3 h, A 12 h, B 30 min, B 1 h and 1 more; the fewest, 26, "
        "in B 3 h."
    )


def test_raised_depths_are_told() -> None:
    """Durations, frequencies and amounts that were raised are named."""
    found = found_of(crossing_maxima(), minutes=MINUTES[[1, 2]], frequencies=FREQUENCIES)
    raised = np.argwhere(found.fit.depth > found.fit.quantiles)
    assert raised.tolist() == [[0, 1, 3]]
    before, after = found.fit.quantiles[0, 1, 3], found.fit.depth[0, 1, 3]
    assert found.remarks[-1] == (
        "Fits of different durations cross; so that depth does not fall with duration nor intensity rise, these are "
        f"raised by up to {100 * (after / before - 1):.2f} %: A 3 h AEP 0.05 (1 in 20) from {before:.2f} to "
        f"{after:.2f} mm."
    )


def test_no_shape_is_told() -> None:
    """Where all maxima but one are equal Gumbel's depths stand alone, and it is said."""
    maxima = annual_maxima(20, areas=1)
    maxima[:, 0, 0] = np.eye(20)[4] * 3 + 5
    remarks = found_of(maxima).remarks
    assert "No shape can be fitted where all maxima but one are equal: A 30 min." in remarks
    assert "differ from Gumbel's" not in remarks[0]
