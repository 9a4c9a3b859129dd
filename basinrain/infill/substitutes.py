"""Who donates to a gauge while some of its donors are silent: found once for every set of silent donors that occurs.

Every method promises that a gauge of weight 0 can go missing without any weight changing. So the weights at a step are
known from few gauges: take the donors of a full network; drop those that are silent and ask the method again; and so on
until all donors report. What else is silent at that step does not matter, and many steps share one answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final, Protocol

import numpy as np
import numpy.typing as npt

__all__ = ["MOST_BYTES", "MOST_DONORS", "AskWeights", "Pairs", "Substitutes", "sum_donors"]

MOST_DONORS: Final = 32
"""With more donors than this nearly every set of silent gauges is one of its own, and steps are taken row by row."""

MOST_BYTES: Final = 64 << 20
"""Memory held by sets of silent donors unless the caller says otherwise."""

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BATCH: Final = 1 << 20
"""Weights held at a time while they are brought into few columns."""
_NODE: Final = 160
"""Bytes that a node takes besides its donors and its silent gauges: its place among the known ones, mostly."""


class AskWeights(Protocol):
    """``ask(target, reporting)`` gives the donor weights of one gauge, shape (n_cases, n_gauges), as ``reporting``."""

    def __call__(self, target: int, reporting: Bools, /) -> Floats:
        """Return the weights; all 0 where there are too few donors."""


@dataclass(frozen=True, eq=False)
class Pairs:
    """Rows and gauges whose donors are not those of the full network.

    Parameters
    ----------
    row, target : array of int, shape (n_pairs,)
        Rising by row, then gauge.
    node : array of int, shape (n_pairs,)
        As :meth:`Substitutes.donors` takes them.
    """

    row: Ints
    target: Ints
    node: Ints


class Substitutes:
    """The donors of every gauge of a network, with all gauges reporting and for every set of silent donors met so far.

    Parameters
    ----------
    reporting : array of bool, shape (n_gauges,)
        The gauges that report at any time: with all of these the network is full. The others are never estimated.
    ask
        Gives the weights; asked for a gauge when that is first looked up.
    most_bytes
        About as much memory is held at most by the sets of silent donors met so far; with more they are forgotten
        before the next ones are looked up.

    Examples
    --------
    Each gauge takes the next one in line that reports.

    >>> def next_one(target, reporting):
    ...     order = [g % 3 for g in range(target + 1, target + 3)]
    ...     weights = np.zeros(reporting.shape)
    ...     first = reporting[:, order].argmax(axis=1)
    ...     weights[np.arange(len(first)), np.array(order)[first]] = reporting[:, order].any(axis=1)
    ...     return weights
    >>> substitutes = Substitutes(np.ones(3, dtype=bool), next_one)
    >>> substitutes.base
    array([[0., 0., 1.],
           [1., 0., 0.],
           [0., 1., 0.]])
    >>> silent = np.array([[False, False, False], [False, True, False]])
    >>> pairs = substitutes.of(silent)  # gauge 1 is silent: gauge 0 turns to gauge 2
    >>> pairs.target, substitutes.donors(pairs.node)
    (array([0]), (array([[2]]), array([[1.]])))
    >>> node = substitutes.nodes(silent, np.array([0, 1]), np.array([1, 1]))  # gauge 1 itself, silent or not
    >>> substitutes.donors(node)[0].ravel()
    array([2, 2])
    """

    def __init__(self, reporting: Bools, ask: AskWeights, *, most_bytes: int = MOST_BYTES) -> None:
        n = len(reporting)
        self._n, self._ask, self._reporting, self._most_bytes = n, ask, reporting, most_bytes
        # Nodes: the first n are the gauges with nothing silent. Unused places of a row point at gauge n, which no
        # network has, so that it is never silent, until they are handed out as gauge 0 with weight 0.
        self._target = np.arange(n)
        self._silent = np.packbits(np.tile(~reporting, (n, 1)), axis=1)
        self._places, self._weights = np.full((n, 1), n), np.zeros((n, 1))
        self._asked = ~reporting
        self._known: dict[int, int] = {}

    @cached_property
    def base(self) -> Floats:
        """Weights in the full network, shape (n_gauges, n_targets): depths @ base are estimates."""
        base = np.zeros((self._n, self._n))
        for g in np.flatnonzero(self._reporting):
            base[:, g] = self._in_full(int(g))
        return base

    @cached_property
    def wide(self) -> bool:
        """Whether a gauge has more than MOST_DONORS donors; :meth:`of` and :meth:`nodes` cannot be used then."""
        return int((self.base != 0).sum(axis=0).max(initial=0)) > MOST_DONORS

    def donors(self, node: Ints) -> tuple[Ints, Floats]:
        """Return the donors of some nodes and their weights, both of shape (n, most).

        In places that are not used the weight is 0 and the gauge is the node's first donor, or 0 where it has none.
        """
        places, weights = self._places[node], self._weights[node]
        places = np.where(places == self._n, places[:, :1], places)
        places[places == self._n] = 0
        return places, weights

    def estimable(self, node: Ints) -> Bools:
        """Return whether some nodes have any donor, shape (n,)."""
        return np.asarray(self._places[node, 0] < self._n)

    def __len__(self) -> int:
        """Return the number of nodes."""
        return len(self._target)

    @property
    def n_bytes(self) -> int:
        """About how much memory the donors of all nodes take."""
        return int(len(self) * (_NODE + self._silent.shape[1] + 16 * self._places.shape[1]))

    def of(self, silent: Bools) -> Pairs | None:
        """Return which gauges need other donors than in the full network, and their nodes.

        Parameters
        ----------
        silent : array of bool, shape (n_rows, n_gauges)
            Which gauges do not report. Gauges that are silent themselves are left out.

        Returns
        -------
        Pairs or None
            None where more than half of all gauges in all rows need other donors: then hardly any two need the same,
            and asking row by row is quicker.
        """
        n = self._n
        self._begin(np.arange(n))
        padded = _padded(silent)
        code = np.zeros(silent.shape, dtype=np.int64)
        for k in range(self._places.shape[1]):
            code |= padded[:, self._places[:n, k]].astype(np.int64) << k
        code[silent] = 0
        cell = np.flatnonzero(code)
        if len(cell) > silent.size // 2:
            return None
        row, target = np.divmod(cell, n)
        return Pairs(row, target, self._walk(padded, row, target, code.ravel()[cell]))

    def nodes(self, silent: Bools, row: Ints, target: Ints) -> Ints:
        """Return the nodes of some gauges at some rows, whether or not these gauges are silent themselves.

        Parameters
        ----------
        silent : array of bool, shape (n_rows, n_gauges)
            Which gauges do not report.
        row, target : array of int, shape (n_pairs,)
            The rows, and the gauges that are to be estimated there.

        Returns
        -------
        array of int, shape (n_pairs,)
            As :meth:`donors` takes them, until more are looked up; not :meth:`estimable` where donors are too few.

        Raises
        ------
        ValueError
            A gauge has more than MOST_DONORS donors.
        """
        self._begin(np.unique(target))
        padded = _padded(silent)
        return self._walk(padded, row, target, self._silent_donors(padded, row, target))

    def _in_full(self, g: int) -> Floats:
        everyone = self._reporting.copy()
        everyone[g] = False
        return np.asarray(self._ask(g, everyone[None, :])[0])

    def _begin(self, targets: Ints) -> None:
        """Make room for the next look-ups, and ask for the donors of gauges that were not looked up before."""
        if self.n_bytes > self._most_bytes and len(self._target) > self._n:
            self._forget()
        new = targets[~self._asked[targets]]
        if not len(new):
            return
        known = "base" in vars(self)
        rows = self.base.T[new] if known else np.stack([self._in_full(int(g)) for g in new])
        width = int((rows != 0).sum(axis=1).max(initial=1))
        if width > MOST_DONORS:
            msg = f"gauges with more than {MOST_DONORS} donors are not looked up by sets of silent donors"
            raise ValueError(msg)
        self._widen(width)
        self._places[new], self._weights[new] = _few_columns(rows, self._n, self._places.shape[1], MOST_DONORS)
        self._asked[new] = True

    def _widen(self, width: int) -> None:
        more = max(width - self._places.shape[1], 0)
        self._places = np.pad(self._places, ((0, 0), (0, more)), constant_values=self._n)
        self._weights = np.pad(self._weights, ((0, 0), (0, more)))

    def _walk(self, padded: Bools, row: Ints, target: Ints, code: Ints) -> Ints:
        """Return the nodes that are reached from those of the full network, ``code`` of whose donors are silent."""
        node = target.copy()
        open_ = np.flatnonzero(code)
        code = code[open_]
        while len(open_):
            node[open_] = self._after(node[open_], code)
            code = self._silent_donors(padded, row[open_], node[open_])
            left = code != 0
            open_, code = open_[left], code[left]
        return node

    def _forget(self) -> None:
        """Keep nothing but the full network's donors, so that memory is bounded."""
        n = self._n
        self._target, self._silent = self._target[:n].copy(), self._silent[:n].copy()
        self._places, self._weights = self._places[:n].copy(), self._weights[:n].copy()
        self._known = {}

    def _silent_donors(self, padded: Bools, row: Ints, node: Ints) -> Ints:
        """Return which donors of a node are silent, one bit each, shape (n_cells,)."""
        flat, first = padded.ravel(), row * padded.shape[1]
        code = np.zeros(len(row), dtype=np.int64)
        for k in range(self._places.shape[1]):
            code |= flat[first + self._places[node, k]].astype(np.int64) << k
        return code

    def _after(self, node: Ints, code: Ints) -> Ints:
        """Return the nodes that follow when the donors of ``code`` are silent too; new ones are made."""
        keys, which = np.unique((node << MOST_DONORS) | code, return_inverse=True)
        found = np.array([self._known.get(key, -1) for key in keys.tolist()], dtype=np.int64)
        new = np.flatnonzero(found < 0)
        if len(new):
            found[new] = self._make(keys[new] >> MOST_DONORS, keys[new] & ((1 << MOST_DONORS) - 1))
            self._known.update(zip(keys[new].tolist(), found[new].tolist(), strict=True))
        return np.asarray(found[which.ravel()])

    def _make(self, parent: Ints, code: Ints) -> Ints:
        """Make the nodes that follow these, and return them."""
        n, first = self._n, len(self._target)
        bits = (code[:, None] >> np.arange(self._places.shape[1])) & 1
        at, place = np.nonzero(bits)
        silent = np.unpackbits(self._silent[parent], axis=1, count=n).astype(bool)
        silent[at, self._places[parent[at], place]] = True
        target = self._target[parent]
        order = np.argsort(target, kind="stable")
        groups = np.split(order, np.flatnonzero(np.diff(target[order])) + 1)
        reporting = ~silent
        reporting[np.arange(len(target)), target] = False
        width = self._places.shape[1]
        most = np.asarray((self._places[parent] < n).sum(axis=1))
        places = np.full((len(target), width), n)
        weights = np.zeros((len(target), width))
        held: list[Ints] = []
        rows: list[Floats] = []
        size = 0
        for k, group in enumerate(groups):
            held.append(group)
            rows.append(self._ask(int(target[group[0]]), reporting[group]))
            size += rows[-1].size
            if size >= _BATCH or k == len(groups) - 1:
                members = np.concatenate(held)
                places[members], weights[members] = _few_columns(np.concatenate(rows), n, width, most[members])
                held, rows, size = [], [], 0
        self._target = np.concatenate([self._target, target])
        self._silent = np.concatenate([self._silent, np.packbits(silent, axis=1)])
        self._places = np.concatenate([self._places, places])
        self._weights = np.concatenate([self._weights, weights])
        return np.arange(first, first + len(target), dtype=np.int64)


def sum_donors(values: Floats, begin: Ints, length: Ints, donors: Ints, weights: Floats) -> tuple[Ints, Floats]:
    """Return the weighted sums of some stretches' donors, row by row.

    Parameters
    ----------
    values : array of float, shape (n_rows, n_gauges)
        In one piece of memory. Numbers at all donors.
    begin, length : array of int, shape (n_stretches,)
        The rows of each stretch.
    donors, weights : array, shape (n_stretches, most)
        Gauges and what their values are multiplied by.

    Returns
    -------
    at : array of int, shape (total length,)
        The flat position of the first gauge of each row of each stretch.
    sums : array of float, shape (total length,)

    Examples
    --------
    >>> values = np.array([[1.0, 2.0, 3.0], [4.0, 5.0, 6.0], [7.0, 8.0, 9.0]])
    >>> half = np.full((2, 2), 0.5)
    >>> sum_donors(values, np.array([0, 1]), np.array([2, 1]), np.array([[0, 1], [1, 2]]), half)
    (array([0, 3, 3]), array([1.5, 4.5, 5.5]))
    """
    n, total = values.shape[1], int(length.sum())
    at = np.repeat(begin - (np.cumsum(length) - length), length)
    at += np.arange(total)
    at *= n
    flat = values.ravel()
    sums = np.zeros(total)
    for k in range(donors.shape[1]):
        index = np.repeat(donors[:, k], length)
        index += at
        found = flat.take(index)
        found *= np.repeat(weights[:, k], length)
        sums += found
    return at, sums


def _padded(silent: Bools) -> Bools:
    """Return the mask with one more gauge, which is never silent."""
    padded = np.zeros((len(silent), silent.shape[1] + 1), dtype=bool)
    padded[:, :-1] = silent
    return padded


def _few_columns(table: Floats, n: int, width: int, most: Ints | int) -> tuple[Ints, Floats]:
    """Return the places and the weights of the donors of every row, shape (n_rows, width); place n is none."""
    row, column = np.nonzero(table)
    count = np.bincount(row, minlength=len(table))
    place = np.arange(len(row)) - np.repeat(np.cumsum(count) - count, count)
    if (count > most).any():
        # A method whose donors become more as gauges fall silent breaks the promise that the rest rests on.
        msg = "a donor went silent and the number of donors grew: the method's weights do not keep their promise"
        raise RuntimeError(msg)
    places = np.full((len(table), width), n)
    weights = np.zeros((len(table), width))
    places[row, place] = column
    weights[row, place] = table[row, column]
    return places, weights
