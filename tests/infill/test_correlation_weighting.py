"""Correlation weighting."""

from __future__ import annotations

import numpy as np
import pytest
from related import line, relations_with

from basinrain.errors import DataError
from basinrain.infill import correlation_weights

NETWORK = line(5)
DONORS = np.array([False, True, True, True, True])
NAN = float("nan")


def test_by_hand() -> None:
    """0.8 : 0.6 : 0.4 : 0.2, of 2 in all; 10, 20, 30 and 40 mm give 8·10 + 6·20 + 4·30 + 2·40 over 20, 20 mm."""
    weights = correlation_weights(NETWORK, 0, DONORS, relations=relations_with(NETWORK, [0.8, 0.6, 0.4, 0.2]))
    assert weights == pytest.approx([0, 0.4, 0.3, 0.2, 0.1])
    assert weights @ np.array([0, 10, 20, 30, 40]) == pytest.approx(20)


def test_gauges_without_a_correlation_above_zero() -> None:
    """B's is not known, C's is 0, D's is negative: only A is left, which is too few unless one is enough."""
    relations = relations_with(NETWORK, [0.8, NAN, 0.0, -0.5])
    assert correlation_weights(NETWORK, 0, DONORS, relations=relations).tolist() == [0.0] * 5
    weights = correlation_weights(NETWORK, 0, DONORS, relations=relations, min_donors=1)
    assert weights.tolist() == [0, 1, 0, 0, 0]


def test_the_nearest_eligible_ones_donate() -> None:
    """Of two asked for A has no correlation, so B and C donate, though D's is higher."""
    relations = relations_with(NETWORK, [NAN, 0.6, 0.2, 0.9])
    weights = correlation_weights(NETWORK, 0, DONORS, relations=relations, nearest=2)
    assert weights == pytest.approx([0, 0, 0.75, 0.25, 0])


def test_relations_of_other_gauges() -> None:
    """Relations in another order are not taken for these."""
    relations = relations_with(line(4), [0.8, 0.6, 0.4])
    with pytest.raises(DataError, match=r"relations between gauges: found other gauges .* expected X, A, B, C, D"):
        correlation_weights(NETWORK, 0, DONORS, relations=relations)
