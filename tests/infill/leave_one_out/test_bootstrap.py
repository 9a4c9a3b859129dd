"""Whether differences in error can be told from chance."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.infill.leave_one_out.bootstrap import RESAMPLES, differences_to_best, what_is_drawn


def test_the_interval_is_that_of_a_plain_loop() -> None:
    """Percentiles over resampled weeks, each with all its cases, of the difference of the root-mean-square errors."""
    rng = np.random.default_rng(5)
    squared, count = rng.gamma(1.0, 5.0, (2, 60)), rng.integers(1, 5, 60).astype(float)
    week = np.sort(rng.integers(0, 12, 60))
    found = differences_to_best(("a", "b"), squared, count, week, seed=3)
    weeks = np.unique(week)
    loop = np.random.default_rng(3)
    drawn = []
    for times in loop.multinomial(len(weeks), np.full(len(weeks), 1 / len(weeks)), RESAMPLES):
        cases = np.concatenate([np.flatnonzero(week == w) for w, k in zip(weeks, times, strict=True) for _ in range(k)])
        drawn.append(np.sqrt(squared[:, cases].sum(axis=1) / count[cases].sum()))
    rmse = np.sqrt(squared.sum(axis=1) / count.sum())
    best = int(rmse.argmin())
    other = found[1 - best]
    low, high = np.percentile(np.array(drawn)[:, 1 - best] - np.array(drawn)[:, best], [2.5, 97.5])
    assert other.difference == pytest.approx(rmse.max() - rmse.min())
    assert (other.low, other.high) == pytest.approx((low, high))
    assert other.distinguishable == (low > 0)
    assert (found[best].difference, found[best].low, found[best].high) == (0, 0, 0)


def test_a_repeat_is_the_same_and_another_seed_is_not() -> None:
    """The interval depends on the seed alone."""
    squared = np.random.default_rng(1).gamma(1.0, 5.0, (3, 80))
    runs = [differences_to_best(("a", "b", "c"), squared, np.ones(80), np.arange(80), seed=seed) for seed in (1, 1, 2)]
    assert runs[0] == runs[1] != runs[2]


def test_errors_that_go_together_are_told_apart_and_noise_is_not() -> None:
    """A method always 10 % worse is distinguishable; one worse by a single lucky storm is not."""
    rng = np.random.default_rng(2)
    base = rng.gamma(1.0, 5.0, 200)
    lucky = base.copy()
    lucky[17] += 40.0
    worse, luck = differences_to_best(("a", "b", "c"), np.stack([base, base * 1.21, lucky]), np.ones(200),
                                      np.arange(200), seed=1)[1:]  # fmt: skip
    assert worse.distinguishable
    assert worse.low > 0
    assert not luck.distinguishable
    assert luck.low == 0


def test_of_two_equally_good_the_first_is_the_best() -> None:
    """Differences below 1e-12 mm are none."""
    squared = np.stack([np.full(30, 9.0), np.full(30, 4.0 + 1e-14), np.full(30, 4.0)])
    found = differences_to_best(("a", "b", "c"), squared, np.ones(30), np.arange(30), seed=1)
    assert {difference.best for difference in found} == {"b"}
    assert [difference.distinguishable for difference in found] == [True, False, False]


def test_nothing_drawn() -> None:
    """There is no interval, and nothing is distinguishable."""
    found = differences_to_best(("a", "b"), np.array([[1.0] * 4, [9.0] * 4]), np.ones(4), None, seed=1)
    assert found[1].difference == 2
    assert np.isnan([found[1].low, found[1].high]).all()
    assert not found[1].distinguishable


@pytest.mark.parametrize(
    ("weeks", "days", "gauges", "expected"),
    [
        (10, 10, 1, "week"),
        (9, 63, 9, "time"),
        (1, 5, 1, "time"),
        (4, 4, 2, "case"),
        (1, 1, 5, "case"),
        (2, 2, 2, ""),
        (1, 1, 4, ""),
    ],
)
def test_the_largest_parts_of_which_there_are_enough_are_drawn(
    weeks: int, days: int, gauges: int, expected: str
) -> None:
    """Ten weeks, else five times, else five cases."""
    week, count = np.arange(days) % weeks, np.full(days, float(gauges))
    assert what_is_drawn(week, count) == expected
    assert what_is_drawn(None, count) == ("time" if expected == "week" else expected)


def test_days_of_a_week_drawn_one_by_one_give_a_narrower_interval() -> None:
    """Seven equal days a week are one piece of evidence, not seven: by weeks the interval is about √7 times as wide."""
    rng = np.random.default_rng(4)
    squared = np.repeat(rng.gamma(1.0, 5.0, (2, 40)), 7, axis=1)
    widths = []
    for group in (np.arange(280) // 7, np.arange(280)):
        worse = max(
            differences_to_best(("a", "b"), squared, np.ones(280), group, seed=1), key=lambda found: found.difference
        )
        widths.append(worse.high - worse.low)
    assert widths[0] / widths[1] == pytest.approx(np.sqrt(7), rel=0.15)
