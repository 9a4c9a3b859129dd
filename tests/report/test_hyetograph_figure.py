from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.collections import PolyCollection
from report.markup import svg_texts
from report.small_run import make_run

from basinrain.report import hyetograph_figure
from basinrain.report.hyetograph_figure import binned, hyetograph_pictures, lead_method
from basinrain.results import StormResult, StormRun


def _without(result: StormResult, method: str, *, step: int | None = None) -> StormResult:
    """Take away a method's number in basin west, at one step or at all."""
    depth = result.depths[method].depth.copy()
    depth[slice(None) if step is None else step, 0] = np.nan
    return replace(result, depths={**result.depths, method: replace(result.depths[method], depth=depth)})


@given(st.lists(st.floats(0, 50), min_size=1, max_size=300), st.integers(1, 50))
def test_bars_keep_the_total(depth: list[float], most: int) -> None:
    """Neighbouring steps are added up, never dropped, and there are no more bars than asked."""
    bars, together = binned(np.array(depth), most)
    assert len(bars) <= most
    assert len(bars) == -(-len(depth) // together)
    assert bars.sum() == pytest.approx(sum(depth))


def test_bars_stand_on_their_intervals(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """The bar of 07:00 begins at 06:00 and is an hour wide; its height is the mean of A and B, 0, 1.5, 6.5 mm ..."""
    drawn = []
    real = PolyCollection

    def spy(corners: list[np.ndarray[tuple[int, int], np.dtype[np.float64]]], **style: Any) -> object:  # noqa: ANN401 - handed on
        drawn.append(np.array(corners))
        return real(corners, **style)

    monkeypatch.setattr(hyetograph_figure, "PolyCollection", spy)
    hyetograph_pictures(run, run.storms[0], 1)
    west = drawn[0]
    day = float(np.datetime64("2031-05-04", "D").astype(int))  # days since 1970, the figure's own clock
    assert west[:, 0, 0] == pytest.approx(day + np.arange(6, 12) / 24)
    assert west[:, 2, 0] == pytest.approx(day + np.arange(7, 13) / 24)
    assert west[:, :, 1] == pytest.approx(np.array([[0, h, h, 0] for h in (0, 1.5, 6.5, 3.5, 0.5, 0)]))


def test_axes_say_unit_step_and_clock(run: StormRun) -> None:
    """Depth per step, sum, and the record's own clock."""
    texts = svg_texts(hyetograph_pictures(run, run.storms[0], 1)[0].svg)
    for text in ("mm in 1 h", "sum, mm", "time, UTC+02:00", "depth by arithmetic", "08:00"):
        assert text in texts


def test_the_machines_clock_and_language_do_not_matter(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """Another time zone set for the plotting library moves no label."""
    import matplotlib as mpl

    plain = hyetograph_pictures(run, run.storms[0], 1)[0].svg
    with mpl.rc_context({"timezone": "America/New_York"}):
        assert hyetograph_pictures(run, run.storms[0], 1)[0].svg == plain


def test_a_step_without_a_number_is_marked_and_not_zero(run: StormRun) -> None:
    """The gap has its own look and its own line in the legend; the mass curve's total is no number."""
    result = _without(run.storms[0], "arithmetic", step=2)
    result = replace(result, depths={"arithmetic": result.depths["arithmetic"]})
    svg = hyetograph_pictures(replace(run, storms=(result,)), result, 1)[0].svg
    assert "no number" in svg_texts(svg)
    assert "arithmetic –" in str(svg)


def test_a_single_total_has_no_hyetograph() -> None:
    """One step makes no figure."""
    run = make_run(one_step=True)
    assert hyetograph_pictures(run, run.storms[0], 1) == []


def test_the_first_method_with_a_number_everywhere_leads(run: StormRun) -> None:
    """The arithmetic mean comes first unless a basin has none."""
    assert lead_method(run.storms[0]) == "arithmetic"
    assert lead_method(_without(run.storms[0], "arithmetic")) == "thiessen"


def test_a_gap_of_every_method_does_not_change_the_lead(run: StormRun) -> None:
    """One hour without any number leaves no total at all; still the method that lacks a whole basin does not lead."""
    result = _without(run.storms[0], "arithmetic")
    for method in ("thiessen", "idw"):
        result = _without(result, method, step=2)
    assert lead_method(result) == "thiessen"


def test_many_steps_share_bars(run: StormRun, monkeypatch: pytest.MonkeyPatch) -> None:
    """With at most 3 bars two hours share one, and the axis says so."""
    monkeypatch.setattr(hyetograph_figure, "MOST_BARS", 3)
    picture = hyetograph_pictures(run, run.storms[0], 1)[0]
    assert "mm in 2 × 1 h" in svg_texts(picture.svg)
    assert picture.caption.endswith("A bar adds up 2 steps.")


def test_a_basin_without_any_number_is_one_gap(run: StormRun) -> None:
    """Where the only method has no number in a basin, its panel is there and says so."""
    result = _without(run.storms[0], "arithmetic")
    result = replace(result, depths={"arithmetic": result.depths["arithmetic"]})
    svg = hyetograph_pictures(replace(run, storms=(result,)), result, 1)[0].svg
    assert "no number" in svg_texts(svg)
    assert "Storm totals in mm: arithmetic –." in str(svg)
