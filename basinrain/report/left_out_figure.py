"""How the long-term mean moves without single gauges: a row a gauge, a panel a method, a mark a policy."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, MaxNLocator

from basinrain.report import series_names
from basinrain.report.figures import INK, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.long_term_list import most_moving
from basinrain.report.words import inline, number_text, short_names
from basinrain.results_series import SeriesRun

__all__ = ["POLICY_MARKS", "left_out_picture"]

POLICY_MARKS: Final[tuple[dict[str, Any], ...]] = (
    {"marker": "s", "markersize": 3.2, "markerfacecolor": "black"},
    {"marker": "o", "markersize": 3.7, "markerfacecolor": "white"},
    {"marker": "x", "markersize": 3.6, "markerfacecolor": "black", "markeredgewidth": 1.0},
)
"""One a policy, told apart without colour where they fall on each other."""

_ROW, _HEAD, _FOOT, _GAP = 0.2, 0.55, 0.42, 0.22  # inches
_PANELS: Final = 4
_APART: Final = 0.27  # of a row


def left_out_picture(run: SeriesRun) -> Picture | None:
    """Return the figure of the lead basin; None where no gauge was left out or none has a number."""
    gauges = most_moving(run)
    b = series_names.lead_basin(run)
    percents = [float(one.percent[b]) for found in gauges.values() for one in found.values()]
    if not percents or np.isnan(percents).all():
        return None
    methods = list(dict.fromkeys(method for _, method in series_names.listed(run)))[:_PANELS]
    labels = short_names(list(gauges), 20)
    left = 0.2 + 0.062 * max(len(label) for label in labels)
    height = _HEAD + _FOOT + _ROW * len(labels)
    wide = (PAGE_WIDTH - left - 0.16 - _GAP * (len(methods) - 1)) / len(methods)
    half = max(float(np.nanmax(np.abs(percents))), 1.0) * 1.12
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, height))
        for k, method in enumerate(methods):
            axes = figure.add_axes(
                (
                    (left + k * (wide + _GAP)) / PAGE_WIDTH,
                    _FOOT / height,
                    wide / PAGE_WIDTH,
                    1 - (_HEAD + _FOOT) / height,
                )
            )
            axes.set_xlim(-half, half)
            axes.set_ylim(len(labels) - 0.5, -0.5)
            axes.axvline(0, color=INK, linewidth=0.7)
            axes.hlines(
                np.arange(len(labels)),
                0,
                1,
                transform=axes.get_yaxis_transform(),
                color="#dfe3e5",
                linewidth=0.5,
                zorder=0,
            )
            for p, policy in enumerate(run.setup.gaps):
                values = np.array([_percent(found, (policy, method), b) for found in gauges.values()])
                # One above the other, so that equal values do not hide each other.
                rows = np.arange(len(labels)) + (p - (len(run.setup.gaps) - 1) / 2) * _APART
                axes.plot(values, rows, linestyle="none", color="black", zorder=3, **POLICY_MARKS[p])
            for row, found in enumerate(gauges.values()):
                if all(np.isnan(_percent(found, (policy, method), b)) for policy in run.setup.gaps):
                    axes.text(half * 0.04, row, "no number", va="center", fontsize=6)
            axes.xaxis.set_major_locator(MaxNLocator(4, symmetric=True))
            axes.xaxis.set_major_formatter(
                FuncFormatter(lambda value, _: f"{value:+g}".replace("-", "−") if value else "0")
            )
            axes.set_yticks(np.arange(len(labels)), labels if k == 0 else [""] * len(labels))
            axes.tick_params(axis="y", length=0, pad=5)
            axes.set_title(inline(method, 24), pad=4)
            for side in ("top", "right", "left"):
                axes.spines[side].set_visible(False)
        figure.text(
            (left + (PAGE_WIDTH - left) / 2) / PAGE_WIDTH,
            0.06 / height,
            "change of the mean without the gauge, %",
            ha="center",
            fontsize=7.5,
        )
        figure.legend(
            handles=[
                Line2D([], [], linestyle="none", color="black", label=policy, **POLICY_MARKS[p])
                for p, policy in enumerate(run.setup.gaps)
            ],
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / height),
            ncols=3,
            columnspacing=1.3,
            handletextpad=0.3,
        )
        described = "; ".join(
            f"{gauge}: "
            + ", ".join(
                f"{number_text(float(one.percent[b]), 1)} % by {method} ({gaps})"
                for (gaps, method), one in found.items()
            )
            for gauge, found in gauges.items()
        )
        basin = run.basins.ids[b]
        title = inline(f"Change of the mean of basin {basin} without single gauges")
        svg = to_svg(figure, "left-out", title, inline(described))
    caption = f"Basin {basin}: by how much the mean changes when a gauge is left out; gauges that matter most first."
    return Picture("left-out", caption, svg)


def _percent(found: dict[series_names.Series, Any], series: series_names.Series, b: int) -> float:
    return float(found[series].percent[b]) if series in found else float("nan")
