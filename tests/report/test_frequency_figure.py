from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from report.design_run import from_record
from report.markup import svg_texts, svg_tree
from report.spying import drawn_by

from basinrain.design_record import RecordSource
from basinrain.report import frequency_figure
from basinrain.report.frequency_figure import MOST_PANELS, frequency_picture


@pytest.fixture
def figures(monkeypatch: pytest.MonkeyPatch) -> list[Any]:
    """Return the figures that are drawn."""
    return drawn_by(frequency_figure, monkeypatch)


def record() -> RecordSource:
    """Return fifteen years of days."""
    found = from_record().from_record
    assert found is not None
    return found


def test_maxima_stand_at_gringortens_positions(figures: list[Any]) -> None:
    """The i-th of n ranked ones at -ln(-ln((i - 0.44) / (n + 0.12))) (Gringorten 1963), in the unit drawn."""
    assert frequency_picture(record(), 0, [0, 1], area="ford", depth_unit="in") is not None
    axes = figures[0].axes[0]
    (points,) = [line for line in axes.lines if line.get_marker() == "o"]
    x, y = points.get_data()
    np.testing.assert_allclose(x, -np.log(-np.log((np.arange(1, 16) - 0.44) / 15.12)))
    np.testing.assert_allclose(y, np.sort(record().maxima[:, 0, 0]) / 25.4)
    assert [one.get_title(loc="left") for one in figures[0].axes] == ["24 h", "48 h"]


def test_a_gumbel_distribution_is_a_straight_line(figures: list[Any]) -> None:
    """Location plus scale times the reduced variate; the other is dashed and is not straight."""
    frequency_picture(record(), 1, [0], area="mouth", depth_unit="mm")
    axes = figures[0].axes[0]
    long = {line.get_linestyle(): line for line in axes.lines if len(line.get_xdata()) == 80}
    solid, dashed = long["-"], long["--"]
    parameters = record().depths.fits["gumbel"].parameters
    x, y = solid.get_data()
    np.testing.assert_allclose(y, parameters.location[1, 0] + parameters.scale[1, 0] * x)
    assert np.abs(np.diff(dashed.get_ydata(), 2)).max() > 1e-6
    assert solid.get_linewidth() > dashed.get_linewidth()


def test_the_interval_is_that_of_the_distribution_taken(figures: list[Any]) -> None:
    """From the first frequency that has a depth to the last."""
    frequency_picture(record(), 0, [0], area="ford", depth_unit="mm")
    ends = [line.get_data() for line in figures[0].axes[0].lines if line.get_linewidth() == 0.5]
    ladder = [frequency.variate for frequency in record().depths.depths.frequencies]
    np.testing.assert_allclose([x for x, _ in ends], [ladder, ladder])
    np.testing.assert_allclose([y for _, y in ends], [record().depths.lower[0, 0], record().depths.upper[0, 0]])


def test_the_axis_is_in_return_periods(figures: list[Any]) -> None:
    """2 years stand at their reduced variate, 0.3665; labels do not run into each other."""
    frequency_picture(record(), 0, [0, 1, 1], area="ford", depth_unit="mm")
    axes = figures[0].axes[0]
    places = axes.xaxis.get_majorticklocs()
    labels = [axes.xaxis.get_major_formatter()(place) for place in places]
    assert dict(zip(labels, places, strict=True))["2"] == pytest.approx(-np.log(np.log(2)))
    assert labels == sorted(labels, key=float)
    low, high = axes.get_xlim()
    points = (places - low) / (high - low) * axes.get_position().width * 6.9 * 72
    assert np.diff(points).min() >= 4.2 * 1.5


def test_words_for_who_does_not_see_it() -> None:
    """Numbers of the maxima and of the interval, and the area with whatever letters it has."""
    picture = frequency_picture(record(), 0, [0], area="R&D <ford>", depth_unit="mm", name="f")
    assert picture is not None
    title, description = svg_tree(picture.svg)[0].text, svg_tree(picture.svg)[1].text or ""
    assert title == "Annual maxima of R&D <ford> on Gumbel paper"
    ranked = np.sort(record().maxima[:, 0, 0])
    assert description.startswith(f"mm; 24 h: 15 annual maxima from {ranked[0]:.1f} to {ranked[-1]:.1f}; ")
    assert {"annual maximum", "Gumbel, taken", "its 90 % interval", "GEV", "return period, years"} <= set(
        svg_texts(picture.svg)
    )
    assert picture.name == "f"
    assert picture.caption.startswith("R&D <ford>: ranked annual maxima at Gringorten's plotting positions")


def test_years_that_do_not_count_have_no_mark(figures: list[Any]) -> None:
    """A gap is no zero."""
    maxima = record().maxima.copy()
    maxima[2, 0, 0] = np.nan
    frequency_picture(replace(record(), maxima=maxima), 0, [0], area="ford", depth_unit="mm")
    (points,) = [line for line in figures[0].axes[0].lines if line.get_marker() == "o"]
    assert len(points.get_xdata()) == 14


def test_of_many_durations_the_first_few(figures: list[Any]) -> None:
    """As many as have room beside each other."""
    frequency_picture(record(), 0, [0, 1, 0, 1], area="ford", depth_unit="mm")
    assert len(figures[0].axes) == MOST_PANELS


def test_without_a_fit_there_is_no_figure() -> None:
    """Nor an empty frame."""
    found = record().depths
    gumbel = found.fits["gumbel"]
    none = replace(gumbel.parameters, location=np.full_like(gumbel.parameters.location, np.nan))
    depths = replace(found, fits={**found.fits, "gumbel": replace(gumbel, parameters=none)})
    assert frequency_picture(replace(record(), depths=depths), 0, [0], area="ford", depth_unit="mm") is None


def test_the_same_bytes_on_a_repeat() -> None:
    """Whatever was drawn between."""
    first = frequency_picture(record(), 0, [0], area="ford", depth_unit="mm")
    frequency_picture(record(), 1, [1], area="mouth", depth_unit="in")
    assert frequency_picture(record(), 0, [0], area="ford", depth_unit="mm") == first
