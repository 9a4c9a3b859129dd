"""Estimates of every gauge from the others, against asking for one step and gauge at a time."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from leave_one_out_data import every_candidate, plain_estimates, small_depths, small_network

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Candidate, Estimator, estimator
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import relations_of

candidates = pytest.mark.parametrize("candidate", every_candidate(), ids=lambda candidate: candidate.label)


def learned(candidate: Candidate, network: GaugeNetwork, depth: estimator.Floats) -> dict[str, Any]:
    return {"relations": relations_of(depth, network)} if candidate.options.chosen_method.needs_relations else {}


@candidates
@pytest.mark.parametrize("missing", [0.06, 0.3, 0.7])
@pytest.mark.parametrize("few", [0, 64])
def test_every_method_is_the_plain_double_loop(
    candidate: Candidate, missing: float, few: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """To 1e-12, whether sets of silent gauges are taken apart or asked for one by one, and NaN in the same places."""
    monkeypatch.setattr(estimator, "_FEW_SETS", few)
    network, depth = small_network(), small_depths(130, missing=missing)
    further = learned(candidate, network, small_depths(400, seed=9, missing=0.0))
    expected = plain_estimates(network, depth, candidate.options, **further)
    assert np.isfinite(expected).any()
    found = Estimator(network, candidate.options, **further).estimates(depth)
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-12)


@candidates
def test_monthly_normals_are_those_of_each_step(candidate: Candidate) -> None:
    """Steps of all months mixed; 0 is a step without times, which takes the year's."""
    network, depth = small_network(monthly=True), small_depths(90)
    months = np.random.default_rng(5).integers(0, 13, 90)
    further = learned(candidate, network, small_depths(400, seed=9, missing=0.0))
    expected = plain_estimates(network, depth, candidate.options, months, **further)
    found = Estimator(network, candidate.options, **further).estimates(depth, months)
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("method", ["station-average", "inverse-distance", "normal-ratio"])
def test_all_of_a_large_network_donate(method: str) -> None:
    """39 donors are too many to be taken apart."""
    network, depth = small_network(40), small_depths(80, 40)
    options = InfillOptions(method=method, nearest="all", min_donors=1)
    expected = plain_estimates(network, depth, options)
    np.testing.assert_allclose(Estimator(network, options).estimates(depth), expected, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize(("block", "piece"), [(1, 1), (50, 20), (301, 97)])
@pytest.mark.parametrize("missing", [0.05, 0.5])
def test_pieces_do_not_matter(block: int, piece: int, missing: float, monkeypatch: pytest.MonkeyPatch) -> None:
    """Cut anywhere, runs of equal rows included, the estimates are the same."""
    network, depth = small_network(), np.repeat(small_depths(60, missing=missing), 3, axis=0)
    expected = Estimator(network, InfillOptions()).estimates(depth)
    monkeypatch.setattr(estimator, "_BLOCK", block)
    monkeypatch.setattr(estimator, "_PIECE", piece)
    monkeypatch.setattr(estimator, "_FEW_SETS", 0)
    np.testing.assert_allclose(Estimator(network, InfillOptions()).estimates(depth), expected, rtol=1e-12, atol=1e-12)


def test_column_order_in_memory_does_not_matter() -> None:
    """An array stored gauge by gauge gives the same, also where a gauge is alone."""
    network, depth = small_network(3), small_depths(100, 3, missing=0.5)
    options = InfillOptions(min_donors=1)
    rowwise = Estimator(network, options).estimates(depth)
    assert (np.isnan(rowwise) & ~np.isnan(depth)).any()
    assert np.array_equal(Estimator(network, options).estimates(np.asfortranarray(depth)), rowwise, equal_nan=True)


def test_the_record_is_not_changed() -> None:
    """Depths may be read-only."""
    depth = small_depths(100)
    kept = depth.copy()
    depth.setflags(write=False)
    Estimator(small_network(), InfillOptions()).estimates(depth)
    assert np.array_equal(depth, kept, equal_nan=True)


def test_nothing_to_estimate() -> None:
    """No step, one gauge, and a step at which one gauge reports."""
    network = small_network(3)
    assert Estimator(network, InfillOptions()).estimates(np.empty((0, 3))).shape == (0, 3)
    alone = np.array([[4.0, np.nan, np.nan]])
    assert np.isnan(Estimator(network, InfillOptions(min_donors=1)).estimates(alone)).all()
    assert np.isnan(Estimator(small_network(1), InfillOptions()).estimates(np.ones((5, 1)))).all()


def test_what_is_not_known_of_a_gauge_that_never_reports_does_not_matter() -> None:
    """A normal is asked of gauges that take part; of those, one without it is named."""
    network = small_network(4)
    normals = np.array(network.normals)
    normals[2] = np.nan
    network = GaugeNetwork(ids=network.ids, x=network.x, y=network.y, crs="local", normals=normals)
    depth = small_depths(100, 4, missing=0.1)
    options = InfillOptions(method="normal-ratio", min_donors=1)
    with pytest.raises(DataError, match=f"gauge {network.ids[2]}: found no normal for the year"):
        Estimator(network, options).estimates(depth)
    depth[:, 2] = np.nan
    reporting = np.array([True, True, False, True])
    assert np.isfinite(Estimator(network, options, reporting=reporting).estimates(depth)).any()


@pytest.mark.parametrize(
    "candidate",
    every_candidate(radius=14e3, elevation_limit=500.0, min_donors=1, nearest=2),
    ids=lambda candidate: candidate.label,
)
def test_limits_on_donors(candidate: Candidate) -> None:
    """Radius, elevation limit and two donors: some gauges have none at all, and the loop agrees."""
    network, depth = small_network(9), small_depths(120, 9)
    further = learned(candidate, network, small_depths(400, 9, seed=9, missing=0.0))
    expected = plain_estimates(network, depth, candidate.options, **further)
    assert (np.isnan(expected) & ~np.isnan(depth)).any()
    assert np.isfinite(expected).any()
    found = Estimator(network, candidate.options, **further).estimates(depth)
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("method", ["normal-ratio", "ten-percent-rule", "inverse-distance-ratios"])
def test_normals_from_the_record(method: str) -> None:
    """Pairs without common years do not donate to each other, month by month."""
    network, depth = small_network(6), small_depths(150, 6)
    rng = np.random.default_rng(7)
    means = rng.uniform(20, 90, (12, 6, 6))
    means[rng.random((12, 6, 6)) < 0.2] = np.nan
    ratios = NormalRatios(network.ids, np.full((12, 6, 6), 30), means)
    months = rng.integers(1, 13, 150)
    options = InfillOptions(method=method, min_donors=1)
    expected = plain_estimates(network, depth, options, months, ratios=ratios)
    found = Estimator(network, options, ratios=ratios).estimates(depth, months)
    np.testing.assert_allclose(found, expected, rtol=1e-12, atol=1e-12)
