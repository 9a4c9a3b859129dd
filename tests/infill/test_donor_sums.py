"""Sums over donors: the three ways to them, and the form of weights that the second rests on."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from drawn import gauges_at
from gappy import options_of
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks

from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillOptions, relations_of
from basinrain.infill.donor_sums import DonorSums

NAN = float("nan")


def test_all_that_report_by_hand() -> None:
    """B between A at 1 and C at 2 km: (4 x 6 + 12)/5 = 7.2; with D at 3 km, 9 mm, the squares are as 36 : 9 : 4."""
    network = gauges_at((0, 0), (1, 0), (3, 0), (4, 0), unit=1e3)
    values = np.array([[6.0, NAN, 12.0, NAN], [6.0, NAN, 12.0, 9.0], [NAN, NAN, NAN, 9.0]])
    out, wanted = values.copy(), np.zeros(values.shape, dtype=bool)
    wanted[:, 1] = True
    DonorSums(network, InfillOptions(nearest="all")).put(values, ~np.isnan(values), wanted, np.array([5, 5, 5]), out)
    assert out[:, 1] == pytest.approx([7.2, (36 * 6 + 9 * 12 + 4 * 9) / 49, NAN], nan_ok=True)
    assert np.array_equal(out[:, [0, 2, 3]], values[:, [0, 2, 3]], equal_nan=True)


def test_nothing_wanted() -> None:
    """Nothing is written, and nothing asked for: a method without its normals is not refused."""
    network = gauges_at((0, 0), (1, 0))
    out = np.array([[1.0, NAN]])
    none = np.zeros((1, 2), dtype=bool)
    DonorSums(network, InfillOptions(method="normal-ratio")).put(out, ~none, none, np.array([5]), out)
    assert np.array_equal(out, [[1.0, NAN]], equal_nan=True)


@pytest.mark.parametrize("method", [name for name, method in METHODS.items() if method.share_factors is not None])
@given(network=networks(at_least=2), data=st.data())
def test_shares_keep_their_proportions_whoever_reports(method: str, network: GaugeNetwork, data: st.DataObject) -> None:
    """With all that report as donors the weights of any two are to each other as with everyone there."""
    rng = np.random.default_rng(data.draw(st.integers(0, 2**32 - 1)))
    n = len(network)
    network = GaugeNetwork(
        ids=network.ids, x=network.x, y=network.y, crs="local", normals=rng.uniform(20, 200, (n, 12))
    )
    days = rng.gamma(0.5, 8, (40, 1)) * rng.gamma(2, 0.5, (40, n))
    options = options_of(method, {"nearest": "all", "min_donors": 1, "power": 1.5})
    further: dict[str, Any] = {"month": 7, "relations": relations_of(days, network, np.full(40, 7))}
    reporting = rng.random(n) < 0.6
    reporting[0] = False
    everyone = np.arange(n) > 0
    few, full = (options.weights(network, 0, there, **further) for there in (reporting, everyone))
    assert np.array_equal(few > 0, (full > 0) & reporting)
    donors = np.flatnonzero(few > 0)
    if not len(donors):
        return
    # What the weights are of is one number over the factors' share of each.
    factor = few[donors] / full[donors]
    np.testing.assert_allclose(factor, factor[0], rtol=1e-9)


def weights_seen(network: GaugeNetwork, options: InfillOptions, months: npt.NDArray[np.int64]) -> int:
    """Return how many months' donors are kept after estimates in these months."""
    sums = DonorSums(network, options)
    values = np.ones((len(months), len(network)))
    wanted = np.zeros(values.shape, dtype=bool)
    wanted[:, 0] = True
    sums.put(values, ~wanted, wanted, months, values)
    return len(sums._substitutes._kept)


def test_months_are_told_apart_only_where_they_matter() -> None:
    """Monthly normals have their own donors in each month; one normal a year, or none, have not."""
    months = np.array([1, 1, 2, 3, 1])
    place: dict[str, Any] = {"ids": ("A", "B", "C"), "x": [0.0, 1e3, 3e3], "y": [0.0, 0.0, 0.0], "crs": "local"}
    monthly = GaugeNetwork(**place, normals=np.full((3, 12), 50.0))
    annual = GaugeNetwork(**place, normals=np.full((3, 1), 600.0))
    assert weights_seen(monthly, InfillOptions(method="normal-ratio"), months) == 3
    assert weights_seen(annual, InfillOptions(method="normal-ratio"), months) == 1
    assert weights_seen(monthly, InfillOptions(), months) == 1
