"""The laws of the averaging methods, for every method in the registry, each by the flags it promises them with."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
import shapely
from drawn import basins_of, gauges_at
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st
from strategies import Case, cases, divided_basins

from basinrain.averaging import METHODS, AveragingMethod, arithmetic_weights
from basinrain.basins import UNION, Basins
from basinrain.gauges import GaugeNetwork
from basinrain.weights import WeightTable

# A given cell keeps every example quick; what choosing it does is tested beside the grid.
OPTIONS: dict[str, dict[str, Any]] = {"idw": {"cell": 731.0}}

ALL = sorted(METHODS)
laws = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])


def weigh(method: AveragingMethod, case: Case, *, scale: float = 1.0) -> WeightTable:
    """Return the weights of the present gauges; options that are lengths are scaled."""
    given_options = OPTIONS.get(method.name, {})
    options = {k: v * scale if k in method.lengths else v for k, v in given_options.items()}
    return method(case.network, case.basins, options)(case.present)


def moved(case: Case, east: float, north: float, scale: float = 1.0) -> Case:
    """Return the case with everything shifted, then drawn ``scale`` times as large."""
    network, basins = case.network, case.basins
    own = len(basins) - (UNION in basins.ids)
    polygons = shapely.transform(basins.polygons[:own], lambda xy: (xy + np.array([east, north])) * scale)
    return case._replace(
        network=replace(network, x=(network.x + east) * scale, y=(network.y + north) * scale),
        # The union is drawn anew: its corners are crossings, which a move rounds.
        basins=Basins(ids=basins.ids[:own], polygons=polygons, crs="local").with_union(),
    )


@pytest.mark.parametrize("name", ALL)
@laws
@given(case=cases(), data=st.data())
def test_order_of_gauges_does_not_matter(name: str, case: Case, data: st.DataObject) -> None:
    """Gauges listed in another order have the same weights."""
    order = np.array(data.draw(st.permutations(range(len(case.network)))))
    network = case.network
    shuffled = case._replace(
        network=GaugeNetwork(
            ids=tuple(network.ids[k] for k in order), x=network.x[order], y=network.y[order], crs="local"
        ),
        present=case.present[order],
    )
    np.testing.assert_allclose(
        weigh(METHODS[name], shuffled).weights, weigh(METHODS[name], case).weights[:, order], atol=1e-12
    )


@pytest.mark.parametrize("name", ALL)
@laws
@given(case=cases(), east=st.integers(-20, 20), north=st.integers(-20, 20))
def test_moving_the_plane_does_not_matter(name: str, case: Case, east: int, north: int) -> None:
    """A false easting and northing of up to 20,000 km changes no weight."""
    there = moved(case, east * 1e6, north * 1e6)
    np.testing.assert_allclose(weigh(METHODS[name], there).weights, weigh(METHODS[name], case).weights, atol=1e-8)


@pytest.mark.parametrize("name", ALL)
@laws
@given(case=cases(), scale=st.sampled_from([0.125, 0.3048, 3.0, 1000.0]))
def test_scale_does_not_matter(name: str, case: Case, scale: float) -> None:
    """Drawn larger or smaller, with the options that are lengths scaled too, the weights stay."""
    np.testing.assert_allclose(
        weigh(METHODS[name], moved(case, 0.0, 0.0, scale), scale=scale).weights,
        weigh(METHODS[name], case).weights,
        atol=1e-9,
    )


@pytest.mark.parametrize("name", [name for name in ALL if METHODS[name].sums_to_one])
@laws
@given(case=cases())
def test_rows_sum_to_one_and_constant_rain_returns_the_constant(name: str, case: Case) -> None:
    """Weights of a basin sum to 1, absent gauges have none, and 12.7 mm everywhere is 12.7 mm on average."""
    table = weigh(METHODS[name], case)
    rows = table.weights[table.answered]
    assert name == "arithmetic" or table.answered.all()
    np.testing.assert_allclose(rows.sum(axis=1), 1.0, rtol=1e-12)
    assert (rows[:, ~case.present] == 0).all()
    means = table.apply(np.full(len(case.network), 12.7))
    np.testing.assert_allclose(means[table.answered], 12.7, rtol=1e-12)


@pytest.mark.parametrize("name", [name for name in ALL if METHODS[name].non_negative and METHODS[name].sums_to_one])
@laws
@given(case=cases())
def test_the_mean_lies_between_least_and_greatest_depth(name: str, case: Case) -> None:
    """No weight is negative, so no mean lies outside the range of the present gauges' depths."""
    table = weigh(METHODS[name], case)
    assert not (table.weights < 0).any()
    means = table.apply(np.where(case.present, case.depths, np.nan))[table.answered]
    depths = case.depths[case.present]
    assert (means >= depths.min() - 1e-9).all()
    assert (means <= depths.max() + 1e-9).all()


@pytest.mark.parametrize("name", [name for name in ALL if METHODS[name].partition])
@laws
@given(case=cases(divided_basins()))
def test_adjoining_basins_add_up_to_their_union(name: str, case: Case) -> None:
    """Depth times area, summed over basins that adjoin, is the union's depth times its area, for every gauge apart."""
    assume(len(case.basins) > 1)
    whole = case._replace(basins=case.basins.with_union())
    weights = weigh(METHODS[name], whole).weights
    areas = whole.basins.areas
    np.testing.assert_allclose(areas[:-1] @ weights[:-1], areas[-1] * weights[-1], atol=1e-9 * areas[-1])


@pytest.mark.parametrize("name", [name for name in ALL if METHODS[name].partition])
@laws
@given(case=cases(divided_basins()))
def test_the_union_has_the_weights_of_its_own_polygon(name: str, case: Case) -> None:
    """The union's row, summed up from the basins, is what the union's polygon gives when weighed by itself."""
    union = basins_of(whole=case.basins.union)
    alone = weigh(METHODS[name], case._replace(basins=union)).weights[0]
    among = weigh(METHODS[name], case._replace(basins=case.basins.with_union())).weights[-1]
    np.testing.assert_allclose(among, alone, atol=1e-9)


@pytest.mark.parametrize("name", ALL)
@laws
@given(case=cases(at_least=2))
def test_a_mask_is_the_network_of_the_present_gauges(name: str, case: Case) -> None:
    """Weights of the present gauges are those of a network that has no others."""
    network = case.network.subset(case.present)
    alone = weigh(METHODS[name], case._replace(network=network, present=np.ones(len(network), dtype=bool)))
    masked = weigh(METHODS[name], case)
    np.testing.assert_allclose(masked.weights[:, case.present], alone.weights, atol=1e-12)
    np.testing.assert_allclose(masked.covered, alone.covered, atol=1e-12)


@pytest.mark.parametrize("name", ALL)
@laws
@given(case=cases())
def test_contributions_sum_to_the_mean(name: str, case: Case) -> None:
    """What the gauges put into a basin's mean sums to that mean."""
    table = weigh(METHODS[name], case)
    np.testing.assert_allclose(
        table.contributions(case.depths).sum(axis=1), table.apply(case.depths), rtol=1e-12, equal_nan=True
    )


@pytest.mark.parametrize("name", ALL)
def test_no_gauge_present_is_no_number(name: str) -> None:
    """With no gauge present, every basin is without a number and wholly uncovered, and nothing is raised."""
    network, basins = gauges_at((1000, 1000), (2000, 1000)), basins_of(all=shapely.box(0, 0, 4000, 4000))
    table = METHODS[name](network, basins, OPTIONS.get(name))(np.array([False, False]))
    assert np.isnan(table.weights).all()
    assert table.covered.tolist() == [0.0]
    assert np.isnan(table.apply(np.array([5.0, 7.0]))).all()


def test_the_arithmetic_mean_does_not_add_up() -> None:
    """Two gauges in one half of a square and one in the other: (15 x 50 + 40 x 50) / 100 = 27.5, but (10+20+40) / 3."""
    network = gauges_at((1, 5), (4, 5), (8, 5))
    basins = basins_of(west=shapely.box(0, 0, 5, 10), east=shapely.box(5, 0, 10, 10)).with_union()
    means = arithmetic_weights(network, basins).apply(np.array([10.0, 20.0, 40.0]))
    assert means[:2].tolist() == [15.0, 40.0]
    assert means[:2] @ basins.areas[:2] / 100.0 == pytest.approx(27.5)
    assert means[2] == pytest.approx(70 / 3)
