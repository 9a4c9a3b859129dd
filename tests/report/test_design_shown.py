from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from hypothesis import given
from hypothesis import strategies as st
from report.design_run import bare, make_design, two_halves

from basinrain.report import design_shown
from basinrain.report.design_shown import left_out, spread


@given(items=st.lists(st.integers(), min_size=1, max_size=30, unique=True), most=st.integers(2, 12))
def test_of_many_the_ends_and_some_between_in_order(items: list[int], most: int) -> None:
    """Never more than asked for, each once, the first and the last among them; all where there is room."""
    kept = spread(items, most)
    assert len(kept) == min(len(items), most)
    assert (kept[0], kept[-1]) == (items[0], items[-1])
    places = [items.index(item) for item in kept]
    assert places == sorted(set(places))


def test_what_is_not_shown_is_counted(tmp_path: Path) -> None:
    """Points, frequencies and durations by number, with the file; no word where all are shown."""
    assert left_out(two_halves(), "f.csv") == ()
    run = make_design(
        tmp_path,
        design__return_periods=[2, 3, 4, 5, 6, 7, 8, 10],
        design__durations=[f"{hours}h" for hours in range(1, 9)],
        design__point=[{"name": f"P{k}", "basins": ["nw"]} for k in range(6)],
    )
    (sentence,) = left_out(run, "f.csv")
    assert sentence == (
        "Shown here: the first 4 of 6 points of interest, 6 of 8 frequencies and 6 of 8 durations; the others are in "
        "f.csv."
    )
    assert [point.name for point in design_shown.points(run)] == ["P0", "P1", "P2", "P3"]
    assert [f.return_period for f in design_shown.frequencies(run)] == [2, 3, 5, 6, 8, 10]
    assert design_shown.durations(run) == [60, 120, 240, 300, 420, 480]


def test_the_file_of_hyetographs_is_that_of_the_first_format() -> None:
    """By the word of the job."""
    run = bare()
    assert design_shown.hyetograph_file(run) == "design_hyetographs.csv"
    design = run.asked.design.model_copy(update={"formats": ("netcdf", "csv")})
    assert (
        design_shown.hyetograph_file(replace(run, asked=replace(run.asked, design=design))) == "design_hyetographs.nc"
    )
