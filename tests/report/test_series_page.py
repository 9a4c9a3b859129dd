from __future__ import annotations

import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from report.markup import Page, check_page
from report.series_run import four_days, four_years, make_series_run, read_by_chunks, widened

from basinrain.notes import Note
from basinrain.report import render_series
from basinrain.results_common import CAUTION

SCRIPT = "<script>alert(1)</script>"


@pytest.fixture(scope="module")
def html() -> str:
    """Return the page of four years."""
    return render_series(four_years())


def test_the_page_holds_everything_in_order(html: str) -> None:
    """From the run in short to the job, as a reviewer reads."""
    text = Page(html).text
    places = [
        text.index(words)
        for words in (
            "2027-01-01 00:00 to 2031-01-01 00:00",
            CAUTION[:40],
            "Without a single gauge the long-term mean",
            "Mean annual depth, mm, by averaging method and policy for gaps",
            "What the series of basin union rest on",
            "Gauges came into service once",
            "Changes of the network",
            "3 gauges were left out, one at a time",
            "Change of the mean of basin union without each gauge, %",
            "A water year begins with October",
            "Water years of basin union: depth in mm",
            "Means of the complete months of basin union",
            "Both are as they were found: none is multiplied",
            "Greatest depths of basin union by thiessen",
            "Storms were sought in the series of basin union",
            "Largest storms of basin union",
            "Marks of a value",
            "Monthly Weather Review 39",
            "checks were made",
            "Files beside this page",
            "Input files and their SHA-256",
            "series.water_year = 10",
        )
    ]
    assert places == sorted(places)


def test_the_page_is_whole_and_described(html: str) -> None:
    """No script, nothing fetched, ids unique, links arriving, figures valid, tables with captions and heads."""
    check_page(html, figures=1 + 1 + 1 + 2 + 4)


def test_a_repeat_is_identical(html: str) -> None:
    """Letter for letter."""
    assert render_series(four_years()) == html


def test_names_stay_text(tmp_path: Path) -> None:
    """Markup in ids and notes is shown, not obeyed."""
    run = make_series_run(tmp_path, np.array([[1, 2, 3], [4, np.nan, 6]]), names=(f"A{SCRIPT}", "B&B", "$a_b$"))
    basins = replace(run.basins, ids=("we<b>st", "</style></svg>", "union"))
    run = replace(run, basins=basins, notes=(Note(code="far-gauge", text=SCRIPT),))
    page = render_series(run)
    assert SCRIPT not in page
    assert "&lt;script&gt;" in page
    check_page(page, figures=1 + 1 + 2 + 1)


def test_no_half_of_the_page_breaks_on_a_short_or_empty_record(tmp_path: Path) -> None:
    """One step; a dry record; steps of months; one value in forty days."""
    almost = np.full((40, 3), np.nan)
    almost[5, 0] = 3.0
    runs = {
        "one": make_series_run(tmp_path / "one", [[1, 2, 3]], gaps=["reweight"]),
        "dry": make_series_run(tmp_path / "dry", np.zeros((40, 3))),
        "months": make_series_run(tmp_path / "months", np.ones((30, 3)), first="2027-01", step="1mo"),
        "almost": make_series_run(tmp_path / "almost", almost),
    }
    figures = {"one": 1 + 1, "dry": 1, "months": 3, "almost": 1}
    for name, run in runs.items():
        page = render_series(run)
        check_page(page, figures=figures[name])
        assert "nan" not in Page(page).text.replace("\u202f", " ").split(), name
        assert "NaT" not in page, name


def test_one_basin(tmp_path: Path) -> None:
    """Tables and figures are of it; no union is spoken of, nor any basin beside it."""
    run = make_series_run(tmp_path, [[1, 2, 3], [4, 5, 6]], basins=1, gaps=["reweight"], methods=["thiessen"])
    text = Page(render_series(run)).text
    assert "union" not in text.replace("storms.basin", "")
    assert "Change of the mean of basin west without each gauge, %" in text
    assert "any basin" not in text


def test_a_record_read_by_chunks_says_what_was_not_done() -> None:
    """Not screened, no gauge left out, reporting gauges not counted."""
    text = Page(render_series(read_by_chunks(four_years()))).text
    assert "The record was not screened: it was read chunk by chunk" in text
    assert "No gauge was left out in turn: the record was read chunk by chunk." in text
    assert "how many reported at every step was not counted" in text
    assert "checks were made" not in text


def test_inches(tmp_path: Path) -> None:
    """Two decimals: 25.4 mm on every gauge are 1.00 in."""
    run = make_series_run(tmp_path, [[25.4] * 3] * 3, gaps=["reweight"], more='depth_unit = "in"')
    text = Page(render_series(run)).text
    assert "depths in inches" in text
    assert "east thiessen 3.00 3" in text


def test_a_thousand_basins_stay_readable_and_quick() -> None:
    """Under 2 MB, within a few seconds, and of the series only single columns are read."""
    run = widened(four_years(), 1000)
    began = time.perf_counter()
    page = render_series(run)
    assert time.perf_counter() - began < 20
    assert len(page.encode()) < 2_000_000
    text = Page(page).text
    assert "the 988 others are in series_means.csv" in text
    assert "988 more are in greatest_depths.csv" in text
    check_page(page, figures=9)


def test_weights_by_ratios_are_told() -> None:
    """In the section on how the values came about."""
    run = four_days()
    text = Page(render_series(replace(run, setup=replace(run.setup, ratios=True)))).text
    assert "Ratios: weights are given to the ratios of depths to the gauges' normals" in text
