"""Annual maxima on Gumbel paper, with the lines of both distributions and the interval of the one that is taken."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import FixedLocator, FuncFormatter, MaxNLocator, NullLocator

from basinrain.design_record import RecordSource
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.goodness import plotting_variates
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.record_remarks import SHORT_TITLES, TITLES
from basinrain.report.figures import INK, LINES, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.units import depth_factor

__all__ = ["MOST_PANELS", "frequency_picture"]

MOST_PANELS: Final = 3
"""Durations that stand side by side."""

_HEIGHT, _LEFT, _RIGHT, _FOOT, _HEAD, _GAP = 3.0, 0.5, 0.12, 0.46, 0.62, 0.42  # inches
_WIDEST: Final = 3.6
_YEARS: Final = (1.01, 1.2, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0)
_LETTER: Final = 4.2  # points that a letter of a tick's label takes
_BAND: Final = "#dcdfe2"
_MARK: Final[dict[str, Any]] = {"marker": "o", "markersize": 3.6, "markerfacecolor": "white", "markeredgewidth": 0.7}

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class _Panel:
    """One duration of one area: ranked maxima at their reduced variates, lines, and the interval, in the unit drawn."""

    title: str
    variate: Floats
    ranked: Floats
    at: Floats
    lines: dict[str, Floats]
    ladder: Floats
    lower: Floats
    upper: Floats


def frequency_picture(
    record: RecordSource, row: int, places: Sequence[int], *, area: str, depth_unit: str, name: str = "frequency"
) -> Picture | None:
    """Return the figure of an area's annual maxima, one panel a duration.

    Parameters
    ----------
    record
        The depths from the record.
    row
        The area.
    places
        Places of the durations among those of the record; of many the first :data:`MOST_PANELS`.
    area
        What the figure calls it.
    depth_unit
        The unit to draw.
    name
        The figure's id in the page.

    Returns
    -------
    Picture or None
        None where no duration has a fit.
    """
    mm, found = depth_factor(depth_unit), record.depths
    panels = [
        _panel(record, row, d, mm)
        for d in list(places)[:MOST_PANELS]
        if not np.isnan(found.fit.parameters.location[row, d])
    ]
    if not panels:
        return None
    taken, other = found.distribution, next(one for one in found.fits if one != found.distribution)
    with figure_style():
        svg = to_svg(
            _figure(panels, taken, other, area, unit_word(depth_unit)),
            name,
            inline(f"Annual maxima of {area} on Gumbel paper"),
            inline(_described(panels, taken, depth_unit)),
        )
    caption = (
        f"{area}: ranked annual maxima at Gringorten's plotting positions on Gumbel paper, on which a Gumbel "
        f"distribution is a straight line; solid the distribution that is taken ({TITLES[taken]}) with its 90 % "
        f"interval, dashed the other ({TITLES[other]})."
    )
    return Picture(name, caption, svg)


def _panel(record: RecordSource, row: int, d: int, mm: float) -> _Panel:
    found = record.depths
    maxima = record.maxima[:, d, row]
    ranked = np.sort(maxima[~np.isnan(maxima)]) / mm
    variate = plotting_variates(len(ranked))
    ladder = np.array([frequency.variate for frequency in found.depths.frequencies])
    at = np.linspace(min(variate[0], ladder[0]) - 0.15, max(variate[-1], ladder[-1]) + 0.15, 80)
    lines = {one: fit.parameters.quantiles(at)[row, d] / mm for one, fit in found.fits.items()}
    return _Panel(
        title=duration_text(float(record.minutes[d])),
        variate=variate,
        ranked=ranked,
        at=at,
        lines={one: line for one, line in lines.items() if not np.isnan(line).any()},
        ladder=ladder,
        lower=found.lower[row, d] / mm,
        upper=found.upper[row, d] / mm,
    )


def _figure(panels: Sequence[_Panel], taken: str, other: str, area: str, unit: str) -> Figure:
    figure = Figure(figsize=(PAGE_WIDTH, _HEIGHT))
    n = len(panels)
    width = min(_WIDEST, (PAGE_WIDTH - _LEFT - _RIGHT - (n - 1) * _GAP) / n)
    for k, panel in enumerate(panels):
        left = _LEFT + k * (width + _GAP)
        axes = figure.add_axes((left / PAGE_WIDTH, _FOOT / _HEIGHT, width / PAGE_WIDTH, 1 - (_FOOT + _HEAD) / _HEIGHT))
        axes.fill_between(panel.ladder, panel.lower, panel.upper, facecolor=_BAND, edgecolor="none", zorder=1)
        for end in (panel.lower, panel.upper):
            axes.plot(panel.ladder, end, color=INK, linewidth=0.5, zorder=2)
        if other in panel.lines:
            axes.plot(panel.at, panel.lines[other], color=INK, linewidth=1.0, linestyle=LINES[1], zorder=3)
        axes.plot(panel.at, panel.lines[taken], color="black", linewidth=1.4, zorder=4)
        axes.plot(panel.variate, panel.ranked, linestyle="none", zorder=5, **_MARK)
        _dress(axes, panel, width)
        axes.set_title(panel.title, pad=4, fontsize=7.5)
        if k == 0:
            axes.set_ylabel(f"annual maximum, {unit}")
    figure.text(0.012, 1 - 0.04 / _HEIGHT, inline(area, 60), ha="left", va="top", fontsize=8, fontweight="bold")
    figure.legend(
        handles=[
            Line2D([], [], linestyle="none", label="annual maximum", **_MARK),
            Line2D([], [], color="black", linewidth=1.4, label=f"{SHORT_TITLES[taken]}, taken"),
            Patch(facecolor=_BAND, edgecolor=INK, linewidth=0.5, label="its 90 % interval"),
            Line2D([], [], color=INK, linewidth=1.0, linestyle=LINES[1], label=SHORT_TITLES[other]),
        ],
        loc="upper left",
        bbox_to_anchor=(0.012, 1 - 0.21 / _HEIGHT),
        ncols=4,
        columnspacing=1.5,
        handletextpad=0.5,
        handlelength=2.8,
    )
    return figure


def _dress(axes: Any, panel: _Panel, width: float) -> None:  # noqa: ANN401 - matplotlib's axes
    low, high = float(panel.at[0]), float(panel.at[-1])
    axes.set_xlim(low, high)
    drawn = np.concatenate([*panel.lines.values(), panel.ranked, panel.lower, panel.upper])
    least = float(drawn.min())
    axes.set_ylim(min(0.0, least), float(drawn.max()) * 1.06)
    years: list[float] = []
    places: list[float] = []
    for each in _YEARS:
        y = Frequency(each, ANNUAL_MAXIMUM).variate
        wide = _LETTER * (len(f"{each:g}") + len(f"{years[-1]:g}") + 1) / 2 if years else 0.0
        if low <= y <= high and (not places or (y - places[-1]) / (high - low) * width * 72 >= wide):
            years.append(each)
            places.append(y)
    labels = dict(zip(places, years, strict=True))
    axes.xaxis.set_major_locator(FixedLocator(places))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{labels.get(value, value):g}"))
    axes.xaxis.set_minor_locator(NullLocator())
    axes.yaxis.set_major_locator(MaxNLocator(5))
    axes.set_axisbelow(True)
    axes.grid(axis="both")
    axes.set_xlabel("return period, years")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _described(panels: Sequence[_Panel], taken: str, depth_unit: str) -> str:
    parts = []
    for panel in panels:
        rarest = float(panel.lower[-1]), float(panel.upper[-1])
        low, high = (depth_text(end, depth_unit) for end in rarest)
        least, most = (depth_text(float(panel.ranked[k]), depth_unit) for k in (0, -1))
        parts.append(
            f"{panel.title}: {len(panel.ranked)} annual maxima from {least} to {most}; at the rarest "
            f"frequency the 90 % interval of {SHORT_TITLES[taken]} is {low} to {high}"
        )
    return f"{unit_word(depth_unit)}; {'; '.join(parts)}"
