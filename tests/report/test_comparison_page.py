from __future__ import annotations

import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from report.comparison_pieces import make_comparison, make_network
from report.infill_pieces import make_infill_run, run_three_gauges
from report.markup import Page, check_page

from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import compare_infill
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.report import render_comparison
from basinrain.report.words import NARROW_SPACE

SCRIPT = "<script>alert(1)</script>"


@pytest.fixture(scope="module")
def html() -> str:
    """Return the page of the small run."""
    return render_comparison(make_infill_run())


def test_the_page_holds_everything_in_order(html: str) -> None:
    """Choice, caution, figures, scores, rules, formulas, map, gauges, completed record, screening, inputs."""
    text = Page(html).text
    places = [
        text.index(words)
        for words in (
            "station-average is taken: it is the simplest",
            "Gauge sites are not the basin: the scores",
            "Estimated against observed by station-average",
            "Root mean square error of each method over the same cases",
            "Scores over rainfall days, all gauges together",
            "Scores step by step",
            "Methods that could not take part",
            "2 Rules of the comparison A gauge is taken to be silent",
            "Gauge sites are not the basin. ",
            "Paulhus and Kohler",
            "Root mean square error at every gauge",
            "Scores by gauge of station-average",
            "values were infilled",
            "The completed record; depths in mm",
            "Gauge F stays without a depth at 6 steps: no donor.",
            "No check found anything.",
            "Input files and their SHA-256",
        )
    ]
    assert places == sorted(places)


def test_the_page_is_whole_and_described(html: str) -> None:
    """No script, nothing fetched, ids unique, links arriving, figures valid, tables with captions and heads."""
    check_page(html, figures=3)


def test_a_repeat_is_identical(html: str) -> None:
    """Letter for letter."""
    assert render_comparison(make_infill_run()) == html


def test_what_was_infilled_is_told_by_hand(html: str) -> None:
    """Seven of 36 values, 19.4 %, of a step and of the storm."""
    assert (
        "7 values were infilled (19.4 % of those in service) by station-average at the scale of the step and storm"
        in (Page(html).text)
    )


def test_names_stay_text() -> None:
    """Markup in ids, reasons and notes is shown, not obeyed."""
    names = (f"A{SCRIPT}", "B&B", "$a_b$", "雨<b>", "</style></svg>", "_F' onload='x")
    comparison = make_comparison(names, skipped={"normal-ratio": SCRIPT})
    note = Note(code="few-cases", text=SCRIPT)
    run = make_infill_run(replace(comparison, reason=SCRIPT, notes=(note,)), names=names, job=SCRIPT, notes=(note,))
    html = render_comparison(run)
    page = Page(html)
    assert not page.named("script", "b")
    assert not [a for _, attributes in page.tags for a in attributes if a.startswith("on")]
    assert page.text.count("alert(1)") >= 8
    check_page(html, figures=3)


def test_warnings_stand_apart_from_the_rules() -> None:
    """A warning is among the warnings; what the comparison remarks stands once, among its rules."""
    comparison = make_comparison()
    warning = Note(code="few-cases", text="On 12 cases only.")
    run = make_infill_run(comparison, notes=(warning, *comparison.notes))
    text = Page(render_comparison(run)).text
    assert text.index("On 12 cases only.") < text.index("1 Scores Estimated")
    assert text.count("Gauge sites are not the basin.") == 1


@pytest.mark.parametrize(
    ("settings", "label"),
    [
        ({"method": "inverse-distance", "power": 1.0}, "inverse-distance (power 1)"),
        ({"method": "nearest-gauge"}, "nearest-gauge"),
    ],
)
def test_the_method_that_infilled_is_called_as_in_the_tables(settings: dict[str, object], label: str) -> None:
    """With its power, which tells it from the candidate of another power."""
    page = Page(render_comparison(replace(make_infill_run(), settings={"infill": settings})))
    assert f"Infilled by {label}" in page.text


def test_inches() -> None:
    """Errors are in the job's unit."""
    html = render_comparison(make_infill_run(depth_unit="in"))
    assert "errors in inches" in html


def test_nothing_infilled_is_said() -> None:
    """A record without gaps."""
    run = make_infill_run()
    record = run.completed.record
    full = RainRecord.from_depths(
        record.gauges, record.starts, record.ends, np.ones_like(record.depth), step="1h", zone="+02:00"
    )
    html = render_comparison(replace(run, completed=replace(run.completed, record=full, estimates=(), notes=())))
    assert "Nothing was infilled." in html
    assert "Left without a depth" not in html


def _rests(html: str) -> str:
    text = Page(html).text.replace(NARROW_SPACE, " ")
    begin = text.rindex("5 How much rests on infill")
    return text[begin : text.index("6 Is the record fit to use", begin)]


def test_how_much_rests_on_infill(tmp_path: Path) -> None:
    """By hand: the mean of A's 26 and B's 28 mm is 27; 3 mm of it, 11.1 %, are half of B's estimate of 6 mm.

    By the nearest gauge B has A's 5 mm, and the mean is 26.5 mm. The rest are the numbers of infill_effect.csv.
    """
    run = run_three_gauges(tmp_path, gap=True)
    section = _rests(render_comparison(run))
    assert "All shares are in infill_effect.csv." in section
    assert "The record was completed anew by" in section
    assert "storm" not in section
    frame = pd.read_csv(run.write(tmp_path / "output") / "infill_effect.csv")
    means = frame[frame["method"] == "arithmetic"].set_index("infill_method")
    assert means.loc["station-average", "depth"] == pytest.approx(27)
    assert means.loc["nearest-gauge", "depth"] == pytest.approx(26.5)
    share = frame[frame["infill_method"] == "station-average"].set_index("method")["share_infilled"]
    printed = " ".join(f"{100 * share[method]:.1f} %" for method in run.methods)
    assert printed.startswith("11.1 %")
    basin = run.basins.ids[0]
    assert f"{basin} {printed}" in section
    for method, row in means.iterrows():
        own = "the job's own " if method == "station-average" else ""
        assert f" {method} {own}{row['depth']:.1f} {row['gaps_left']}" in section
    for method, rows in frame.groupby("method"):
        assert f"{rows['depth'].min():.1f}" in section, method
        assert f"{rows['depth'].max():.1f}" in section, method


def test_a_record_without_gaps_rests_on_no_infill(tmp_path: Path) -> None:
    """Said in two sentences; no figure or table of other infill methods."""
    section = _rests(render_comparison(run_three_gauges(tmp_path, gap=False)))
    assert "No basin mean rests on infilled values." in section
    assert "Nothing was infilled in the record, so no infill method moves its means." in section
    assert "by infill method" not in section


def test_a_real_comparison_of_forty_gauges() -> None:
    """Methods of the registry on seeded days: the page has their errors, and is drawn in some seconds."""
    ids = tuple(f"W{k:02d}" for k in range(40))
    network = make_network(ids)
    rng = np.random.default_rng(11)
    depth = np.round(rng.gamma(0.5, 12.0, (200, 1)) * rng.lognormal(0, 0.3, (200, 40)), 1)
    ends = np.datetime64("2031-01-01", "s") + np.arange(1, 201) * np.timedelta64(86400, "s")
    record = RainRecord.from_depths(ids, ends - 86400, ends, depth, step="1d")
    comparison = compare_infill(record, network, options=InfillOptions(method="inverse-distance"))
    run = replace(make_infill_run(comparison), network=network, record=record)
    began = time.perf_counter()
    html = render_comparison(run)
    assert time.perf_counter() - began < 20
    assert comparison.reason in Page(html).text
    check_page(html, figures=3)
