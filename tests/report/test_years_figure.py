from __future__ import annotations

from pathlib import Path

import numpy as np
from report.markup import svg_texts
from report.series_run import four_days, four_years, make_series_run

from basinrain.report.years_figure import years_picture


def test_incomplete_years_are_marked() -> None:
    """The first and the last water year are hatched and described by a dash, never as 0."""
    picture = years_picture(four_years())
    assert picture is not None
    assert {"not complete", "mean", "infill-then-reweight", "thiessen", "idw"} <= set(svg_texts(picture.svg))
    assert "thiessen (reweight): 2027 –, 2028 1096.2" in picture.svg
    assert "Hatched: not complete by one of the policies at least" in picture.caption
    assert picture.svg.count("<pattern") == 1


def test_complete_years_have_no_hatching(tmp_path: Path) -> None:
    """Three calendar years as water years from January."""
    run = make_series_run(
        tmp_path, np.ones((36, 3)), first="2027-01", step="1mo", gaps=["reweight"], series="water_year = 1"
    )
    picture = years_picture(run)
    assert picture is not None
    assert "not complete" not in svg_texts(picture.svg)
    assert "Hatched" not in picture.caption
    assert "2027 12.0, 2028 12.0, 2029 12.0" in picture.svg


def test_a_dry_record_is_drawn_at_zero(tmp_path: Path) -> None:
    """Zero is a number: a year without rain has a bar of no height, not a hatching."""
    run = make_series_run(
        tmp_path, np.zeros((24, 3)), first="2027-01", step="1mo", gaps=["reweight"], series="water_year = 1"
    )
    picture = years_picture(run)
    assert picture is not None
    assert "2027 0.0, 2028 0.0" in picture.svg


def test_no_complete_year_no_figure() -> None:
    """Four days."""
    assert years_picture(four_days()) is None


def test_a_repeat_is_identical() -> None:
    """The same run gives the same bytes."""
    assert years_picture(four_years()) == years_picture(four_years())
