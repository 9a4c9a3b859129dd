"""Averaging methods prepared for storms and for long records: both ways give the same."""

from __future__ import annotations

from functools import partial

import numpy as np
import numpy.typing as npt
import pytest
from drawn import gauges_at
from strips import BASINS, NAN, NETWORK, hourly

from basinrain import averager
from basinrain.averager import Averager
from basinrain.averaging import averaging_method
from basinrain.averaging.registry import Reweigher
from basinrain.basin_depths import average_storm
from basinrain.errors import MethodError, Problem
from basinrain.infill import InfillOptions, complete
from basinrain.weights import WeightTable


def thirds(present: npt.NDArray[np.bool_]) -> WeightTable:
    """Give the gauges that are there equal weights, and refuse a lone one."""
    if present.sum() < 2:
        raise MethodError(Problem(item="thirds", found="one gauge", expected="two"))
    return WeightTable("thirds", ("all",), NETWORK.ids, np.where(present, 1 / present.sum(), 0.0)[None, :])


def test_a_set_that_is_refused_says_why() -> None:
    """Its weights are the error, its steps are NaN; the others have their numbers."""
    sets = np.array([[True, True, False], [True, False, False]])
    first, second = Averager(thirds).weights(sets)
    assert np.asarray(first).tolist() == [[0.5, 0.5, 0.0]]
    assert str(second) == "thirds: found one gauge; expected two"
    depth = np.array([[2.0, 4.0, 9.0], [2.0, 4.0, 9.0]])
    assert Averager(thirds).means(depth, sets, 1).ravel() == pytest.approx([3, NAN], nan_ok=True)


def test_few_sets_need_no_preparation() -> None:
    """The faster way is prepared with more than 64 sets, once."""
    network = gauges_at(*((3 * k, 5) for k in range(1, 9)), unit=1e3)
    method, prepared = averaging_method("thiessen"), []

    def prepare() -> Reweigher:
        prepared.append(1)
        return method.reweigher(network, BASINS)

    fast, plain = Averager(method(network, BASINS), prepare), Averager(method(network, BASINS))
    sets = (np.arange(1, 256)[:, None] >> np.arange(8)) % 2 == 1
    depth = np.random.default_rng(1).random(sets.shape)
    fast.means(depth[: averager.FEW_SETS], sets[: averager.FEW_SETS], 1)
    assert not prepared
    np.testing.assert_allclose(fast.means(depth, sets, 1), plain.means(depth, sets, 1), rtol=1e-12)
    for one, other in zip(fast.weights(sets), plain.weights(sets), strict=True):
        assert not isinstance(one, MethodError)
        assert not isinstance(other, MethodError)
        np.testing.assert_allclose(one, other, rtol=1e-12, atol=1e-12)
    assert len(prepared) == 1


@pytest.mark.parametrize("name", ["arithmetic", "thiessen"])
def test_a_storm_is_averaged_alike_either_way(monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    """Depths, shares, contributions and extremes of weights do not depend on how weights are found."""
    rng = np.random.default_rng(4)
    network = gauges_at((3, 5), (9, 2), (14, 8), (21, 4), (27, 6), unit=1e3)
    depth = np.where(rng.random((60, 5)) < 0.5, NAN, rng.gamma(0.5, 6, (60, 5)))
    depth[:, 0] = 1.0
    completed = complete(hourly(depth.tolist(), network), network, InfillOptions(scale="step", min_donors=3))
    method = averaging_method(name)
    plain = average_storm(completed, method(network, BASINS))
    monkeypatch.setattr(averager, "FEW_SETS", 2)
    fast = average_storm(completed, Averager(method(network, BASINS), partial(method.reweigher, network, BASINS)))
    for field in ("depth", "infilled", "reporting", "reporting_only", "contribution", "least", "most"):
        np.testing.assert_allclose(getattr(fast, field), getattr(plain, field), rtol=1e-11, atol=1e-12, err_msg=field)
    np.testing.assert_allclose(fast.observed_share, plain.observed_share, rtol=1e-11)
    assert plain.without_depth.sum() > 10
