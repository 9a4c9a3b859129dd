"""Whose a stretch is."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import line_of, rain_of, record_of

from basinrain.screening import ScreeningOptions
from basinrain.screening.checks.belonging import TELLING, better_fit
from basinrain.screening.screened import Screened

SPAN = (
    np.datetime64("2031-01-01", "s") + np.timedelta64(300, "D"),
    np.datetime64("2031-01-01", "s") + np.timedelta64(390, "D"),
)


def two_valleys(wrong: int) -> Screened:
    """Return A and C of one valley, B and D of another; from day 300 to 390 A and B have one of the two records."""
    one, two = rain_of(800, 2, seed=5), rain_of(800, 2, seed=6)
    depths = np.column_stack([one[:, 0], two[:, 0], one[:, 1], two[:, 1]])
    depths[300:390, wrong] = depths[300:390, 1 - wrong]
    return Screened(record_of(depths), line_of(4), ScreeningOptions())


@pytest.mark.parametrize("wrong", [0, 1])
def test_it_is_the_owners_in_either_order(wrong: int) -> None:
    """The measure turns its sign with the pair, and points to the gauge whose valley it rained in."""
    view = two_valleys(wrong)
    sure = better_fit(view, (0, 1), *SPAN)
    assert better_fit(view, (1, 0), *SPAN) == pytest.approx(-sure)
    assert (sure > 0) == (wrong == 1)
    assert abs(sure) > TELLING


def test_without_others_nothing_is_known() -> None:
    """Two gauges have no third to ask; a record that ends with the stretch has nothing to compare with."""
    depths = rain_of(800, 2)
    view = Screened(record_of(depths), line_of(2), ScreeningOptions())
    assert better_fit(view, (0, 1), *SPAN) == 0
    short = Screened(record_of(rain_of(400, 4)[290:]), line_of(4), ScreeningOptions())
    assert better_fit(short, (0, 1), short.record.starts[10], short.record.ends[-1]) == 0
