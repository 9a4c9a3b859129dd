from __future__ import annotations

import itertools
import re
import time
from dataclasses import replace

import numpy as np
import pytest
import shapely
from report.comparison_pieces import make_comparison
from report.markup import Page, svg_texts, svg_tree
from report.screen_pieces import make_screen_run
from report.small_run import make_run

from basinrain.basins import Basins
from basinrain.ground import Plane, equal_area_plane
from basinrain.notes import Note
from basinrain.report import render_report
from basinrain.results import StormRun
from basinrain.results_common import CAUTION

SCRIPT = "<script>alert(1)</script>"
NASTY = (f"A{SCRIPT}", 'R&D "x"', "$a_b$", "雨<b>", "</style></svg>", "_F' onload='x")


def _figures(html: str) -> list[str]:
    return re.findall(r"<svg .*?</svg>", html, flags=re.DOTALL)


def test_the_page_says_what_a_reviewer_looks_for(html: str) -> None:
    """Title, cautions, warnings and the eight sections, in order."""
    page = Page(html)
    text = page.text
    places = [
        text.index(words)
        for words in (
            "Two squares",
            "2 basins, and their union",
            CAUTION[:60],
            "Gauge A has 62 % of the weight in basin west.",
            "Basin mean depth by method",
            "Basins, Thiessen cells with every gauge",
            "Weights are those of each method",
            "Bars are depths over their intervals",
            "The gauges in the working plane",
            "Quill: estimates, mm",
            "Local plane",
            "Input files and their SHA-256",
            "The job as resolved",
        )
    ]
    assert places == sorted(places)
    assert CAUTION in text


def test_two_renders_are_identical(run: StormRun, html: str) -> None:
    """The same run gives the same page, letter for letter."""
    assert render_report(run) == html


def test_names_from_files_stay_text() -> None:
    """Markup in names of gauges, basins, storms, notes and files is shown, not obeyed, in figures too."""
    note = Note(code="far-gauge", text=f"Far {SCRIPT}", basin=SCRIPT)
    run = make_run(
        names=NASTY, basin_names=(SCRIPT, "b & <i>"), job=f"Job {SCRIPT}", storms=(f"S {SCRIPT}",), notes=(note,)
    )
    html = render_report(replace(run, inputs={SCRIPT: "0"}, facts={"grid": SCRIPT}, settings={"job": {"name": SCRIPT}}))
    page = Page(html)
    assert not page.named("script", "b")
    assert "<script" not in html.lower()
    assert not [a for _, attributes in page.tags for a in attributes if a.startswith("on")]
    assert page.text.count("alert(1)") > 20
    drawn = [text for svg in _figures(html) for text in svg_texts(svg)]
    for name in ("$a_b$", 'R&D "x"', "雨<b>", "</style></svg>"):
        assert name in drawn


def test_nothing_is_fetched_and_nothing_runs(html: str) -> None:
    """No script, no link, no image, no font, no address of another place."""
    page = Page(html)
    assert not page.named("script", "link", "img", "iframe", "object", "base", "form")
    assert not re.search(r"@import|@font-face|javascript:", html)
    assert all(
        value.startswith("#")
        for _, a in page.tags
        for key in ("href", "src", "xlink:href")
        if (value := a.get(key) or "#")
    )
    addresses = set(re.findall(r"https?://[^\"' <]+", html))
    assert addresses == {"http://www.w3.org/2000/svg"}


def test_ids_are_unique_and_links_arrive() -> None:
    """Every id stands once, with several storms too, and every link points to one."""
    page = Page(render_report(make_run(storms=("Quill", "Sedge"))))
    ids = [a["id"] for _, a in page.tags if "id" in a]
    assert len(ids) > 30
    assert len(ids) == len(set(ids))
    links = {(a.get("href") or "#")[1:] for a in page.named("a")}
    assert len(links) == 11
    assert links <= set(ids)


def test_every_figure_is_valid_and_described(html: str) -> None:
    """One map, three panels of weights, three hyetographs: well-formed, with role, title, description and caption."""
    figures = _figures(html)
    assert len(figures) == 7
    for svg in figures:
        root = svg_tree(svg)
        assert root.attrib["role"] == "img"
        assert all((root[k].text or "").strip() for k in (0, 1))
    assert len(Page(html).named("figcaption")) == 7


def test_headings_descend_one_level_at_a_time(html: str) -> None:
    """One h1, and no level is skipped."""
    levels = [int(tag[1]) for tag, _ in Page(html).tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels.count(1) == 1
    assert all(b <= a + 1 for a, b in itertools.pairwise(levels))


def test_tables_have_captions_and_scoped_heads(html: str) -> None:
    """Every head says what it heads, and the page says its language."""
    page = Page(html)
    assert page.named("html") == [{"lang": "en"}]
    assert len(page.named("table")) == len(page.named("caption")) > 10
    assert {a.get("scope") for a in page.named("th")} == {"col", "row", "colgroup", "rowgroup"}
    assert all(a.get("aria-label") for a in page.named("div") if a.get("role") == "region")


def test_text_stands_out_from_its_ground() -> None:
    """Every text colour of the style has a contrast of 4.5 to white at least (WCAG 2.2, success criterion 1.4.3)."""

    def luminance(colour: str) -> float:
        parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
        linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    for colour in ("#1d2328", "#4a545b", "#8a4300", "#164a7a"):
        assert 1.05 / (luminance(colour) + 0.05) >= 4.5


def test_screening_and_edits_stand_in_short() -> None:
    """Section 8: counts by check, what the job decided, and its edits whole."""
    screened = make_screen_run()
    run = replace(make_run(), screening=screened.screening, edit_rows=screened.edit_rows)
    text = Page(render_report(run)).text
    places = [
        text.index(words)
        for words in (
            "could not be; basinrain screen tells",
            "Findings by check and by what the job says of them",
            "Settled by the job: 2 findings",
            "Edits of the job, all of them",
            "9 Ground and methods Plane",
        )
    ]
    assert places == sorted(places)


def test_the_choice_of_the_infill_method_is_recorded(run: StormRun) -> None:
    """Where leave-one-out chose, section 6 has the reason and the scores; else it speaks of neither."""
    comparison = make_comparison()
    html = render_report(replace(run, comparison=comparison))
    assert "Why this infill method" in html
    assert comparison.reason in Page(html).text
    assert "Scores over rainfall days" in html
    assert "Why this infill method" not in render_report(run)


def test_shares_on_infill_stand_in_their_own_section(html: str) -> None:
    """Section 7 begins with the share of every mean that rests on infilled values."""
    text = Page(html).text
    start = text.index("7 How much rests on infill Share of the basin means that rests on infilled values")
    assert text.index("Nothing was infilled in this storm, so no infill method moves its means.") > start


def test_a_storm_of_one_total_has_no_hyetograph_but_a_report() -> None:
    """The page says why there is none."""
    html = render_report(make_run(one_step=True, depth_unit="in"))
    assert "This storm is one total without steps: it has no hyetograph." in html
    assert "hyetograph-1-1" not in html
    assert "depths in inches" in html


def test_no_warnings_is_said() -> None:
    """An empty list could be a fault; a sentence is not."""
    assert "None of the checks raised a warning." in render_report(make_run())


def test_remarks_are_no_warnings() -> None:
    """A note of level info stands among the remarks of section 7."""
    html = render_report(make_run(notes=(Note(code="window-widened", text="Widened.", level="info"),)))
    assert html.index("Remarks of the run") < html.index("Widened.")
    assert "None of the checks raised a warning." in html


def test_control_characters_do_not_break_the_page() -> None:
    """A name with a bell, or with what is no character, still gives a page that can be written and read."""
    html = render_report(make_run(names=("A\x07", "B\x00", "C\ufffe", "D", "E", "F")))
    html.encode("utf-8")
    assert "\x07" not in html
    assert "\x00" not in html
    assert len([svg_tree(svg) for svg in _figures(html)]) == 7


def test_a_single_basin_has_no_union() -> None:
    """One basin: one row, one panel, and no union is spoken of."""
    page = Page(render_report(make_run(basin_names=("west",))))
    assert "1 basin; 100.0 km²" in page.text
    assert "and their union" not in page.text


@pytest.mark.parametrize("methods", [("thiessen",), ("idw", "thiessen")])
def test_other_sets_of_methods(methods: tuple[str, ...]) -> None:
    """With one method there is no spread and no difference, which are dashes."""
    page = Page(render_report(make_run(methods=methods)))
    assert f"Averages {', '.join(methods)}" in page.text


def test_a_large_run_stays_small() -> None:
    """100 basins, 2 storms: shortened, said so, a page of under 2 MB in a few seconds."""
    squares = [shapely.box(k * 200, 0, k * 200 + 200, 1e4) for k in range(100)]
    basins = Basins(ids=tuple(f"b{k:02d}" for k in range(100)), polygons=np.array(squares), crs="local").with_union()
    run = make_run(basins=basins, storms=("Quill", "Sedge"))
    began = time.perf_counter()
    html = render_report(run)
    assert time.perf_counter() - began < 20
    assert len(html) < 2e6
    assert "Shown here: the first 12 basins and the union of 101 rows. The others are in weights.csv." in html
    assert len(_figures(html)) == 1 + 13 + 2 * 13


def test_a_plane_on_the_map() -> None:
    """On a map the arrow to true north is there and the caption speaks of it."""
    plane = Plane(equal_area_plane(10, 50, 12, 51), "Lambert azimuthal equal-area plane", 1e-4)
    assert "The arrow points to true north." in render_report(make_run(plane=plane))
