"""Ten per cent rule."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import NormalRatios, ten_percent_rule_weights


def network(*normals: object) -> GaugeNetwork:
    """X, A, B and C, 1 km apart in line, with these normals."""
    table = np.array(normals, dtype=float).reshape(4, -1)
    return GaugeNetwork(
        ids=("X", "A", "B", "C"), x=np.arange(4, dtype=float) * 1e3, y=np.zeros(4), crs="local", normals=table
    )


DONORS = np.array([False, True, True, True])


@pytest.mark.parametrize("edge", [0.9, 1.1])
def test_ten_per_cent_is_within(edge: float) -> None:
    """1000 mm, and a donor at 900 or 1100: the station average; 0.1 mm more and normals count for all donors."""
    assert ten_percent_rule_weights(network(1000, 1000, 1050, 1000 * edge), 0, DONORS).tolist() == [0, *[1 / 3] * 3]
    beyond = 1000 * edge + (0.1 if edge > 1 else -0.1)
    weights = ten_percent_rule_weights(network(1000, 1000, 1050, beyond), 0, DONORS)
    assert weights == pytest.approx([0, 1 / 3, 1000 / 1050 / 3, 1000 / beyond / 3])


def test_it_is_ten_per_cent_of_the_targets_normal() -> None:
    """1100 is 10 % above 1000; seen from 1100, 1000 is 9.1 % below, and 1000 seen from 1112 is 10.07 % below."""
    assert ten_percent_rule_weights(network(1100, 1000, 1000, 1000), 0, DONORS)[1] == 1 / 3
    assert ten_percent_rule_weights(network(1112, 1000, 1000, 1000), 0, DONORS)[1] == pytest.approx(1.112 / 3)


def test_the_donors_of_the_case_decide() -> None:
    """C is 50 % above: the rule turns to the normal ratio where C donates, and only there."""
    cases = np.array([DONORS, [False, True, True, False]])
    weights = ten_percent_rule_weights(network(1000, 1000, 950, 1500), 0, cases)
    assert weights == pytest.approx(np.array([[0, 1 / 3, 1 / 2.85, 1 / 4.5], [0, 0.5, 0.5, 0]]))


def test_a_gauge_that_does_not_donate_has_no_say() -> None:
    """With the two nearest C, 50 % above, plays no part."""
    weights = ten_percent_rule_weights(network(1000, 1000, 950, 1500), 0, DONORS, nearest=2)
    assert weights.tolist() == [0, 0.5, 0.5, 0]


def test_the_months_normals_decide() -> None:
    """In January all have 80 mm, in July the target has 50 and its donors 100 mm."""
    months = np.full((4, 12), 80.0)
    months[:, 6] = [50, 100, 100, 100]
    monthly = network(months)
    assert ten_percent_rule_weights(monthly, 0, DONORS, month=1).tolist() == [0, *[1 / 3] * 3]
    assert ten_percent_rule_weights(monthly, 0, DONORS, month=7) == pytest.approx([0, *[1 / 6] * 3])


def test_normals_from_the_record() -> None:
    """The rule holds pair by pair: B's mean is 8 % above the target's in their years, C has too few and is no donor."""
    bare = GaugeNetwork(ids=("X", "A", "B", "C"), x=np.arange(4, dtype=float) * 1e3, y=np.zeros(4), crs="local")
    means = np.full((12, 4, 4), 50.0)
    means[6, 2, 0], means[6, 3, 0] = 54.0, np.nan
    ratios = NormalRatios(bare.ids, np.full((12, 4, 4), 10), means)
    assert ten_percent_rule_weights(bare, 0, DONORS, month=7, ratios=ratios).tolist() == [0, 0.5, 0.5, 0]
    means[6, 2, 0] = 60.0
    ratios = NormalRatios(bare.ids, np.full((12, 4, 4), 10), means)
    assert ten_percent_rule_weights(bare, 0, DONORS, month=7, ratios=ratios) == pytest.approx([0, 0.5, 5 / 12, 0])


def test_normals_that_cannot_be_used() -> None:
    """The line names the gauge, the normal and this method."""
    with pytest.raises(DataError, match=r"^gauge B: found a normal of 0 mm for the year; .* ten-percent-rule method"):
        ten_percent_rule_weights(network(1000, 1000, 0, 1000), 0, DONORS)
