from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from report.series_run import ALL, four_days, four_years, make_series_run

from basinrain.report import series_names


def test_the_union_leads() -> None:
    """Of several basins the last row, the union, is what most tables show."""
    assert four_days().basins.ids[series_names.lead_basin(four_days())] == "union"


def test_a_single_basin_leads_itself(tmp_path: Path) -> None:
    """There is no union of one."""
    run = make_series_run(tmp_path, [[1, 2, 3]] * 3, basins=1, gaps=["reweight"], methods=["thiessen"])
    assert run.basins.ids[series_names.lead_basin(run)] == "west"
    assert series_names.heads(run) == (("thiessen",), ())
    assert series_names.names(run) == {("reweight", "thiessen"): "thiessen"}


def test_series_stand_by_method() -> None:
    """Policies side by side under each method, though the run has them the other way round."""
    run = four_years()
    heads, over = series_names.heads(run)
    assert heads == (*ALL, *ALL)
    assert over == (("thiessen", 3), ("idw", 3))
    assert series_names.listed(run)[3] == ("infill-then-reweight", "idw")
    assert series_names.names(run)["reweight", "idw"] == "idw, reweight"
    assert series_names.left_out(run, "a.csv") == ()


def test_one_method_is_named_by_its_policies() -> None:
    """The method would only repeat itself."""
    assert list(series_names.names(four_days()).values()) == ["infill", "reweight"]


def test_whole_methods_are_left_out_with_their_file() -> None:
    """Nine series fit: of five methods by three policies, three methods."""
    run = four_years()
    setup = replace(run.setup, methods={f"m{k}": {} for k in range(5)})
    many = replace(run, setup=setup)
    assert len(series_names.listed(many)) == series_names.MOST_SERIES
    assert series_names.left_out(many, "a.csv") == ("The series by m3, m4 are in a.csv.",)


@pytest.mark.parametrize(("n", "words"), [(1, "1 day"), (5, "5 days")])
def test_days_are_counted(n: int, words: str) -> None:
    """One day, several days."""
    import numpy as np

    assert series_names.length_text(np.timedelta64(n, "D")) == words
