from __future__ import annotations

import numpy as np
from report.markup import svg_texts

from basinrain.report.double_mass_figure import MOST_CURVES, double_mass_pictures, drawn_curves
from basinrain.screening.double_mass import DoubleMass, double_mass

YEARS = np.arange(1981, 2011)


def _curve(gauge: str, factor: float, *, seed: int = 1, after: int = 1995) -> DoubleMass:
    rng = np.random.default_rng(seed)
    reference = rng.gamma(40, 20, len(YEARS))
    totals = reference * np.where(after >= YEARS, factor, 1.0) * rng.normal(1, 0.03, len(YEARS))
    return double_mass(totals, reference, YEARS, gauge=gauge, reference=("P", "Q", "R"))


def test_only_curves_that_break_are_drawn_the_clearest_first() -> None:
    """A clear break before a faint one; a straight curve is left out."""
    curves = [_curve("straight", 1.0), _curve("faint", 1.15), _curve("clear", 1.6)]
    assert [curve.gauge for curve in drawn_curves(curves)] == ["clear", "faint"]
    assert [p.name for p in double_mass_pictures(curves, depth_unit="mm")] == ["double-mass-1", "double-mass-2"]


def test_break_slopes_and_ratio_are_told_in_words() -> None:
    """A gauge that caught 1.5 times as much until 1995: ratio near 2/3, both slopes in legend and caption."""
    curve = _curve("W03", 1.5)
    picture = double_mass_pictures([curve], depth_unit="mm")[0]
    texts = svg_texts(picture.svg)
    assert "1995" in texts
    assert {"1985", "1990", "2000", "2005", "2010", f"W03: ratio {curve.ratio:.3f}"} <= set(texts)
    assert f"before {curve.slopes[0]:.3f}" in texts
    assert f"after {curve.slopes[1]:.3f}" in texts
    assert "break after 1995" in picture.caption
    assert f"newer over older years {curve.ratio:.3f}" in picture.caption
    assert "the mean of P, Q, R" in picture.caption
    assert "1981 to 2010" in texts


def test_inches_change_the_axes_and_no_slope() -> None:
    """Slopes have no unit."""
    curve = _curve("W03", 1.5)
    picture = double_mass_pictures([curve], depth_unit="in")[0]
    assert "cumulative at the gauge, inches" in svg_texts(picture.svg)
    assert f"before {curve.slopes[0]:.3f}" in svg_texts(picture.svg)


def test_at_most_a_dozen() -> None:
    """Twenty broken gauges have twelve figures."""
    curves = [_curve(f"W{k:02d}", 1.5, seed=k) for k in range(20)]
    assert len(double_mass_pictures(curves, depth_unit="mm")) == MOST_CURVES == 12


def test_no_curves_no_figures() -> None:
    """Short records have none."""
    assert double_mass_pictures([], depth_unit="mm") == []
    short = double_mass(np.ones(4), np.ones(4), YEARS[:4], gauge="A")
    assert double_mass_pictures([short], depth_unit="mm") == []
