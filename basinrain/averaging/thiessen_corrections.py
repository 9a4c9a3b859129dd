"""What the silence of gauges changes in basin means: stretches of steps and the shares that hold in them."""

from __future__ import annotations

from collections import Counter
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.averaging.thiessen_epochs import Holes
from basinrain.averaging.thiessen_removal import Removal, Removals
from basinrain.averaging.thiessen_tessellation import DEAR, Tessellation

__all__ = ["Corrections", "Spans"]

Ints = npt.NDArray[np.int64]
Floats = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]

_LONG: Final = 24
"""Over at least so many steps a correction is a small product of its own; shorter ones are gathered."""

_BITS: Final = 1 << 24
"""Places of removals by runs that are unpacked at once."""


class Spans(NamedTuple):
    """Stretches of steps, ``stop`` not included, each of a thing given by its place in some list."""

    of: Ints
    first: Ints
    stop: Ints

    @classmethod
    def where(cls, mask: Bools, borders: Ints) -> Spans:
        """Return where a mask of shape (n_things, n_runs) holds; ``borders`` are the steps at which the runs begin.

        Examples
        --------
        >>> Spans.where(np.array([[True, True, False], [False, False, True]]), np.array([0, 5, 6, 9]))
        Spans(of=array([0, 1]), first=array([0, 6]), stop=array([6, 9]))
        """
        width = mask.shape[1] + 1
        padded = np.zeros((mask.shape[0], width), dtype=bool)
        padded[:, :-1] = mask
        flat = padded.reshape(-1)
        # Nothing holds in the last column, so that a stretch ends in its row and turns come in pairs.
        turns = np.flatnonzero(np.diff(flat, prepend=False))
        of, first = np.divmod(turns[::2], width)
        return cls(of, borders[first], borders[turns[1::2] - of * width])

    @classmethod
    def join(cls, lots: list[Spans]) -> Spans:
        """Return the spans of several lots, one after another."""
        none = np.empty(0, dtype=np.int64)
        return cls(*(np.concatenate([none, *some]) for some in zip(*lots, strict=True))) if lots else cls(*[none] * 3)

    def within(self, first: int, stop: int) -> Spans:
        """Return what lies in some steps, counted from the first of these."""
        at = np.flatnonzero((self.first < stop) & (self.stop > first))
        begins = np.maximum(self.first[at], first) - first
        return Spans(self.of[at], begins, np.minimum(self.stop[at], stop) - first)

    def chosen(self, which: Bools) -> Spans:
        """Return some of them."""
        return Spans(self.of[which], self.first[which], self.stop[which])

    @property
    def lengths(self) -> Ints:
        """Steps of each."""
        return self.stop - self.first

    def steps(self) -> Ints:
        """Return the steps of all of them, one after another."""
        lengths = self.lengths
        begins = np.cumsum(lengths) - lengths
        steps: Ints = np.arange(lengths.sum()) + np.repeat(self.first - begins, lengths)
        return steps


class Corrections:
    """What is added to the means of a tessellation's weights for some runs of a record.

    Parameters
    ----------
    tessellation, removals
        What the means are corrected from.
    missing : array of bool, shape (n_runs, n_gauges)
        The tessellation's gauges that are missing, in runs in which some gauge reports. It is changed.
    holes
        Large groups among them.
    borders : array of int, shape (n_runs + 1,)
        The steps at which the runs begin, and the end.
    """

    def __init__(
        self, tessellation: Tessellation, removals: Removals, missing: Bools, holes: Holes, borders: Ints
    ) -> None:
        self._removals: list[Removal] = []
        lots: list[Spans] = []
        # A hole that comes in many runs is shared once for all of them.
        often = Counter(holes.gauges)
        burden = {group: tessellation.burden_of(group) / n for group, n in often.items()}
        burdens = np.bincount(holes.run, [burden[group] for group in holes.gauges], minlength=len(missing))
        own: Bools = np.asarray(burdens > DEAR)
        missing[own] = False
        shared = [(run, group) for run, group in zip(holes.run.tolist(), holes.gauges, strict=True) if not own[run]]
        for run, group in shared:
            missing[run, list(group)] = False
        self._removals += removals.holes([group for _, group in shared])
        runs = np.array([run for run, _ in shared], dtype=np.int64)
        lots.append(Spans(np.arange(len(runs)), borders[runs], borders[runs + 1]))
        own[runs[[removal.lost for removal in self._removals]]] = True
        n_runs = len(missing)
        for some, when in removals.asked(np.packbits(missing.T, axis=1)):
            for k in range(0, len(some), max(_BITS // max(n_runs, 1), 1)):
                mask = np.unpackbits(when[k : k + max(_BITS // n_runs, 1)], axis=1, count=n_runs).astype(bool)
                spans = Spans.where(mask, borders)
                lots.append(Spans(spans.of + len(self._removals) + k, spans.first, spans.stop))
                own |= mask[[removal.lost for removal in some[k : k + len(mask)]]].any(axis=0)
            self._removals += some
        self._spans = Spans.join(lots)
        entries = [removal.gauge for removal in self._removals]
        self._entries = np.zeros(len(entries) + 1, dtype=np.int64)
        np.cumsum([len(some) for some in entries], out=self._entries[1:])
        self._basin = np.concatenate([np.empty(0, dtype=np.int64), *(removal.basin for removal in self._removals)])
        self._gauge = np.concatenate([np.empty(0, dtype=np.int64), *entries])
        self._share = np.concatenate([np.empty(0), *(removal.share for removal in self._removals)])
        self.own: Ints = np.flatnonzero(own)
        """Runs whose means must come from weights of their own instead."""

    def add_to(self, means: Floats, known: Floats, first: int, stop: int) -> None:
        """Add the corrections of some steps.

        Parameters
        ----------
        means : array of float, shape (n_basins, n_steps)
            mm; in one piece of memory. It is changed.
        known : array of float, shape (n_gauges, n_steps)
            mm, 0 where a gauge is missing; in one piece of memory.
        first, stop : int
            The steps.
        """
        spans = self._spans.within(first, stop)
        long = spans.lengths >= _LONG
        for k, begin, end in zip(*(some.tolist() for some in spans.chosen(long)), strict=True):
            removal = self._removals[k]
            means[removal.basins, begin:end] += removal.table @ known[removal.gauges, begin:end]
        spans = spans.chosen(~long)
        # By every step of every span and every entry of its removal.
        number = np.diff(self._entries)[spans.of]
        begins = np.cumsum(number) - number
        entry = np.arange(number.sum()) + np.repeat(self._entries[spans.of] - begins, number)
        each = Spans(entry, np.repeat(spans.first, number), np.repeat(spans.stop, number))
        step, entry = each.steps(), np.repeat(entry, each.lengths)
        n_steps = stop - first
        depth = known.reshape(-1)[self._gauge[entry] * n_steps + step]
        np.add.at(means.reshape(-1), self._basin[entry] * n_steps + step, self._share[entry] * depth)
