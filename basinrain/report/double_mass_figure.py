"""Double-mass curves: a small figure for every gauge whose curve breaks."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, MaxNLocator

from basinrain.report.figures import HALF_WIDTH, HALO, INK, LINES, Picture, figure_style, to_svg
from basinrain.report.words import inline, number_text, unit_word
from basinrain.screening.double_mass import DoubleMass
from basinrain.units import depth_factor

__all__ = ["MOST_CURVES", "double_mass_pictures", "drawn_curves"]

MOST_CURVES: Final = 12
"""Curves drawn; of more, those whose break is clearest."""

_HEIGHT: Final = 2.75


def drawn_curves(curves: Sequence[DoubleMass]) -> list[DoubleMass]:
    """Return the curves with a significant break, the clearest first, at most a dozen."""
    broken = [curve for curve in curves if curve.break_after is not None and curve.significant]
    return sorted(broken, key=lambda curve: (-curve.f, curve.gauge))[:MOST_CURVES]


def double_mass_pictures(curves: Sequence[DoubleMass], *, depth_unit: str) -> list[Picture]:
    """Return one figure for each of :func:`drawn_curves`.

    Parameters
    ----------
    curves
        Of all gauges.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    with figure_style():
        return [
            _picture(curve, depth_unit, f"double-mass-{k}") for k, curve in enumerate(drawn_curves(curves), start=1)
        ]


def _picture(curve: DoubleMass, depth_unit: str, name: str) -> Picture:
    mm = depth_factor(depth_unit)
    x, y = np.append(0.0, curve.x) / mm, np.append(0.0, curve.y) / mm
    stop = int(np.flatnonzero(curve.years == curve.break_after)[0]) + 1
    before, after = curve.slopes
    figure = Figure(figsize=(HALF_WIDTH, _HEIGHT))
    left, foot, head = 0.66, 0.44, 0.56
    axes = figure.add_axes(
        (left / HALF_WIDTH, foot / _HEIGHT, 1 - (left + 0.14) / HALF_WIDTH, (_HEIGHT - foot - head) / _HEIGHT)
    )
    # Each slope goes on a little where the curve has left it, so that the bend is seen.
    reach = 0.22 * x[-1]
    ahead = min(x[-1], x[stop] + reach)
    back = max(0.0, x[stop] - reach, x[stop] - y[stop] / after if after > 0 else 0.0)
    axes.plot([0, ahead], [0, before * ahead], color=INK, linewidth=0.8, linestyle=LINES[1], zorder=2)
    axes.plot(
        [back, x[-1]],
        [y[stop] - after * (x[stop] - back), y[stop] + after * (x[-1] - x[stop])],
        color=INK,
        linewidth=0.8,
        linestyle=LINES[2],
        zorder=2,
    )
    points: dict[str, Any] = {"marker": "o", "markersize": 2.8, "markerfacecolor": "white", "markeredgewidth": 0.6}
    axes.plot(x, y, color="#6d757b", linewidth=0.8, zorder=3, clip_on=False, **points)
    broken: dict[str, Any] = {"marker": "D", "markersize": 5.4, "markerfacecolor": "black"}
    axes.plot([x[stop]], [y[stop]], linestyle="none", color="black", zorder=4, **broken)
    axes.annotate(
        str(curve.break_after),
        (x[stop], y[stop]),
        xytext=(6, -7),
        textcoords="offset points",
        ha="left",
        va="center",
        fontsize=6.5,
        fontweight="bold",
        gid=f"{HALO}-break",
        zorder=6,
    )
    for k in _told_years(curve.years, stop):
        # Above the curve, where neither slope goes on; the break's own stands below.
        axes.annotate(
            str(curve.years[k]),
            (x[k + 1], y[k + 1]),
            xytext=(-4, 5),
            textcoords="offset points",
            ha="right",
            va="center",
            fontsize=6,
            gid=f"{HALO}-year",
            zorder=5,
        )
    axes.set_xlim(0, x[-1] * 1.04)
    axes.set_ylim(0, max(y[-1], before * ahead) * 1.06)
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MaxNLocator(4))
        axis.set_major_formatter(FuncFormatter(lambda value, _: number_text(value, 0, grouped=True)))
    for spine in ("top", "right"):
        axes.spines[spine].set_visible(False)
    unit = unit_word(depth_unit)
    axes.set_xlabel(f"cumulative mean of the neighbours on shared days, {unit}")
    axes.set_ylabel(f"cumulative at the gauge, {unit}")
    title = f"{inline(curve.gauge, 40)}: ratio {number_text(curve.ratio, 3)}"
    figure.text(0.02, 1 - 0.03 / _HEIGHT, title, ha="left", va="top", fontsize=8, fontweight="bold")
    figure.legend(
        handles=[
            Line2D([], [], color="#6d757b", linewidth=0.8, label=f"{curve.years[0]} to {curve.years[-1]}", **points),
            Line2D([], [], linestyle="none", color="black", label="break", **broken),
            Line2D([], [], color=INK, linewidth=0.8, linestyle=LINES[1], label=f"before {number_text(before, 3)}"),
            Line2D([], [], color=INK, linewidth=0.8, linestyle=LINES[2], label=f"after {number_text(after, 3)}"),
        ],
        loc="upper left",
        bbox_to_anchor=(0.02, 1 - 0.2 / _HEIGHT),
        ncols=4,
        columnspacing=1.0,
        handletextpad=0.4,
        handlelength=2.0,
    )
    numbers = (
        f"slopes {number_text(before, 3)} and {number_text(after, 3)}, newer over older years "
        f"{number_text(curve.ratio, 3)}"
    )
    caption = (
        f"Gauge {curve.gauge} against the mean of {', '.join(curve.reference)}: break after {curve.break_after}; "
        f"{numbers}; F\u00a0=\u00a0{number_text(curve.f, 1)}, probability {_probability(curve.significance)}."
    )
    fewest = int(curve.days.min())
    if fewest < 365:
        caption += f" A year's sums are over the days that both have, {fewest} of 365 at the fewest."
    if not curve.persists:
        caption += " One side has fewer than five years."
    title = f"Double-mass curve of gauge {curve.gauge}"
    return Picture(name, caption, to_svg(figure, name, inline(title), inline(caption)), half=True)


def _told_years(years: npt.NDArray[np.int64], stop: int) -> list[int]:
    """Return the places of the last year and of round ones before it, none beside another, the break or the origin.

    Examples
    --------
    >>> _told_years(np.arange(1998, 2017), 8)  # the break is after 2005
    [2, 12, 18]
    """
    apart = max(2, len(years) // 10)
    told = [len(years) - 1]
    step = 5 if len(years) <= 40 else 10
    for k in np.flatnonzero(years % step == 0).tolist():
        if min(abs(k - other) for other in [*told, stop - 1, -1]) >= apart:
            told.append(k)
    return sorted(k for k in told if abs(k - (stop - 1)) >= apart)


def _probability(value: float) -> str:
    return "below\u00a00.001" if value < 0.001 else number_text(value, 3)
