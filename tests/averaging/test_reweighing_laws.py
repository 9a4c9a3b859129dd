"""The laws of averaging while gauges come and go, for every method in the registry."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import basins_of, gauges_at
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from strategies import Case, broken_records, cases

from basinrain.averaging import METHODS
from basinrain.averaging.registry import Reweigher
from basinrain.averaging.reporting import ReportingRuns
from basinrain.gauges import GaugeNetwork

Floats = npt.NDArray[np.float64]

OPTIONS: dict[str, dict[str, Any]] = {"idw": {"cell": 731.0}}
"""A given cell keeps every example quick."""

CLOSE: dict[str, float] = {"idw": 1e-5}
"""How close, relatively, means are to those of weights made step by step; 1e-9 for every other method."""

ALL = sorted(METHODS)
laws = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])


class Broken(NamedTuple):
    """A case, and a record of its network."""

    case: Case
    depth: Floats


@st.composite
def broken(draw: st.DrawFn) -> Broken:
    case = draw(cases())
    return Broken(case, draw(broken_records(len(case.network))))


def reweigher(name: str, case: Case) -> Reweigher:
    return METHODS[name].reweigher(case.network, case.basins, OPTIONS.get(name))


def means(name: str, case: Case, depth: Floats) -> Floats:
    return reweigher(name, case)(depth, ReportingRuns.of(~np.isnan(depth)))


def equal(name: str, found: Floats, expected: Floats) -> None:
    np.testing.assert_allclose(found, expected, rtol=CLOSE.get(name, 1e-9), atol=1e-12)


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken())
def test_every_step_is_that_of_its_own_weights(name: str, given_record: Broken) -> None:
    """Means are those of the method's weights for the gauges that report, made and applied step by step."""
    case, depth = given_record
    weigh = METHODS[name](case.network, case.basins, OPTIONS.get(name))
    found = means(name, case, depth)
    assert found.shape == (len(depth), len(case.basins))
    for row, mean in zip(depth, found, strict=True):
        weights = weigh(~np.isnan(row)).weights
        equal(name, mean, weights @ np.nan_to_num(row))
        if np.isnan(row).all():
            assert np.isnan(mean).all()


@pytest.mark.parametrize("name", [name for name in ALL if METHODS[name].sums_to_one])
@laws
@given(given_record=broken())
def test_constant_rain_returns_the_constant(name: str, given_record: Broken) -> None:
    """12.7 mm at whichever gauges report is 12.7 mm on average, to 1e-12 by every method."""
    case, depth = given_record
    found = means(name, case, np.where(np.isnan(depth), np.nan, 12.7))
    known = ~np.isnan(found)
    np.testing.assert_allclose(found[known], 12.7, rtol=1e-12)
    if name != "arithmetic":
        np.testing.assert_array_equal(known.all(axis=1), (~np.isnan(depth)).any(axis=1))


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken(), factor=st.sampled_from([0.5, 4.0, 1024.0]))
def test_more_rain_in_proportion(name: str, given_record: Broken, factor: float) -> None:
    """All depths times a factor give all means times that factor."""
    case, depth = given_record
    np.testing.assert_allclose(means(name, case, depth * factor), means(name, case, depth) * factor, rtol=1e-12)


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken(), data=st.data())
def test_order_of_gauges_does_not_matter(name: str, given_record: Broken, data: st.DataObject) -> None:
    """Gauges listed in another order give the same means."""
    case, depth = given_record
    order = np.array(data.draw(st.permutations(range(len(case.network)))))
    network = case.network
    shuffled = GaugeNetwork(
        ids=tuple(network.ids[k] for k in order), x=network.x[order], y=network.y[order], crs="local"
    )
    equal(name, means(name, case._replace(network=shuffled), depth[:, order]), means(name, case, depth))


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken(), data=st.data())
def test_chunks_do_not_matter(name: str, given_record: Broken, data: st.DataObject) -> None:
    """The record cut in two anywhere gives the same means as in one piece."""
    case, depth = given_record
    cut = data.draw(st.integers(0, len(depth)))
    reweigh = reweigher(name, case)
    parts = [reweigh(part, ReportingRuns.of(~np.isnan(part))) for part in (depth[:cut], depth[cut:])]
    equal(name, np.concatenate(parts), means(name, case, depth))


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken(), data=st.data())
def test_what_was_asked_before_does_not_matter(name: str, given_record: Broken, data: st.DataObject) -> None:
    """A reweigher that has averaged another record gives the very same bytes as a new one."""
    case, depth = given_record
    other = data.draw(broken_records(len(case.network)))
    used = reweigher(name, case)
    used(other, ReportingRuns.of(~np.isnan(other)))
    used(depth[::-1], ReportingRuns.of(~np.isnan(depth[::-1])))
    runs = ReportingRuns.of(~np.isnan(depth))
    assert used(depth, runs).tobytes() == reweigher(name, case)(depth, runs).tobytes()


@pytest.mark.parametrize("name", ALL)
@laws
@given(given_record=broken())
def test_what_stands_at_a_gauge_that_does_not_report_does_not_count(name: str, given_record: Broken) -> None:
    """A number in place of a missing depth changes no byte, and neither is the record changed."""
    case, depth = given_record
    runs = ReportingRuns.of(~np.isnan(depth))
    numbers = np.where(np.isnan(depth), 777.0, depth)
    before = numbers.copy()
    reweigh = reweigher(name, case)
    assert reweigh(numbers, runs).tobytes() == reweigh(depth, runs).tobytes()
    np.testing.assert_array_equal(numbers, before)


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("arithmetic", [[20.0, 45.0], [20.0, 60.0], [20.0, np.nan], [np.nan, 60.0], [np.nan, np.nan]]),
        ("thiessen", [[20.0, 45.0], [20.0, 50.0], [20.0, 20.0], [60.0, 60.0], [np.nan, np.nan]]),
    ],
)
def test_three_gauges_in_a_row_by_hand(name: str, expected: list[list[float]]) -> None:
    """A in the west; B and C in the east with half of it each: (30 + 60) / 2 = 45.

    Without B the border of A and C lies at 15: a quarter of the east is A's, 20 / 4 + 60 x 3/4 = 50. A gauge alone has
    both basins; by the arithmetic mean a basin without a gauge of its own has no number.
    """
    network = gauges_at((5, 5), (15, 5), (25, 5))
    basins = basins_of(west=shapely.box(0, 0, 10, 10), east=shapely.box(10, 0, 30, 10))
    nan = np.nan
    depth = np.array([[20.0, 30.0, 60.0], [20.0, nan, 60.0], [20.0, nan, nan], [nan, nan, 60.0], [nan, nan, nan]])
    found = METHODS[name].reweigher(network, basins)(depth, ReportingRuns.of(~np.isnan(depth)))
    np.testing.assert_allclose(found, expected, rtol=1e-12)
