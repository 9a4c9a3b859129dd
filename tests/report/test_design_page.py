from __future__ import annotations

import re
import time
from dataclasses import replace
from pathlib import Path

import pytest
import shapely
from report.design_run import POINTS, bare, from_record, make_design, two_halves, two_points, two_storms
from report.markup import Page, check_page

from basinrain.notes import Note
from basinrain.report import render_design
from basinrain.results_design import DesignRun

SCRIPT = "<script>alert(1)</script>"


@pytest.fixture(scope="module")
def html() -> str:
    """Return the page of the two halves."""
    return render_design(two_halves())


def headings(html: str) -> list[str]:
    """Return the numbered headings of a page."""
    return re.findall(r"<h2>(\d .*?)</h2>", html)


def test_the_page_holds_everything_in_order(html: str) -> None:
    """The caution before all else, then what was asked, and the chain as a reviewer goes along it."""
    text = Page(html).text
    places = [
        text.index(words)
        for words in (
            "Inputs for the judgement of a licensed engineer, not a design.",
            "invented table; dated 2031",
            "Points of interest",
            "None of the checks raised a warning.",
            "Areal depth = point depth × interval factor × uplift × areal reduction",
            "ford: from point depth to areal depth",
            "mouth: from point depth to areal depth",
            "the Gumbel reduced variate",
            "Area that decides",
            "Outside their region, for comparison only",
            "Scientific Paper 36",
            "The formula is from memory.",
            "mouth, 24 h: design hyetographs of basin",
            "mouth: depth of the basins by duration and frequency",
            "mouth: peaks at AEP 0.1",
            "What is printed sums to the printed total.",
            "Point depths of the source",
            "Weights of the depth points (thiessen)",
            "Files beside this page",
            "Input files and their SHA-256",
            "design.uplift.factor = 1.1",
        )
    ]
    assert places == sorted(places)


def test_the_page_is_whole_and_described(html: str) -> None:
    """No script, nothing fetched, ids unique, links arriving, figures valid, tables with captions and heads."""
    check_page(html, figures=2 + 6)
    check_page(render_design(bare()), figures=1)
    check_page(render_design(from_record()), figures=2 + 4 + 2)
    check_page(render_design(two_storms()), figures=1 + 2)


@pytest.mark.parametrize(
    ("run", "titles"),
    [
        (
            two_halves,
            [
                "1 From point depth to areal depth",
                "2 Areal reduction",
                "3 Temporal patterns",
                "4 Hyetographs",
                "5 Point depths",
                "6 Files, inputs and job",
            ],
        ),
        (
            bare,
            [
                "1 From point depth to areal depth",
                "2 Temporal patterns",
                "3 Hyetographs",
                "4 Point depths",
                "5 Files, inputs and job",
            ],
        ),
        (
            from_record,
            [
                "1 From point depth to areal depth",
                "2 Temporal patterns",
                "3 Hyetographs",
                "4 Depths from the record",
                "5 Files, inputs and job",
            ],
        ),
        (
            two_storms,
            [
                "1 From point depth to areal depth",
                "2 Temporal patterns",
                "3 Hyetographs",
                "4 Point depths",
                "5 How rare observed storms were",
                "6 Files, inputs and job",
            ],
        ),
    ],
)
def test_sections_that_do_not_apply_are_absent(run: object, titles: list[str]) -> None:
    """The others are numbered without a gap, and the contents are theirs."""
    assert callable(run)
    html = render_design(run())
    assert headings(html) == titles
    assert re.findall(r'<li><a href="#\w+">(.*?)</a></li>', html) == ["Warnings", *titles]


def test_a_comparison_alone_has_its_section(tmp_path: Path) -> None:
    """Although nothing is reduced."""
    run = make_design(tmp_path, design__areal_reduction={"method": "none", "compare": ["leclerc-schaake"]})
    html = render_design(run)
    assert "2 Areal reduction" in headings(html)
    assert "The design has no areal reduction." in html


def test_a_repeat_is_identical(html: str) -> None:
    """Letter for letter."""
    assert render_design(two_halves()) == html


def test_names_stay_text(tmp_path: Path) -> None:
    """Markup in names, sources and notes is shown, not obeyed."""
    squares = {f"w{SCRIPT}": shapely.box(0, 0, 5, 10), "B&B": shapely.box(5, 0, 10, 10)}
    run = make_design(
        tmp_path,
        squares=squares,
        depths=two_points((f"P{SCRIPT}", "$a_b$")),
        design__depths__source=SCRIPT,
        design__uplift={"factor": 1.1, "source": f"</style>{SCRIPT}", "horizon": SCRIPT},
        design__point=[{"name": f"ford{SCRIPT}", "basins": [f"w{SCRIPT}"]}, {"name": "R&D", "basins": list(squares)}],
        design__pattern=[{"name": f"</svg>{SCRIPT}", "shape": "uniform"}],
    )
    page = render_design(replace(run, name=SCRIPT, notes=(Note(code="far-gauge", text=SCRIPT),)))
    assert SCRIPT not in page
    assert "&lt;script&gt;" in page
    check_page(page, figures=2 + 6)


def test_inches_and_square_miles(tmp_path: Path) -> None:
    """60 mm are 2.36 in; 50 square units are miles."""
    run = make_design(
        tmp_path, job__depth_unit="in", job__area_unit="mi2", design__areal_reduction=None, design__uplift=None
    )
    text = Page(render_design(run)).text
    assert "depths in inches, areas in mi²" in text
    assert "AEP 0.1 (1 in 10) 1 h 1.1811 1 1 1 1.18 6 h 2.3622 1 1 1 2.36" in text


def test_no_number_is_nan(tmp_path: Path) -> None:
    """What is not known is a dash."""
    runs = (two_halves(), bare(), from_record(), two_storms())
    for run in runs:
        words = Page(render_design(run)).text.replace("\u202f", " ").split()
        assert "nan" not in words
        assert "NaT" not in words


def test_warnings_and_remarks() -> None:
    """Warnings at the head of the page, remarks at its end."""
    run = replace(
        bare(), notes=(Note(code="not-reduced", text="Over 100 mi2."), Note(code="climate", level="info", text="None."))
    )
    text = Page(render_design(run)).text
    assert text.index("Not reduced Over 100 mi2.") < text.index("1 From point depth to areal depth Areal depth")
    assert text.index("Remarks of the run Climate None.") > text.index("Files, inputs and job")


def _large(folder: Path) -> DesignRun:
    strips = {f"B{k:03d}": shapely.box(k / 10, 0, (k + 1) / 10, 10) for k in range(100)}
    points = [{"name": f"P{k:02d}", "basins": list(strips)[: 5 * k + 5]} for k in range(20)]
    return make_design(
        folder,
        squares=strips,
        design__return_periods=[2, 3, 4, 5, 6, 7, 8, 9, 10],
        design__durations=[f"{hours}h" for hours in (1, 2, 3, 4, 6, 8, 12, 24)],
        design__point=points,
        design__sub_basins="own-depth",
    )


def test_a_hundred_basins_and_twenty_points_stay_readable_and_quick(tmp_path: Path) -> None:
    """Under 2 MB, within some seconds; every list that is shortened says where the rest is."""
    run = _large(tmp_path)
    began = time.perf_counter()
    page = render_design(run)
    assert time.perf_counter() - began < 20
    assert len(page.encode()) < 2_000_000
    check_page(page, figures=4 + 6)
    text = Page(page).text
    for file in ("design_depths.csv", "design_storms.csv", "reductions_compared.csv"):
        assert (
            "Shown here: the first 4 of 20 points of interest, 6 of 9 frequencies and 6 of 8 durations; the others "
            f"are in {file}." in text
        )
    assert "B000, B001" in text
    assert "and 48 more" in text


def test_the_page_of_the_job_with_points_as_written(tmp_path: Path) -> None:
    """The page is among the files of the run, as it is rendered."""
    run = make_design(tmp_path / "job", design__point=POINTS)
    folder = run.write(tmp_path / "out")
    assert (folder / "report.html").read_text(encoding="utf-8") == render_design(run)
