"""Greatest depth against duration: sliding beside clock-aligned, and the series beside each other."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, FuncFormatter, LogLocator, NullFormatter, NullLocator

from basinrain.report import series_names
from basinrain.report.figures import HALF_WIDTH, LINES, Picture, figure_style, to_svg
from basinrain.report.greatest_list import duration_words
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.results_series import SeriesRun
from basinrain.units import depth_factor

__all__ = ["duration_pictures"]

_HEIGHT, _LEFT, _RIGHT, _FOOT = 2.9, 0.52, 0.14, 0.44  # inches
_APART: Final = 17.0  # points between labels of the axis
_LINE: Final = 0.145
_GREYS: Final = ("black", "#7b848a", "#4a545b")
_MARKS: Final = ("o", "s", "^")

Floats = npt.NDArray[np.float64]


def duration_pictures(run: SeriesRun) -> list[Picture]:
    """Return up to two figures of the lead basin; none where fewer than two durations have a depth above 0."""
    first = run.summaries[run.setup.series[0]].greatest
    if first is None:
        return []
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    seconds = first.durations.astype("timedelta64[s]").astype(float)
    kinds = {
        "sliding": (first.sliding.depth[:, b] / mm, {"linestyle": "-", "color": "black", "marker": "o", "markersize": 4.2, "markerfacecolor": "white"}),
        "tied to the clock": (
            first.aligned.depth[:, b] / mm,
            {"linestyle": LINES[1], "color": "#5a6268", "marker": "s", "markersize": 3.2, "markerfacecolor": "black"},
        ),
    }
    if np.count_nonzero(kinds["sliding"][0] > 0) < 2:
        return []
    basin = run.basins.ids[b]
    words = duration_words(first)
    one = series_names.series_word(run.setup.series[0])
    pictures = [
        _picture(
            run,
            words,
            seconds,
            kinds,
            name="duration-kinds",
            title=f"Greatest depths of basin {basin} by duration",
            caption=f"Basin {basin}: greatest depths by {one}, both axes logarithmic.",
        )
    ]
    if len(run.setup.series) > 1:
        names = series_names.names(run)
        several: dict[str, tuple[Floats, dict[str, Any]]] = {}
        methods = list(run.setup.methods)
        for series in series_names.listed(run):
            found = run.summaries[series].greatest
            if found is not None:
                p, m = run.setup.gaps.index(series[0]), methods.index(series[1])
                look = {"linestyle": LINES[m % len(LINES)], "color": _GREYS[p % 3], "marker": _MARKS[p % 3]}
                look |= {"markersize": 3.2, "markerfacecolor": "white", "linewidth": 0.9}
                several[names[series]] = (found.sliding.depth[:, b] / mm, look)
        pictures.append(
            _picture(
                run,
                words,
                seconds,
                several,
                name="duration-series",
                title=f"Greatest depths of basin {basin} by duration and series",
                caption=f"Basin {basin}: greatest depths in sliding windows by every series.",
            )
        )
    return pictures


def _picture(
    run: SeriesRun,
    words: list[str],
    seconds: Floats,
    curves: dict[str, tuple[Floats, dict[str, Any]]],
    *,
    name: str,
    title: str,
    caption: str,
) -> Picture:
    columns = 2 if max(map(len, curves)) < 24 else 1
    head = 0.12 + _LINE * -(-len(curves) // columns)
    total = _HEIGHT + max(0.0, head - 0.4)
    figure_size = (HALF_WIDTH, total)
    with figure_style():
        figure = Figure(figsize=figure_size)
        axes = figure.add_axes(
            (_LEFT / HALF_WIDTH, _FOOT / total, 1 - (_LEFT + _RIGHT) / HALF_WIDTH, 1 - (_FOOT + head) / total)
        )
        axes.set_xscale("log")
        axes.set_yscale("log")
        known = [depth[depth > 0] for depth, _ in curves.values()]
        least, most = min(float(k.min()) for k in known if len(k)), max(float(k.max()) for k in known if len(k))
        for label, (depth, look) in curves.items():
            axes.plot(seconds, np.where(depth > 0, depth, np.nan), label=label, **look)
        axes.set_xlim(seconds[0] / 1.25, seconds[-1] * 1.25)
        axes.set_ylim(least / 1.25, most * 1.25)
        _label(axes, words, seconds)
        axes.yaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
        axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axes.yaxis.set_minor_formatter(NullFormatter())
        axes.yaxis.set_minor_locator(NullLocator())
        axes.set_axisbelow(True)
        axes.grid(axis="both")
        axes.set_xlabel("duration")
        axes.set_ylabel(f"greatest depth, {unit_word(run.depth_unit)}")
        for side in ("top", "right"):
            axes.spines[side].set_visible(False)
        figure.legend(
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / total),
            ncols=columns,
            columnspacing=1.3,
            handletextpad=0.5,
            handlelength=3.2,
        )
        described = "; ".join(
            f"{label}: "
            + ", ".join(f"{w} {depth_text(float(v), run.depth_unit)}" for w, v in zip(words, depth, strict=True))
            for label, (depth, _) in curves.items()
        )
        svg = to_svg(figure, name, inline(title), inline(described))
    return Picture(name, caption, svg, half=True)


def _label(axes: Any, words: list[str], seconds: Floats) -> None:  # noqa: ANN401 - matplotlib's axes
    """Mark every duration, and name as many as have room."""
    points = (HALF_WIDTH - _LEFT - _RIGHT) * 72
    at = np.log(seconds / seconds[0]) / np.log(seconds[-1] / seconds[0] * 1.25**2) * points
    shown: list[str] = []
    last = -np.inf
    for place, word in zip(at, words, strict=True):
        room = place - last >= max(_APART, 4.2 * len(word))
        shown.append(word if room else "")
        last = place if room else last
    axes.xaxis.set_major_locator(FixedLocator(seconds.tolist()))
    axes.set_xticks(seconds, shown)
    axes.xaxis.set_minor_locator(NullLocator())
