"""Large depths that hang on one gauge."""

from __future__ import annotations

import numpy as np
import pytest
from series.test_long_term import daily, strip

from basinrain.rainfall import RainRecord
from basinrain.series.dominance import Dominance, dominances
from basinrain.series.engine import SeriesSetup
from basinrain.series.policies import INFILL, REWEIGHT

N = np.nan
USUAL = {"thiessen": np.array([[1 / 3, 1 / 3, 1 / 3], [1.0, 0.0, 0.0]])}
"""Weights in the strip and in its western third while all gauges are there."""
RECORD = daily([[3, 9, 6], [30, N, N], [6, N, 3]], ("A", "B", "C"))


def looked_at(setup: SeriesSetup, steps: dict[tuple[str, str], list[list[int]]], **given: float) -> list[Dominance]:
    def load(step: int) -> tuple[RainRecord, None, int]:
        return RECORD.window(step, step + 1), None, 0

    return list(dominances(setup, {series: np.array(rows) for series, rows in steps.items()}, USUAL, load, **given))


def test_weights_at_the_step_itself() -> None:
    """With all there no gauge has over half of the strip; A alone has it all; with C, A has half, which is not over."""
    setup = strip(gaps=(INFILL, REWEIGHT))
    series = (REWEIGHT, "thiessen")
    assert looked_at(setup, {series: [[0, -1]]}) == []
    assert looked_at(setup, {series: [[2, -1]]}) == []
    (found,) = looked_at(setup, {series: [[1, -1]]})
    assert (found.basin, found.gauge, found.step) == ("strip", "A", 1)
    assert found.weight == pytest.approx(1)


def test_the_step_within_what_is_loaded() -> None:
    """Of three steps loaded together the one asked for is looked at: A has all the weight at the second alone."""
    setup, series = strip(gaps=(REWEIGHT,)), (REWEIGHT, "thiessen")
    for step, gauges in ((0, []), (1, ["A"]), (2, [])):
        found = dominances(setup, {series: np.array([[step, -1]])}, USUAL, lambda step: (RECORD, None, step))
        assert [one.gauge for one in found] == gauges


def test_infilled_gauges_keep_their_weight() -> None:
    """On the third day B is infilled from A and C, so that nobody has over half of the strip."""
    setup = strip(gaps=(INFILL, REWEIGHT))
    assert looked_at(setup, {(INFILL, "thiessen"): [[2, -1]]}, above=0.49) == []
    found = looked_at(setup, {(REWEIGHT, "thiessen"): [[2, -1]]}, above=0.49)
    assert [one.gauge for one in found] == ["A"]


def test_only_the_basins_whose_step_it_is() -> None:
    """A step that is large in one basin is told of in that basin alone."""
    setup, series = strip(gaps=(REWEIGHT,)), (REWEIGHT, "thiessen")
    usual = {"thiessen": np.array([[1 / 3, 1 / 3, 1 / 3], [0.4, 0.6, 0.0]])}
    for steps, basins in (([[1, -1]], ["strip"]), ([[-1, 1]], ["west"]), ([[1, 1]], ["strip", "west"])):
        found = dominances(
            setup, {series: np.array(steps)}, usual, lambda step: (RECORD.window(step, step + 1), None, 0)
        )
        assert [one.basin for one in found] == basins


def test_what_is_always_so_is_not_told() -> None:
    """The western third is A's at every step, whoever else is silent."""
    setup = strip(gaps=(REWEIGHT,))
    assert looked_at(setup, {(REWEIGHT, "thiessen"): [[-1, 0], [-1, 1]]}) == []
