from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import gumbel_r

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, SERIES, Frequency
from basinrain.designstorm.found_frequency import (
    check_frequencies,
    found_frequencies,
    found_frequency,
    odds,
)
from basinrain.errors import DataError

YEARS = (2.0, 10.0, 100.0)
LADDER = [Frequency(years, ANNUAL_MAXIMUM) for years in YEARS]
DEPTHS = [60.0, 90.0, 130.0]

steps = st.lists(st.floats(0.5, 50.0), min_size=2, max_size=7)


def ladder_of(rises: list[float], series: str) -> tuple[list[Frequency], npt.NDArray[np.float64]]:
    """Return frequencies and depths that both rise, from rises of depth."""
    return [Frequency(2.0 * 3.0**k, series) for k in range(len(rises))], np.cumsum(rises)


def test_between_two_depths_by_hand() -> None:
    """2-year 60 mm, 10-year 90 mm: y is 0.36651 and 2.25037, so y = 1.49994 of 5 years lies at 60 + 0.60163 * 30."""
    share = (1.49994 - 0.36651) / (2.25037 - 0.36651)
    found = found_frequency(60 + 30 * share, LADDER, DEPTHS)
    assert found.estimate is not None
    assert found.estimate.return_period == pytest.approx(5.0, abs=1e-3)
    assert (found.commoner, found.rarer) == (LADDER[0], LADDER[1])
    assert found.words == "between 1 in 2 and 1 in 10 a year, about 1 in 5"
    assert found.known
    assert not found.beyond


def test_a_depth_of_the_table_is_its_frequency() -> None:
    """At a node range and estimate are that frequency; at the last one the words say that the table ends."""
    found = found_frequency(90.0, LADDER, DEPTHS)
    assert found.estimate == found.commoner == found.rarer == LADDER[1]
    assert found.words == "1 in 10 a year"
    last = found_frequency(130.0, LADDER, DEPTHS)
    assert last.estimate == LADDER[2]
    assert not last.beyond
    assert last.words == "1 in 100 a year (the table's end)"


def test_a_sum_of_tips_is_the_depth_that_it_sums_to() -> None:
    """300 tips of 0.2 mm are 60 mm, though their sum in binary is a little off."""
    total = sum([0.2] * 300)
    assert total != 60.0
    assert found_frequency(total, LADDER, DEPTHS).estimate == LADDER[0]
    assert found_frequency(130.0 * (1 + 1e-12), LADDER, DEPTHS).estimate == LADDER[2]


def test_nothing_is_extrapolated() -> None:
    """Beyond both ends there is a limit on one side and no estimate."""
    common, rare = found_frequency(59.9, LADDER, DEPTHS), found_frequency(130.1, LADDER, DEPTHS)
    assert (common.estimate, common.commoner, common.rarer) == (None, None, LADDER[0])
    assert common.words == "more frequent than 1 in 2 a year (the table's most frequent)"
    assert (rare.estimate, rare.commoner, rare.rarer) == (None, LADDER[2], None)
    assert rare.words == "rarer than 1 in 100 a year (the table's end)"
    assert rare.beyond
    assert (common.rank, rare.rank) == (-math.inf, math.inf)
    assert found_frequency(0.0, LADDER, DEPTHS).words == common.words


def test_what_is_not_known() -> None:
    """No depth, or no table, and nothing is said; a NaN is never a zero."""
    none = found_frequency(math.nan, LADDER, DEPTHS)
    assert (none.estimate, none.commoner, none.rarer) == (None, None, None)
    assert none.words == "not known: no depth of the storm"
    assert not none.known
    assert math.isnan(none.rank)
    assert found_frequency(70.0, LADDER, [math.nan] * 3).words == "not known: no depths of the table"


def test_a_gap_in_the_table_widens_the_range() -> None:
    """Without the 10-year depth the neighbours are 2 and 100 years; without the 100-year one the table ends at 10."""
    wide = found_frequency(95.0, LADDER, [60.0, math.nan, 130.0])
    assert (wide.commoner, wide.rarer) == (LADDER[0], LADDER[2])
    short = found_frequency(95.0, LADDER, [60.0, 90.0, math.nan])
    assert short.words == "rarer than 1 in 10 a year (the table's end)"
    assert found_frequency(90.0, LADDER, [60.0, 90.0, math.nan]).words == "1 in 10 a year (the table's end)"


def test_equal_depths_of_several_frequencies() -> None:
    """The range holds all of them, and rarity is not overstated."""
    found = found_frequency(90.0, LADDER, [60.0, 90.0, 90.0])
    assert (found.commoner, found.rarer, found.estimate) == (LADDER[1], LADDER[2], LADDER[1])
    assert found.words == "from 1 in 10 to 1 in 100 a year, which have the same depth"
    assert found_frequency(90.1, LADDER, [60.0, 90.0, 90.0]).commoner == LADDER[2]


def test_partial_duration_in_words() -> None:
    """Return periods of a partial duration series are no chance a year; halfway in depth is halfway in ln T."""
    ladder = [Frequency(years, PARTIAL_DURATION) for years in (1.0, 4.0)]
    found = found_frequency(25.0, ladder, [20.0, 30.0])
    assert found.estimate is not None
    assert found.estimate.return_period == pytest.approx(2.0)
    assert found.words == "between 1 year and 4 years (partial duration), about 2 years"
    assert (
        found_frequency(40.0, ladder, [20.0, 30.0]).words == "rarer than 4 years (partial duration) (the table's end)"
    )


def test_one_frequency_is_a_table_too() -> None:
    """It has two sides and nothing between them."""
    words = [found_frequency(depth, LADDER[:1], [60.0]).words for depth in (50.0, 60.0, 70.0)]
    assert words == [
        "more frequent than 1 in 2 a year (the table's most frequent)",
        "1 in 2 a year (the table's end)",
        "rarer than 1 in 2 a year (the table's end)",
    ]


@given(share=st.floats(0.001, 0.999), loc=st.floats(20.0, 80.0), scale=st.floats(1.0, 30.0))
def test_depths_of_a_gumbel_distribution_are_found_exactly(share: float, loc: float, scale: float) -> None:
    """Against scipy.stats.gumbel_r: on its quantiles the interpolation is no approximation."""
    depths = np.asarray(gumbel_r.isf([1 / years for years in YEARS], loc=loc, scale=scale))
    depth = depths[0] + share * (depths[2] - depths[0])
    found = found_frequency(float(depth), LADDER, depths)
    assert found.estimate is not None
    assert found.estimate.aep == pytest.approx(float(gumbel_r.sf(depth, loc=loc, scale=scale)), rel=1e-7)


@given(rises=steps, series=st.sampled_from(SERIES), share=st.floats(0.0, 1.0), data=st.data())
def test_a_depth_interpolated_at_a_frequency_is_found_as_it(
    rises: list[float], series: str, share: float, data: st.DataObject
) -> None:
    """There and back is the same return period, and the range contains it."""
    ladder, depths = ladder_of(rises, series)
    k = data.draw(st.integers(0, len(ladder) - 2))
    low, high = ladder[k].variate, ladder[k + 1].variate
    variate = low + share * (high - low)
    depth = depths[k] + share * (depths[k + 1] - depths[k])
    found = found_frequency(float(depth), ladder, depths)
    assert found.estimate is not None
    assert found.commoner is not None
    assert found.rarer is not None
    assert found.estimate.variate == pytest.approx(variate, abs=1e-6)
    assert found.commoner <= found.estimate <= found.rarer


@given(rises=steps, series=st.sampled_from(SERIES), two=st.tuples(st.floats(0.0, 400.0), st.floats(0.0, 400.0)))
def test_deeper_is_never_less_rare(rises: list[float], series: str, two: tuple[float, float]) -> None:
    """By estimate, and by both ends of the range where they are known."""
    ladder, depths = ladder_of(rises, series)
    less, more = (found_frequency(depth, ladder, depths) for depth in sorted(two))
    assert less.rank <= more.rank
    for one, other in ((less.commoner, more.commoner), (less.rarer, more.rarer)):
        assert one is None or other is None or one <= other


@given(
    rises=steps,
    series=st.sampled_from(SERIES),
    values=st.lists(st.floats(0.0, 400.0) | st.just(math.nan), min_size=1, max_size=12),
)
def test_many_at_once_are_the_same_as_one_by_one(rises: list[float], series: str, values: list[float]) -> None:
    """Nothing is carried from one depth to another, with one ladder for all or a ladder for each."""
    ladder, depths = ladder_of(rises, series)
    together = found_frequencies(values, ladder, depths)
    apart = found_frequencies(values, ladder, np.tile(depths, (len(values), 1)))
    for k, value in enumerate(values):
        alone = found_frequency(value, ladder, depths)
        assert repr(together.one((k,))) == repr(apart.one((k,))) == repr(alone)


def test_two_axes_of_depths() -> None:
    """Rows and columns each with their own ladder."""
    nodes = np.array([[[60.0, 90.0, 130.0]], [[6.0, 9.0, 13.0]]])
    found = found_frequencies(np.array([[90.0], [90.0]]), LADDER, nodes)
    assert found.estimate[0, 0] == 10.0
    assert np.isnan(found.estimate[1, 0])
    assert found.commoner[1, 0] == 100.0


def test_odds_in_words() -> None:
    """Two digits where it is about; no year in the plural alone."""
    assert odds(Frequency(34.4, ANNUAL_MAXIMUM), about=True) == "1 in 34"
    assert odds(Frequency(345.0, ANNUAL_MAXIMUM), about=True) == "1 in 340"
    assert odds(Frequency(10000, ANNUAL_MAXIMUM)) == "1 in 10000"
    assert odds(Frequency(1, PARTIAL_DURATION)) == "1 year"
    assert odds(Frequency(0.25, PARTIAL_DURATION)) == "0.25 years"


def test_frequencies_that_are_no_ladder() -> None:
    """None, of two series, not rising: each is told with what to do."""
    with pytest.raises(DataError, match=r"frequencies: found none; expected one at least"):
        check_frequencies([])
    with pytest.raises(DataError, match=r"both annual-maximum and partial-duration series; expected all of one"):
        check_frequencies([LADDER[0], Frequency(10, PARTIAL_DURATION)])
    with pytest.raises(DataError, match=r"AEP 0\.5 \(1 in 2\): found after AEP 0\.5 \(1 in 2\); expected a rarer one"):
        check_frequencies([LADDER[0], LADDER[0]])


def test_depths_that_cannot_be() -> None:
    """All problems together; a table that falls is not searched."""
    with pytest.raises(DataError, match=r"(?s)depth: found -1 mm.*table's depths: found 80 mm after 90 mm"):
        found_frequency(-1.0, LADDER, [60.0, 90.0, 80.0])
    with pytest.raises(DataError, match=r"found 80 mm after 90 mm at a more frequent one"):
        found_frequency(70.0, LADDER, [90.0, math.nan, 80.0])
    with pytest.raises(DataError, match=r"depth: found inf mm; expected 0 or more"):
        found_frequency(math.inf, LADDER, DEPTHS)
    with pytest.raises(DataError, match=r"found shape \(2,\); expected shape \(3,\)"):
        found_frequency(70.0, LADDER, DEPTHS[:2])
