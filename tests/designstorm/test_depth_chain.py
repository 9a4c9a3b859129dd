"""From depths of points to areal depths: every link by hand, and what the links promise together."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from depth_tables import table, tables
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import Reduced, areal_reduction
from basinrain.designstorm.depth_chain import DepthChain
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.point_depths import PointDepths
from basinrain.errors import MethodError

Floats = npt.NDArray[np.float64]

TEN = Frequency(10.0, ANNUAL_MAXIMUM)
TWO_POINTS = table([[[20, 30], [40, 60]], [[30, 40], [50, 80]]])
"""1 and 4 h at 2 and 10 years: 30 and 60 mm at the first point, 40 and 80 mm at the second, both of 10 years."""


def halves(area: float, minutes: Floats, frequency: Frequency) -> Reduced:
    """Reduce to one half in an hour and to all in four, whatever the area, and say so."""
    assert frequency.return_period > 1
    return Reduced(np.where(minutes < 240, 0.5, 1.0), (f"{area:g} m² clamped.",), ("Halved.",))


def test_the_links_by_hand() -> None:
    """(3 x 30 + 40) / 4 = 32.5 mm, read at intervals x 1.2, uplift x 1.1, reduction x 0.5: 21.45 mm."""
    chain = DepthChain(
        source=TWO_POINTS,
        weights=np.array([[0.75, 0.25], [0.0, 1.0]]),
        areas=np.array([8e6, 2e6]),
        interval_factor=lambda minutes: np.where(minutes < 240, 1.2, 1.0),
        uplift=1.1,
        reduce=halves,
    )
    links = chain.links(0, np.array([60.0, 240.0]), TEN)
    assert links.minutes.tolist() == [60, 240]
    assert links.point == pytest.approx([32.5, 65])
    assert (links.interval_factor.tolist(), links.uplift, links.reduction.tolist()) == ([1.2, 1.0], 1.1, [0.5, 1.0])
    assert links.unreduced == pytest.approx([42.9, 71.5])
    assert links.areal == pytest.approx([21.45, 71.5])
    assert (links.reduced_area, links.clamped, links.remarks) == (8e6, ("8e+06 m² clamped.",), ("Halved.",))


def test_depths_of_several_areas_before_the_reduction() -> None:
    """Every row is what the links of its area have before the areal reduction."""
    chain = DepthChain(
        source=TWO_POINTS,
        weights=np.array([[0.75, 0.25], [0.0, 1.0], [1.0, 0.0]]),
        areas=np.array([8e6, 2e6, 6e6]),
        interval_factor=lambda minutes: np.where(minutes < 240, 1.2, 1.0),
        uplift=1.1,
        reduce=halves,
    )
    minutes = np.array([60.0, 240.0])
    found = chain.unreduced([2, 0], minutes, TEN)
    assert found == pytest.approx(np.array([[30 * 1.2 * 1.1, 60 * 1.1], [42.9, 71.5]]))
    assert found == pytest.approx(np.stack([chain.links(row, minutes, TEN).unreduced for row in (2, 0)]))


def test_the_area_that_decides_the_reduction_may_be_another() -> None:
    """Depths of one area are reduced as those of the whole to the point of interest, or of a part."""
    chain = DepthChain(source=TWO_POINTS, weights=np.eye(2), areas=np.array([8e6, 2e6]), reduce=halves)
    links = chain.links(1, np.array([240.0]), TEN, reduced_as=0)
    assert (links.point.tolist(), links.reduced_area) == ([80.0], 8e6)
    assert chain.links(1, np.array([240.0]), TEN).reduced_area == 2e6


def test_a_bare_chain_gives_the_depth_of_the_point() -> None:
    """Without factor, uplift and reduction every link is 1."""
    links = DepthChain(source=TWO_POINTS, weights=np.eye(2), areas=np.ones(2)).links(0, np.array([60.0]), TEN)
    assert links.areal.tolist() == [30.0]
    assert (links.interval_factor.tolist(), links.uplift, links.reduction.tolist()) == ([1.0], 1.0, [1.0])
    assert (links.clamped, links.remarks) == ((), ())


def test_areal_depths_are_not_reduced() -> None:
    """Depths of areas take no areal reduction, whoever makes the chain."""
    areal = table([[20, 30]], areal=True)
    assert DepthChain(source=areal, weights=np.eye(1), areas=np.ones(1)).reduce is None
    with pytest.raises(MethodError, match=r"^\[design.areal_reduction\]: found an areal reduction of depths that are"):
        DepthChain(source=areal, weights=np.eye(1), areas=np.ones(1), reduce=halves)


def test_extrapolation_is_the_sources() -> None:
    """The chain goes beyond the table where it may, and else says what the table says."""
    bare = DepthChain(source=TWO_POINTS, weights=np.eye(2), areas=np.ones(2))
    with pytest.raises(MethodError, match="or allow it with extrapolate = true"):
        bare.links(0, np.array([960.0]), TEN)
    with pytest.raises(MethodError, match="partial duration"):
        bare.links(0, np.array([60.0]), Frequency(10.0, PARTIAL_DURATION))
    on = DepthChain(source=TWO_POINTS, weights=np.eye(2), areas=np.ones(2), extrapolate=True)
    # 30 mm in 1 h and 60 mm in 4 h double every fourfold duration.
    assert on.links(0, np.array([960.0]), TEN).areal == pytest.approx([120])


def test_curves_have_one_reduction_or_each_its_own() -> None:
    """Of 4 h as a whole 1 h keeps its 30 mm; by its own reduction it has 15 mm, and what was clamped is said."""
    chain = DepthChain(source=TWO_POINTS, weights=np.eye(2), areas=np.array([8e6, 2e6]), reduce=halves)
    curves = chain.curves(0, 240, TEN)
    assert curves.one(np.array([60.0, 240.0])) == pytest.approx([30, 60])
    assert dict(curves.said) == {}
    assert curves.each(np.array([60.0, 240.0])) == pytest.approx([15, 60])
    assert list(curves.said) == ["8e+06 m² clamped."]
    assert list(chain.curves(0, 240, TEN, reduced_as=1).said) == []
    whole = chain.curves(0, 60, TEN)
    assert whole.one(np.array([60.0, 240.0])) == pytest.approx([15, 30])


@given(
    tables(),
    st.floats(0.1, 10),
    st.floats(1e6, 5e8),
    st.floats(0.5, 2),
    st.data(),
)
def test_laws_of_the_chain(source: PointDepths, factor: float, area: float, uplift: float, data: st.DataObject) -> None:
    """The areal depth is the product of its links, grows with the uplift in proportion, and both curves meet in it."""
    weights: Floats = np.array(
        data.draw(st.lists(st.floats(1, 9), min_size=len(source.points), max_size=len(source.points)))
    )
    frequency = data.draw(st.sampled_from(source.frequencies))
    minutes = source.durations[(source.durations >= 30) & (source.durations <= 1440)]
    method = areal_reduction("leclerc-schaake")

    def chain(uplift: float) -> DepthChain:
        return DepthChain(
            source=source,
            weights=weights[None] / weights.sum(),
            areas=np.array([area]),
            interval_factor=lambda minutes: np.full(len(minutes), factor),
            uplift=uplift,
            reduce=method.reduce,
        )

    links = chain(uplift).links(0, minutes, frequency)
    assert links.areal == pytest.approx(links.point * factor * uplift * links.reduction, rel=1e-12)
    assert links.areal == pytest.approx(chain(1.0).links(0, minutes, frequency).areal * uplift, rel=1e-12)
    assert (links.areal <= links.unreduced).all()
    for k, each in enumerate(minutes):
        curves = chain(uplift).curves(0, int(each), frequency)
        assert curves.one(minutes[k : k + 1]) == pytest.approx(links.areal[k : k + 1], rel=1e-12)
        assert curves.each(minutes) == pytest.approx(links.areal, rel=1e-12)
