from __future__ import annotations

from dataclasses import replace

import numpy as np
from report.small_run import make_run
from report.test_effect_figure import make_effect

from basinrain.report.effect_list import series_table, spread_table, storm_effects, totals_table
from basinrain.report.words import NARROW_SPACE
from basinrain.series_check import SeriesCheck, series_check

BASINS = [(0, "west"), (1, "east")]
EFFECT = make_effect([[9.0, 20.0], [10.0, 20.0], [11.0, np.nan]])


def _plain(row: tuple[str, ...]) -> list[str]:
    return [cell.replace(NARROW_SPACE, " ") for cell in row]


def test_spread_by_hand() -> None:
    """West: 9, 10, 11 mm: 2 mm are 20 % of 10. East: two equal numbers, 0 %."""
    rows = [_plain(row) for row in spread_table(EFFECT, BASINS, depth_unit="mm", storm="Quill").rows]
    assert rows[0] == ["west", "thiessen", "20.0 %", "10.0", "9.0", "nearest-gauge", "11.0", "normal-ratio", "20.0 %"]
    assert rows[1][3:] == ["20.0", "20.0", "nearest-gauge", "20.0", "nearest-gauge", "0.0 %"]


def test_every_infill_method_has_a_line() -> None:
    """The job's own is marked in words; no number is a dash with its reason."""
    refused = replace(EFFECT, refused={("thiessen", "normal-ratio"): "gauges stayed without a depth"})
    table = totals_table(refused, "thiessen", BASINS, depth_unit="mm", storm="Quill")
    assert [row[0] for row in table.rows] == list(EFFECT.methods)
    assert [row[1] for row in table.rows] == ["", "the job's own", ""]
    assert table.rows[2][2:4] == ("11.0", "–")
    assert "–: gauges stayed without a depth." in table.notes


def test_the_series_before_and_after() -> None:
    """West by arithmetic is 0, 1.5, 6.5, 3.5, 0.5, 0 after infill: 4 of 6 steps wet, the largest six 2.0 mm each.

    One of its gauges has 5 steps of its own, which a sentence explains.
    """
    run = make_run()
    result = run.storms[0]
    check = series_check(result.completed.record, result.depths)
    table = series_table(check, ["west", "east", "union"], depth_unit="mm", storm="Quill")
    assert table is not None
    row = _plain(table.rows[0])
    assert row[:5] == ["west", "arithmetic", "6", "5", "66.7 %"]
    assert row[7] == "2.0"
    depths = np.array([0, 1.5, 6.5, 3.5, 0.5, 0])
    assert row[10] == f"{depths.var(ddof=1):.2f}"
    assert any("silent over the peak" in note for note in table.notes)
    whole = SeriesCheck(figures=tuple(replace(figures, steps=6) for figures in check.figures))
    told = series_table(whole, ["west"], depth_unit="mm", storm="Quill")
    assert told is not None
    assert not any("silent" in note for note in told.notes)
    assert [r[0] for r in table.rows] == ["west"] * 3 + ["east"] * 3 + ["union"] * 3


def test_a_series_without_figures_has_no_table() -> None:
    """Nothing was checked."""
    assert series_table(SeriesCheck(figures=()), ["west"], depth_unit="mm", storm="Quill") is None


def test_a_storm_without_infill_says_so() -> None:
    """No effect: one sentence, no figure."""
    (storm,) = storm_effects(make_run())
    assert storm.sentences == ("Nothing was infilled in this storm, so no infill method moves its means.",)
    assert storm.pictures == ()


def test_a_storm_with_an_effect_has_figure_and_tables() -> None:
    """Methods that cannot run are named with the reason that they share."""
    run = make_run()
    effect = replace(
        make_effect([[9.0, 20.0, 14.0], [10.0, 20.0, 15.0], [11.0, 21.0, 16.0]]),
        skipped={"regression": "no relations", "ratio-regression": "no relations"},
    )
    effect = replace(
        effect,
        totals=dict.fromkeys(run.methods, effect.totals["thiessen"]),
        share_infilled=dict.fromkeys(run.methods, effect.share_infilled["thiessen"]),
    )
    result = replace(run.storms[0], effect=effect)
    (storm,) = storm_effects(replace(run, storms=(result,)))
    assert "Not possible here: regression, ratio-regression (no relations)." in storm.sentences
    assert [picture.name for picture in storm.pictures] == ["effect-1"]
    assert len(storm.tables) == 2
