"""How the gaps of one gauge were infilled: every estimate with its donors, and what is to be said of the rest."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Final

import numpy as np

from basinrain.infill.beyond import beyond_donors
from basinrain.infill.completed import Estimate
from basinrain.infill.gaps import steps_in_words
from basinrain.infill.relations import AT_LEAST
from basinrain.infill.span_filling import Fate, SpanCells
from basinrain.infill.window import Bools, Floats, Ints, Window
from basinrain.notes import Note
from basinrain.rainfall import RainRecord

__all__ = ["GaugeFilling"]

_ASKED: Final = 1 << 18
"""Weights that are asked for together."""


class GaugeFilling:
    """How the gaps of one gauge of a window were infilled.

    Parameters
    ----------
    window
        The window.
    g
        The gauge's column.
    long : array of bool, shape (n_steps,)
        Where its gaps are too long to be infilled.
    depth : array of float, shape (n_steps,)
        Its depths in mm after infill.
    spans
        What became of the days, or of the storm, of which it misses more than half.

    Examples
    --------
    See :func:`basinrain.infill.complete`, which makes one for every gauge with a gap.
    """

    def __init__(self, window: Window, g: int, long: Bools, depth: Floats, spans: SpanCells) -> None:
        self.estimates: list[Estimate] = []
        """Every estimate, by time."""
        self._window, self._g, self._depth = window, g, depth
        self._gauge = window.record.gauges[g]
        # Steps by what is to be said of them.
        self._left: dict[str, list[Ints]] = {}
        self._raised: list[Ints] = []
        self._evenly: dict[str, list[Ints]] = {}
        limit = f"longer than {window.options.longest_gap:g} days (longest_gap)"
        if long.any():
            self._left[f"the gap is {limit}"] = [np.flatnonzero(long)]
        by_step = window.fillable[:, g].copy()
        self._tell_spans(spans, by_step, limit)
        self._tell_steps(np.flatnonzero(by_step))
        self.estimates.sort(key=lambda estimate: estimate.first)

    def _tell_steps(self, steps: Ints) -> None:
        if not len(steps):
            return
        window = self._window
        known = ~np.isnan(self._depth[steps])
        if not known.all():
            self._leave("reported at the step", steps[~known])
        steps = steps[known]
        donors = self._donors(window.measured[steps], window.months[steps])
        method, gauge = window.options.method, self._gauge
        self.estimates += [
            Estimate(gauge=gauge, first=s, stop=s + 1, scale="step", depth=d, method=method, donors=weights)
            for s, d, weights in zip(steps.tolist(), self._depth[steps].tolist(), donors, strict=True)
        ]

    def _tell_spans(self, cells: SpanCells, by_step: Bools, limit: str) -> None:
        """Tell of some spans, and take those steps from ``by_step`` that were not infilled step by step."""
        window, fate = self._window, cells.fate
        unknown = "has values of its own" if window.options.donors_required == 1 else "have values of their own"
        unknown += f" at every step of the {window.scale}"
        left = {Fate.UNKNOWN: unknown, Fate.UNKNOWN_CUT: f"{unknown}, totals that reach beyond it left out"}
        why = {Fate.EVEN_NONE_COMPLETE: f"is complete over the {window.scale}", Fate.EVEN_NONE_WET: "is wet in them"}
        for k, kind in enumerate(fate.tolist()):
            missing = self._missing(cells, k)
            if kind == Fate.RAISED:
                self._raised.append(missing)
                continue
            by_step[missing] = False
            if kind == Fate.LONG:
                reason = f"most of the {window.scale} is missing, in part by a gap {limit}"
                self._left.setdefault(reason, []).append(missing)
            elif kind in left:
                self._leave(left[Fate(kind)], missing)
            elif kind in why:
                self._evenly.setdefault(f"no recording gauge {why[Fate(kind)]}", []).append(missing)
        known = fate >= Fate.SPREAD
        donors = self._donors(cells.donating[known], cells.month[known])
        self.estimates += [
            Estimate(
                gauge=self._gauge,
                first=first,
                stop=stop,
                scale=window.scale,
                depth=total,
                method=window.options.method,
                donors=weights,
            )
            for first, stop, total, weights in zip(
                *(values[known].tolist() for values in (cells.first, cells.stop, cells.total)), donors, strict=True
            )
        ]

    def _missing(self, cells: SpanCells, k: int) -> Ints:
        first = int(cells.first[k])
        return np.flatnonzero(self._window.fillable[first : cells.stop[k], self._g]) + first

    def _donors(self, reporting: Bools, months: Ints) -> list[Mapping[str, float]]:
        """Return the donor weights, by gauge id, of cases of reporting gauges; cases that are alike share a mapping."""
        window = self._window
        if not len(reporting):
            return []
        if not window.options.chosen_method.needs_normals:
            months = np.zeros_like(months)
        keys = np.column_stack([np.packbits(reporting, axis=1), months.astype(np.uint8)])
        # Rows as single values of so many bytes, which compare many times as fast as rows do.
        whole = np.ascontiguousarray(keys).view(np.dtype((np.void, keys.shape[1])))
        _, case, which = np.unique(whole.ravel(), return_index=True, return_inverse=True)
        ids = window.network.ids
        different: list[dict[str, float]] = [{} for _ in case]
        for month in np.unique(months[case]):
            mine = np.flatnonzero(months[case] == month)
            for begin in range(0, len(mine), max(_ASKED // len(ids), 1)):
                some = mine[begin : begin + max(_ASKED // len(ids), 1)]
                rows = window.options.weights(
                    window.network,
                    self._g,
                    reporting[case[some]],
                    month=int(month) or None,
                    distances=window.distances[self._g],
                    relations=window.relations,
                    ratios=window.ratios,
                )
                at, columns = np.nonzero(rows)
                found = zip(some[at].tolist(), columns.tolist(), rows[at, columns].tolist(), strict=True)
                for row, column, weight in found:
                    different[row][ids[column]] = weight
        return [different[k] for k in which.ravel().tolist()]

    def _leave(self, what: str, steps: Ints) -> None:
        required = self._window.options.donors_required
        others = "no other gauge" if required == 1 else f"fewer than {required} other gauges"
        reason = f"{others}{self._limits} {what}{self._unrelated}"
        self._left.setdefault(reason, []).append(steps)

    @property
    def _limits(self) -> str:
        """What a donor must be besides reporting, in words."""
        options, method = self._window.options, self._window.options.chosen_method
        within = [
            f"within {limit}"
            for limit in (
                f"{options.radius / 1000:g} km" if options.radius is not None else "",
                f"{options.elevation_limit:g} m of its elevation" if options.elevation_limit is not None else "",
            )
            if limit
        ]
        words = [" and ".join(within), method.donors_are]
        if method.needs_normals and self._window.ratios is not None:
            words.append("with normals of enough common years")
        return "".join(f" {part}" for part in words if part)

    @cached_property
    def _unrelated(self) -> str:
        """Why correlations are not known, in words: too few cases in common."""
        relations, required = self._window.relations, self._window.options.donors_required
        if relations is None:
            return ""
        common = np.delete(relations.common[self._g], self._g)
        related = int(np.count_nonzero(common >= AT_LEAST))
        if related >= required:
            return ""
        shares = f"as many with {related} only" if related else f"{common.max(initial=0):,} at most with any other"
        return f"; a correlation needs {AT_LEAST} days, or longer steps, in common, and {self._gauge} has {shares}"

    def notes(self) -> list[Note]:
        """Return what the user must know of this gauge's gaps."""
        record, gauge, scale = self._window.record, self._gauge, self._window.scale
        notes = [
            Note(
                code="not-infilled",
                text=f"Gauge {gauge} stays without a depth at {_words(record, steps)}: {reason}.",
                gauge=gauge,
                method=self._window.options.method,
            )
            for reason, steps in self._left.items()
        ]
        if self._raised:
            notes.append(
                Note(
                    code="total-raised",
                    text=f"Gauge {gauge} observed more than the {scale} total estimated for it; what was observed was "
                    f"kept, and only the missing steps were infilled, step by step: {_words(record, self._raised)}.",
                    gauge=gauge,
                    method=self._window.options.method,
                )
            )
        notes += beyond_donors(self._window, self._g, self.estimates)
        notes += [
            Note(
                code="spread-evenly",
                text=f"Gauge {gauge}: the infilled {scale} total was spread evenly over {_words(record, steps)}, "
                f"because {reason}.",
                gauge=gauge,
                method=self._window.options.method,
            )
            for reason, steps in self._evenly.items()
        ]
        return notes


def _words(record: RainRecord, steps: list[Ints]) -> str:
    return steps_in_words(record, np.unique(np.concatenate(steps)))
