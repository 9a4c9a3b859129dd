"""A design hyetograph has steps, basins and no gap, and tells itself from others."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from small_hyetographs import hyetograph

from basinrain.errors import DataError


def test_a_hyetograph_tells_itself() -> None:
    """Ten-minute steps end at 10, 20 and 30 minutes; 1 + 2 + 4 mm are 7."""
    one = hyetograph([[1.0], [2.0], [4.0]], basins=("west",), step=10)
    assert (one.elapsed.tolist(), one.totals.tolist(), one.duration, one.n_steps) == ([10, 20, 30], [7.0], "30min", 3)
    assert one.name == "bridge, AEP 0.01 (1 in 100), 30 min, nrcs-type-ii"


@pytest.mark.parametrize(("minutes", "step"), [(25, 10), (10, 20), (60, 0)])
def test_a_step_divides_its_duration(minutes: int, step: int) -> None:
    """Nothing else can be said of the depths then."""
    message = (
        rf"^hyetograph bridge, nrcs-type-ii: found a step of {step} min in a duration of {minutes} min; "
        "expected a step of whole minutes that divides the duration$"
    )
    with pytest.raises(DataError, match=message):
        replace(hyetograph([[1.0]], basins=("west",)), minutes=minutes, step=step)


def test_depths_have_steps_and_basins() -> None:
    """One basin twice and a step too few are named together."""
    message = (
        r"^hyetograph bridge, AEP 0.01 \(1 in 100\), 2 h, nrcs-type-ii: found basins west, west; expected each basin "
        r"once\nhyetograph .*: found depths of shape \(1, 2\); expected steps and basins, \(2, 2\)$"
    )
    with pytest.raises(DataError, match=message):
        replace(hyetograph([[1.0, 2.0]] * 2, basins=("west", "east")), basins=("west", "west"), depth=np.ones((1, 2)))
    with pytest.raises(DataError, match="found basins none; expected each basin once"):
        hyetograph(np.empty((2, 0)), basins=())


def test_a_design_storm_has_no_gap() -> None:
    """A NaN is never written as if it were the end of a shorter storm, nor is less than nothing."""
    with pytest.raises(DataError, match=r"found nan mm in step 2 of basin west; expected depths of 0 or more$"):
        hyetograph([[1.0, 0.0], [np.nan, 1.0]], basins=("west", "east"))
    with pytest.raises(DataError, match=r"found -1 mm in step 1 of basin east, and 1 more like it; expected"):
        hyetograph([[1.0, -1.0], [1.0, np.inf]], basins=("west", "east"))
