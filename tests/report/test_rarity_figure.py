from __future__ import annotations

import numpy as np
from rarity_cases import FREQUENCIES, NAN, UPPER, at_gauges, over_basins, quill, storm_depths
from report.markup import svg_texts

from basinrain.designstorm.exceedance import PARTIAL_DURATION, Frequency
from basinrain.report.figures import Picture
from basinrain.report.rarity_figure import rarity_picture


def drawn(picture: Picture | None) -> Picture:
    """Return a figure that is expected to be there."""
    assert picture is not None
    return picture


def test_curves_are_named_and_durations_in_words() -> None:
    """Every frequency at its line's end, once; ticks as engineers name them; the storm by its name."""
    picture = drawn(rarity_picture(quill(), "Upper", depth_unit="mm"))
    texts = svg_texts(picture.svg)
    assert [texts.count(words) for words in ("1 in 2", "1 in 10", "1 in 100")] == [1, 1, 1]
    assert {"30 min", "1 h", "6 h", "24 h", "48 h", "duration", "depth, mm"} <= set(texts)
    assert {"Mean over Upper, areal depths", "storm Quill, mean over the basin", "curves by chance a year"} <= set(
        texts
    )
    assert not picture.half
    assert picture.caption == (
        "Storm Quill: greatest mean depths over Upper by duration, drawn on its areal depths of equal frequency; both "
        "axes logarithmic."
    )


def test_what_is_drawn_is_told() -> None:
    """The description has every depth with how rare it was, in the unit asked for."""
    picture = drawn(rarity_picture(quill(), "Lower", depth_unit="in", name="rarity-2"))
    assert "1 h 0.59 (more frequent than 1 in 2 a year (the table's most frequent))" in picture.svg
    assert "24 h 3.74 (rarer than 1 in 100 a year (the table's end))" in picture.svg
    assert "1.57" not in picture.svg  # the 40 mm in 1 h are Upper's
    assert "depth, inches" in svg_texts(picture.svg)
    assert picture.name == "rarity-2"
    assert 'aria-labelledby="rarity-2-title rarity-2-desc"' in picture.svg


def test_the_wettest_gauge_has_its_own_panel() -> None:
    """Named where it changes, on point depths; the curves' names are there twice."""
    picture = drawn(rarity_picture(quill(gauges=at_gauges()), "Upper", depth_unit="mm"))
    texts = svg_texts(picture.svg)
    assert {"Wettest gauge, point depths", "wettest gauge", "W2", "W1", "W3"} <= set(texts)
    assert texts.count("1 in 100") == 2
    assert "read against the curves of its own panel only" in picture.caption
    assert "at the gauge named" not in picture.caption
    assert "1 h 45.0 at W2 (between 1 in 2 and 1 in 10 a year, about 1 in 4.2)" in picture.svg


def test_both_panels_are_in_the_unit_asked_for() -> None:
    """20 to 120 mm are 0.8 to 4.7 in: the axes of both name no depth above 5."""
    picture = drawn(rarity_picture(quill(gauges=at_gauges()), "Upper", depth_unit="in"))
    numbers = [float(text) for text in svg_texts(picture.svg) if text.replace(".", "", 1).isdigit()]
    assert set(numbers) == {1.0, 2.0, 5.0}


def test_a_gauge_that_stays_is_named_once() -> None:
    """W2 in all durations."""
    depth = np.full((5, 2), 50.0) + np.array([0.0, 5.0])
    gauges = storm_depths("W1 W2", depth, [UPPER, UPPER + 1])
    picture = drawn(rarity_picture(quill(gauges=gauges), "Upper", depth_unit="mm"))
    assert svg_texts(picture.svg).count("W2") == 1
    assert picture.caption.endswith("Point depths are those at the gauge named.")


def test_partial_duration_curves_are_years() -> None:
    """Return periods are not written as chances."""
    found = quill(frequencies=[Frequency(years, PARTIAL_DURATION) for years in (1, 10, 100)])
    texts = svg_texts(drawn(rarity_picture(found, "Upper", depth_unit="mm")).svg)
    assert {"1 year", "10 years", "100 years", "curves by return period, partial duration"} <= set(texts)


def test_more_frequencies_than_can_be_told_apart() -> None:
    """Eight are drawn, both ends among them, and the caption says so."""
    frequencies = [Frequency(2.0**k, FREQUENCIES[0].series) for k in range(1, 13)]
    ladder = UPPER[:, :1] + np.arange(12.0)
    areal = storm_depths("Upper", over_basins().depth[:, :1], [ladder])
    picture = drawn(rarity_picture(quill(areal, frequencies=frequencies), "Upper", depth_unit="mm"))
    names = [text for text in svg_texts(picture.svg) if text.startswith("1 in ")]
    assert len(names) == 8
    assert {"1 in 2", "1 in 4096"} <= set(names)
    assert picture.caption.endswith("Of the table's 12 frequencies 8 are drawn.")


def test_nothing_to_draw() -> None:
    """No depth above 0 and fewer than two durations with curves have no place on a logarithmic scale."""
    dry = storm_depths("Upper", np.zeros((5, 1)), [UPPER])
    assert rarity_picture(quill(dry), "Upper", depth_unit="mm") is None
    areal = over_basins()
    areal.ladder[:, [0, 2, 3, 4]] = NAN
    assert rarity_picture(quill(areal), "Upper", depth_unit="mm") is None
    assert rarity_picture(quill(window=20.0), "Upper", depth_unit="mm") is None


def test_gauges_without_curves_have_no_panel() -> None:
    """The basin's is still drawn."""
    gauges = at_gauges()
    gauges.ladder[:, [0, 2, 3, 4]] = NAN
    picture = drawn(rarity_picture(quill(gauges=gauges), "Upper", depth_unit="mm"))
    assert "Wettest gauge, point depths" not in svg_texts(picture.svg)
    assert "Right" not in picture.caption


def test_a_gap_in_the_table_is_no_zero() -> None:
    """The curve goes on without the duration, and is still named."""
    areal = over_basins()
    areal.ladder[0, 4, 2] = NAN
    texts = svg_texts(drawn(rarity_picture(quill(areal), "Upper", depth_unit="mm")).svg)
    assert "1 in 100" in texts


def test_a_repeat_is_identical() -> None:
    """The same storm gives the same bytes."""
    pictures = [rarity_picture(quill(gauges=at_gauges()), "Upper", depth_unit="mm") for _ in range(2)]
    assert pictures[0] == pictures[1]
