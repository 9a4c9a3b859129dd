from __future__ import annotations

import numpy as np
import numpy.typing as npt
from report.markup import svg_texts

from basinrain.infill_effect import InfillEffect
from basinrain.report.effect_figure import effect_picture
from basinrain.report.figures import Picture

METHODS = ("nearest-gauge", "station-average", "normal-ratio")


def make_effect(totals: npt.ArrayLike) -> InfillEffect:
    """Return an effect of three infill methods, the second the job's own; a column a basin."""
    array = np.array(totals, dtype=float)
    return InfillEffect(
        methods=METHODS[: len(array)],
        own="station-average",
        totals={"thiessen": array},
        share_infilled={"thiessen": np.full_like(array, 0.2)},
        left=np.zeros(len(array), dtype=np.int64),
        skipped={},
        refused={},
    )


def _picture(effect: InfillEffect, n: int, unit: str = "mm") -> Picture | None:
    basins = [(b, f"b{b}") for b in range(n)]
    return effect_picture(effect, "thiessen", basins, depth_unit=unit, name="effect-1", storm="Quill")


def test_one_panel_a_basin_with_the_methods_once() -> None:
    """Two basins: two titles, every infill method named once, the numbers in the description."""
    picture = _picture(make_effect([[10.0, 20.0], [11.0, 22.0], [12.5, 21.0]]), 2)
    assert picture is not None
    texts = svg_texts(picture.svg)
    assert {"b0", "b1"} <= set(texts)
    for method in METHODS:
        assert texts.count(method) == 1
    assert "b0: nearest-gauge 10.0, station-average 11.0, normal-ratio 12.5" in picture.svg
    assert "the job&apos;s infill method" in picture.svg or "the job's infill method" in texts


def test_the_basins_that_move_most_are_drawn() -> None:
    """Of six basins the four with the widest range, in their order; the file holds the others."""
    ranges = np.array([1.0, 6.0, 2.0, 5.0, 4.0, 3.0])
    picture = _picture(make_effect(np.array([10 + ranges, np.full(6, 10.0), np.full(6, 10.0)])), 6)
    assert picture is not None
    titles = [text for text in svg_texts(picture.svg) if text.startswith("b") and text[1:].isdigit()]
    assert titles == ["b1", "b3", "b4", "b5"]
    assert "the others are in infill_effect.csv" in picture.caption


def test_a_method_without_a_number_says_so() -> None:
    """It is no zero, and no gap that could be a fault."""
    picture = _picture(make_effect([[np.nan], [11.0], [12.0]]), 1)
    assert picture is not None
    assert "no number" in svg_texts(picture.svg)
    assert picture.half


def test_equal_means_are_drawn_as_equal() -> None:
    """Differences far below what is printed do not fill the axis: 0.1 mm either side at least."""
    picture = _picture(make_effect([[10.0], [10.001], [10.0]]), 1)
    assert picture is not None
    numbers = [float(text) for text in svg_texts(picture.svg) if text.replace(".", "").isdigit()]
    assert max(numbers) - min(numbers) >= 0.1


def test_nothing_to_compare_is_no_figure() -> None:
    """No numbers, or one method only."""
    assert _picture(make_effect([[np.nan], [np.nan], [np.nan]]), 1) is None
    one = make_effect([[1.0], [2.0]])
    single = InfillEffect(
        methods=("station-average",),
        own="station-average",
        totals={"thiessen": one.totals["thiessen"][:1]},
        share_infilled={"thiessen": one.share_infilled["thiessen"][:1]},
        left=one.left[:1],
        skipped={},
        refused={},
    )
    assert _picture(single, 1) is None
