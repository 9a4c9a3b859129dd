"""Regression on ratios to normals."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from related import line, relations_with

from basinrain.errors import DataError
from basinrain.infill import NormalRatios, ratio_regression_weights, relations_of

NETWORK = line(4, [[900.0], [600.0], [1200.0], [300.0]])
DONORS = np.array([False, True, True, True])
NAN = float("nan")


def test_by_hand() -> None:
    """Squares .64 : .36 : .25 of 1.25, slopes 1, 2, 0.5, ratios of normals 1.5, 0.75, 3."""
    relations = relations_with(NETWORK, [0.8, 0.6, 0.5], [1, 2, 0.5])
    weights = ratio_regression_weights(NETWORK, 0, DONORS, relations=relations)
    assert weights == pytest.approx([0, 0.64 / 1.25 * 1.5, 0.36 / 1.25 * 2 * 0.75, 0.25 / 1.25 * 0.5 * 3])


def test_it_goes_by_the_relations_of_ratios() -> None:
    """Those of the depths, none of which could donate, play no part."""
    relations = replace(relations_with(NETWORK, [0.8, 0.6, 0.5]), correlation=np.full((4, 4), NAN))
    assert (ratio_regression_weights(NETWORK, 0, DONORS, relations=relations)[1:] > 0).all()


def test_seasons_that_differ_from_gauge_to_gauge() -> None:
    """A has twice X's normal in January and half of it in July; X always had A's ratio to its normal, and so has it."""
    months = np.full((3, 12), 50.0)
    months[1, 0], months[1, 6] = 100.0, 25.0
    network = line(3, months)
    share = np.abs(np.sin(np.arange(40.0)))
    month = np.where(np.arange(40) % 2, 1, 7)
    depths = share[:, None] * months[:, month - 1].T
    relations = relations_of(depths, network, month)
    donors = np.array([False, True, True])
    for m, ratio in ((1, 0.5), (7, 2.0), (3, 1.0)):
        weights = ratio_regression_weights(network, 0, donors, relations=relations, month=m)
        assert weights == pytest.approx([0, ratio / 2, 0.5])


def test_without_relations_of_ratios() -> None:
    """Relations made without normals have none."""
    relations = replace(relations_with(NETWORK, [0.8, 0.6, 0.5]), ratio_slope=None, ratio_correlation=None)
    with pytest.raises(DataError, match=r"relations between gauges: found none of ratios to normals; .* give normals"):
        ratio_regression_weights(NETWORK, 0, DONORS, relations=relations)


def test_normals_that_cannot_be_used() -> None:
    """The line names the gauge and this method."""
    dry = line(4, [[900.0], [600.0], [0.0], [300.0]])
    with pytest.raises(DataError, match=r"^gauge B: found a normal of 0 mm .* ratio-regression method; give it"):
        ratio_regression_weights(dry, 0, DONORS, relations=relations_with(dry, [0.8, 0.6, 0.5]))


def test_normals_from_the_record() -> None:
    """C has no ratio in July and does not donate; .64 : .36 with ratios of 2 and 1/2."""
    bare = line(4)
    means = np.full((12, 4, 4), 50.0)
    means[6, :, 0] = [50, 25, 100, NAN]
    ratios = NormalRatios(bare.ids, np.full((12, 4, 4), 10), means)
    relations = relations_with(bare, [0.8, 0.6, 0.5])
    weights = ratio_regression_weights(bare, 0, DONORS, relations=relations, month=7, ratios=ratios)
    assert weights == pytest.approx([0, 0.64 * 2, 0.36 * 0.5, 0])
