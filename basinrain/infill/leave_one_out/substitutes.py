"""Who donates to a gauge while some of its donors are silent: found once for every set of silent donors that occurs.

Every method promises that a gauge of weight 0 can go missing without any weight changing. So the weights at a step are
known from few gauges: take the donors of a full network; drop those that are silent and ask the method again; and so on
until all donors report. What else is silent at that step does not matter, and many steps share one answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
import numpy.typing as npt

__all__ = ["MOST_DONORS", "AskWeights", "Pairs", "Substitutes"]

MOST_DONORS: Final = 32
"""With more donors than this nearly every set of silent gauges is one of its own, and steps are taken row by row."""

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_BATCH: Final = 1 << 20
"""Weights held at a time while they are brought into few columns."""
_MOST_NODES: Final = 1 << 18
"""With more of them than this the sets of silent donors met so far are forgotten before the next ones are looked up."""


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
        Rows of :attr:`Substitutes.donors` and :attr:`Substitutes.weights`.
    """

    row: Ints
    target: Ints
    node: Ints


class Substitutes:
    """The donors of every gauge of a network, with all gauges reporting and for every set of silent donors met so far.

    Parameters
    ----------
    reporting : array of bool, shape (n_gauges,)
        The gauges that report at any time: with all of these the network is full.
    ask
        Gives the weights.

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
    >>> pairs.target, substitutes.donors[pairs.node], substitutes.weights[pairs.node]
    (array([0]), array([[2]]), array([[1.]]))
    """

    def __init__(self, reporting: Bools, ask: AskWeights) -> None:
        n = len(reporting)
        self._n, self._ask = n, ask
        everyone = reporting & ~np.eye(n, dtype=bool)
        self.base: Floats = np.zeros((n, n))
        """Weights in the full network, shape (n_gauges, n_targets): depths @ base are estimates."""
        for g in np.flatnonzero(reporting):
            self.base[:, g] = ask(int(g), everyone[g : g + 1])[0]
        width = int((self.base != 0).sum(axis=0).max(initial=0))
        self.wide = width > MOST_DONORS
        """Whether a gauge has more than MOST_DONORS donors; :meth:`of` cannot be used then."""
        if self.wide:
            return
        # Nodes: the first n are the gauges with nothing silent. Unused places of a row point at gauge n, which no
        # network has, so that it is never silent, until they are handed out as gauge 0 with weight 0.
        self._target = np.arange(n)
        self._silent = np.packbits(np.zeros((n, n), dtype=bool), axis=1)
        self._places, self._weights = _few_columns(self.base.T, n, max(width, 1))
        self._known: dict[int, int] = {}

    @property
    def donors(self) -> Ints:
        """The donors of every node, shape (n_nodes, most); 0 where the weight is 0."""
        return np.where(self._places == self._n, 0, self._places)

    @property
    def weights(self) -> Floats:
        """Their weights, shape (n_nodes, most); 0 in places that are not used."""
        return self._weights

    @property
    def estimable(self) -> Bools:
        """Whether a node has any donor, shape (n_nodes,)."""
        return self._places[:, 0] < self._n

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
        if len(self._target) > _MOST_NODES:
            self._forget()
        padded = np.zeros((len(silent), n + 1), dtype=bool)
        padded[:, :n] = silent
        code = np.zeros(silent.shape, dtype=np.int64)
        for k in range(self._places.shape[1]):
            code |= padded[:, self._places[:n, k]].astype(np.int64) << k
        code[silent] = 0
        cell = np.flatnonzero(code)
        if len(cell) > silent.size // 2:
            return None
        row, target = np.divmod(cell, n)
        node = target.copy()
        open_, code = np.arange(len(cell)), code.ravel()[cell]
        while len(open_):
            node[open_] = self._after(node[open_], code)
            code = self._silent_donors(padded, row[open_], node[open_])
            left = code != 0
            open_, code = open_[left], code[left]
        return Pairs(row, target, node)

    def _forget(self) -> None:
        """Keep nothing but the full network's donors, so that memory is bounded."""
        n = self._n
        self._target, self._silent = self._target[:n], self._silent[:n]
        self._places, self._weights = self._places[:n], self._weights[:n]
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
                places[members], weights[members] = _few_columns(np.concatenate(rows), n, width)
                held, rows, size = [], [], 0
        self._target = np.concatenate([self._target, target])
        self._silent = np.concatenate([self._silent, np.packbits(silent, axis=1)])
        self._places = np.concatenate([self._places, places])
        self._weights = np.concatenate([self._weights, weights])
        return np.arange(first, first + len(target), dtype=np.int64)


def _few_columns(table: Floats, n: int, width: int) -> tuple[Ints, Floats]:
    """Return the places and the weights of the donors of every row, shape (n_rows, width); place n is none."""
    row, column = np.nonzero(table)
    count = np.bincount(row, minlength=len(table))
    place = np.arange(len(row)) - np.repeat(np.cumsum(count) - count, count)
    if len(place) and place.max() >= width:
        # A method whose donors become more as gauges fall silent breaks the promise that the rest rests on.
        msg = "a donor went silent and the number of donors grew: the method's weights do not keep their promise"
        raise RuntimeError(msg)
    places = np.full((len(table), width), n)
    weights = np.zeros((len(table), width))
    places[row, place] = column
    weights[row, place] = table[row, column]
    return places, weights
