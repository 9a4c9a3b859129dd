"""What is read off a series, some basins at a time."""

from __future__ import annotations

import numpy as np
import pytest
from series.test_long_term import Stored

import basinrain.series.summary as module
from basinrain.series.summary import LARGEST, SeriesSummary, summarise

N = np.nan
HOUR = np.timedelta64(3600, "s")


def stored(n_steps: int, n_basins: int) -> Stored:
    rng = np.random.default_rng(n_basins)
    depth = rng.gamma(0.3, 4.0, (n_steps, n_basins))
    depth[rng.random(depth.shape) < 0.01] = N
    return Stored(depth, np.ones(depth.shape, np.float32), np.zeros(depth.shape, np.uint8))


def summary(series: Stored) -> SeriesSummary:
    ends = np.datetime64("2030-11-01", "s") + np.arange(1, series.n_steps + 1) * HOUR
    durations = [HOUR, 6 * HOUR]
    return summarise(series, "infill", "thiessen", ends - HOUR, ends, durations=durations, water_year=10, complete=0.9)


@pytest.mark.parametrize("held", [1, 3 * 24 * 90, 10**9])
def test_some_basins_at_a_time_are_all_basins(held: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """However many basins are looked at together, the figures are the same but for rounding."""
    series = stored(24 * 90, 7)
    whole = summary(series)
    monkeypatch.setattr(module, "_HELD", held)
    parts = summary(series)
    assert whole.greatest is not None
    assert parts.greatest is not None
    for one, other in (
        (whole.months.total, parts.months.total),
        (whole.months.share, parts.months.share),
        (whole.years.present, parts.years.present),
        (whole.water_years.present, parts.water_years.present),
        (whole.annual.of_steps, parts.annual.of_steps),
        (whole.annual.years, parts.annual.years),
        (whole.greatest.sliding.depth, parts.greatest.sliding.depth),
        (whole.greatest.sliding.left_out, parts.greatest.sliding.left_out),
        (whole.greatest.aligned.depth, parts.greatest.aligned.depth),
        (whole.largest, parts.largest),
        (whole.terms.total, parts.terms.total),
    ):
        np.testing.assert_allclose(one, other, rtol=1e-13, atol=0)
    np.testing.assert_array_equal(whole.greatest.aligned.ends, parts.greatest.aligned.ends)
    assert whole.months.total.shape == (3, 7)


def test_largest_steps_by_hand() -> None:
    """The largest depths come first; steps that are dry or without a number are none of them."""
    depth = np.array([[0.0, N], [5.0, N], [N, 0.0], [7.0, 2.0], [1.0, 0.0], [5.5, 0.0]])
    found = summary(Stored(depth, np.ones(depth.shape, np.float32), np.zeros(depth.shape, np.uint8)))
    assert found.largest.shape == (LARGEST, 2)
    assert found.largest[:, 0].tolist() == [3, 5, 1, 4, -1]
    assert found.largest[:, 1].tolist() == [3, -1, -1, -1, -1]


def test_without_durations_there_are_no_greatest_depths() -> None:
    """Steps of a month have no durations to ask for."""
    ends = np.array(["2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    starts = np.array(["2031-01-01", "2031-02-01"], dtype="datetime64[s]")
    depth = np.array([[80.0], [60.0]])
    series = Stored(depth, np.ones(depth.shape, np.float32), np.zeros(depth.shape, np.uint8))
    found = summarise(series, "infill", "thiessen", starts, ends, durations=(), water_year=10, complete=0.95)
    assert found.greatest is None
    assert found.months.total.ravel().tolist() == [80, 60]
