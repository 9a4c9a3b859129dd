"""The registry of averaging methods."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from drawn import basins_of, gauges_at

from basinrain.averaging import METHODS, arithmetic_weights, averaging_method, idw_weights, thiessen_weights
from basinrain.errors import JobError


def test_names_are_those_of_the_methods() -> None:
    """Every method stands under its own name, in the order of the reports, and makes tables of that name."""
    network, basins = gauges_at((1, 1), (3, 1)), basins_of(square=shapely.box(0, 0, 4, 4))
    assert list(METHODS) == ["arithmetic", "thiessen", "idw"]
    for name, method in METHODS.items():
        assert method.name == name
        assert method(network, basins)(np.array([True, True])).method == name


def test_the_functions_are_the_registry_s_methods() -> None:
    """The functions of the Python interface give what the registry gives, options included."""
    network, basins = gauges_at((1, 1), (3, 1), (9, 9)), basins_of(square=shapely.box(0, 0, 4, 4))
    mask = np.array([True, False, True])
    for name, table, options in (
        ("arithmetic", arithmetic_weights(network, basins, mask, gauges="all"), {"gauges": "all"}),
        ("thiessen", thiessen_weights(network, basins, mask), {}),
        ("idw", idw_weights(network, basins, mask, power=3.0, cell=1.0), {"power": 3.0, "cell": 1.0}),
    ):
        np.testing.assert_array_equal(averaging_method(name)(network, basins, options)(mask).weights, table.weights)


def test_an_unknown_name_is_refused_with_the_nearest() -> None:
    """A misspelt method is an error that names the one meant, and all there are."""
    with pytest.raises(
        JobError, match="found 'tiessen'; expected one of: arithmetic, thiessen, idw; did you mean 'thiessen'"
    ):
        averaging_method("tiessen")
