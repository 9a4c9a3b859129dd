from __future__ import annotations

from pathlib import Path

import numpy as np
from report.markup import svg_texts
from report.series_run import four_days, four_years, make_series_run

from basinrain.report.found_figure import STORMS, found_pictures


def test_storms_are_titled_and_described() -> None:
    """Rank, depth and beginning above; the greatest step for a reader who does not see it."""
    first, second = found_pictures(four_days())
    assert "1: 25.8 mm, from 2027-01-03 00:00" in svg_texts(first.svg)
    assert "greatest step 25.8, ending 2027-01-04 00:00" in first.svg
    assert "observed, %" in svg_texts(second.svg)
    assert first.caption == (
        "Storm 1 of basin union by thiessen ('infill'); below, the share of the weight on gauges that report."
    )


def test_the_largest_are_drawn() -> None:
    """Four, whatever the number asked for."""
    assert [picture.name for picture in found_pictures(four_years())] == [f"found-{k}" for k in range(1, STORMS + 1)]


def test_long_storms_are_added_up(tmp_path: Path) -> None:
    """Three hundred wet hours make bars of three hours."""
    depth = np.ones((320, 3))
    depth[:10], depth[-10:] = 0, 0
    run = make_series_run(tmp_path, depth, first="2027-01-01T00:00", step="1h", gaps=["reweight"], methods=["thiessen"])
    (picture,) = found_pictures(run)
    assert picture.caption.endswith("A bar adds up 3 steps.")
    assert "mm in 3 × 1 h" in svg_texts(picture.svg)


def test_no_storm_no_figure(tmp_path: Path) -> None:
    """A dry record."""
    assert found_pictures(make_series_run(tmp_path, np.zeros((9, 3)), gaps=["reweight"])) == []


def test_a_repeat_is_identical() -> None:
    """The same run gives the same bytes."""
    assert found_pictures(four_years()) == found_pictures(four_years())
