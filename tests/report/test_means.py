from __future__ import annotations

from dataclasses import replace

import numpy as np
import shapely
from report.small_run import make_run

from basinrain.basins import Basins
from basinrain.report.means import details, summary
from basinrain.report.words import NARROW_SPACE
from basinrain.results import StormRun


def _plain(cells: tuple[str, ...]) -> list[str]:
    return [cell.replace(NARROW_SPACE, " ") for cell in cells]


def test_depths_stand_side_by_side_with_their_spread(run: StormRun) -> None:
    """West by arithmetic: A and B fell 12 mm each, so 12.0; the spread is that of the three numbers beside it."""
    west = _plain(summary(run).rows[0])
    assert west[:4] == ["Quill", "west", "100.0", "12.0"]
    totals = [d.total[0] for d in run.storms[0].depths.values()]
    assert west[6] == f"{max(totals) - min(totals):.1f}"
    assert west[7] == f"{100 * (max(totals) - min(totals)) / np.mean(totals):.1f} %"


def test_depth_volume_and_infilled_share(run: StormRun) -> None:
    """12 mm on 100 km² are 1 200 000 m³; B's infilled 7 mm are half of 7/12 = 29.2 % of it; without infill 11.5 mm."""
    table = details(run)[0]
    west = _plain(table.rows[0])
    # Reporting only: hours 1 to 6 give 0, 1.5, 6 (A alone), 3.5, 0.5, 0.
    assert west == ["west", "arithmetic", "12.0", "1 200 000", "2", "29.2 %", "11.5"]
    assert [row[0] for row in table.rows] == ["west"] * 3 + ["east"] * 3 + ["union"] * 3


def test_inches_have_two_decimals_and_acre_feet() -> None:
    """12 mm are 0.47 in; 1 200 000 m³ are 972.9 acre-ft."""
    west = _plain(details(make_run(depth_unit="in"))[0].rows[0])
    assert west[2:4] == ["0.47", "972.9"]


def test_a_method_without_a_number_is_never_zero() -> None:
    """Basin far has no gauge inside: the arithmetic mean has no number there, and no column is added for it."""
    run = make_run()
    table = run.storms[0].depths["arithmetic"]
    weights, depth, only = table.table.weights.copy(), table.depth.copy(), table.reporting_only.copy()
    weights[0], depth[:, 0], only[0] = np.nan, np.nan, np.nan
    covered = np.array([0.0, 1.0, 1.0])
    silent = replace(
        table, depth=depth, reporting_only=only, table=replace(table.table, weights=weights, covered=covered)
    )
    result = replace(run.storms[0], depths={**run.storms[0].depths, "arithmetic": silent})
    broken = replace(run, storms=(result,))
    assert list(details(broken)[0].rows[0]) == ["west", "arithmetic", "no number", "–", "–", "–", "–"]
    assert summary(broken).rows[0][3] == "–"
    assert "–: the method has no number there." in summary(broken).notes


def test_the_covered_share_is_shown_where_it_is_not_whole() -> None:
    """A basin covered to 80 % has a column that says so."""
    run = make_run()
    idw = run.storms[0].depths["idw"]
    partly = replace(idw, table=replace(idw.table, covered=np.array([0.8, 1.0, 0.9])))
    result = replace(run.storms[0], depths={**run.storms[0].depths, "idw": partly})
    table = details(replace(run, storms=(result,)))[0]
    assert table.heads[-1] == "area covered"
    assert table.rows[2][-1].replace(NARROW_SPACE, " ") == "80.0 %"
    assert "area covered" not in details(run)[0].heads


def test_details_of_many_basins_are_shortened_and_say_so() -> None:
    """Of 51 rows the first dozen and the union are printed, with the file that has all."""
    run = make_run()
    squares = [shapely.box(k * 200, 0, k * 200 + 200, 1e4) for k in range(50)]
    ids = tuple(f"b{k:02d}" for k in range(50))
    basins = Basins(ids=ids, polygons=np.array(squares), crs="local").with_union()
    many = make_run(basins=basins)
    table = details(many)[0]
    assert len(table.rows) == 13 * 3
    assert table.notes[-1] == "13 of 51 rows are shown; all are in basin_means.csv."
    assert len(summary(many).rows) == 51
    assert len(details(run)[0].rows) == 9


def test_storms_beyond_the_first_few_are_in_the_file() -> None:
    """Six storms have six lines a basin in the summary, and detailed tables for four."""
    run = make_run(storms=tuple(f"S{k}" for k in range(6)))
    assert len(summary(run).rows) == 18
    tables = details(run)
    assert len(tables) == 4
    assert tables[-1].notes[-1] == "2 more storms are in basin_means.csv."
