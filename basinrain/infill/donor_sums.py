"""Estimates of any gauges at many rows from the gauges that donate there, by any method, with weights asked for seldom.

Rows are steps, or spans of time with their totals. Three ways lead to the same sums:

- Few donors: the donors of every set of silent donors that occurs (:class:`Substitutes`), then a sum of a few products.
- All reporting gauges donate, and their shares are to each other as they are whoever else reports: ``Σ f_i s_i P_i /
  Σ s_i``. The numerators of all rows are one product, the denominators are found once for every set of gauges.
- Else: weights are asked for once for every set of gauges.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from itertools import pairwise
from typing import Final, Generic, Protocol, TypeVar

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import ALL, distances_from
from basinrain.infill.normals import normals_of
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations
from basinrain.infill.substitutes import MOST_BYTES, MOST_DONORS, AskWeights, Substitutes, sum_donors

__all__ = ["DonorSums"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

_CELLS: Final = 1 << 17
"""Gauges at stretches of rows whose donors are looked up together."""
_ASKED: Final = 1 << 18
"""Weights that are asked for together."""
_STEEPEST: Final = 30.0
"""With a higher exponent of the distance a far donor's share may be too small to be a number above 0."""


class DonorSums:
    """Estimates by one method and its numbers, for any number of blocks of rows.

    What is learned of donors is kept between calls, at most about 64 MiB of it beside the least that one month needs;
    it changes how long a call takes, never a number.

    Parameters
    ----------
    network, options, relations, ratios
        As for :func:`basinrain.infill.complete`.

    Examples
    --------
    B is estimated from A and C at the first row; at the second C alone is too few.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> sums = DonorSums(network, InfillOptions(method="station-average"))
    >>> values = np.array([[4.0, np.nan, 8.0], [np.nan, np.nan, 8.0]])
    >>> donating, wanted = ~np.isnan(values), np.array([[False, True, False]] * 2)
    >>> out = values.copy()
    >>> sums.put(values, donating, wanted, np.array([5, 5]), out)
    >>> out
    array([[ 4.,  6.,  8.],
           [nan, nan,  8.]])
    """

    def __init__(
        self,
        network: GaugeNetwork,
        options: InfillOptions,
        *,
        relations: Relations | None = None,
        ratios: NormalRatios | None = None,
    ) -> None:
        self._network, self._options, self._relations, self._ratios = network, options, relations, ratios
        self._distances = network.distances() if 8 * len(network) ** 2 <= MOST_BYTES else None
        method, wanted = options.chosen_method, options.donors_wanted
        monthly = ratios is not None or (network.normals is not None and network.normals.shape[1] > 1)
        self._by_month = method.needs_normals and monthly
        steep = options.exponent is not None and options.exponent > _STEEPEST
        self._all = wanted == ALL and method.share_factors is not None and not steep
        self._few = wanted != ALL and wanted <= MOST_DONORS
        self._substitutes = _ByMonth(self._make_substitutes)
        self._shares = _ByMonth(self._make_shares)

    def put(self, values: Floats, donating: Bools, wanted: Bools, months: Ints, out: Floats) -> None:
        """Write the estimates that are wanted into ``out``, NaN where there are too few donors.

        Parameters
        ----------
        values : array of float, shape (n_rows, n_gauges)
            mm; any number, or NaN, where a gauge does not donate.
        donating : array of bool, shape (n_rows, n_gauges)
            Which gauges have a value that may donate.
        wanted : array of bool, shape (n_rows, n_gauges)
            Which gauges are to be estimated, none of them donating at that row.
        months : array of int, shape (n_rows,)
            1 to 12, 0 without times.
        out : array of float, shape (n_rows, n_gauges)
            What is not wanted is left as it is.

        Raises
        ------
        DataError
            As the method's weights.
        """
        if not wanted.any():
            return
        values = np.ascontiguousarray(values)
        for month, rows in self._stretches(months):
            if wanted[rows].any():
                part = _Part(values[rows], donating[rows], wanted[rows], out[rows])
                if self._few:
                    self._from_few(part, month)
                elif self._all:
                    self._from_all(part, month)
                else:
                    self._by_sets(part, month)

    def _stretches(self, months: Ints) -> Iterator[tuple[int, slice]]:
        """Yield the rows of one month at a time, as long as the month matters."""
        if not self._by_month:
            yield 0, slice(0, len(months))
            return
        first = np.concatenate([[0], np.flatnonzero(np.diff(months)) + 1, [len(months)]]).tolist()
        for begin, stop in pairwise(first):
            yield int(months[begin]), slice(begin, stop)

    def _weights(self, month: int, target: int, reporting: Bools, /) -> Floats:
        return self._options.weights(
            self._network,
            target,
            reporting,
            month=month or None,
            distances=distances_from(self._network, target) if self._distances is None else self._distances[target],
            relations=self._relations,
            ratios=self._ratios,
        )

    def _make_substitutes(self, month: int) -> Substitutes:
        most = MOST_BYTES // (12 if self._by_month else 1)
        return Substitutes(self._usable(month), partial(self._weights, month), most_bytes=most)

    def _make_shares(self, month: int) -> _Shares:
        factor = partial(self._factor, month) if self._options.chosen_method.share_factors else None
        return _Shares(self._usable(month), partial(self._weights, month), factor)

    def _usable(self, month: int) -> Bools:
        """Return the gauges of which the method knows all that it needs, shape (n_gauges,)."""
        usable = np.ones(len(self._network), dtype=bool)
        if self._options.chosen_method.needs_normals and self._ratios is None:
            normals = normals_of(self._network, month or None)
            usable &= np.isfinite(normals) & (normals > 0)
        if self._options.elevation_limit is not None:
            usable &= ~np.isnan(self._network.elevation)
        return usable

    def _factor(self, month: int, g: int) -> Floats:
        """Return what every donor's share is multiplied by, shape (n_gauges,)."""
        network, factor = self._network, np.ones(len(self._network))
        for name in self._options.chosen_method.share_factors or ():
            if name != "normals":
                if self._relations is not None:
                    factor *= self._relations.of(network, ratios=name == "slope of ratios")[1][g]
            elif self._ratios is not None:
                factor *= self._ratios.of(network, g, month or None)
            else:
                normals = normals_of(network, month or None)
                factor *= normals[g] / np.where(self._usable(month), normals, np.inf)
        return factor

    def _from_few(self, part: _Part, month: int) -> None:
        substitutes = self._substitutes.of(month)
        run, target = part.cells
        first, length = part.run[:-1], np.diff(part.run)
        flat = part.out.reshape(-1)
        for begin in range(0, len(run), _CELLS):
            r, g = run[begin : begin + _CELLS], target[begin : begin + _CELLS]
            silent = ~part.donating[first[r[0] : r[-1] + 1]]
            node = substitutes.nodes(silent, r - r[0], g)
            at, sums = sum_donors(part.values, first[r], length[r], *substitutes.donors(node))
            lost = ~substitutes.estimable(node)
            if lost.any():
                sums[np.repeat(lost, length[r])] = np.nan
            at += np.repeat(g, length[r])
            flat[at] = sums

    def _from_all(self, part: _Part, month: int) -> None:
        targets = np.flatnonzero(part.wanted.any(axis=0))
        numerators, strengths = self._shares.of(month).of(targets)
        rows = np.flatnonzero(part.wanted.any(axis=1))
        # Where most rows are needed they are read in place, not gathered.
        some: Ints | slice = rows if 2 * len(rows) < len(part.wanted) else slice(None)
        sums = np.where(part.donating[some], part.values[some], 0.0) @ numerators
        present = part.donating[part.run[:-1]].astype(float)
        total = present @ strengths
        enough = present @ (strengths > 0) > self._options.donors_required - 0.5
        total[~enough] = np.nan
        at, k = np.nonzero(part.wanted[some][:, targets])
        row = rows[at] if isinstance(some, np.ndarray) else at
        part.out[row, targets[k]] = sums[at, k] / total[part.run_of_row[row], k]

    def _by_sets(self, part: _Part, month: int) -> None:
        values = np.where(part.donating, part.values, 0.0)
        sets, set_of_row = part.sets
        n = len(self._network)
        for g in np.flatnonzero(part.wanted.any(axis=0)).tolist():
            rows = np.flatnonzero(part.wanted[:, g])
            used, which = np.unique(set_of_row[rows], return_inverse=True)
            order = np.argsort(which, kind="stable")
            for begin in range(0, len(used), max(_ASKED // n, 1)):
                stop = min(begin + max(_ASKED // n, 1), len(used))
                weights = self._weights(month, g, sets[used[begin:stop]])
                lo, hi = np.searchsorted(which[order], [begin, stop])
                for at in range(lo, hi, max(_ASKED // n, 1)):
                    mine = order[at : min(at + max(_ASKED // n, 1), hi)]
                    found = weights[which[mine] - begin]
                    sums = np.einsum("tg,tg->t", values[rows[mine]], found)
                    part.out[rows[mine], g] = np.where(found.any(axis=1), sums, np.nan)


class _Part:
    """Rows of one month, and the stretches of them at which the same gauges donate and the same are wanted."""

    def __init__(self, values: Floats, donating: Bools, wanted: Bools, out: Floats) -> None:
        self.values, self.donating, self.wanted, self.out = values, donating, wanted, out
        packed = np.concatenate([np.packbits(donating, axis=1), np.packbits(wanted, axis=1)], axis=1)
        change = np.flatnonzero((packed[1:] != packed[:-1]).any(axis=1)) + 1
        self.run: Ints = np.concatenate([[0], change, [len(packed)]])
        """The first row of every stretch, and the number of rows at the end."""

    @property
    def cells(self) -> tuple[Ints, Ints]:
        """The stretch and the gauge of all that is wanted."""
        run, target = np.nonzero(self.wanted[self.run[:-1]])
        return run, target

    @property
    def run_of_row(self) -> Ints:
        """The stretch of every row."""
        return np.repeat(np.arange(len(self.run) - 1), np.diff(self.run))

    @property
    def sets(self) -> tuple[Bools, Ints]:
        """The different sets of donating gauges, and which of them every row has."""
        of_run = self.donating[self.run[:-1]]
        packed = np.ascontiguousarray(np.packbits(of_run, axis=1))
        # Rows as single values of so many bytes, which compare many times as fast as rows do.
        whole = packed.view(np.dtype((np.void, packed.shape[1]))).ravel()
        _, first, which = np.unique(whole, return_index=True, return_inverse=True)
        return of_run[first], which.ravel()[self.run_of_row]


class _Shares:
    """What every gauge brings to another's estimate when all that report donate: ``f_i s_i``, and ``s_i``."""

    def __init__(self, usable: Bools, ask: AskWeights, factor: Callable[[int], Floats] | None) -> None:
        n = len(usable)
        self._usable, self._ask, self._factor = usable, ask, factor
        self._numerators = np.zeros((n, n))
        self._strengths = self._numerators if factor is None else np.zeros((n, n))
        self._asked = ~usable

    @property
    def n_bytes(self) -> int:
        return self._numerators.nbytes * (1 if self._factor is None else 2)

    def of(self, targets: Ints) -> tuple[Floats, Floats]:
        """Return both for some targets, shape (n_gauges, n_targets); only the proportions of a target's count."""
        for g in targets[~self._asked[targets]].tolist():
            everyone = self._usable.copy()
            everyone[g] = False
            weights = self._ask(g, everyone[None, :])[0]
            self._numerators[:, g] = weights
            if self._factor is not None:
                donors = weights != 0
                self._strengths[donors, g] = weights[donors] / self._factor(g)[donors]
        self._asked[targets] = True
        if len(targets) == len(self._asked):
            return self._numerators, self._strengths
        return self._numerators[:, targets], self._strengths[:, targets]


class _Sized(Protocol):
    @property
    def n_bytes(self) -> int: ...


_Kept = TypeVar("_Kept", bound=_Sized)


class _ByMonth(Generic[_Kept]):
    """What is known of the donors in each month; the months least lately used make room for the others."""

    def __init__(self, make: Callable[[int], _Kept]) -> None:
        self._make = make
        self._kept: dict[int, _Kept] = {}

    def of(self, month: int) -> _Kept:
        found = self._kept.pop(month, None)
        if found is None:
            found = self._make(month)
        self._kept[month] = found
        while len(self._kept) > 1 and sum(kept.n_bytes for kept in self._kept.values()) > MOST_BYTES:
            del self._kept[next(iter(self._kept))]
        return found
