"""Depth against duration for every frequency: on a point, and over the area."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.transforms import ScaledTranslation
from scipy.optimize import isotonic_regression

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.errors import DataError, Problem
from basinrain.report.duration_axis import depth_axis, duration_axis
from basinrain.report.figures import INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.units import depth_factor

__all__ = ["MOST_FREQUENCIES", "apart", "depths_picture"]

MOST_FREQUENCIES: Final = 8
"""Frequencies whose curves can still be told apart."""

_HEIGHT, _LEFT, _RIGHT, _FOOT, _HEAD = 3.7, 0.55, 1.5, 0.44, 0.42  # inches
_LABEL: Final = 9.5  # points between labels of curves
_BESIDE: Final = 14.0  # points from a curve's end to its label
_SHORT: Final = 56.0  # points for short labels before the curves
_ROOM: Final = 1.2  # how many times the greatest depth the axis goes to

_KINDS: Final[Mapping[str, dict[str, Any]]] = MappingProxyType(
    {
        "point depth": {
            "linestyle": LINES[1],
            "color": "#5a6268",
            "marker": "o",
            "markersize": 5.2,
            "markerfacecolor": "white",
            "markeredgecolor": "#5a6268",
            "linewidth": 0.9,
        },
        "areal depth": {
            "linestyle": "-",
            "color": "black",
            "marker": "s",
            "markersize": 2.8,
            "markerfacecolor": "black",
        },
    }
)

Floats = npt.NDArray[np.float64]


def depths_picture(
    minutes: Floats,
    frequencies: Sequence[Frequency],
    point_depths: Floats,
    areal_depths: Floats,
    *,
    depth_unit: str,
    title: str,
    name: str = "design-depths",
) -> Picture:
    """Return the depth-duration curves of every frequency on logarithmic axes, labelled at their ends.

    Parameters
    ----------
    minutes : array of float, shape (n_durations,)
        Durations, rising.
    frequencies
        One a curve; of more than :data:`MOST_FREQUENCIES` so many are drawn, spread over all, and the caption says so.
    point_depths, areal_depths : array of float, shape (n_frequencies, n_durations)
        mm, before and after the areal reduction. A NaN has no place; a kind with no number at all is left out.
    depth_unit
        The unit to draw.
    title
        Whose depths they are: the point of interest.
    name
        The figure's id in the page.

    Raises
    ------
    DataError
        No depth is above 0, so that none has a place on a logarithmic axis.
    """
    minutes, mm = np.asarray(minutes, dtype=float), depth_factor(depth_unit)
    order = sorted(range(len(frequencies)), key=lambda f: frequencies[f].variate)
    shown = np.unique(np.linspace(0, len(order) - 1, min(len(order), MOST_FREQUENCIES)).round().astype(int))
    rows = [order[at] for at in shown.tolist()]
    given = (np.asarray(depths, dtype=float)[rows] / mm for depths in (point_depths, areal_depths))
    kinds = {
        label: (depth, look) for (label, look), depth in zip(_KINDS.items(), given, strict=True) if (depth > 0).any()
    }
    if not kinds:
        raise DataError(Problem(item=f"depths of {title}", found="none above 0", expected="depths by duration"))
    labels = [frequencies[row].label for row in rows]
    words = [duration_text(duration) for duration in minutes.tolist()]
    about = inline(title, 60)
    caption = f"{title}: {' and '.join(kinds)} by duration and frequency, both axes logarithmic."
    if len(rows) < len(frequencies):
        caption += f" Drawn: {len(rows)} of {len(frequencies)} frequencies."
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, _HEIGHT))
        wide, high = PAGE_WIDTH - _LEFT - _RIGHT, _HEIGHT - _FOOT - _HEAD
        axes = figure.add_axes((_LEFT / PAGE_WIDTH, _FOOT / _HEIGHT, wide / PAGE_WIDTH, high / _HEIGHT))
        _depth_axis(axes, [depth for depth, _ in kinds.values()], unit_word(depth_unit))
        both = len(kinds) == len(_KINDS)
        duration_axis(axes, minutes, words, points=wide * 72, left=_SHORT if both else _BESIDE, right=_BESIDE)
        for depth, look in kinds.values():
            for curve in depth:
                axes.plot(minutes, curve, clip_on=False, **look)
        ends = [depth for depth, _ in kinds.values()]
        _label_curves(axes, minutes, ends[-1], labels, points=high * 72)
        if both:
            short = [frequencies[row].short_label for row in rows]
            _label_curves(axes, minutes, ends[0], short, points=high * 72, first=True)
        figure.text(0.012, 1 - 0.04 / _HEIGHT, about, ha="left", va="top", fontsize=8, fontweight="bold")
        figure.legend(
            handles=[Line2D([], [], label=label, **look) for label, (_, look) in kinds.items()],
            loc="upper left",
            bbox_to_anchor=(0.012, 1 - 0.21 / _HEIGHT),
            ncols=2,
            columnspacing=1.6,
            handlelength=3.2,
        )
        described = "; ".join(
            f"{kind}, {label}: "
            + ", ".join(f"{w} {depth_text(v, depth_unit)}" for w, v in zip(words, curve, strict=True))
            for kind, (depth, _) in kinds.items()
            for label, curve in zip(labels, depth.tolist(), strict=True)
        )
        heading = inline(f"Depths by duration and frequency, {title}")
        svg = to_svg(figure, name, heading, inline(f"{unit_word(depth_unit)}; {described}"))
    return Picture(name, caption, svg)


def _depth_axis(axes: Any, depths: list[Floats], unit: str) -> None:  # noqa: ANN401 - matplotlib's axes
    known = np.concatenate([depth[depth > 0] for depth in depths])
    least, most = float(known.min()), float(known.max())
    axes.set_yscale("log")
    axes.set_ylim(least / _ROOM, most * _ROOM)
    # Less than a decade and a half has few places at 1, 2 and 5.
    close = math.log10(most / least * _ROOM**2) < 1.0
    depth_axis(axes, f"depth, {unit}", places=(1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0) if close else (1.0, 2.0, 5.0))


def _label_curves(
    axes: Any,  # noqa: ANN401 - matplotlib's axes
    minutes: Floats,
    depth: Floats,
    labels: list[str],
    *,
    points: float,
    first: bool = False,
) -> None:
    """Write each frequency beside the last end of its curve, or the first, as near as the other labels let it be."""
    low, high = (math.log(limit) for limit in axes.get_ylim())
    ends = []
    for label, curve in zip(labels, depth, strict=True):
        known = np.flatnonzero(curve > 0)
        if len(known):
            at = known[0 if first else -1]
            ends.append((label, float(minutes[at]), (math.log(curve[at]) - low) / (high - low) * points))
    ends.sort(key=lambda end: end[2])
    places = apart([y for _, _, y in ends], gap=_LABEL, top=points).tolist()
    x_text = (minutes[0], -_BESIDE) if first else (minutes[-1], _BESIDE)
    for (label, x, y), place in zip(ends, places, strict=True):
        axes.annotate(
            label,
            xy=(x, math.exp(low + y / points * (high - low))),
            xytext=(x_text[0], math.exp(low + place / points * (high - low))),
            textcoords=axes.transData + ScaledTranslation(x_text[1] / 72, 0, axes.figure.dpi_scale_trans),
            va="center",
            ha="right" if first else "left",
            fontsize=7,
            annotation_clip=False,
            arrowprops={"arrowstyle": "-", "linewidth": 0.5, "color": INK, "shrinkA": 1.0, "shrinkB": 3.5},
        )


def apart(places: Sequence[float], *, gap: float, top: float) -> Floats:
    """Return rising places moved as little as can be so that none is nearer to the next than a gap.

    Parameters
    ----------
    places
        Rising, from 0 to ``top``.
    gap, top
        The least distance, and the last place there is; where not all have room they go below 0.

    Examples
    --------
    >>> apart([1.0, 1.0, 6.0], gap=2.0, top=6.0)
    array([0., 2., 6.])
    """
    steps = gap * np.arange(len(places))
    moved = isotonic_regression(np.asarray(places) - steps).x if len(places) else steps
    return np.asarray(np.clip(moved, 0, None).clip(None, top - gap * (len(places) - 1)) + steps)
