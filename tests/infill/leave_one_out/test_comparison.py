"""What a comparison holds."""

from __future__ import annotations

import numpy as np
import pytest
from leave_one_out_data import daily_record, small_depths, small_network

import basinrain.infill.leave_one_out
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import compare_infill


def test_a_score_by_its_names() -> None:
    """All gauges pooled and the scale of the score where nothing else is said; what is not there is an error."""
    network = small_network()
    comparison = compare_infill(daily_record(network, small_depths(200)), network, options=InfillOptions())
    score = comparison.score("station-average", gauge=network.ids[2])
    assert (score.candidate, score.gauge, score.scale) == ("station-average", network.ids[2], "day")
    assert comparison.score("station-average").n == np.isfinite(comparison.observed).sum()
    with pytest.raises(KeyError, match="median"):
        comparison.score("median")
    with pytest.raises(KeyError, match="step"):
        comparison.score("station-average", scale="step")


def test_public_names() -> None:
    """What the room offers is sorted and exists."""
    names = basinrain.infill.leave_one_out.__all__
    assert names == sorted(names)
    assert all(hasattr(basinrain.infill.leave_one_out, name) for name in names)
