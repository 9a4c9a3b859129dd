from __future__ import annotations

import numpy as np
import pytest
from report.markup import svg_texts

from basinrain.rainfall import RainRecord, Status
from basinrain.report import availability_figure
from basinrain.report.availability_figure import availability_picture
from basinrain.report.words import NARROW_SPACE


def _record(ids: tuple[str, ...] = ("A", "B"), *, steps: int = 100) -> RainRecord:
    """Return a record in which the second gauge came late, was missing, was rejected, and knows one longer total."""
    ends = np.datetime64("2031-05-04", "s") + np.arange(1, steps + 1) * np.timedelta64(3600, "s")
    status = np.full((steps, len(ids)), Status.OBSERVED, dtype=np.uint8)
    if len(ids) > 1:
        for k, code in enumerate((Status.NOT_INSTALLED, Status.MISSING, Status.REJECTED, Status.ACCUMULATED)):
            status[k * steps // 5 : (k + 1) * steps // 5, 1] = code
    depth = np.where(status == Status.OBSERVED, 1.0, np.nan)
    return RainRecord(ids, ends - np.timedelta64(3600, "s"), ends, depth, status, step="1h", zone="+02:00")


def test_every_kind_has_a_letter_and_its_words() -> None:
    """The legend names what occurs, and the strip holds its letter, so that no colour is needed."""
    picture = availability_picture(_record())
    assert picture is not None
    texts = svg_texts(picture.svg)
    for words in ("own values", "M missing", "R rejected", "T known over several steps only", "N not in service"):
        assert words in texts
    assert {"M", "R", "T", "N", "A", "B"} <= set(texts)


def test_what_does_not_occur_is_not_in_the_legend() -> None:
    """A record without gaps has one kind only."""
    picture = availability_picture(_record(("A",)))
    assert picture is not None
    assert "M missing" not in svg_texts(picture.svg)


def test_the_share_is_of_the_steps_in_service() -> None:
    """B has 20 of the 80 steps since it was installed: 25 %."""
    picture = availability_picture(_record())
    assert picture is not None
    assert f"25.0{NARROW_SPACE}%" in svg_texts(picture.svg)
    assert f"100.0{NARROW_SPACE}%" in svg_texts(picture.svg)


def test_a_single_rejected_step_is_still_seen() -> None:
    """One step of 8760 is far below a point in width, and is drawn wider."""
    record = _record(("A",), steps=8760)
    status = record.status.copy()
    status[4000, 0] = Status.REJECTED
    depth = np.where(status == Status.OBSERVED, 1.0, np.nan)
    one = RainRecord(record.gauges, record.starts, record.ends, depth, status, step="1h")
    picture = availability_picture(one)
    assert picture is not None
    assert "R rejected" in svg_texts(picture.svg)


def test_a_strip_is_full_or_empty_only_where_all_its_steps_are() -> None:
    """One missing step in a bin of many leaves a mark, one observed step among missing ones too."""
    strips = availability_figure._Strips(np.array([0.0, 1.0, 2.0, 3.0]), points=300.0)
    shares = np.array([[1.0, 0.999, 0.001], [0.0, 0.001, 0.999], [0.0] * 3, [0.0] * 3, [0.0] * 3])
    strips.add(0, shares)
    heights = [bottom - top for _, bottom, _, top in strips._boxes["own"]]
    assert heights == pytest.approx([0.72, 0.72 * 7 / 8, 0.72 / 8])
    assert len(strips._boxes["missing"]) == 2


def test_many_gauges_are_shortened_to_the_worst() -> None:
    """Of 60 gauges the 44 with the fewest values are drawn, B among them, and the file is named."""
    ids = tuple(f"G{k:02d}" for k in range(60))
    picture = availability_picture(_record(ids))
    assert picture is not None
    assert "the 44 gauges of 60 with the smallest shares, and below them all gauges together" in picture.caption
    assert {"G01", "all 60"} <= set(svg_texts(picture.svg))
    assert len(picture.svg) < 300_000


def test_totals_without_times_have_no_figure() -> None:
    """There is no axis to draw them on."""
    nat = np.array(["NaT", "NaT"], dtype="datetime64[s]")
    status = np.zeros((2, 1), dtype=np.uint8)
    assert availability_picture(RainRecord(("A",), nat, nat, np.ones((2, 1)), status, step="storm")) is None
    assert availability_picture(_record(steps=1)) is None


def test_a_repeat_is_identical() -> None:
    """The same record gives the same bytes."""
    first, second = availability_picture(_record()), availability_picture(_record())
    assert first == second
