"""Real records whose gauges come and go, beside basin means that were computed independently of this package.

The reference rebuilds its weights from the gauges that report at every step; its Thiessen and inverse-distance weights
are those of a raster of whole cells.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from reference_sets import Reference, every_set

from basinrain.averaging import METHODS, choose_grid
from basinrain.averaging.reporting import ReportingRuns


def options_of(method: str, data: Reference) -> dict[str, Any]:
    """Return the options that make a method's rules the reference's."""
    return {"cell": data.cell} if method == "idw" else {}


@every_set
@pytest.mark.parametrize(
    ("method", "column", "tolerance"),
    [("arithmetic", "arithmetic_inside", 1e-3), ("thiessen", "thiessen_grid", 0.1), ("idw", "idw2_grid", 0.1)],
)
def test_every_step_is_the_reference_s(name: str, method: str, column: str, tolerance: float) -> None:
    """All steps are the reference's to the tolerance in mm, none left out; its figures have three or four decimals."""
    data = Reference(name)
    depth = data.depth
    reweigh = METHODS[method].reweigher(data.network, data.basins, options_of(method, data))
    means = reweigh(depth, ReportingRuns.of(~np.isnan(depth)))[:, 0]
    expected = data.series(column)
    assert len(means) == len(expected)
    np.testing.assert_allclose(means, expected, rtol=0, atol=tolerance)


@every_set
@pytest.mark.parametrize("method", sorted(METHODS))
def test_every_step_is_that_of_its_own_weights(name: str, method: str) -> None:
    """Means are those of weights made anew at every step: 1e-9 of themselves, by inverse distance 1e-5."""
    data = Reference(name)
    depth = data.depth
    reporting = ~np.isnan(depth)
    options = options_of(method, data)
    if method == "idw":
        options = {"grid": choose_grid(data.network, data.basins, **options)}
    weigh = METHODS[method](data.network, data.basins, options)
    means = METHODS[method].reweigher(data.network, data.basins, options)(depth, ReportingRuns.of(reporting))
    weights = weigh(reporting[0]).weights
    for t, present in enumerate(reporting):
        if t and (present != reporting[t - 1]).any():
            weights = weigh(present).weights
        expected = weights @ np.where(present, depth[t], 0.0)
        np.testing.assert_allclose(means[t], expected, rtol=1e-5 if method == "idw" else 1e-9, atol=1e-12)


def test_thiessen_of_the_july_day_on_oahu() -> None:
    """On 25 July 2016 it is 214.9 mm with the gauges that report, 74.6 % of it by the one with most weight."""
    data = Reference("oahu")
    depth = data.depth
    day = (np.datetime64("2016-07-25") - np.datetime64("2010-01-01")).astype(int)
    means = METHODS["thiessen"].reweigher(data.network, data.basins)(depth, ReportingRuns.of(~np.isnan(depth)))
    assert means[day, 0] == pytest.approx(214.9, abs=0.05)
    weights = METHODS["thiessen"](data.network, data.basins)(~np.isnan(depth[day])).weights[0]
    assert weights.max() == pytest.approx(0.746, abs=5e-4)
