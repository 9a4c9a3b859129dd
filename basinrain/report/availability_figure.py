"""What there is of the record: a strip a gauge, along time; filled where the gauge has values of its own."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt
from matplotlib.dates import date2num
from matplotlib.figure import Figure
from matplotlib.patches import Patch, PathPatch
from matplotlib.path import Path

from basinrain.rainfall import RainRecord, Status
from basinrain.report.figures import HALO, INK, PAGE_WIDTH, Picture, figure_style, to_svg
from basinrain.report.time_axis import date_axis
from basinrain.report.words import counted, inline, percent_text, short_names, zone_text

__all__ = ["MOST_ROWS", "availability_picture"]

MOST_ROWS: Final = 44
"""Gauges drawn; of more, those with the least of their own values."""

_ROW, _HEAD, _FOOT, _RIGHT = 0.152, 0.4, 0.4, 0.62  # inches
_HIGH: Final = 0.36  # half the height of a strip, of a row's
_PARTS: Final = 8  # heights of a strip that are told apart
_LETTER_ROOM: Final = 9.0  # points that a letter takes
_NARROW: Final = 4.0  # points below which a stretch has no outline

# What else a step can be, the letter that stands for it, and how it is drawn.
_KINDS: Final[dict[str, tuple[str, dict[str, Any]]]] = {
    "missing": ("M", {"facecolor": "white", "hatch": ""}),
    "rejected": ("R", {"facecolor": "black", "hatch": ""}),
    "known over several steps only": ("T", {"facecolor": "white", "hatch": "//////"}),
    "not in service": ("N", {"facecolor": "white", "hatch": "xxxx"}),
}
_OWN: Final = "#8d969c"
_CODES: Final = {
    Status.MISSING: 1,
    Status.REJECTED: 2,
    Status.ACCUMULATED: 3,
    Status.NOT_INSTALLED: 4,
}

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]


def availability_picture(record: RainRecord) -> Picture | None:
    """Return the figure; None for a record without times or of fewer than two steps.

    Parameters
    ----------
    record
        As it was read and edited, nothing infilled.
    """
    if len(record) < 2 or np.isnat(record.ends).any() or not record.gauges:
        return None
    kinds = _kinds(record)
    own, in_service = (kinds == 0).sum(axis=0), (kinds != 4).sum(axis=0)
    share = np.divide(own, in_service, out=np.full(len(own), np.nan), where=in_service > 0)
    rows = list(range(len(record.gauges)))
    if len(rows) > MOST_ROWS:
        least = sorted(rows, key=lambda g: (np.nan_to_num(share[g], nan=-1.0), record.gauges[g]))[:MOST_ROWS]
        rows = sorted(least)
    labels = short_names([record.gauges[g] for g in rows], 18)
    shares = [float(share[g]) for g in rows]
    everyone = len(rows) < len(record.gauges)
    if everyone:
        labels.append(f"all {len(record.gauges)}")
        shares.append(float(own.sum() / in_service.sum()) if in_service.any() else float("nan"))
    left = 0.22 + 0.06 * max(len(label) for label in labels)
    height = _HEAD + _FOOT + _ROW * len(labels)
    points = (PAGE_WIDTH - left - _RIGHT) * 72
    edges, first = _bins(record, 230 if len(rows) <= 20 else 160)
    with figure_style():
        figure = Figure(figsize=(PAGE_WIDTH, height))
        axes = figure.add_axes(
            (left / PAGE_WIDTH, _FOOT / height, 1 - (left + _RIGHT) / PAGE_WIDTH, 1 - (_HEAD + _FOOT) / height)
        )
        axes.set_xlim(edges[0], edges[-1])
        axes.set_ylim(len(labels) - 0.5, -0.5)
        strips = _Strips(edges, points)
        for row, g in enumerate(rows):
            strips.add(row, _shares(kinds[:, g], first))
        if everyone:
            strips.add(len(rows), np.mean([_shares(kinds[:, g], first) for g in range(len(own))], axis=0))
        strips.draw(axes)
        axes.set_yticks(np.arange(len(labels)), labels)
        axes.tick_params(axis="y", length=0, pad=4)
        for side in ("top", "right", "left"):
            axes.spines[side].set_visible(False)
        date_axis(axes.xaxis, most=9)
        axes.set_xlabel(f"time, {zone_text(record.zone)}")
        for row, part in enumerate(shares):
            axes.annotate(
                percent_text(part),
                (1.0, row),
                xycoords=("axes fraction", "data"),
                xytext=(5, 0),
                textcoords="offset points",
                va="center",
                fontsize=6.5,
            )
        figure.text(
            1 - (_RIGHT - 0.07) / PAGE_WIDTH, 1 - (_HEAD - 0.05) / height, "own values", fontsize=6.5, va="bottom"
        )
        figure.legend(
            handles=strips.legend(),
            loc="upper left",
            bbox_to_anchor=(0.02, 1 - 0.04 / height),
            ncols=5,
            columnspacing=1.3,
            handletextpad=0.5,
            handleheight=0.9,
        )
        name = "availability"
        title = "What there is of the record"
        described = "; ".join(
            f"{label}: {percent_text(part)} own values" for label, part in zip(labels, shares, strict=True)
        )
        svg = to_svg(figure, name, title, inline(f"By share of the steps in service. {described}."))
    caption = (
        "The record, a strip a gauge. Where a strip is filled in part, that part of the steps has values of the "
        "gauge's own. On the right their share of the steps in service."
    )
    if everyone:
        caption += (
            f" Drawn: the {counted(len(rows), 'gauge')} of {len(record.gauges)} with the smallest shares, and below "
            "them all gauges together; all are in completeness.csv."
        )
    return Picture(name, caption, svg)


def _kinds(record: RainRecord) -> Ints:
    """Return 0 where a gauge has a value of its own, else what there is instead, by the order of the legend from 1."""
    lookup = np.zeros(len(Status), dtype=np.int64)
    for status, code in _CODES.items():
        lookup[status] = code
    return lookup[record.status]


def _bins(record: RainRecord, most: int) -> tuple[Floats, Ints]:
    """Return the edges in time of at most ``most`` bins of whole steps, and the first step of each."""
    together = -(-len(record) // most)
    first = np.arange(0, len(record), together, dtype=np.int64)
    edges = np.append(record.starts[first], record.ends[-1])
    return np.asarray(date2num(edges), dtype=np.float64), first  # type: ignore[no-untyped-call]


def _shares(kinds: Ints, first: Ints) -> Floats:
    """Return what share of every bin's steps is of each kind, shape (n_kinds, n_bins)."""
    sizes = np.diff(np.append(first, len(kinds)))
    return np.array([np.add.reduceat((kinds == code).astype(float), first) / sizes for code in range(len(_KINDS) + 1)])


class _Strips:
    """The strips as one path a kind, and the letters that find room."""

    def __init__(self, edges: Floats, points: float) -> None:
        self._edges = edges
        self._a_point = (edges[-1] - edges[0]) / points
        self._boxes: dict[str, list[tuple[float, float, float, float]]] = {"own": [], **{kind: [] for kind in _KINDS}}
        self._letters: list[tuple[float, float, str]] = []

    def add(self, row: int, shares: Floats) -> None:
        """Add one gauge's strip: own values from below, above them what most of the other steps are."""
        # A bin is full or empty only where all of its steps are.
        parts = np.where(
            (shares[0] == 0) | (shares[0] == 1),
            shares[0],
            np.clip(np.round(shares[0] * _PARTS), 1, _PARTS - 1) / _PARTS,
        )
        rest = np.where(parts < 1, 1 + np.argmax(shares[1:], axis=0), 0)
        # One step rejected among many missing must not vanish.
        rest[(shares[2] > 0) & (parts < 1)] = 2
        bottom, top = row + _HIGH, row - _HIGH
        for start, stop in _runs(parts, rest):
            left, right = self._edges[start], self._edges[stop]
            level = bottom - parts[start] * 2 * _HIGH
            if parts[start] > 0:
                self._boxes["own"].append((left, bottom, right, level))
            if rest[start]:
                kind = list(_KINDS)[rest[start] - 1]
                if kind == "rejected":
                    right = max(right, left + 1.5 * self._a_point)
                self._boxes[kind].append((left, level, right, top))
                if (right - left) / self._a_point >= _LETTER_ROOM and parts[start] <= 0.25:
                    self._letters.append(((left + right) / 2, row, _KINDS[kind][0]))

    def draw(self, axes: Any) -> None:  # noqa: ANN401 - matplotlib's axes
        """Draw all strips."""
        for kind, boxes in self._boxes.items():
            # A line around every notch and slit of a strip that is nearly full would hide more than it shows.
            notches = [
                box for box in boxes if box[1] - box[3] < 2 * _HIGH - 1e-9 or box[2] - box[0] < _NARROW * self._a_point
            ]
            for some, style in (
                ([box for box in boxes if box not in notches], _look(kind)),
                (notches, {**_look(kind), "linewidth": 0.0}),
            ):
                if some:
                    path = Path.make_compound_path(*(_box(*box) for box in some))
                    axes.add_patch(PathPatch(path, zorder=3 if kind == "rejected" else 2, **style))
        for x, y, letter in self._letters:
            axes.text(
                x,
                y,
                letter,
                ha="center",
                va="center",
                fontsize=5.5,
                fontweight="bold",
                color="white" if letter == "R" else INK,
                gid=None if letter == "R" else f"{HALO}-{letter}",
                zorder=4,
            )

    def legend(self) -> list[Patch]:
        """Return a handle for every kind that occurs."""
        handles = [Patch(**_look("own"), label="own values")]
        handles += [Patch(**_look(kind), label=f"{_KINDS[kind][0]} {kind}") for kind in _KINDS if self._boxes[kind]]
        return handles


def _look(kind: str) -> dict[str, Any]:
    if kind == "own":
        return {"facecolor": _OWN, "edgecolor": _OWN, "linewidth": 0.0}
    edge = "#6d757b"
    return {**_KINDS[kind][1], "edgecolor": edge, "linewidth": 0.4}


def _box(left: float, bottom: float, right: float, top: float) -> Path:
    return Path([(left, bottom), (right, bottom), (right, top), (left, top), (left, bottom)], closed=True)


def _runs(parts: Floats, rest: Ints) -> list[tuple[int, int]]:
    """Return first and stop of every run of bins that look the same."""
    turns = np.flatnonzero((np.diff(parts) != 0) | (np.diff(rest) != 0)) + 1
    starts = np.concatenate([[0], turns])
    return list(zip(starts.tolist(), np.append(turns, len(parts)).tolist(), strict=True))
