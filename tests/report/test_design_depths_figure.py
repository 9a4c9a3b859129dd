from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from report.markup import svg_texts, svg_tree
from report.spying import drawn_by

from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import DataError
from basinrain.report import design_depths_figure
from basinrain.report.design_depths_figure import MOST_FREQUENCIES, apart, depths_picture
from basinrain.report.figures import Picture

MINUTES = np.array([60.0, 360.0, 2880.0])
FREQUENCIES = (Frequency.of_aep(0.01), Frequency.of_aep(0.5))
POINT = np.array([[50.8, 76.2, 127.0], [25.4, 38.1, 63.5]])
AREAL = np.array([[40.64, 68.58, 120.65], [20.32, 34.29, 60.325]])


def picture(
    point: npt.ArrayLike = POINT, areal: npt.ArrayLike = AREAL, *, unit: str = "mm", title: str = "Old weir"
) -> Picture:
    """Return the figure of two frequencies and three durations."""
    return depths_picture(
        MINUTES, FREQUENCIES, np.asarray(point), np.asarray(areal), depth_unit=unit, title=title, name="f"
    )


@pytest.fixture
def figures(monkeypatch: pytest.MonkeyPatch) -> list[Any]:
    """Return the figures that are drawn."""
    return drawn_by(design_depths_figure, monkeypatch)


def test_curves_are_drawn_where_their_depths_are(figures: list[Any]) -> None:
    """From the common to the rare, on points and then over the area, in inches: 25.4 mm are 1 in."""
    picture(unit="in")
    axes = figures[0].axes[0]
    assert (axes.get_xscale(), axes.get_yscale()) == ("log", "log")
    drawn = np.array([line.get_data() for line in axes.lines])
    np.testing.assert_array_equal(drawn[:, 0], np.tile(MINUTES, (4, 1)))
    np.testing.assert_array_equal(drawn[:, 1], np.vstack([POINT[::-1], AREAL[::-1]]) / 25.4)
    low, high = axes.get_ylim()
    assert low < AREAL.min() / 25.4 < POINT.max() / 25.4 < high


def test_every_curve_is_labelled(figures: list[Any]) -> None:
    """In short beside the first point depth, in full beside the last areal depth, at their heights."""
    texts = svg_texts(picture().svg)
    for text in ("AEP 0.01 (1 in 100)", "AEP 0.5 (1 in 2)", "1 in 100", "1 in 2", "point depth", "areal depth"):
        assert texts.count(text) == 1
    assert {"1 h", "6 h", "48 h", "duration", "depth, mm", "Old weir"} <= set(texts)
    ends = {note.get_text(): note.xy for note in figures[0].axes[0].texts}
    assert ends["AEP 0.01 (1 in 100)"] == pytest.approx((2880, 120.65))
    assert ends["1 in 2"] == pytest.approx((60, 25.4))


def test_the_description_has_the_numbers() -> None:
    """Whoever does not see the figure is told every depth, and its unit."""
    one = picture(title="R&D <weir>")
    description = svg_tree(one.svg)[1].text or ""
    assert description.startswith("mm; point depth, AEP 0.5 (1 in 2): 1 h 25.4, 6 h 38.1, 48 h 63.5; ")
    assert description.endswith("areal depth, AEP 0.01 (1 in 100): 1 h 40.6, 6 h 68.6, 48 h 120.7")
    assert one.caption == "R&D <weir>: point depth and areal depth by duration and frequency, both axes logarithmic."
    assert (one.name, one.half) == ("f", False)


def test_depths_that_are_areal_already_have_one_kind_of_curve(figures: list[Any]) -> None:
    """Without point depths no line, no label and no word speaks of them."""
    one = picture(np.full_like(POINT, np.nan))
    assert len(figures[0].axes[0].lines) == 2
    assert not {"point depth", "1 in 100"} & set(svg_texts(one.svg))
    assert one.caption.startswith("Old weir: areal depth by duration")


def test_a_curve_that_ends_early_is_labelled_at_its_end(figures: list[Any]) -> None:
    """The last duration of the rare areal depth is not known: its label points to the one before."""
    picture(areal=np.where(AREAL > 100, np.nan, AREAL))
    ends = {note.get_text(): note.xy for note in figures[0].axes[0].texts}
    assert ends["AEP 0.01 (1 in 100)"] == pytest.approx((360, 68.58))


def test_partial_duration_and_durations_that_are_no_whole_minutes() -> None:
    """Return periods in years; seven and a half minutes are not rounded to seven."""
    frequencies = [Frequency(2.0, "partial-duration")]
    one = depths_picture(
        np.array([7.5]), frequencies, np.array([[9.0]]), np.array([[8.0]]), depth_unit="mm", title="Old weir"
    )
    assert {"2-year", "2-year, partial duration", "7.5 min"} <= set(svg_texts(one.svg))
    assert one.name == "design-depths"


def test_of_many_frequencies_some_are_drawn(figures: list[Any]) -> None:
    """The most common, the rarest and some between, and the caption says how many."""
    frequencies = [Frequency(float(years), "annual-maximum") for years in range(2, 22)]
    depths = np.outer(np.arange(2.0, 22.0), [10.0, 20.0, 30.0])
    one = depths_picture(MINUTES, frequencies, depths, depths, depth_unit="mm", title="Old weir")
    firsts = [line.get_ydata()[0] for line in figures[0].axes[0].lines[:MOST_FREQUENCIES]]
    assert (len(figures[0].axes[0].lines), firsts[0], firsts[-1]) == (2 * MOST_FREQUENCIES, 20.0, 210.0)
    assert one.caption.endswith("Drawn: 8 of 20 frequencies.")


def test_a_logarithm_needs_a_depth() -> None:
    """Nothing above 0 is told by name."""
    with pytest.raises(DataError, match="depths of Old weir: found none above 0; expected depths by duration"):
        picture(np.zeros_like(POINT), np.full_like(AREAL, np.nan))


def test_a_repeat_is_identical() -> None:
    """The same depths give the same bytes."""
    assert picture() == picture()


@given(st.lists(st.floats(0, 100), min_size=1, max_size=9).map(sorted), st.floats(1, 12))
def test_labels_keep_apart(places: list[float], gap: float) -> None:
    """No label stands on another, none above the top, and labels with room of their own do not move."""
    moved = apart(places, gap=gap, top=100)
    assert (np.diff(moved) >= gap - 1e-9).all()
    assert moved[-1] <= 100 + 1e-9
    assert moved[0] >= -1e-9 or gap * (len(places) - 1) > 100
    if (np.diff(places) >= gap).all():
        assert moved == pytest.approx(np.array(places))
