"""Greatest depth against duration: sliding beside clock-aligned, and the series beside each other."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, NullLocator

from basinrain.report import series_names
from basinrain.report.duration_axis import depth_axis, words_with_room
from basinrain.report.figures import HALF_WIDTH, LINES, MARKS, Picture, figure_style, to_svg
from basinrain.report.greatest_list import duration_words
from basinrain.report.words import depth_text, inline, unit_word
from basinrain.results_series import SeriesRun
from basinrain.units import depth_factor

__all__ = ["duration_pictures"]

_HEIGHT, _LEFT, _RIGHT, _FOOT = 2.9, 0.52, 0.14, 0.44  # inches
_LINE: Final = 0.145
_GREYS: Final = ("black", "#5a6268", "#7b848a", "black")
_CURVES: Final = 4

Floats = npt.NDArray[np.float64]


def duration_pictures(run: SeriesRun) -> list[Picture]:
    """Return up to two figures of the lead basin; none where fewer than two durations have a depth above 0."""
    first = run.summaries[run.setup.series[0]].greatest
    if first is None:
        return []
    b, mm = series_names.lead_basin(run), depth_factor(run.depth_unit)
    seconds = first.durations.astype("timedelta64[s]").astype(float)
    kinds = {
        "sliding": (
            first.sliding.depth[:, b] / mm,
            {"linestyle": "-", "color": "black", "marker": "o", "markersize": 4.2, "markerfacecolor": "white"},
        ),
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
    several = _beside(run)
    if len(several) > 1:
        gaps = run.setup.gaps[0]
        curves: dict[str, tuple[Floats, dict[str, Any]]] = {}
        for k, (label, series) in enumerate(several.items()):
            found = run.summaries[series].greatest
            if found is not None:
                look = {"linestyle": LINES[k % len(LINES)], "color": _GREYS[k % len(_GREYS)], "linewidth": 1.0}
                curves[label] = (found.sliding.depth[:, b] / mm, {**look, **MARKS[k % len(MARKS)], "markersize": 3.4})
        every = (
            "policy" if len(run.setup.methods) == 1 else "method" + (f" ('{gaps}')" if len(run.setup.gaps) > 1 else "")
        )
        pictures.append(
            _picture(
                run,
                words,
                seconds,
                curves,
                name="duration-series",
                title=f"Greatest depths of basin {basin} by duration and {every}",
                caption=f"Basin {basin}: greatest depths in sliding windows by every {every}.",
            )
        )
    return pictures


def _beside(run: SeriesRun) -> dict[str, series_names.Series]:
    """Return the series that are drawn side by side: the methods by the first policy, or the only one's policies."""
    methods, gaps = list(run.setup.methods), run.setup.gaps
    if len(methods) > 1:
        return {inline(method, 24): (gaps[0], method) for method in methods[:_CURVES]}
    return {policy: (policy, methods[0]) for policy in gaps}


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
    head = 0.12 + 2 * _LINE
    # Durations longer than the record have no depth.
    last = 1 + max(int(np.flatnonzero(depth > 0)[-1]) for depth, _ in curves.values() if (depth > 0).any())
    words, seconds = words[:last], seconds[:last]
    curves = {label: (depth[:last], look) for label, (depth, look) in curves.items()}
    total = _HEIGHT
    with figure_style():
        figure = Figure(figsize=(HALF_WIDTH, total))
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
        depth_axis(axes, f"greatest depth, {unit_word(run.depth_unit)}")
        figure.legend(
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / total),
            ncols=2,
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
    axes.xaxis.set_major_locator(FixedLocator(seconds.tolist()))
    axes.set_xticks(seconds, words_with_room(at.tolist(), words))
    axes.xaxis.set_minor_locator(NullLocator())
