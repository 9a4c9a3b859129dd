from __future__ import annotations

import subprocess
import sys

import matplotlib as mpl
import pytest
from matplotlib.figure import Figure
from report.markup import SVG, svg_tree

from basinrain.report.figures import HALO, figure_style, to_svg


def _svg(name: str = "f1", text: str = "R&D <1>", *, gid: str = "") -> str:
    with figure_style():
        figure = Figure(figsize=(2, 1.5))
        axes = figure.add_axes((0.2, 0.2, 0.7, 0.7))
        axes.bar([1, 2], [1, 2], hatch="//")
        axes.plot([1, 2], [1, 2], marker="o")
        axes.text(1, 1, text, gid=gid or None)
        return str(to_svg(figure, name, "Title", "Description"))


def test_text_stays_text_and_is_escaped() -> None:
    """Names can be searched and copied, and cannot become markup."""
    assert "R&amp;D &lt;1&gt;</text>" in _svg()


def test_a_dollar_sign_is_a_dollar_sign() -> None:
    """Names are never read as formulas."""
    assert "$a_b$</text>" in _svg(text="$a_b$")


def test_every_id_begins_with_the_figures_name_and_is_referred_to() -> None:
    """Two figures of one page never share an id, and nothing points into nowhere."""
    root = svg_tree(_svg("fig-7"))
    ids = [e.attrib["id"] for e in root.iter() if "id" in e.attrib]
    assert ids
    assert all(i.startswith("fig-7-") for i in ids)
    assert len(ids) == len(set(ids))
    text = _svg("fig-7")
    targets = {part.split(")")[0] for part in text.split("url(#")[1:]}
    targets |= {part.split('"')[0] for part in text.split('href="#')[1:]}
    assert targets
    assert targets <= set(ids)


def test_the_figure_is_named_for_those_who_do_not_see_it() -> None:
    """Title and description are there and referred to."""
    root = svg_tree(_svg())
    assert root.attrib["role"] == "img"
    assert root.attrib["aria-labelledby"] == "f1-title f1-desc"
    assert [(e.tag, e.text) for e in root[:2]] == [(f"{SVG}title", "Title"), (f"{SVG}desc", "Description")]


def test_no_style_of_the_page_and_no_date() -> None:
    """The figure changes nothing outside itself and holds nothing that differs between two runs."""
    assert "<style" not in _svg()
    assert "<metadata" not in _svg()
    assert _svg() == _svg()


def test_labels_on_a_rim_are_drawn_so() -> None:
    """A text whose gid says so gets a white rim that needs no second copy of the text."""
    svg = _svg(gid=f"{HALO}-1")
    assert "paint-order: stroke" in svg
    assert svg.count("R&amp;D") == 1


def test_local_settings_change_nothing() -> None:
    """A user's own matplotlib settings neither reach the figures nor are touched."""
    plain = _svg()
    with mpl.rc_context({"font.size": 30, "svg.fonttype": "path", "axes.facecolor": "red"}):
        assert _svg() == plain
        assert mpl.rcParams["font.size"] == 30


@pytest.mark.parametrize("text", ["雨量計", "عداد", "🌧"])
def test_letters_that_the_measuring_font_lacks_are_no_warning(text: str) -> None:
    """The browser has the letters; the run stays quiet (warnings are errors here)."""
    assert text in _svg(text=text)


def test_no_global_figure_state() -> None:
    """Making figures does not load the stateful interface."""
    code = "import sys, basinrain.report; print('matplotlib.pyplot' in sys.modules)"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "False"
