"""The basin-mean series of a record, chunk by chunk, while gauges come and go."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from scipy import sparse

from basinrain.averaging import averaging_method
from basinrain.averaging.reporting import ReportingRuns
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.infill.normals import normals_of, require_normals
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_filling import RecordFiller
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.relations import Relations
from basinrain.infill.spans import month_of
from basinrain.rainfall import REPORTING, RainRecord, Status
from basinrain.series.flags import Flag
from basinrain.series.policies import INFILL_THEN_REWEIGHT, REWEIGHT

__all__ = ["SeriesEngine", "SeriesPart", "SeriesSetup"]

Bools = npt.NDArray[np.bool_]
Bytes = npt.NDArray[np.uint8]
Floats = npt.NDArray[np.float64]
Table = sparse.csr_array | npt.NDArray[np.float32]
Parts = dict[tuple[str, str], "SeriesPart"]

_ABSENT, _WITHOUT, _OWN, _SPREAD, _ESTIMATED, _INFILLED = range(6)
"""Kinds of value: not in service; in service without a depth; the gauge's own; infilled."""
_KIND: Final = np.array(
    [
        {
            Status.NOT_INSTALLED: _ABSENT,
            Status.SPREAD: _SPREAD,
            Status.ESTIMATED: _ESTIMATED,
            Status.ADJUSTED: _ESTIMATED,
            Status.INFILLED: _INFILLED,
        }.get(status, _OWN if status in REPORTING else _WITHOUT)
        for status in Status
    ],
    dtype=np.uint8,
)
_KEPT_BYTES: Final = 64 << 20
"""Bytes of the weights of sets of gauges in service that are kept."""
_TOGETHER: Final = 512
"""Gauges whose weights are asked for together."""
_DENSE: Final = 0.2
"""A weight table with a smaller share of weights other than 0 is kept and multiplied as a sparse one."""
_ROWS: Final = 1 << 14
"""Stretches of equal kinds that are looked at together."""


@dataclass(frozen=True, eq=False, kw_only=True)
class SeriesSetup:
    """What the series of a record rests on besides its depths; it can be sent to another process.

    Parameters
    ----------
    network, basins
        In one plane; basins with the union's row where it is wanted.
    methods
        Averaging methods by name, each with its options.
    gaps
        One or more of :data:`~basinrain.series.policies.GAPS`.
    infill
        How gaps are infilled, at the scale ``"step"`` or ``"day"``.
    relations, normal_ratios
        Of the whole record, where the infill method needs them.
    ratios
        Whether weights are given to the ratios of depths to the gauges' normals, whose mean is multiplied by the
        basin's normal, instead of to the depths themselves.

    Examples
    --------
    See :class:`SeriesEngine`.
    """

    network: GaugeNetwork
    basins: Basins
    methods: Mapping[str, Mapping[str, Any]]
    gaps: tuple[str, ...]
    infill: InfillOptions
    relations: Relations | None = None
    normal_ratios: NormalRatios | None = None
    ratios: bool = False

    @property
    def series(self) -> tuple[tuple[str, str], ...]:
        """Every series that is computed, by policy and method."""
        return tuple((gaps, method) for gaps in self.gaps for method in self.methods)


@dataclass(frozen=True, eq=False)
class SeriesPart:
    """Some steps of the series of all basins by one policy and one method.

    Parameters
    ----------
    depth : array of float, shape (n_steps, n_basins)
        mm; NaN where there is no number.
    observed_share : array of float32, shape (n_steps, n_basins)
        With the weights that all gauges in service have, the share that lies on gauges which report; NaN where the
        depth is.
    flags : array of uint8, shape (n_steps, n_basins)
        Sums of :class:`~basinrain.series.flags.Flag`.
    """

    depth: Floats
    observed_share: npt.NDArray[np.float32]
    flags: Bytes


class SeriesEngine:
    """Computes the series of one chunk of a record after another.

    What it learns of the network serves later chunks, and changes nothing but the time they take.

    Parameters
    ----------
    setup
        What to compute.

    Raises
    ------
    DataError
        Ratios to normals are asked for, and a gauge's normal is missing or not above 0; all of them.

    Examples
    --------
    A and B have half of the basin each. While B is silent, A has all of it, or B gets what A has.

    >>> import shapely
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 10.0], y=[5.0, 5.0], crs="local")
    >>> basins = Basins(ids=("all",), polygons=[shapely.box(0, 0, 10, 10)], crs="local")
    >>> ends = np.array(["2031-05-04T01", "2031-05-04T02"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(network.ids, ends - 3600, ends, [[4.0, 8.0], [3.0, np.nan]], step="1h")
    >>> setup = SeriesSetup(
    ...     network=network,
    ...     basins=basins,
    ...     methods={"thiessen": {}},
    ...     gaps=("infill", "reweight"),
    ...     infill=InfillOptions(method="nearest-gauge", scale="step"),
    ... )
    >>> parts = SeriesEngine(setup).compute(record)
    >>> part = parts["reweight", "thiessen"]
    >>> part.depth.ravel(), part.observed_share.ravel(), part.flags.ravel()
    (array([6., 3.]), array([1. , 0.5], dtype=float32), array([0, 2], dtype=uint8))
    >>> parts["infill", "thiessen"].flags.ravel()
    array([0, 1], dtype=uint8)
    """

    def __init__(self, setup: SeriesSetup) -> None:
        self.setup = setup
        network, basins = setup.network, setup.basins
        self._reweighers = {
            name: averaging_method(name).reweigher(network, basins, o) for name, o in setup.methods.items()
        }
        self._service: OrderedDict[tuple[str, bytes], Table] = OrderedDict()
        self._filler: RecordFiller | None = None
        if set(setup.gaps) != {REWEIGHT}:
            self._filler = RecordFiller(network, setup.infill, relations=setup.relations, ratios=setup.normal_ratios)
        self._basin_normals: dict[str, Floats] = {}
        if setup.ratios:
            everyone = np.ones(len(network), dtype=bool)
            require_normals(network, everyone, [None, *range(1, 13)], method="ratios to normals")
            normals = np.column_stack([normals_of(network, month) for month in (None, *range(1, 13))])
            for name in setup.methods:
                self._basin_normals[name] = self.weights(name, everyone) @ normals

    def compute(self, chunk: RainRecord, long: Bools | None = None) -> Parts:
        """Return the series of a chunk, by policy and method.

        Parameters
        ----------
        chunk : RainRecord
            Whole rainfall days of the record where gaps are infilled by the day; columns in the network's order.
        long : array of bool, shape (n_steps, n_gauges), optional
            The gaps longer than the limit, of the whole record; none where not given.

        Returns
        -------
        dict of (str, str) to SeriesPart
        """
        parts: Parts = {}
        for gaps, depth, kind in self._completed(chunk, long):
            present = ReportingRuns.of(kind >= _OWN)
            kinds = _Kinds.of(kind)
            for method in self.setup.methods:
                means = self._means(method, chunk, depth, present)
                share, flags = self._marks(method, kinds)
                none = np.isnan(means)
                share[none] = np.nan
                flags[none] = Flag.MISSING
                parts[gaps, method] = SeriesPart(means, share, flags)
        return parts

    def means(self, chunk: RainRecord, long: Bools | None = None) -> dict[tuple[str, str], Floats]:
        """Return the depths of :meth:`compute` alone."""
        return {
            (gaps, method): self._means(method, chunk, depth, ReportingRuns.of(kind >= _OWN))
            for gaps, depth, kind in self._completed(chunk, long)
            for method in self.setup.methods
        }

    def with_depth(self, chunk: RainRecord, long: Bools | None = None) -> dict[str, Bools]:
        """Return which gauges have a depth at every step, their own or infilled, by policy."""
        return {gaps: kind >= _OWN for gaps, _, kind in self._completed(chunk, long)}

    def weights(self, method: str, present: Bools) -> Floats:
        """Return a method's weights for a set of gauges, (n_basins, n_gauges); NaN where it has no number."""
        n = len(present)
        parts = []
        for first in range(0, n, _TOGETHER):
            # A millimetre at one gauge after the other: what it makes of the basins' means is its weight in them.
            one_by_one = np.eye(min(_TOGETHER, n - first), n, k=first)
            runs = ReportingRuns(np.zeros(1, dtype=np.int64), present[None, :], len(one_by_one))
            parts.append(self._reweighers[method](one_by_one, runs))
        return np.concatenate(parts).T

    def _completed(self, chunk: RainRecord, long: Bools | None) -> list[tuple[str, Floats, Bytes]]:
        """Return, for every policy, the chunk's depths and their kinds, (n_steps, n_gauges)."""
        bare = _KIND[chunk.status]
        completed: dict[bool, tuple[Floats, Bytes]] = {}
        result = []
        for gaps in self.setup.gaps:
            if gaps == REWEIGHT or self._filler is None:
                result.append((gaps, chunk.depth, bare))
                continue
            limited = gaps == INFILL_THEN_REWEIGHT and long is not None and bool(long.any())
            if limited not in completed:
                # Without a limit no gap is too long, however long it is.
                none = np.zeros(chunk.depth.shape, dtype=bool)
                filled = self._filler.fill(chunk, long if limited else none)
                kind = bare.copy()
                kind[filled.filled] = _INFILLED
                completed[limited] = filled.depth, kind
            result.append((gaps, *completed[limited]))
        return result

    def _means(self, method: str, chunk: RainRecord, depth: Floats, present: ReportingRuns) -> Floats:
        if not self.setup.ratios:
            return self._reweighers[method](depth, present)
        months = month_of(chunk.starts, chunk.ends)
        normals = np.column_stack([normals_of(self.setup.network, month or None) for month in range(13)])
        ratios = depth / normals.T[months]
        return self._reweighers[method](ratios, present) * self._basin_normals[method].T[months]

    def _marks(self, method: str, kinds: _Kinds) -> tuple[npt.NDArray[np.float32], Bytes]:
        """Return observed shares and flags, (n_steps, n_basins), as if every basin had a number."""
        n_basins = len(self.setup.basins)
        share = np.empty((len(kinds.rows), n_basins), dtype=np.float32)
        flags = np.zeros((len(kinds.rows), n_basins), dtype=np.uint8)
        for rows, kind in kinds.by_service():
            weights = self._in_service(method, kind[0] != _ABSENT)
            has_weight = weights.astype(np.bool_).astype(np.float32)
            # From 1 downward, so that it is 1 to the last digit where every gauge in service reports.
            share[rows] = np.maximum(1 - _product((kind == _WITHOUT) | (kind == _INFILLED), weights), 0)
            for flag, meant in _FLAGGED.items():
                marked = kind == meant
                if marked.any():
                    flags[rows] |= np.where(_product(marked, has_weight) > 0, np.uint8(flag), np.uint8(0))
        return np.repeat(share, kinds.lengths, axis=0), np.repeat(flags, kinds.lengths, axis=0)

    def _in_service(self, method: str, service: Bools) -> Table:
        """Return a method's weights with the gauges in service, (n_basins, n_gauges); zeros where it has no number."""
        key = (method, service.tobytes())
        if key not in self._service:
            weights = np.nan_to_num(self.weights(method, service)).astype(np.float32)
            thin = np.count_nonzero(weights) < _DENSE * weights.size
            self._service[key] = sparse.csr_array(weights) if thin else weights
            while len(self._service) > 1 and sum(map(_bytes_of, self._service.values())) > _KEPT_BYTES:
                self._service.popitem(last=False)
        self._service.move_to_end(key)
        return self._service[key]


_FLAGGED: Final = {
    Flag.INFILLED: _INFILLED,
    Flag.REWEIGHTED: _WITHOUT,
    Flag.SPREAD: _SPREAD,
    Flag.ESTIMATED: _ESTIMATED,
}


@dataclass(frozen=True, eq=False)
class _Kinds:
    """The kinds of value of every stretch of steps at which they are the same, (n_rows, n_gauges)."""

    rows: Bytes
    lengths: npt.NDArray[np.int64]

    @classmethod
    def of(cls, kind: Bytes) -> _Kinds:
        change = np.flatnonzero((kind[1:] != kind[:-1]).any(axis=1)) + 1
        first = np.concatenate([np.zeros(min(len(kind), 1), dtype=np.int64), change])
        return cls(kind[first], np.diff(first, append=len(kind)))

    def by_service(self) -> list[tuple[npt.NDArray[np.int64], Bytes]]:
        """Return rows that have the same gauges in service, a bounded number at a time."""
        runs = ReportingRuns.of(self.rows != _ABSENT)
        of_row = np.repeat(runs.set_of_run, runs.lengths)
        order = np.argsort(of_row, kind="stable")
        groups = np.split(order, np.flatnonzero(np.diff(of_row[order])) + 1) if len(order) else []
        blocks = [group[at : at + _ROWS] for group in groups for at in range(0, len(group), _ROWS)]
        return [(block, self.rows[block]) for block in blocks]


def _product(marked: Bools, weights: Table) -> npt.NDArray[np.float32]:
    """Return the sum of the weights of the marked gauges, (n_rows, n_basins)."""
    return np.asarray((weights @ marked.T.astype(np.float32)).T, dtype=np.float32)


def _bytes_of(weights: Table) -> int:
    if isinstance(weights, np.ndarray):
        return weights.nbytes
    return int(weights.data.nbytes + weights.indices.nbytes + weights.indptr.nbytes)
