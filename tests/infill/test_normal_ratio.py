"""Normal ratio."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import normal_ratio_weights

NORMALS = np.array([[1500.0], [1000.0], [1200.0]])


def network(normals: np.ndarray = NORMALS) -> GaugeNetwork:
    n = len(normals)
    return GaugeNetwork(
        ids=tuple("XABCDE"[:n]), x=np.arange(n, dtype=float) * 1000, y=np.zeros(n), crs="local", normals=normals
    )


DONORS = np.array([False, True, True])


def test_weights_by_hand() -> None:
    """1500/1000/2 and 1500/1200/2."""
    assert normal_ratio_weights(network(), 0, DONORS).tolist() == pytest.approx([0, 0.75, 0.625])


def test_basin_weights_of_thirds() -> None:
    """With basin weights of a third each the two reporting gauges count (1 + .75)/3 and (1 + .625)/3."""
    donors = normal_ratio_weights(network(), 0, DONORS)
    basin = np.full(3, 1 / 3)
    effective = basin[1:] + basin[0] * donors[1:]
    assert effective == pytest.approx([0.58333, 0.54167], abs=5e-6)
    # Rain at 10 % of normal: the basin gets 10 % of its own normal, (1500 + 1000 + 1200) / 3 / 10.
    assert effective @ np.array([100.0, 120.0]) == pytest.approx(123.33, abs=0.005)
    assert effective @ np.array([100.0, 120.0]) == pytest.approx(370 / 3)


def test_the_four_nearest_donate() -> None:
    """Five report, the farthest gets nothing; the others a quarter of their ratio."""
    weights = normal_ratio_weights(
        network(np.array([[8.0], [8.0], [4.0], [2.0], [1.0], [1.0]])), 0, np.ones(6, dtype=bool)
    )
    assert weights.tolist() == [0, 1 / 4, 2 / 4, 4 / 4, 8 / 4, 0]


def test_the_months_normals() -> None:
    """In February the ratio is 1 to 3, in the year another."""
    monthly = np.ones((3, 12))
    monthly[0, 1], monthly[1, 1], monthly[2, 1] = 10, 30, 20
    weights = normal_ratio_weights(network(monthly), 0, DONORS, month=2)
    assert weights.tolist() == pytest.approx([0, 1 / 3 / 2, 1 / 2 / 2])
    # The year: 21 mm against 41 and 31.
    assert normal_ratio_weights(network(monthly), 0, DONORS).tolist() == pytest.approx([0, 21 / 41 / 2, 21 / 31 / 2])


def test_a_donor_without_a_normal_is_refused() -> None:
    """B's normal is missing and B would donate."""
    with pytest.raises(DataError, match="gauge B: found no normal for the year; expected a normal above 0"):
        normal_ratio_weights(network(np.array([[1.0], [1.0], [np.nan]])), 0, DONORS)


def test_normals_of_gauges_that_do_not_donate_are_not_needed() -> None:
    """B is silent; its missing normal does not matter."""
    weights = normal_ratio_weights(
        network(np.array([[3.0], [2.0], [np.nan]])), 0, np.array([False, True, False]), min_donors=1
    )
    assert weights.tolist() == [0, 1.5, 0]
