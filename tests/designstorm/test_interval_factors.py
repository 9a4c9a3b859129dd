"""Factors from fixed clock intervals to true ones."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.interval_factors import INTERVAL_FACTORS, hershfield, interval_factor, weiss
from basinrain.errors import JobError, MethodError

PUBLISHED = Path(__file__).parents[1] / "data" / "published" / "fixed_interval_factors.csv"


def test_published_factors() -> None:
    """Weiss (1964) by his formula; Hershfield (1961) and the rounded ones of WMO from memory."""
    table = pd.read_csv(PUBLISHED)
    n = table["n_intervals"].to_numpy(float)
    np.testing.assert_allclose(weiss(n), table["weiss_8n_over_8n_minus_1"], atol=5e-6)
    np.testing.assert_array_equal(hershfield(n), table["hershfield_wmo_rounded"])


def test_weiss_of_one_interval_is_the_mean_of_two_rains() -> None:
    """Of steady rain of one interval, begun at any moment, a clock interval catches 3/4; 1 / mean(1, 3/4) = 8/7."""
    begun = (np.arange(100_000) + 0.5) / 100_000
    steady = np.maximum(begun, 1 - begun).mean()
    assert steady == pytest.approx(0.75, abs=1e-9)
    assert weiss(np.array([1.0]))[0] == pytest.approx(1 / np.mean([1.0, steady]), abs=1e-9)


@given(st.lists(st.floats(1.0, 1e4), min_size=2, max_size=8))
def test_weiss_falls_to_one(n: list[float]) -> None:
    """The more intervals, the smaller the factor; always above 1 and below 4/3, that of steady rain."""
    factors = weiss(np.sort(np.array(n)))
    assert (np.diff(factors) <= 0).all()
    assert ((factors > 1) & (factors < 4 / 3)).all()


def test_rounded_factors_go_with_weiss() -> None:
    """The two sets agree within 0.03 at every number of intervals that both have."""
    n = np.arange(1.0, 25.0)
    assert np.abs(hershfield(n) - weiss(n)).max() < 0.03


def test_durations() -> None:
    """Depths of clock hours: 60 min is one interval, 90 min one and a half, 1 d twenty-four."""
    factors = interval_factor("weiss", np.array([60.0, 90.0, 1440.0]), 60.0)
    np.testing.assert_allclose(factors, [8 / 7, 12 / 11, 192 / 191], rtol=1e-15)
    np.testing.assert_array_equal(interval_factor("hershfield", np.array([1440.0, 2880.0]), 1440.0), [1.13, 1.04])


def test_memory_is_said() -> None:
    """What is from memory says so, and every set has its source."""
    assert {name: known.evidence for name, known in INTERVAL_FACTORS.items()} == {
        "weiss": "",
        "hershfield": "from memory",
    }
    assert "1964" in INTERVAL_FACTORS["weiss"].source
    assert "1961" in INTERVAL_FACTORS["hershfield"].source


def test_durations_below_the_interval() -> None:
    """A duration below one interval has no factor; all such durations are named."""
    with pytest.raises(MethodError) as caught:
        interval_factor("weiss", np.array([30.0, 60.0, 45.0]), 60.0)
    assert str(caught.value).splitlines() == [
        f"[design.depths] interval_factor 'weiss': found a duration of {words} intervals of 1 h; expected one interval "
        "or more; leave the duration out, or the factor"
        for words in ("30 min, 0.5", "45 min, 0.75")
    ]


@pytest.mark.parametrize("minutes", [90.0, 30.0, 1500.0])
def test_rounded_factors_end(minutes: float) -> None:
    """The rounded factors are for whole numbers of intervals, 1 to 24."""
    with pytest.raises(MethodError, match=r"intervals of 1 h; expected a whole number of intervals, 1 to 24; leave"):
        interval_factor("hershfield", np.array([minutes]), 60.0)


@pytest.mark.parametrize("n", [0.5, 0.0, -1.0, np.nan, np.inf])
def test_numbers_of_intervals_that_cannot_be(n: float) -> None:
    """Below one, or no number: refused."""
    with pytest.raises(
        MethodError, match=rf"^\[design\.depths\] interval_factor 'weiss': found {n:g} intervals; expected one interval"
    ):
        weiss(np.array([n]))


def test_unknown_method_and_interval() -> None:
    """The method must be known and the interval above 0; both are said at once."""
    with pytest.raises(JobError) as caught:
        interval_factor("weis", np.array([60.0]), 0.0)
    assert str(caught.value).splitlines() == [
        "[design.depths] interval_factor: found 'weis'; expected one of: weiss, hershfield; did you mean 'weiss'?",
        "[design.depths] observed_every: found 0 minutes; expected more than 0",
    ]
