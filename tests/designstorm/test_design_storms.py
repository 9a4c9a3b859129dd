"""Design storms: the depth of every basin above a point by hand, and the volume that they keep."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from depth_tables import table
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import Reduced, areal_reduction
from basinrain.designstorm.depth_chain import DepthChain
from basinrain.designstorm.design_storms import OWN_DEPTH, SAME_DEPTH, PatternChoice, PointOfInterest, design_storm
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.patterns import PATTERNS, pattern
from basinrain.errors import MethodError

Floats = npt.NDArray[np.float64]

TEN = Frequency(10.0, ANNUAL_MAXIMUM)
UNIFORM = PatternChoice(label="uniform", pattern=pattern("uniform"))
MI2 = 1609.344**2
LECLERC = areal_reduction("leclerc-schaake").reduce


def outlet(n: int, *, apart: bool = True) -> PointOfInterest:
    """Return a point with n basins above it, in the rows after its own."""
    return PointOfInterest(name="outlet", row=0, basins=tuple("abcdefgh"[:n]), rows=tuple(range(1, n + 1)), apart=apart)


def quarters(*depths: float, reduced: bool = True) -> DepthChain:
    """Return four basins of 25 mi², each with its own depth point of one duration, 6 h, and one frequency."""
    return DepthChain(
        source=table([[[depth]] for depth in depths], durations=[360], return_periods=[10]),
        weights=np.vstack([np.full(4, 0.25), np.eye(4)]),
        areas=np.array([100, 25, 25, 25, 25]) * MI2,
        reduce=LECLERC if reduced else None,
    )


def test_four_basins_to_their_outlet() -> None:
    """60 mm in 6 h on 100 mi²: 60 (1 - e^(-1.1 6^0.25) (1 - e^(-0.01 100))) = 53.22 mm for each of four basins.

    The formula is that of Leclerc and Schaake (1972), on the curves of U.S. Weather Bureau Technical Papers 29 and 40.
    """
    taken = np.exp(-1.1 * 6**0.25)
    storm = design_storm(quarters(60, 60, 60, 60), outlet(4), TEN, UNIFORM, minutes=360, step=60)
    assert storm.totals == pytest.approx([60 * (1 - taken * (1 - np.exp(-1)))] * 4, rel=1e-12)
    assert storm.totals.round(2).tolist() == [53.22] * 4
    assert storm.depth == pytest.approx(np.full((6, 4), storm.totals[0] / 6), rel=1e-12)
    assert storm.reduction.round(4).tolist() == [0.887] * 4
    assert (storm.minutes, storm.step, storm.choice.label) == (360, 60, "uniform")


def test_each_basin_by_its_own_area_only_if_asked() -> None:
    """On 25 mi² each it is 57.63 mm, which together is more than the depth on 100 mi²."""
    storm = design_storm(quarters(60, 60, 60, 60), outlet(4), TEN, UNIFORM, minutes=360, step=60, own_area=True)
    assert storm.totals == pytest.approx([60 * (1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-0.25)))] * 4, rel=1e-12)
    assert storm.totals.round(2).tolist() == [57.63] * 4


def test_each_basin_with_its_own_depth() -> None:
    """40, 50, 60 and 90 mm have the mean 60: each keeps its share of 53.22 mm, and the volume is that of the whole."""
    chain = quarters(40, 50, 60, 90)
    same = design_storm(chain, outlet(4), TEN, UNIFORM, minutes=360, step=60, sub_basins=SAME_DEPTH)
    own = design_storm(chain, outlet(4), TEN, UNIFORM, minutes=360, step=60, sub_basins=OWN_DEPTH)
    assert same.totals.round(2).tolist() == [53.22] * 4
    assert own.totals == pytest.approx(same.totals * np.array([40, 50, 60, 90]) / 60, rel=1e-12)
    assert own.totals.mean() == pytest.approx(same.totals.mean(), rel=1e-12)
    assert own.reduction.tolist() == same.reduction.tolist()


def test_own_depth_and_own_area_go_together() -> None:
    """Each basin's own points, reduced by its own area: 40 mm become 40 x 57.63 / 60."""
    chain = quarters(40, 50, 60, 90)
    storm = design_storm(chain, outlet(4), TEN, UNIFORM, minutes=360, step=60, sub_basins=OWN_DEPTH, own_area=True)
    factor = 1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-0.25))
    assert storm.totals == pytest.approx(np.array([40, 50, 60, 90]) * factor, rel=1e-12)


def test_own_depth_is_refused_where_basins_overlap() -> None:
    """Volumes of basins that share ground do not add up; the same depth for all has no such trouble."""
    chain = quarters(40, 50, 60, 90)
    message = (
        r"^\[\[design.point\]\] outlet: found basins that overlap; expected basins apart from each other, for each to "
        r'have its own depth with the whole volume kept; write sub_basins = "same-depth", or name basins that do'
    )
    with pytest.raises(MethodError, match=message):
        design_storm(chain, outlet(4, apart=False), TEN, UNIFORM, minutes=360, step=60, sub_basins=OWN_DEPTH)
    storm = design_storm(chain, outlet(4, apart=False), TEN, UNIFORM, minutes=360, step=60)
    assert storm.totals.round(2).tolist() == [53.22] * 4


def test_basins_stand_in_the_order_of_the_point() -> None:
    """A point that names its basins in another order has its columns so."""
    point = PointOfInterest(name="ford", row=0, basins=("d", "a"), rows=(4, 1), apart=True)
    storm = design_storm(quarters(40, 50, 60, 90), point, TEN, UNIFORM, minutes=360, step=60, sub_basins=OWN_DEPTH)
    assert storm.totals[0] / storm.totals[1] == pytest.approx(90 / 40, rel=1e-12)


def test_options_go_to_the_pattern() -> None:
    """A triangle of 6 steps with its peak at a quarter has the most in the second step (1.5 of 6)."""
    early = PatternChoice(label="early", pattern=pattern("triangular"), options={"peak": "early"})
    storm = design_storm(quarters(60, 60, 60, 60, reduced=False), outlet(4), TEN, early, minutes=360, step=60)
    assert storm.depth.argmax(axis=0).tolist() == [1] * 4
    assert storm.totals == pytest.approx([60] * 4, rel=1e-12)


def test_what_was_clamped_is_said_of_its_area() -> None:
    """Out of the method's range the point's name stands before the sentence; by own area that of each basin."""

    def clamp(area: float, minutes: Floats, frequency: Frequency) -> Reduced:
        return LECLERC(area * 5, minutes, frequency, outside="clamp")

    base = quarters(60, 60, 60, 60)
    chain = DepthChain(source=base.source, weights=base.weights, areas=base.areas, reduce=clamp)
    whole = design_storm(chain, outlet(4), TEN, UNIFORM, minutes=360, step=60)
    (sentence,) = whole.clamped
    assert sentence.startswith("outlet: ")
    assert "the nearest end of the method's range" in sentence
    own = design_storm(chain, outlet(4), TEN, UNIFORM, minutes=360, step=60, own_area=True)
    assert own.clamped == ()
    large = DepthChain(source=base.source, weights=base.weights, areas=base.areas * 4, reduce=clamp)
    own = design_storm(large, outlet(4), TEN, UNIFORM, minutes=360, step=60, own_area=True)
    assert [text.split(": ")[:2] for text in own.clamped] == [["outlet", basin] for basin in "abcd"]


def test_durations_within_a_nested_storm_that_were_clamped_are_said() -> None:
    """Nesting asks for the reduction of every shorter duration; one below the range is clamped, and not in silence."""

    def clamp(area: float, minutes: Floats, frequency: Frequency) -> Reduced:
        return LECLERC(area, minutes, frequency, outside="clamp")

    chain = DepthChain(
        source=table([[10, 15], [20, 30], [32, 48], [40, 60]], durations=[10, 30, 60, 120]),
        weights=np.ones((2, 1)),
        areas=np.array([10.0, 10.0]) * MI2,
        reduce=clamp,
    )
    nested = PatternChoice(label="nested", pattern=pattern("nested"), options={"smooth": True})
    storm = design_storm(chain, outlet(1), TEN, nested, minutes=120, step=10)
    (sentence,) = storm.clamped
    assert sentence.startswith("outlet: ")
    assert "10 min" in sentence
    assert design_storm(chain, outlet(1), TEN, UNIFORM, minutes=120, step=10).clamped == ()


def test_remarks_of_the_pattern_are_kept_once() -> None:
    """Four basins by their own area have one remark between them."""
    huff = PatternChoice(label="huff", pattern=pattern("huff-1"), options={"basis": "area"})
    storm = design_storm(quarters(60, 60, 60, 60), outlet(4), TEN, huff, minutes=360, step=60, own_area=True)
    assert storm.remarks
    assert len(set(storm.remarks)) == len(storm.remarks)


DEPTHS = st.lists(st.tuples(st.floats(1, 300), st.floats(0.01, 200)), min_size=1, max_size=8)
"""Depths in mm and areas in km² of basins side by side."""


@given(DEPTHS, st.sampled_from(["uniform", "triangular", "nrcs-type-ii"]), st.booleans())
def test_own_depth_keeps_the_volume(basins: list[tuple[float, float]], shape: str, reduced: bool) -> None:  # noqa: FBT001
    """Whatever the depths and areas, the basins' volumes add up to the areal depth times the whole area."""
    depth, area = np.array(basins).T
    reduce = areal_reduction("leclerc-schaake").reduce if reduced and area.sum() < 1000 else None
    # One point a basin; the whole has other weights than the areas', as points may lie unevenly.
    chain = DepthChain(
        source=table(depth[:, None, None], durations=[1440], return_periods=[10]),
        weights=np.vstack([np.full(len(depth), 1 / len(depth)), np.eye(len(depth))]),
        areas=np.array([area.sum(), *area]) * 1e6,
        reduce=reduce,
    )
    choice = PatternChoice(label=shape, pattern=PATTERNS[shape])
    storm = design_storm(chain, outlet(len(depth)), TEN, choice, minutes=1440, step=60, sub_basins=OWN_DEPTH)
    areal = chain.links(0, np.array([1440.0]), TEN).areal[0]
    assert storm.totals @ area == pytest.approx(areal * area.sum(), rel=1e-11)
    assert storm.totals / storm.totals[0] == pytest.approx(depth / depth[0], rel=1e-11)
    # One pattern times each basin's share.
    assert storm.depth * storm.totals[0] == pytest.approx(storm.depth[:, :1] * storm.totals, rel=1e-9)
