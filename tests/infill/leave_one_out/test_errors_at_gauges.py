"""Leave-one-out errors of one method, against references computed independently (tests/data, reference.json)."""

from __future__ import annotations

import tracemalloc

import numpy as np
import pytest
from leave_one_out_data import open_data, small_depths, small_network

from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Estimator, estimator, leave_one_out_errors

METHODS = {
    "mean": InfillOptions(method="station-average", nearest="all", min_donors=1),
    "idw1": InfillOptions(method="inverse-distance", power=1, nearest="all", min_donors=1),
    "idw2": InfillOptions(method="inverse-distance", power=2, nearest="all", min_donors=1),
    "nratio": InfillOptions(method="normal-ratio", nearest="all", min_donors=1),
}


@pytest.mark.parametrize("name", ["oahu", "nyc_hourly", pytest.param("co_platte", marks=pytest.mark.open_data)])
@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize(("donors", "nearest"), [("all", "all"), ("5nn", 5)])
def test_open_data(name: str, method: str, donors: str, nearest: int) -> None:
    """Number, RMSE, MAE and bias to 1e-6 under the references' rules.

    Planar distances, one donor enough, every value with a donor, dry ones too, pooled; normals are means of the gauges'
    own records; equal distances go by id.
    """
    data = open_data(name)
    given = METHODS[method]
    options = InfillOptions(method=given.method, power=given.power, nearest=nearest, min_donors=1)
    errors = leave_one_out_errors(data.depth, data.network, options)
    expected = data.reference[f"{method}_{donors}"]
    assert errors.n.sum() == expected["n"]
    assert errors.rmse == pytest.approx(expected["RMSE"], abs=1e-6)
    assert errors.mae == pytest.approx(expected["MAE"], abs=1e-6)
    assert errors.bias == pytest.approx(expected["bias"], abs=1e-6)


def test_sums_are_those_of_the_estimates() -> None:
    """By gauge, from the whole table of estimates."""
    network, depth = small_network(), small_depths(300)
    errors = leave_one_out_errors(depth, network, InfillOptions())
    error = Estimator(network, InfillOptions()).estimates(depth) - depth
    assert np.array_equal(errors.n, np.isfinite(error).sum(axis=0))
    np.testing.assert_allclose(errors.total, np.nansum(error, axis=0), atol=1e-9)
    np.testing.assert_allclose(errors.absolute, np.nansum(np.abs(error), axis=0), rtol=1e-12)
    np.testing.assert_allclose(errors.squared, np.nansum(error**2, axis=0), rtol=1e-12)


def test_no_estimate() -> None:
    """Without two gauges at any step the figures are NaN, and the count 0."""
    errors = leave_one_out_errors(np.array([[1.0, np.nan], [np.nan, 2.0]]), small_network(2), InfillOptions())
    assert errors.n.sum() == 0
    assert np.isnan([errors.rmse, errors.mae, errors.bias]).all()


def test_memory_does_not_grow_with_the_record(monkeypatch: pytest.MonkeyPatch) -> None:
    """Eight times the steps need hardly more memory than the steps themselves."""
    monkeypatch.setattr(estimator, "_BLOCK", 1 << 15)
    monkeypatch.setattr(estimator, "_PIECE", 1 << 13)
    network = small_network(20)
    depth = small_depths(64_000, 20, missing=0.05)

    def peak(steps: int) -> int:
        tracemalloc.start()
        leave_one_out_errors(depth[:steps], network, InfillOptions())
        most = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return most

    peak(2000)
    assert peak(64_000) < 1.5 * peak(8000)
