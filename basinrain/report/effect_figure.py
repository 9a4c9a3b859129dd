"""How the basin means of a storm move with the infill method: a dot a method, a panel a basin."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import MaxNLocator

from basinrain.infill_effect import InfillEffect
from basinrain.report.figures import HALF_WIDTH, INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.words import depth_text, inline, short_names, unit_word
from basinrain.units import depth_factor

__all__ = ["effect_picture"]

_ROW, _HEAD, _FOOT, _GAP = 0.165, 0.55, 0.42, 0.26  # inches
_MOST: Final = 4

_OWN: Final[dict[str, Any]] = {"marker": "s", "markersize": 5.2, "markerfacecolor": "black"}
_OTHER: Final[dict[str, Any]] = {"marker": "o", "markersize": 4.4, "markerfacecolor": "white"}


def effect_picture(
    effect: InfillEffect, averaging: str, basins: list[tuple[int, str]], *, depth_unit: str, name: str, storm: str
) -> Picture | None:
    """Return the figure for one averaging method; None where no basin has two different numbers to compare.

    Parameters
    ----------
    effect
        The basin means by every infill method.
    averaging
        The averaging method to show.
    basins
        Row and id of the basins that may be drawn; the four whose mean moves most are.
    depth_unit
        ``"mm"`` or ``"in"``.
    name, storm
        The figure's id in the page, and the storm's name.
    """
    totals = effect.totals[averaging] / depth_factor(depth_unit)
    moves = {}
    for b, _ in basins:
        known = totals[:, b][~np.isnan(totals[:, b])]
        if len(known) > 1:
            moves[b] = float(np.ptp(known))
    drawn = sorted(moves, key=lambda b: (-round(moves[b], 9), b))[:_MOST]
    if not drawn or len(effect.methods) < 2:
        return None
    drawn.sort()
    ids = dict(basins)
    labels = [inline(method, 34) for method in effect.methods]
    left = 0.2 + 0.058 * max(len(label) for label in labels)
    whole = HALF_WIDTH + 0.6 if len(drawn) == 1 else PAGE_WIDTH
    height = _HEAD + _FOOT + _ROW * len(labels)
    wide = (whole - left - 0.16 - _GAP * (len(drawn) - 1)) / len(drawn)
    names = short_names([ids[b] for b in drawn], max(4, int(wide * 72 / 5.2)))
    with figure_style():
        figure = Figure(figsize=(whole, height))
        for k, b in enumerate(drawn):
            axes = figure.add_axes(
                (
                    (left + k * (wide + _GAP)) / whole,
                    _FOOT / height,
                    wide / whole,
                    (height - _HEAD - _FOOT) / height,
                )
            )
            _panel(axes, effect, totals[:, b], labels if k == 0 else None)
            axes.set_title(names[k], pad=4)
        figure.text(
            (left + (whole - left) / 2) / whole,
            0.06 / height,
            f"basin mean by {averaging}, {unit_word(depth_unit)}",
            ha="center",
            fontsize=7.5,
        )
        figure.legend(
            handles=[
                Line2D([], [], linestyle="none", color="black", label="the job's infill method", **_OWN),
                Line2D([], [], linestyle="none", color="black", label="another infill method", **_OTHER),
            ],
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.03 / height),
            ncols=2,
            columnspacing=1.2,
            handletextpad=0.3,
        )
        description = "; ".join(
            f"{ids[b]}: "
            + ", ".join(
                f"{method} {depth_text(value, depth_unit)}"
                for method, value in zip(effect.methods, totals[:, b], strict=True)
            )
            for b in drawn
        )
        svg = to_svg(figure, name, inline(f"Basin means by infill method, {storm}"), inline(description))
    more = len(moves) - len(drawn)
    caption = (
        f"{storm}: the basin mean by {averaging} after each infill method, from simple to complex; the dashed line is "
        "the job's own. The axes do not begin at zero, and each panel has its own."
    )
    if more:
        caption += f" The {len(drawn)} basins whose mean moves most; the others are in infill_effect.csv."
    return Picture(name, caption, svg, half=len(drawn) == 1)


def _panel(axes: Any, effect: InfillEffect, values: Any, labels: list[str] | None) -> None:  # noqa: ANN401 - matplotlib's axes
    places = np.arange(len(values))
    own = effect.methods.index(effect.own)
    if not np.isnan(values[own]):
        axes.axvline(values[own], color=INK, linewidth=0.7, linestyle=LINES[1], zorder=1)
    axes.hlines(places, 0, 1, transform=axes.get_yaxis_transform(), color="#c9cdd0", linewidth=0.5, zorder=0)
    for row, value in enumerate(values):
        if not np.isnan(value):
            style = _OWN if row == own else _OTHER
            axes.plot([value], [row], linestyle="none", color="black", clip_on=False, zorder=3, **style)
        else:
            axes.text(0.5, row, "no number", transform=axes.get_yaxis_transform(), ha="center", va="center", fontsize=6)
    least, most = float(np.nanmin(values)), float(np.nanmax(values))
    # Differences below what is printed shall not look large.
    room = max(most - least, 0.02 * abs(most), 0.2) * 0.12
    middle = (least + most) / 2
    half = max((most - least) / 2 + room, 0.01 * abs(most), 0.1)
    axes.set_xlim(middle - half, middle + half)
    axes.set_ylim(len(values) - 0.5, -0.5)
    axes.xaxis.set_major_locator(MaxNLocator(3))
    axes.set_yticks(places, labels or [""] * len(values))
    if labels:
        for row, label in enumerate(axes.get_yticklabels()):
            label.set_fontweight("bold" if row == own else "normal")
    axes.tick_params(axis="y", length=0, pad=5)
    for side in ("top", "right", "left"):
        axes.spines[side].set_visible(False)
