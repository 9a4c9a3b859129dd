from __future__ import annotations

import re
import time
from dataclasses import replace

import numpy as np
import pytest
from report.markup import Page, check_page, svg_tree
from report.screen_pieces import make_findings, make_monthly, make_screen_run

from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.report import render_screening
from basinrain.screening import Screening

SCRIPT = "<script>alert(1)</script>"


@pytest.fixture(scope="module")
def html() -> str:
    """Return the page of the small run."""
    note = Note(code="mixed-reading-hours", text="Two hours.", level="info")
    return render_screening(make_screen_run(notes=(note,)))


def test_the_page_holds_everything_in_order(html: str) -> None:
    """Record, counts, caution, availability, findings, edits, curves, tests, checks, inputs."""
    text = Page(html).text
    places = [
        text.index(words)
        for words in (
            "Two squares",
            "1 month; 360 steps",
            "Findings by severity and by what the job says of them",
            "A finding is a reason to look, not a proof",
            "Two hours.",
            "The record, a strip a gauge.",
            "What there is of every gauge, in steps",
            "Erroneous: 1 open finding, cannot be right",
            "missing-code: 1 finding",
            "For the job",
            "Settled by the job: 2 findings",
            "Edits of the job, all of them",
            "1 breaks at the level of 1 %",
            "Tests of homogeneity",
            "Checks made",
            "Checks that could not be made",
            "Input files and their SHA-256",
            "The job as resolved",
        )
    ]
    assert places == sorted(places)


def test_the_page_is_whole_and_described(html: str) -> None:
    """No script, nothing fetched, ids unique, links arriving, figures valid, tables with captions and heads."""
    check_page(html, figures=2)


def test_a_repeat_is_identical(html: str) -> None:
    """Letter for letter."""
    note = Note(code="mixed-reading-hours", text="Two hours.", level="info")
    assert render_screening(make_screen_run(notes=(note,))) == html


def test_nothing_found_is_said() -> None:
    """A short record of one gauge, no findings, no edits, no years: sentences stand where tables would."""
    text = Page(
        render_screening(make_screen_run(make_monthly(("A",), years=1), screening=Screening(), edit_rows=()))
    ).text
    for words in (
        "No check found anything. That does not prove the record right.",
        "The job edits nothing.",
        "No gauge has years and neighbours enough for a double-mass curve.",
        "No gauge has the 20 years that the tests take.",
        "The run raised no warning besides the findings.",
    ):
        assert words in text


def test_names_and_evidence_stay_text() -> None:
    """Markup in ids, evidence, reasons and file names is shown, not obeyed."""
    ids = (f"A{SCRIPT}", "B&B", "$a_b$", "雨<b>", "</style></svg>", "_F' onload='x")
    run = make_screen_run(make_monthly(ids), name=SCRIPT)
    findings = tuple(replace(f, gauge=ids[0], evidence=SCRIPT, action=SCRIPT) for f in make_findings())
    rows = tuple({**row, "reason": SCRIPT, "by": SCRIPT} for row in run.edit_rows)
    run = replace(run, screening=replace(run.screening, findings=findings), edit_rows=rows, inputs={SCRIPT: "0"})
    html = render_screening(run)
    page = Page(html)
    assert not page.named("script", "b")
    assert "<script" not in html.lower()
    assert not [a for _, attributes in page.tags for a in attributes if a.startswith("on")]
    assert page.text.count("alert(1)") > 20
    check_page(html, figures=2)


def test_storm_totals_without_times() -> None:
    """There is no availability figure, and the page says what the record is."""
    nat = np.array(["NaT"] * 2, dtype="datetime64[s]")
    status = np.zeros((2, 2), dtype=np.uint8)
    record = RainRecord(("A", "B"), nat, nat, np.ones((2, 2)), status, step="storm", labels=("Quill", "Sedge"))
    html = render_screening(make_screen_run(record, screening=Screening(), edit_rows=()))
    assert "2 storm totals without times" in html
    assert "<svg" not in html


def test_a_large_record_stays_small() -> None:
    """100 gauges with thousands of findings: a page of under 2 MB in some seconds, and the edit log still whole."""
    ids = tuple(f"G{k:03d}" for k in range(100))
    record = make_monthly(ids)
    run = make_screen_run(record)
    many = tuple(replace(f, gauge=ids[k % 100]) for k in range(600) for f in make_findings()[:3])
    run = replace(run, screening=replace(run.screening, findings=many), edit_rows=run.edit_rows[:1] * 300)
    began = time.perf_counter()
    html = render_screening(run)
    assert time.perf_counter() - began < 20
    assert len(html) < 2e6
    assert html.count("Shown: 25 of 600. All are in findings.csv.") == 2
    assert html.count("The keys of 575 more are in findings.csv.") == 2
    assert html.count("logger set to 0.1 mm") == 300
    for svg in re.findall(r"<svg .*?</svg>", html, flags=re.DOTALL):
        svg_tree(svg)


def test_inches(html: str) -> None:
    """Edits and axes are in the job's unit; the evidence says that it is in mm."""
    inches = render_screening(make_screen_run(depth_unit="in"))
    assert "depths in inches" in inches
    assert "cumulative at the gauge, inches" in inches
    assert "depths in the evidence are in mm" in inches
    assert "cumulative at the gauge, mm" in html
