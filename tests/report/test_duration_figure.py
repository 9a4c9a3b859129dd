from __future__ import annotations

from pathlib import Path

import numpy as np
from report.markup import svg_texts
from report.series_run import four_days, four_years, make_series_run

from basinrain.report.duration_figure import duration_pictures


def test_both_kinds_of_windows_are_drawn() -> None:
    """Sliding and tied to the clock, with their numbers in the description."""
    kinds, series = duration_pictures(four_days())
    assert {"sliding", "tied to the clock", "1 day", "2 days", "3 days"} <= set(svg_texts(kinds.svg))
    assert "sliding: 1 day 25.8, 2 days 25.8, 3 days 40.8" in kinds.svg
    assert series.caption == "Basin union: greatest depths in sliding windows by every policy."
    assert kinds.half


def test_durations_longer_than_the_record_have_no_place() -> None:
    """Five days are not on the axis."""
    assert "5 days" not in svg_texts(duration_pictures(four_days())[0].svg)


def test_methods_stand_beside_each_other() -> None:
    """By the first policy only, which the caption names."""
    series = duration_pictures(four_years())[1]
    assert {"thiessen", "idw"} <= set(svg_texts(series.svg))
    assert series.caption.endswith("by every method ('infill-then-reweight').")


def test_nothing_to_draw(tmp_path: Path) -> None:
    """A dry record, one step, steps of months; a logarithm needs two depths above 0."""
    assert duration_pictures(make_series_run(tmp_path / "dry", np.zeros((9, 3)))) == []
    assert duration_pictures(make_series_run(tmp_path / "one", [[1, 2, 3]], gaps=["reweight"])) == []
    months = make_series_run(tmp_path / "mo", np.ones((5, 3)), first="2027-01", step="1mo", gaps=["reweight"])
    assert duration_pictures(months) == []


def test_one_series_has_one_figure(tmp_path: Path) -> None:
    """There is nothing to put beside it."""
    run = make_series_run(tmp_path, np.ones((9, 3)), gaps=["reweight"], methods=["thiessen"])
    assert len(duration_pictures(run)) == 1


def test_a_repeat_is_identical() -> None:
    """The same run gives the same bytes."""
    assert duration_pictures(four_years()) == duration_pictures(four_years())
