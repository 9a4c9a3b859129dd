"""The pages in a real browser: on screen, at the width of paper, and printed."""

from __future__ import annotations

import shutil
import subprocess
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import pytest
import shapely
from report.comparison_pieces import make_comparison, make_network
from report.design_run import from_record, make_design, two_points, two_storms
from report.infill_pieces import make_infill_run
from report.screen_pieces import make_monthly, make_screen_run
from report.series_run import four_years, make_series_run, widened
from report.small_run import make_run
from report.test_effect_figure import make_effect

from basinrain.notes import Note
from basinrain.report import render_comparison, render_design, render_report, render_screening, render_series

CHROMIUM = Path("/usr/bin/chromium")

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(not CHROMIUM.exists(), reason="needs Chromium at /usr/bin/chromium"),
]


NAMES = ("A<script>alert(1)</script>", "B&B", "C", "D", "E", "F")
NOTE = Note(code="far-gauge", text="Gauge E is far.")
LONG = tuple(f"Upper Wintermill Gauge No. {k:02d}" for k in range(40))


def _report() -> str:
    effect = make_effect([[9.0, 20.0, 14.0], [10.0, 20.0, 15.0], [11.0, 21.0, 16.0]])
    run = make_run(names=NAMES, storms=("Quill", "Sedge"), notes=(NOTE,))
    all_alike = dict.fromkeys(run.methods, effect.totals["thiessen"])
    effect = replace(effect, totals=all_alike, share_infilled=all_alike)
    screened = make_screen_run()
    storms = tuple(replace(result, effect=effect) for result in run.storms)
    return render_report(replace(run, storms=storms, screening=screened.screening, edit_rows=screened.edit_rows))


def _series() -> str:
    with TemporaryDirectory() as folder:
        run = make_series_run(
            Path(folder),
            methods=("arithmetic", "thiessen", "idw"),
            opened="2028-05-01",
            names=("A<script>alert(1)</script>", LONG[0], LONG[1]),
        )
    basins = replace(run.basins, ids=("Upper Wintermill above the weir at the old ford", "B&B", "union"))
    return render_series(replace(run, basins=basins, setup=replace(run.setup, basins=basins)))


def _design(patterns: int = 2) -> str:
    """Return a page with hostile and long names everywhere, and warnings."""
    squares = {f"w{NAMES[0]}": shapely.box(0, 0, 5, 10), LONG[0]: shapely.box(5, 0, 10, 10)}
    points = [{"name": f"Old weir {NAMES[0]}", "basins": [f"w{NAMES[0]}"]}, {"name": LONG[1], "basins": list(squares)}]
    with TemporaryDirectory() as folder:
        run = make_design(
            Path(folder),
            squares=squares,
            depths=two_points((f"P{NAMES[0]}", LONG[2])),
            design__depths__source="Wintermill Rainfall Atlas, volume 2, table 7 (invented)",
            design__sub_basins="own-depth",
            design__point=points,
            design__pattern=[
                {"name": f"{LONG[3 + k]}, late peak", "shape": "triangular", "peak": 0.3 + k / 10}
                for k in range(patterns)
            ],
        )
    return render_design(replace(run, notes=(*run.notes, NOTE)))


PAGES: dict[str, Callable[[], str]] = {
    "report": _report,
    "screening": lambda: render_screening(make_screen_run(notes=(NOTE,))),
    "screening of forty": lambda: render_screening(make_screen_run(make_monthly(LONG))),
    "comparison": lambda: render_comparison(make_infill_run(names=NAMES, notes=(NOTE,))),
    "comparison of forty": lambda: render_comparison(
        replace(make_infill_run(make_comparison(LONG, cases=200)), network=make_network(LONG))
    ),
    "design": _design,
    "design of six patterns": lambda: _design(6),
    "design from the record": lambda: render_design(from_record()),
    "design with storms": lambda: render_design(two_storms()),
    "series": _series,
    "series of a thousand": lambda: render_series(widened(four_years(), 1000)),
}


@pytest.fixture(scope="module", params=PAGES)
def file(tmp_path_factory: pytest.TempPathFactory, request: pytest.FixtureRequest) -> Path:
    """Return a page, with a hostile name, as a file in a folder with spaces and non-ASCII letters."""
    path = tmp_path_factory.mktemp("Bericht über Regen") / "report.html"
    path.write_text(PAGES[request.param](), encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    """Start one browser for the module."""
    playwright = pytest.importorskip("playwright.sync_api")
    quiet = [
        "--no-sandbox",
        "--disable-gpu",
        "--disable-background-networking",
        "--disable-component-update",
        "--disable-sync",
    ]
    with playwright.sync_playwright() as driver:
        opened = driver.chromium.launch(executable_path=str(CHROMIUM), args=[f"--{word}" for word in quiet])
        yield opened
        opened.close()


@pytest.fixture
def page(browser: Any, file: Path) -> Iterator[tuple[Any, list[str], list[str]]]:  # noqa: ANN401 - playwright's browser
    """Open the report; return the page, every address it asked for and every complaint."""
    opened = browser.new_page(viewport={"width": 1200, "height": 900})
    asked: list[str] = []
    complaints: list[str] = []
    opened.on("request", lambda request: asked.append(request.url))
    opened.on("console", lambda message: complaints.append(message.text))
    opened.on("pageerror", lambda error: complaints.append(str(error)))
    opened.on("dialog", lambda dialog: complaints.append(f"dialog: {dialog.message}"))
    opened.goto(file.as_uri())
    yield opened, asked, complaints
    opened.close()


def test_only_the_file_itself_is_read(page: tuple[Any, list[str], list[str]], file: Path) -> None:
    """One request, for the file; no word on the console, no dialog."""
    _, asked, complaints = page
    assert asked == [file.as_uri()]
    assert complaints == []


@pytest.mark.parametrize(("width", "media"), [(1200, "screen"), (700, "screen"), (680, "print")])
def test_nothing_runs_over_the_side(page: tuple[Any, list[str], list[str]], width: int, media: str) -> None:
    """At a screen's width and at that of A4 within its margins (180 mm, 680 px) the page does not scroll sideways."""
    opened, _, _ = page
    opened.set_viewport_size({"width": width, "height": 900})
    opened.emulate_media(media=media)
    assert opened.evaluate("document.documentElement.scrollWidth") <= width


@pytest.mark.parametrize("file", ["report"], indirect=True)
def test_figures_have_a_size_and_their_text_is_text(page: tuple[Any, list[str], list[str]]) -> None:
    """Every figure is drawn, within the page, and its labels can be found as text."""
    opened, _, _ = page
    boxes = opened.evaluate(
        "[...document.querySelectorAll('figure svg')].map(s => s.getBoundingClientRect())"
        ".map(r => [r.left, r.right, r.height])"
    )
    assert len(boxes) == 1 + 3 + 6 + 2
    assert all(left >= 0 and right <= 1200 and height > 80 for left, right, height in boxes)
    assert opened.locator("svg text", has_text="gauge, partly infilled").count() == 1


def test_labels_stay_inside_their_figures(page: tuple[Any, list[str], list[str]]) -> None:
    """No letter is cut at a figure's edge, whatever font the browser has."""
    opened, _, _ = page
    outside = opened.evaluate(
        """[...document.querySelectorAll('figure svg')].flatMap(s => {
             const b = s.getBoundingClientRect();
             return [...s.querySelectorAll('text')].filter(t => {
               const r = t.getBoundingClientRect();
               return r.left < b.left - 1 || r.right > b.right + 1 || r.top < b.top - 1 || r.bottom > b.bottom + 1;
             }).map(t => t.textContent);
           })"""
    )
    assert outside == []


@pytest.mark.parametrize("file", ["report"], indirect=True)
def test_printed_pages_keep_text_and_figures(page: tuple[Any, list[str], list[str]], tmp_path: Path) -> None:
    """The PDF has a sensible number of pages, page numbers, and the words of tables and figures."""
    if shutil.which("pdftotext") is None:
        pytest.skip("needs pdftotext (poppler-utils)")
    opened, _, _ = page
    path = tmp_path / "report.pdf"
    opened.pdf(path=str(path), format="A4", prefer_css_page_size=True)
    text = subprocess.run(["pdftotext", "-layout", path, "-"], capture_output=True, text=True, check=True).stdout
    pages = text.split("\f")[:-1]
    assert 5 <= len(pages) <= 18
    assert f"1/{len(pages)}" in "".join(pages[0].split())
    for words in (
        "Basin mean depth by method",
        "gauge, partly infilled",
        "mm in 1 h",
        "A<script>alert(1)</script>",
        "B&B",
    ):
        assert words in text
    assert all(len(page.split()) > 10 for page in pages)


@pytest.mark.parametrize("file", ["design"], indirect=True)
def test_figures_of_a_design_keep_their_size_on_a_phone(page: tuple[Any, list[str], list[str]]) -> None:
    """Their letters are no smaller than they are on paper: the figure is scrolled, the page is not."""
    opened, _, _ = page
    opened.set_viewport_size({"width": 390, "height": 844})
    assert opened.evaluate("document.documentElement.scrollWidth") <= 390
    heights = opened.evaluate(
        "[...document.querySelectorAll('figure.whole svg text')].map(t => t.getBoundingClientRect().height)"
    )
    assert len(heights) > 50
    assert max(heights) >= 10


@pytest.mark.parametrize("file", ["design", "design with storms"], indirect=True)
def test_a_printed_design_is_whole(page: tuple[Any, list[str], list[str]], tmp_path: Path) -> None:
    """No page of the PDF is all but empty, and every section, table and caution is on one."""
    if shutil.which("pdftotext") is None:
        pytest.skip("needs pdftotext (poppler-utils)")
    opened, _, _ = page
    path = tmp_path / "report.pdf"
    opened.pdf(path=str(path), format="A4", prefer_css_page_size=True)
    text = subprocess.run(["pdftotext", "-layout", path, "-"], capture_output=True, text=True, check=True).stdout
    pages = text.split("\f")[:-1]
    assert 4 <= len(pages) <= 18
    for words in ("not a design.", "= areal depth, mm", "share of the total, %", "record.json"):
        assert words in text
    assert all(len(one.split()) > 10 for one in pages)
