"""Regression through the origin."""

from __future__ import annotations

import numpy as np
import pytest
from related import line, relations_with

from basinrain.infill import InfillOptions, complete, regression_weights, relations_of
from basinrain.rainfall import RainRecord

NETWORK = line(5)
DONORS = np.array([False, True, True, True, True])
NAN = float("nan")


def test_by_hand() -> None:
    """Squares .64 : .36 : .16 : .04, of 1.2; slopes 1, 2, 0.5, 1.5."""
    relations = relations_with(NETWORK, [0.8, 0.6, 0.4, 0.2], [1, 2, 0.5, 1.5])
    weights = regression_weights(NETWORK, 0, DONORS, relations=relations)
    assert weights == pytest.approx([0, 0.64 / 1.2, 0.72 / 1.2, 0.08 / 1.2, 0.06 / 1.2])


def test_the_best_correlated_donate() -> None:
    """Of two asked for D and B, though A is nearest; with B silent C, which ties with A, does not: ids decide."""
    relations = relations_with(NETWORK, [0.6, 0.8, 0.6, 0.9])
    assert np.flatnonzero(regression_weights(NETWORK, 0, DONORS, relations=relations, nearest=2)).tolist() == [2, 4]
    silent = DONORS & (np.arange(5) != 2)
    assert np.flatnonzero(regression_weights(NETWORK, 0, silent, relations=relations, nearest=2)).tolist() == [1, 4]


def test_gauges_that_cannot_donate() -> None:
    """A's correlation is not known, B's is negative, C's slope is 0; D alone is too few."""
    relations = relations_with(NETWORK, [NAN, -0.3, 0.5, 0.9], [1, 1, 0, 2])
    assert not regression_weights(NETWORK, 0, DONORS, relations=relations).any()
    weights = regression_weights(NETWORK, 0, DONORS, relations=relations, min_donors=1)
    assert weights.tolist() == [0, 0, 0, 0, 2]


def test_the_radius_holds_for_the_best_correlated_too() -> None:
    """D, 4 km away, is out of 3 km."""
    relations = relations_with(NETWORK, [0.6, 0.8, 0.7, 0.9])
    weights = regression_weights(NETWORK, 0, DONORS, relations=relations, nearest=2, radius=3e3)
    assert np.flatnonzero(weights).tolist() == [2, 3]


def days(depths: np.ndarray) -> RainRecord:
    """Return a daily record of X, A and B."""
    ends = np.datetime64("2031-05-01", "s") + np.arange(1, len(depths) + 1) * np.timedelta64(86400, "s")
    return RainRecord.from_depths(("X", "A", "B"), ends - np.timedelta64(86400, "s"), ends, depths, step="1d")


def test_a_record_whose_gauges_keep_one_ratio() -> None:
    """X always has 1.5 times A and 3 times B: the missing day, 8 mm at A and 4 at B, is 12 mm at X."""
    rain = np.abs(np.sin(np.arange(31.0))) * 20
    depths = np.column_stack([1.5 * rain, rain, rain / 2])
    depths[30] = [NAN, 8, 4]
    completed = complete(days(depths), line(3), InfillOptions(method="regression", scale="step"))
    assert completed.record.depth[30, 0] == pytest.approx(12)


def test_too_short_a_record() -> None:
    """With 29 common days there is no relation: the day stays missing, and the note says what donors lack."""
    rain = np.abs(np.sin(np.arange(30.0))) * 20
    depths = np.column_stack([1.5 * rain, rain, rain / 2])
    depths[29] = [NAN, 8, 4]
    completed = complete(days(depths), line(3), InfillOptions(method="regression", scale="step"))
    assert np.isnan(completed.record.depth[29, 0])
    (note,) = [note for note in completed.notes if note.code == "not-infilled"]
    assert "fewer than 2 other gauges with a known correlation above 0 reported at the step" in note.text


def test_relations_of_the_whole_record_for_a_short_window() -> None:
    """Given with the window, they are used instead of its own."""
    rain = np.abs(np.sin(np.arange(31.0))) * 20
    depths = np.column_stack([1.5 * rain, rain, rain / 2])
    depths[30] = [NAN, 8, 4]
    window = days(depths).window(30, 31)
    completed = complete(
        window, line(3), InfillOptions(method="regression", scale="step"), relations=relations_of(depths, line(3))
    )
    assert completed.record.depth[0, 0] == pytest.approx(12)
