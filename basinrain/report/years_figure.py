"""Water-year totals of a basin: bars by the first policy, marks by the others, a panel a method."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from basinrain.report import series_names
from basinrain.report.figures import INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.left_out_figure import POLICY_MARKS
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.results_series import SeriesRun
from basinrain.units import depth_factor

__all__ = ["years_picture"]

_PANEL, _HEAD, _FOOT, _GAP, _LEFT, _RIGHT = 1.15, 0.36, 0.4, 0.26, 0.62, 0.12  # inches
_WIDE: Final = 0.8
_NO_TOTAL: Final = "#8a8a8a"
_PANELS: Final = 4

Floats = npt.NDArray[np.float64]


def years_picture(run: SeriesRun) -> Picture | None:
    """Return the figure of the lead basin; None where no water year is complete."""
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    methods = list(dict.fromkeys(method for _, method in series_names.listed(run)))[:_PANELS]
    gaps = run.setup.gaps
    totals = {
        (policy, method): run.summaries[policy, method].water_years.total[:, b] / mm
        for method in methods
        for policy in gaps
    }
    top = max((float(np.nanmax(one)) for one in totals.values() if not np.isnan(one).all()), default=None)
    if top is None:
        return None
    names = run.summaries[run.setup.series[0]].water_years.names
    years = np.array([int(name) for name in names])
    height = _HEAD + _FOOT + len(methods) * _PANEL + (len(methods) - 1) * _GAP
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, height))
        for k, method in enumerate(methods):
            bottom = _FOOT + (len(methods) - 1 - k) * (_PANEL + _GAP)
            axes = figure.add_axes(
                (_LEFT / PAGE_WIDTH, bottom / height, 1 - (_LEFT + _RIGHT) / PAGE_WIDTH, _PANEL / height)
            )
            _panel(axes, years, [totals[policy, method] for policy in gaps])
            axes.set_ylim(0, (top or 1.0) * 1.1)
            axes.set_title(inline(method, 60), pad=3)
            axes.set_ylabel(unit_word(run.depth_unit))
            if k < len(methods) - 1:
                axes.tick_params(axis="x", labelbottom=False)
            else:
                axes.set_xlabel("water year, named by its end")
        blank = any(np.isnan(one).any() for one in totals.values())
        figure.legend(
            handles=_handles(gaps, blank=blank),
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / height),
            ncols=5,
            columnspacing=1.3,
            handletextpad=0.4,
        )
        basin = run.basins.ids[b]
        described = "; ".join(
            f"{method} ({policy}): "
            + ", ".join(f"{name} {depth_text(float(v), run.depth_unit)}" for name, v in zip(names, values, strict=True))
            for (policy, method), values in totals.items()
        )
        svg = to_svg(figure, "years", inline(f"Water years of basin {basin}"), inline(described))
    caption = f"Water years of basin {basin}. The dashed line is the mean of the complete years by '{gaps[0]}'."
    if blank:
        caption += " Hatched: not complete by one of the policies at least, which then has no bar or mark; never zero."
    return Picture("years", caption, svg)


def _panel(axes: Any, years: npt.NDArray[np.int64], totals: list[Floats]) -> None:  # noqa: ANN401 - matplotlib's axes
    axes.set_xlim(years[0] - 0.6, years[-1] + 0.6)
    blank = np.isnan(totals).any(axis=0)
    for year in years[blank]:
        axes.axvspan(
            year - _WIDE / 2,
            year + _WIDE / 2,
            facecolor="white",
            hatch="//////",
            edgecolor=_NO_TOTAL,
            linewidth=0,
            zorder=0,
        )
    first = totals[0]
    known = ~np.isnan(first)
    left, right, zero = years[known] - _WIDE / 2, years[known] + _WIDE / 2, np.zeros(known.sum())
    corners = np.array([[left, zero], [left, first[known]], [right, first[known]], [right, zero]]).transpose(2, 0, 1)
    axes.add_collection(PolyCollection(list(corners), facecolors="#b9c0c5", edgecolors=INK, linewidths=0.4, zorder=2))
    for p, values in enumerate(totals[1:], start=1):
        axes.plot(years, values, linestyle="none", color="black", zorder=3, **_mark(p))
    if known.any():
        axes.axhline(float(first[known].mean()), color=INK, linewidth=0.8, linestyle=LINES[1], zorder=4)
    axes.xaxis.set_major_locator(MaxNLocator(12, integer=True, min_n_ticks=1))
    axes.yaxis.set_major_locator(MaxNLocator(4))
    axes.set_axisbelow(True)
    axes.grid(axis="y")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _mark(p: int) -> dict[str, Any]:
    return {**POLICY_MARKS[p], "markersize": 3.8}


def _handles(gaps: tuple[str, ...], *, blank: bool) -> list[Any]:
    handles: list[Any] = [Patch(facecolor="#b9c0c5", edgecolor=INK, linewidth=0.4, label=gaps[0])]
    handles += [
        Line2D([], [], linestyle="none", color="black", label=policy, **_mark(p))
        for p, policy in enumerate(gaps[1:], start=1)
    ]
    handles.append(Line2D([], [], color=INK, linewidth=0.8, linestyle=LINES[1], label="mean"))
    if blank:
        handles.append(Patch(facecolor="white", hatch="//////", edgecolor=_NO_TOTAL, linewidth=0, label="not complete"))
    return handles
