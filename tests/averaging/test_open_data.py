"""Real networks and polygons, beside weights that were computed independently of this package.

The references are half-plane clipping for Thiessen and a raster of whole cells for inverse distance (a cell counts when
its centre is inside); rules, sources and licences stand in the README of every folder. Gauges' x, y and the polygon are
used as they are, in their own plane: nothing is projected.
"""

from __future__ import annotations

import numpy as np
import pytest
from reference_sets import Reference, every_set

from basinrain.averaging import arithmetic_weights, idw_weights, thiessen_weights


@every_set
def test_thiessen_weights(name: str) -> None:
    """Every gauge's weight is the exact reference's to 1e-6."""
    data = Reference(name)
    weights = thiessen_weights(data.network, data.basins).weights[0]
    np.testing.assert_allclose(weights, data.weights("w_thiessen_exact"), rtol=0, atol=1e-6)


@every_set
def test_arithmetic_weights(name: str) -> None:
    """The same gauges are inside, each with the same weight (the reference is printed to eight decimals)."""
    data = Reference(name)
    weights = arithmetic_weights(data.network, data.basins).weights[0]
    np.testing.assert_allclose(weights, data.weights("w_arithmetic"), rtol=0, atol=5e-9)


@every_set
@pytest.mark.parametrize("power", [1, 2])
def test_idw_weights(name: str, power: int) -> None:
    """On the cell chosen by halving, weights are the raster's to 2e-3 (co_platte, with 136 gauges, to 5e-4)."""
    data = Reference(name)
    weights = idw_weights(data.network, data.basins, power=float(power)).weights[0]
    tolerance = 5e-4 if name == "co_platte" else 2e-3
    np.testing.assert_allclose(weights, data.weights(f"w_idw{power}_grid"), rtol=0, atol=tolerance)


@pytest.mark.parametrize(("name", "cell"), [("oahu", 500.0), ("nyc_hourly", 250.0)])
@pytest.mark.parametrize("power", [1, 2])
def test_idw_weights_on_cells_of_the_reference_s_size(name: str, cell: float, power: int) -> None:
    """On cells as small as the raster's, only the boundary cells are counted differently: 5e-4."""
    data = Reference(name)
    weights = idw_weights(data.network, data.basins, power=float(power), cell=cell).weights[0]
    np.testing.assert_allclose(weights, data.weights(f"w_idw{power}_grid"), rtol=0, atol=5e-4)
