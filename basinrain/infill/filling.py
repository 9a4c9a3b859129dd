"""The gaps of one gauge, being infilled."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property

import numpy as np

from basinrain.infill.beyond import beyond_donors
from basinrain.infill.completed import Estimate
from basinrain.infill.gaps import steps_in_words
from basinrain.infill.relations import AT_LEAST
from basinrain.infill.spans import EXACT
from basinrain.infill.window import Bools, Floats, Ints, Spans, Window
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.spreading import pattern_shares, share_out

__all__ = ["GaugeFilling"]


class GaugeFilling:
    """The gaps of one gauge of a window while they are being infilled.

    Parameters
    ----------
    window
        The window.
    g
        The gauge's column.
    long : array of bool, shape (n_steps,)
        Where its gaps are too long to be infilled.
    depth : array of float, shape (n_steps,)
        Its depths in mm, NaN in the gaps; :meth:`infill` writes into it.

    Examples
    --------
    See :func:`basinrain.infill.complete`, which makes one for every gauge with a gap.
    """

    def __init__(self, window: Window, g: int, long: Bools, depth: Floats) -> None:
        self.estimates: list[Estimate] = []
        self._window, self._g, self._long, self._depth = window, g, long, depth
        self._gauge = window.record.gauges[g]
        # Steps by what is to be said of them.
        self._left: dict[str, list[Ints]] = {}
        self._raised: list[Ints] = []
        self._evenly: dict[str, list[Ints]] = {}

    def infill(self) -> None:
        """Infill what can be infilled."""
        limit = f"longer than {self._window.options.longest_gap:g} days (longest_gap)"
        if self._long.any():
            self._left[f"the gap is {limit}"] = [np.flatnonzero(self._long)]
        fillable = self._window.fillable[:, self._g]
        if not fillable.any():
            return
        if self._window.scale == "step":
            self._infill_steps(np.flatnonzero(fillable))
            return
        spans = self._window.spans_of(self._g)
        length = spans.stop - spans.first
        missing = np.add.reduceat(fillable.astype(np.int64), spans.first)
        reported = np.add.reduceat(self._window.reporting[:, self._g].astype(np.int64), spans.first)
        whole = (missing > 0) & (2 * reported < length)
        broken = whole & np.logical_or.reduceat(self._long, spans.first)
        in_broken = np.flatnonzero(fillable & np.repeat(broken, length))
        if len(in_broken):
            self._left[f"most of the {self._window.scale} is missing, in part by a gap {limit}"] = [in_broken]
        by_step = np.flatnonzero(fillable & np.repeat(~whole, length))
        raised = self._infill_spans(spans, np.flatnonzero(whole & ~broken))
        self._infill_steps(np.sort(np.concatenate([by_step, raised])))

    def _infill_steps(self, steps: Ints) -> None:
        if not len(steps):
            return
        window = self._window
        row_of, rows, donors = self._weigh(window.measured[steps], window.months[steps])
        depths = _weighted_sums(row_of, rows, window.own, steps)
        known = (rows != 0).any(axis=1)[row_of]
        if not known.all():
            self._leave("reported at the step", steps[~known])
        self._depth[steps[known]] = depths[known]
        if not window.trace:
            return
        method, gauge = window.options.method, self._gauge
        self.estimates += [
            Estimate(gauge=gauge, first=s, stop=s + 1, scale="step", depth=d, method=method, donors=donors[r])
            for s, d, r in zip(steps[known].tolist(), depths[known].tolist(), row_of[known].tolist(), strict=True)
        ]

    def _infill_spans(self, spans: Spans, chosen: Ints) -> Ints:
        """Infill the totals of spans; return the steps of those whose total is below what was observed."""
        if not len(chosen):
            return np.empty(0, dtype=np.int64)
        window = self._window
        row_of, rows, donors = self._weigh(spans.donating[chosen], spans.months[chosen])
        totals = _weighted_sums(row_of, rows, spans.totals, chosen)
        known = (rows != 0).any(axis=1)[row_of]
        if not known.all():
            own = "has values of its own" if window.options.donors_required == 1 else "have values of their own"
            what = f"{own} at every step of the {window.scale}"
            beyond = ", totals that reach beyond it left out"
            cut = (spans.complete & spans.cut)[chosen].any(axis=1)
            for words, unknown in ((what, ~known & ~cut), (what + beyond, ~known & cut)):
                if unknown.any():
                    self._leave(words, np.concatenate([self._missing(spans, k) for k in chosen[unknown].tolist()]))
        observed = spans.totals[chosen, self._g]
        low = known & (totals < observed - EXACT * np.maximum(observed, 1))
        raised = [self._missing(spans, k) for k in chosen[low].tolist()]
        self._raised += raised
        method, gauge, scale = window.options.method, self._gauge, window.scale
        for k, total, seen, row in zip(
            *(a[known & ~low].tolist() for a in (chosen, totals, observed, row_of)), strict=True
        ):
            first, stop = int(spans.first[k]), int(spans.stop[k])
            self._spread(spans, k, max(total - seen, 0.0))
            if window.trace:
                self.estimates.append(
                    Estimate(
                        gauge=gauge, first=first, stop=stop, scale=scale, depth=total, method=method, donors=donors[row]
                    )
                )
        return np.concatenate(raised) if raised else np.empty(0, dtype=np.int64)

    def _missing(self, spans: Spans, k: int) -> Ints:
        first = int(spans.first[k])
        return np.flatnonzero(self._window.fillable[first : spans.stop[k], self._g]) + first

    def _spread(self, spans: Spans, k: int, rest: float) -> None:
        """Give ``rest`` mm to the missing steps of span ``k``, in one recorder's pattern."""
        if spans.stop[k] - spans.first[k] == 1:
            self._depth[spans.first[k]] = rest
            return
        missing = self._missing(spans, k)
        complete_recorders = np.flatnonzero(self._window.recorders & spans.measured[k])
        wet = complete_recorders[self._window.own[np.ix_(missing, complete_recorders)].sum(axis=0) > 0]
        shares = None
        if len(wet):
            nearest = min(wet.tolist(), key=self._near_rank.__getitem__)
            shares = pattern_shares(self._window.own[missing][:, [nearest]], np.ones(1))
        elif rest > 0 and len(missing) > 1:
            why = "is wet in them" if len(complete_recorders) else f"is complete over the {self._window.scale}"
            self._evenly.setdefault(f"no recording gauge {why}", []).append(missing)
        even = np.full(len(missing), 1 / len(missing))
        self._depth[missing] = share_out(rest, even if shares is None else shares)

    @cached_property
    def _near_rank(self) -> Ints:
        """The rank of every gauge by nearness."""
        order = self._window.network.nearest_first(self._window.distances[self._g])
        rank = np.empty(len(order), dtype=np.int64)
        rank[order] = np.arange(len(order))
        return rank

    def _weigh(self, reporting: Bools, months: Ints) -> tuple[Ints, Floats, list[Mapping[str, float]]]:
        """Return for cases of reporting gauges, (n, n_gauges), the row of each, the different rows, and these by id.

        The last are empty where nothing is traced.
        """
        window = self._window
        if not window.options.chosen_method.needs_normals:
            months = np.zeros_like(months)
        keys = np.column_stack([np.packbits(reporting, axis=1), months.astype(np.uint8)])
        # Rows as single values of so many bytes, which compare many times as fast as rows do.
        whole = np.ascontiguousarray(keys).view(np.dtype((np.void, keys.shape[1])))
        _, case, row_of = np.unique(whole.ravel(), return_index=True, return_inverse=True)
        rows = np.zeros((len(case), len(window.network)))
        for month in np.unique(months[case]):
            mine = months[case] == month
            rows[mine] = window.options.weights(
                window.network,
                self._g,
                reporting[case[mine]],
                month=int(month) or None,
                distances=window.distances[self._g],
                relations=window.relations,
                ratios=window.ratios,
            )
        if not window.trace:
            return row_of.ravel(), rows, []
        ids = window.network.ids
        donors: list[Mapping[str, float]] = [{} for _ in case]
        at, columns = np.nonzero(rows)
        for row, column, weight in zip(at.tolist(), columns.tolist(), rows[at, columns].tolist(), strict=True):
            donors[row][ids[column]] = weight  # type: ignore[index]
        return row_of.ravel(), rows, donors

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


def _weighted_sums(row_of: Ints, rows: Floats, depths: Floats, at: Ints) -> Floats:
    """Return ``Σ_i rows[row_of, i] depths[at, i]``, shape (n,), over the columns that have any weight."""
    used = np.flatnonzero((rows != 0).any(axis=0))
    return np.asarray((rows[:, used][row_of] * depths[np.ix_(at, used)]).sum(axis=1), dtype=float)


def _words(record: RainRecord, steps: list[Ints]) -> str:
    return steps_in_words(record, np.unique(np.concatenate(steps)))
