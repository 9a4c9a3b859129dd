"""What all figures share: their style, and how a figure becomes a piece of the page.

Only matplotlib's object interface is used, with a style that no local setting changes, so that the same run always
gives the same bytes. Text stays text: it can be searched, read aloud and copied.
"""

from __future__ import annotations

import io
import threading
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any, Final
from xml.etree import ElementTree as ET

import matplotlib.style
from markupsafe import Markup
from matplotlib.backends.backend_svg import FigureCanvasSVG
from matplotlib.figure import Figure

__all__ = ["HALF_WIDTH", "HALO", "INK", "LINES", "MARKS", "PAGE_WIDTH", "Picture", "figure_style", "to_svg"]

PAGE_WIDTH: Final = 6.9
"""Width in inches of a figure that takes the width of a page."""

HALF_WIDTH: Final = 3.4
"""Width in inches of a figure that stands beside another."""

INK: Final = "#1d2328"
HALO: Final = "halo"
"""Artists whose ``gid`` begins with this word have their text drawn on a white rim."""

# Told apart without colour: by shape and fill, and by size where they fall on each other.
MARKS: Final[tuple[dict[str, Any], ...]] = (
    {"marker": "o", "markersize": 7.8, "markerfacecolor": "white"},
    {"marker": "s", "markersize": 4.2, "markerfacecolor": "black"},
    {"marker": "^", "markersize": 4.0, "markerfacecolor": "#9a9a9a"},
    {"marker": "x", "markersize": 4.6, "markerfacecolor": "black"},
    {"marker": "D", "markersize": 3.6, "markerfacecolor": "white"},
    {"marker": "P", "markersize": 4.4, "markerfacecolor": "black"},
    {"marker": "v", "markersize": 4.4, "markerfacecolor": "white"},
    {"marker": "*", "markersize": 5.0, "markerfacecolor": "black"},
)
# Solid, dashed, dotted.
LINES: Final = ("-", (0, (5, 2)), (0, (1, 1.4)), (0, (6, 1.5, 1, 1.5)), (0, (3, 1)), (0, (6, 1.5, 1, 1.5, 1, 1.5)))

_STYLE: Final = {
    "svg.fonttype": "none",
    "svg.hashsalt": "basinrain",
    "text.parse_math": False,  # a name may hold a dollar sign
    "font.family": ["DejaVu Sans"],  # comes with matplotlib: the same measures everywhere
    "font.size": 7.5,
    "axes.titlesize": 8,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.labelsize": 7.5,
    "axes.linewidth": 0.6,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.unicode_minus": True,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.labelsize": 7,
    "ytick.labelsize": 7,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "xtick.major.size": 3,
    "ytick.major.size": 3,
    "legend.fontsize": 7,
    "legend.frameon": False,
    "legend.borderpad": 0,
    "legend.borderaxespad": 0,
    "lines.linewidth": 1.1,
    "lines.markeredgewidth": 0.8,
    "lines.markeredgecolor": "black",
    "hatch.linewidth": 0.5,
    "grid.color": "#c9cdd0",
    "grid.linewidth": 0.5,
}
_FONTS: Final = "Arial, 'Liberation Sans', Helvetica, 'DejaVu Sans', sans-serif"
_SVG: Final = "{http://www.w3.org/2000/svg}"
_LINK: Final = "{http://www.w3.org/1999/xlink}href"

# The style is a setting of the whole process.
_one_at_a_time = threading.RLock()


@dataclass(frozen=True)
class Picture:
    """A figure, ready for the page.

    Parameters
    ----------
    name
        Its id in the page.
    caption
        What stands below it.
    svg
        Its markup.
    half
        Whether two of them stand side by side.
    """

    name: str
    caption: str
    svg: Markup
    half: bool = False


@contextmanager
def figure_style() -> Iterator[None]:
    """Make and draw figures in the report's style, whatever the user's own settings are."""
    with _one_at_a_time, warnings.catch_warnings(), matplotlib.style.context(["default", _STYLE]):
        # Measured with a substitute; the browser has the letters.
        warnings.filterwarnings("ignore", message="Glyph .* missing from", category=UserWarning)
        yield


def to_svg(figure: Figure, name: str, title: str, description: str) -> Markup:
    """Return a figure as inline SVG.

    Parameters
    ----------
    figure
        Made inside :func:`figure_style`; to be called inside it too.
    name
        The figure's id in the page; all ids inside begin with it.
    title, description
        Its short name, and what a reader who does not see it must know.

    Examples
    --------
    >>> with figure_style():
    ...     figure = Figure(figsize=(2, 1))
    ...     text = figure.text(0.5, 0.5, "R&D <1>")
    ...     svg = to_svg(figure, "f1", "A title", "A description")
    >>> svg.startswith('<svg xmlns="http://www.w3.org/2000/svg"'), "R&amp;D &lt;1&gt;</text>" in svg
    (True, True)
    """
    buffer = io.StringIO()
    nothing = dict.fromkeys(("Date", "Creator", "Type", "Format"))
    FigureCanvasSVG(figure).print_svg(buffer, metadata=nothing)  # type: ignore[no-untyped-call]
    root = ET.fromstring(buffer.getvalue())  # noqa: S314 - matplotlib's own output
    _tidy(root, name)
    for tag, text in (("desc", description), ("title", title)):
        element = ET.Element(tag, {"id": f"{name}-{tag}"})
        element.text = text
        root.insert(0, element)
    width, height = root.attrib["viewBox"].split()[2:]
    root.attrib.clear()
    root.attrib.update(
        {
            "xmlns": "http://www.w3.org/2000/svg",
            "role": "img",
            "aria-labelledby": f"{name}-title {name}-desc",
            "viewBox": f"0 0 {width} {height}",
            "width": f"{width}pt",
            "height": f"{height}pt",
            "stroke-linejoin": "round",
        }
    )
    return Markup(ET.tostring(root, encoding="unicode"))  # noqa: S704 - serialised from a tree: all text is escaped


def _tidy(root: ET.Element, name: str) -> None:
    """Take out the page-wide style and every id that nothing refers to; put the figure's name before the others."""
    needed = set()
    for element in root.iter():
        for key, value in element.attrib.items():
            if key == _LINK:
                needed.add(value.lstrip("#"))
            elif value.startswith("url(#"):
                needed.add(value[5:-1])
            elif key == "style" and "url(#" in value:
                needed.add(value.split("url(#")[1].split(")")[0])
    for parent in list(root.iter()):
        for child in list(parent):
            if child.tag == f"{_SVG}style":
                parent.remove(child)
        if parent.get("id", "").startswith(HALO):
            for child in parent.iter(f"{_SVG}text"):
                rim = "; paint-order: stroke; stroke: #ffffff; stroke-width: 2.4px; stroke-linejoin: round"
                child.set("style", child.get("style", "") + rim)
    for element in root.iter():
        element.tag = element.tag.removeprefix(_SVG)
        if element.get("id") is not None and element.get("id") not in needed:
            del element.attrib["id"]
        for key, value in list(element.attrib.items()):
            if key == "id":
                element.set(key, f"{name}-{value}")
            elif key == _LINK:
                del element.attrib[key]
                element.set("href", f"#{name}-{value.lstrip('#')}")
            elif "url(#" in value:
                element.set(key, value.replace("url(#", f"url(#{name}-"))
            elif key == "style":
                element.set(key, value.replace("'DejaVu Sans'", _FONTS))
        # Line ends inside path data only make the page longer.
        if "d" in element.attrib:
            element.set("d", " ".join(element.attrib["d"].split()))
        element.tail = None if not (element.tail or "").strip() else element.tail
        if element.tag not in ("text", "tspan") and not (element.text or "").strip():
            element.text = None
