"""What tests ask of a page and of its figures."""

from __future__ import annotations

import itertools
import re
from html.parser import HTMLParser
from xml.etree import ElementTree as ET

SVG = "{http://www.w3.org/2000/svg}"


def svg_tree(svg: str) -> ET.Element:
    """Return a figure as a tree; it must be well-formed XML by itself."""
    return ET.fromstring(svg)  # noqa: S314 - our own figure


def svg_texts(svg: str) -> list[str]:
    """Return what is written in a figure."""
    return ["".join(element.itertext()) for element in svg_tree(svg).iter(f"{SVG}text")]


class Page(HTMLParser):
    """What tests ask of a page: its tags with their attributes, in order, and its text."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.texts: list[str] = []
        self._silent = False
        self.feed(html)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Remember a tag."""
        self.tags.append((tag, dict(attrs)))
        self._silent = tag == "style"

    def handle_data(self, data: str) -> None:
        """Remember text that is shown."""
        if not self._silent:
            self.texts.append(data)

    def handle_endtag(self, tag: str) -> None:
        """End what is not shown."""
        self._silent = self._silent and tag != "style"

    def named(self, *names: str) -> list[dict[str, str | None]]:
        """Return the attributes of all tags of these names."""
        return [attributes for tag, attributes in self.tags if tag in names]

    @property
    def text(self) -> str:
        """All text, spaces and line ends as one space."""
        return " ".join(" ".join(self.texts).replace("\u202f", " ").split())


def check_page(html: str, *, figures: int) -> None:
    """Assert that a page is whole: nothing fetched, nothing run, ids and links right, figures and tables described."""
    page = Page(html)
    assert not page.named("script", "link", "img", "iframe", "object", "base", "form")
    assert not re.search(r"@import|@font-face|javascript:", html)
    assert set(re.findall(r"https?://[^\"' <]+", html)) <= {"http://www.w3.org/2000/svg"}
    ids = [a["id"] for _, a in page.tags if "id" in a]
    assert len(ids) == len(set(ids))
    assert {(a.get("href") or "#")[1:] for a in page.named("a")} <= set(ids)
    levels = [int(tag[1]) for tag, _ in page.tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels.count(1) == 1
    assert all(b <= a + 1 for a, b in itertools.pairwise(levels))
    assert page.named("html") == [{"lang": "en"}]
    assert len(page.named("table")) == len(page.named("caption")) > 0
    assert {a.get("scope") for a in page.named("th")} <= {"col", "row", "colgroup", "rowgroup"}
    drawn = re.findall(r"<svg .*?</svg>", html, flags=re.DOTALL)
    assert len(drawn) == len(page.named("figcaption")) == figures
    for svg in drawn:
        root = svg_tree(svg)
        assert root.attrib["role"] == "img"
        assert all((root[k].text or "").strip() for k in (0, 1))
