"""Laws of the donor weights of every registered method."""

from __future__ import annotations

from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillOptions, NormalRatios, Relations, relations_of

methods = pytest.mark.parametrize("method", METHODS)
WITH_NORMALS = [name for name, method in METHODS.items() if method.needs_normals]


class Case(NamedTuple):
    """A network, what its record tells of it, and who reports."""

    network: GaugeNetwork
    relations: Relations
    ratios: NormalRatios | None
    reporting: npt.NDArray[np.bool_]
    month: int


@st.composite
def case(draw: st.DrawFn) -> Case:
    """Draw a network of 1 to 9 gauges, dense enough for full quadrants and sparse enough for empty ones."""
    bare = draw(networks(at_least=1))
    n = len(bare)
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    spread = draw(st.sampled_from([2, 20, 150]))
    normals = rng.integers(200, 200 + spread, (n, draw(st.sampled_from([1, 12])))).astype(float)
    network = replace(bare, normals=normals, elevation=rng.integers(0, 4, n).astype(float) * 100)
    days = rng.gamma(0.5, 8, (60, 1)) * rng.gamma(2, 0.5, (60, n)) ** draw(st.sampled_from([0.5, 3]))
    days[rng.random((60, n)) < 0.25] = np.nan
    months = rng.integers(1, 13, 60)
    ratios = None
    if draw(st.booleans()):
        means = rng.integers(0, 100, (12, n, n)).astype(float)
        means[rng.random((12, n, n)) < 0.1] = np.nan
        ratios = NormalRatios(network.ids, np.full((12, n, n), 10), means)
    reporting = rng.random(n) < draw(st.sampled_from([0.5, 0.9, 1]))
    relations = relations_of(days, network, months, ratios=ratios, at_least=20)
    return Case(network, relations, ratios, reporting, draw(st.integers(1, 12)))


@st.composite
def options(draw: st.DrawFn) -> dict[str, Any]:
    """Options apart from the method."""
    min_donors = draw(st.integers(1, 3))
    return {
        "min_donors": min_donors,
        "nearest": draw(st.sampled_from([None, "all", min_donors, min_donors + 1])),
        "radius": draw(st.sampled_from([None, 8e3, 20e3])),
        "power": draw(st.sampled_from([None, 0.5, 3])),
        "elevation_limit": draw(st.sampled_from([None, None, 100, 200])),
    }


def weights_of(
    method: str, case: Case, given: dict[str, Any], target: int, reporting: npt.NDArray[np.bool_]
) -> npt.NDArray[np.float64]:
    chosen = InfillOptions(**{"method": "inverse-distance-ratios", **given}).with_method(method)
    return chosen.weights(
        case.network, target, reporting, month=case.month, relations=case.relations, ratios=case.ratios
    )


@methods
@given(case=case(), given=options(), data=st.data())
def test_a_gauge_of_weight_zero_may_go_missing(
    method: str, case: Case, given: dict[str, Any], data: st.DataObject
) -> None:
    """Whichever of the gauges without weight fall silent, the weights stay what they are, to the last bit."""
    target = data.draw(st.integers(0, len(case.network) - 1))
    first = weights_of(method, case, given, target, case.reporting)
    keep = np.array(data.draw(st.lists(st.booleans(), min_size=len(first), max_size=len(first))))
    second = weights_of(method, case, given, target, case.reporting & ((first > 0) | keep))
    assert np.array_equal(first, second)


@methods
@given(case=case(), given=options(), data=st.data())
def test_who_donates(method: str, case: Case, given: dict[str, Any], data: st.DataObject) -> None:
    """Weights are finite and not negative, 0 at the target and where nobody reports; none, or as many as asked for."""
    target = data.draw(st.integers(0, len(case.network) - 1))
    weights = weights_of(method, case, given, target, case.reporting)
    assert np.isfinite(weights).all()
    assert (weights >= 0).all()
    assert (weights[~case.reporting] == 0).all()
    assert weights[target] == 0
    donors = int((weights > 0).sum())
    assert donors == 0 or donors >= (given["min_donors"] if "min_donors" in METHODS[method].takes else 1)
    if METHODS[method].sums_to_one:
        assert weights.sum() == pytest.approx(1.0 if donors else 0.0)


@methods
@given(case=case(), given=options(), data=st.data())
def test_many_cases_at_once_are_each_by_itself(
    method: str, case: Case, given: dict[str, Any], data: st.DataObject
) -> None:
    """A table of reporting gauges of any shape gives the weights of its every row."""
    target = data.draw(st.integers(0, len(case.network) - 1))
    n = len(case.network)
    seed = data.draw(st.integers(0, 2**32 - 1))
    many = np.random.default_rng(seed).random((2, 3, n)) < 0.7
    found = weights_of(method, case, given, target, many)
    assert found.shape == many.shape
    for index in np.ndindex(2, 3):
        one = weights_of(method, case, given, target, many[index])
        assert found[index] == pytest.approx(one, rel=1e-12, abs=0)


@methods
@given(case=case(), given=options(), factor=st.sampled_from([0.1, 25.4]), data=st.data())
def test_the_unit_of_depth_does_not_matter(
    method: str, case: Case, given: dict[str, Any], factor: float, data: st.DataObject
) -> None:
    """Normals, and the depths from which relations come, in another unit give the same weights."""
    target = data.draw(st.integers(0, len(case.network) - 1))
    assert case.network.normals is not None
    ratios = None if case.ratios is None else replace(case.ratios, means=case.ratios.means * factor)
    other = case._replace(network=replace(case.network, normals=case.network.normals * factor), ratios=ratios)
    first = weights_of(method, case, given, target, case.reporting)
    assert weights_of(method, other, given, target, case.reporting) == pytest.approx(first, rel=1e-9, abs=0)


@given(seed=st.integers(0, 2**32 - 1), factor=st.sampled_from([0.1, 25.4, 1e-3]))
def test_relations_do_not_depend_on_the_unit(seed: int, factor: float) -> None:
    """All depths in another unit have the same correlations and slopes, one dry gauge and one constant one too."""
    rng = np.random.default_rng(seed)
    depths = rng.gamma(0.5, 8, (50, 1)) * rng.gamma(2, 0.5, (50, 5))
    depths[:, 3], depths[:, 4] = 0.0, 3.3
    depths[rng.random((50, 5)) < 0.2] = np.nan
    network = GaugeNetwork(ids=tuple("ABCDE"), x=np.arange(5, dtype=float) * 1e3, y=np.zeros(5), crs="local")
    first = relations_of(depths, network, at_least=20)
    second = relations_of(depths * factor, network, at_least=20)
    assert np.allclose(first.correlation, second.correlation, rtol=1e-9, equal_nan=True)
    assert np.allclose(first.slope, second.slope, rtol=1e-9, equal_nan=True)


@methods
def test_a_network_of_one_gauge(method: str) -> None:
    """There is nobody to donate, and nothing to fail on."""
    network = GaugeNetwork(ids=("A",), x=np.zeros(1), y=np.zeros(1), crs="local", normals=np.array([[900.0]]))
    relations = relations_of(np.ones((40, 1)), network)
    weights = InfillOptions(method=method).weights(network, 0, np.array([True]), relations=relations)
    assert weights.tolist() == [0.0]


@methods
def test_cases_in_which_nobody_reports(method: str) -> None:
    """A row without a reporting gauge is a row of zeros, whatever the other rows have."""
    rain = np.abs(np.sin(np.arange(40.0)))
    network = GaugeNetwork(
        ids=("A", "B", "C"),
        x=np.array([0.0, 1e3, -1e3]),
        y=np.array([0.0, 1e3, -1e3]),
        crs="local",
        normals=np.full((3, 1), 900.0),
    )
    relations = relations_of(np.column_stack([rain, rain**2, rain + 1]), network)
    reporting = np.array([[False, False, False], [False, True, True], [True, False, False]])
    weights = InfillOptions(method=method).weights(network, 0, reporting, relations=relations)
    assert weights.any(axis=1).tolist() == [False, True, False]


@pytest.mark.parametrize("method", WITH_NORMALS)
@pytest.mark.parametrize("normal", [0.0, np.nan, -3.0, np.inf])
def test_normals_that_cannot_be_used(method: str, normal: float) -> None:
    """Target and donor at fault are two lines of one error, which name gauge, normal and method."""
    rain = np.abs(np.sin(np.arange(40.0)))
    network = GaugeNetwork(
        ids=("A", "B", "C"),
        x=np.array([0.0, 1e3, 2e3]),
        y=np.zeros(3),
        crs="local",
        normals=np.array([[normal], [900.0], [normal]]),
    )
    good = replace(network, normals=np.full((3, 1), 900.0))
    relations = relations_of(np.column_stack([rain, rain**2, rain + 1]), good)
    with pytest.raises(DataError) as caught:
        InfillOptions(method=method).weights(network, 0, np.array([False, True, True]), relations=relations)
    found = "no normal" if np.isnan(normal) else f"a normal of {normal:g} mm"
    assert str(caught.value).splitlines() == [
        f"gauge {gauge}: found {found} for the year; expected a normal above 0 for the {method} method; give it, leave "
        "the gauge out, or choose another infill method"
        for gauge in "AC"
    ]
