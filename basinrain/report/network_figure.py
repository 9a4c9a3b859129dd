"""How many gauges there are through a record: in service, reporting, and when they come and go."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from basinrain.rainfall import REPORTING, RainRecord, Status
from basinrain.report.figures import INK, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.time_axis import date_axis
from basinrain.report.words import inline, number_text, when_text, zone_text
from basinrain.results_series import SeriesRun
from basinrain.series.network_changes import CLOSES, OPENS, RETURNS, SILENT, NetworkChange

__all__ = ["network_picture"]

_BINS: Final = 240
_POINTS: Final = 400  # marks in a row, steps of a line
_BLOCK: Final = 1 << 24
_HEIGHT, _LEFT, _RIGHT, _HEAD, _FOOT, _ROW = 2.7, 0.62, 0.12, 0.3, 0.42, 0.13  # inches

_FILL: Final = "#b9c0c5"
_ROWS: Final[tuple[tuple[str, dict[str, Any]], ...]] = (
    (OPENS, {"marker": "^", "markerfacecolor": "black"}),
    (CLOSES, {"marker": "v", "markerfacecolor": "black"}),
    (SILENT, {"marker": "v", "markerfacecolor": "white"}),
    (RETURNS, {"marker": "^", "markerfacecolor": "white"}),
)
_IS_REPORTING: Final = np.array([status in REPORTING for status in Status])

Floats = npt.NDArray[np.float64]


def network_picture(run: SeriesRun) -> Picture | None:
    """Return the figure; None where there is nothing along time to draw.

    Of a record that was read chunk by chunk, only what the changes tell: gauges in service and not silent for long.
    """
    held = len(run.record) > 1
    if not held and not run.changes:
        return None
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, _HEIGHT))
        present = [(word, look) for word, look in _ROWS if any(c.change == word for c in run.changes)]
        strip = _ROW * len(present) + 0.06
        wide = (PAGE_WIDTH - _LEFT - _RIGHT) / PAGE_WIDTH
        tall = (_HEIGHT - _HEAD - _FOOT - strip) / _HEIGHT
        axes = figure.add_axes((_LEFT / PAGE_WIDTH, _FOOT / _HEIGHT, wide, tall))
        span = (_number(run.starts[0]), _number(run.ends[-1]))
        handles = _from_record(axes, run.record) if held else _from_changes(axes, run)
        axes.set_xlim(*span)
        axes.set_ylim(bottom=0)
        axes.yaxis.set_major_locator(MaxNLocator(5, integer=True))
        axes.set_axisbelow(True)
        axes.grid(axis="y")
        axes.set_ylabel("gauges")
        axes.set_xlabel(f"time, {zone_text(run.record.zone)}")
        date_axis(axes.xaxis, most=9)
        for side in ("top", "right"):
            axes.spines[side].set_visible(False)
        if present:
            above = figure.add_axes(
                (_LEFT / PAGE_WIDTH, _FOOT / _HEIGHT + tall + 0.05 / _HEIGHT, wide, strip / _HEIGHT)
            )
            _marks(above, run.changes, present, span)
            handles += [
                Line2D([], [], linestyle="none", color="black", markersize=4.2, label=word, **look)
                for word, look in present
            ]
        figure.legend(
            handles=handles,
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / _HEIGHT),
            ncols=6,
            columnspacing=1.3,
            handletextpad=0.4,
        )
        svg = to_svg(figure, "network", "Gauges through the record", inline(_description(run)))
    caption = (
        "Gauges in service, and how many of them report, mean of the steps of each stretch."
        if held
        else "Gauges in service and not silent for long. The record was read chunk by chunk: "
        "how many reported at every step was not counted."
    )
    if run.changes:
        caption += " Above: when gauges come and go."
    return Picture("network", caption, svg)


def _number(when: np.datetime64) -> float:
    return float(date2num(when))  # type: ignore[no-untyped-call]


def _from_record(axes: Any, record: RainRecord) -> list[Any]:  # noqa: ANN401 - matplotlib's axes
    in_service, reporting = _counts(record)
    together = -(-len(record) // _BINS)
    first = np.arange(0, len(record), together)
    sizes = np.diff(first, append=len(record))
    edges = date2num(np.append(record.starts[first], record.ends[-1]))  # type: ignore[no-untyped-call]
    means = [np.add.reduceat(count, first) / sizes for count in (in_service, reporting)]
    axes.stairs(means[1], edges, fill=True, facecolor=_FILL, edgecolor="none", linewidth=0)
    axes.stairs(means[0], edges, baseline=None, color=INK, linewidth=1.1)
    return [Line2D([], [], color=INK, linewidth=1.1, label="in service"), Patch(facecolor=_FILL, label="reporting")]


def _counts(record: RainRecord) -> tuple[Floats, Floats]:
    """Return how many gauges are in service and report at every step."""
    in_service, reporting = np.empty(len(record)), np.empty(len(record))
    size = max(1, _BLOCK // max(1, len(record.gauges)))
    for first in range(0, len(record), size):
        block = record.status[first : first + size]
        in_service[first : first + size] = (block != Status.NOT_INSTALLED).sum(axis=1)
        reporting[first : first + size] = _IS_REPORTING[block].sum(axis=1)
    return in_service, reporting


def _from_changes(axes: Any, run: SeriesRun) -> list[Any]:  # noqa: ANN401 - matplotlib's axes
    last = {change.time: change.gauges for change in run.changes}
    times = _numbers(list(last))
    counts = np.array(list(last.values()))
    edges = np.append(times, _number(run.ends[-1]))
    if len(counts) > _POINTS:
        edges = np.linspace(edges[0], edges[-1], _POINTS + 1)
        counts = counts[np.searchsorted(times, edges[:-1], side="right") - 1]
    axes.stairs(counts, edges, baseline=None, color=INK, linewidth=1.1)
    return [Line2D([], [], color=INK, linewidth=1.1, label="in service, not silent for long, from the first change")]


def _numbers(times: list[np.datetime64]) -> Floats:
    return np.asarray(date2num(np.array(times, dtype="datetime64[s]")), dtype=np.float64)  # type: ignore[no-untyped-call]


def _marks(
    axes: Any,  # noqa: ANN401 - matplotlib's axes
    changes: tuple[NetworkChange, ...],
    rows: list[tuple[str, dict[str, Any]]],
    span: tuple[float, float],
) -> None:
    axes.set_xlim(*span)
    axes.set_ylim(len(rows) - 0.5, -0.5)
    axes.axis("off")
    grain = (span[1] - span[0]) / _POINTS
    for row, (word, look) in enumerate(rows):
        times = _numbers([change.time for change in changes if change.change == word])
        # Marks on the same spot of the paper are one mark.
        _, first = np.unique(np.floor((times - span[0]) / grain), return_index=True)
        axes.plot(
            times[first],
            np.full(len(first), row),
            linestyle="none",
            color="black",
            markersize=4.2,
            clip_on=False,
            **look,
        )


def _description(run: SeriesRun) -> str:
    text = f"From {when_text(run.starts[0])} to {when_text(run.ends[-1])}. "
    if len(run.record) > 1:
        in_service, reporting = _counts(run.record)
        text += (
            f"In service {number_text(in_service.min(), 0)} to {number_text(in_service.max(), 0)} gauges, reporting "
            f"{number_text(reporting.min(), 0)} to {number_text(reporting.max(), 0)}. "
        )
    return text + "; ".join(f"{word}: {sum(change.change == word for change in run.changes)}" for word, _ in _ROWS)
