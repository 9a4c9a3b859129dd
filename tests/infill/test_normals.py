"""Normals as the ratio methods need them."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill.normals import normals_of, require_normals


def network(normals: object) -> GaugeNetwork:
    table = None if normals is None else np.array(normals, dtype=float)
    return GaugeNetwork(ids=("A", "B", "C"), x=np.arange(3.0), y=np.zeros(3), crs="local", normals=table)


EVERYONE = np.ones(3, dtype=bool)
MONTHLY = np.tile(np.arange(1.0, 13.0), (3, 1)) * np.array([[10.0], [20.0], [30.0]])


def test_the_months_normal_is_taken() -> None:
    """March is the third of twelve."""
    assert normals_of(network(MONTHLY), 3).tolist() == [30, 60, 90]


def test_the_years_normal_is_the_sum_of_the_months() -> None:
    """1 + 2 + ... + 12 = 78."""
    assert normals_of(network(MONTHLY), None).tolist() == [780, 1560, 2340]


def test_one_column_is_the_year_in_every_month() -> None:
    """Annual normals have no months to choose from."""
    assert normals_of(network([[900], [1000], [1200]]), 7).tolist() == [900, 1000, 1200]


def test_no_normals_at_all() -> None:
    """One line says that the network has none."""
    assert np.isnan(normals_of(network(None), 1)).all()
    with pytest.raises(
        DataError, match=r"^gauges: found no normals; expected a normal above 0 .* another infill method$"
    ):
        require_normals(network(None), EVERYONE, [1])


def test_every_gauge_at_fault_is_named() -> None:
    """A missing, a zero and a negative normal are three problems of one error."""
    with pytest.raises(DataError) as caught:
        require_normals(network([[np.nan], [0], [-5]]), EVERYONE, [1])
    assert [problem.gauge for problem in caught.value.problems] == ["A", "B", "C"]
    assert [problem.found for problem in caught.value.problems] == [
        "no normal for the year",
        "a normal of 0 mm for the year",
        "a normal of -5 mm for the year",
    ]


def test_only_the_months_concerned_matter() -> None:
    """A dry July is no problem for a storm in March, and is one for a storm in July."""
    dry = MONTHLY.copy()
    dry[1, 6] = 0
    require_normals(network(dry), EVERYONE, [3])
    with pytest.raises(DataError, match="gauge B: found a normal of 0 mm for July; expected a normal above 0"):
        require_normals(network(dry), EVERYONE, [3, 7])


def test_only_the_gauges_concerned_matter() -> None:
    """Gauge A without a normal takes no part here."""
    require_normals(network([[np.nan], [5], [6]]), np.array([False, True, True]), [None])
    with pytest.raises(DataError, match="gauge A: found no normal for the year"):
        require_normals(network([[np.nan], [5], [6]]), EVERYONE, [None])
