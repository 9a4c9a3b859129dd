"""The gauge network: where the gauges are and what is known of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any, Final

import numpy as np
import numpy.typing as npt
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from basinrain import ground
from basinrain.errors import DataError, Problems

__all__ = ["ONE_PLACE", "GaugeNetwork", "colocated_groups", "refuse_colocated"]

ONE_PLACE: Final = 0.01
"""Gauges closer than this, in m, are at one place."""

_TIE: Final = 1e-9


@dataclass(frozen=True, eq=False)
class GaugeNetwork:
    """Gauges with their positions, elevations, normals and times of service.

    Parameters
    ----------
    ids : tuple of str
        One id per gauge, all different. Wherever a choice between gauges is a tie, the id decides.
    x, y : array of float, shape (n_gauges,)
        Easting and northing, or longitude and latitude in degrees, in ``crs``; finite.
    crs : str
        Anything pyproj reads, or ``"local"``: a flat plane in metres that belongs to no map.
    names : tuple of str, optional
        Names for people; the ids where none are given.
    elevation : array of float, shape (n_gauges,), optional
        m above sea level; NaN where not known.
    normals : array of float, shape (n_gauges, 1) or (n_gauges, 12), optional
        Normal precipitation in mm of the year (one column) or of the months January to December; NaN where not known.
    normal_period : str
        The years that the normals belong to, as the user wrote them: ``"1991-2020"``.
    opened, closed : array of datetime64[s], shape (n_gauges,), optional
        In service over ``(opened, closed]``; NaT for no limit.

    Raises
    ------
    DataError
        Ids are repeated or empty, a position is not finite, or an array has another length; all such problems together.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 3000.0], y=[0.0, 4000.0], crs="local")
    >>> len(network), network.position("B")
    (2, 1)
    >>> network.distances()
    array([[   0., 5000.],
           [5000.,    0.]])
    >>> network.subset([False, True]).ids
    ('B',)
    >>> GaugeNetwork(ids=("A", "A"), x=[0.0, 1.0], y=[0.0, 1.0], crs="local")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge A: found the id twice; expected each gauge once; rename or remove one of them
    """

    ids: tuple[str, ...]
    x: npt.NDArray[np.float64]
    y: npt.NDArray[np.float64]
    crs: str = field(kw_only=True)
    names: tuple[str, ...] = field(default=(), kw_only=True)
    elevation: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty(0), kw_only=True)
    normals: npt.NDArray[np.float64] | None = field(default=None, kw_only=True)
    normal_period: str = field(default="", kw_only=True)
    opened: npt.NDArray[np.datetime64] = field(default_factory=lambda: np.empty(0, "datetime64[s]"), kw_only=True)
    closed: npt.NDArray[np.datetime64] = field(default_factory=lambda: np.empty(0, "datetime64[s]"), kw_only=True)

    def __post_init__(self) -> None:
        n = len(self.ids)
        put = object.__setattr__
        put(self, "ids", tuple(self.ids))
        put(self, "names", tuple(self.names) or self.ids)
        put(self, "x", _frozen(self.x, np.float64))
        put(self, "y", _frozen(self.y, np.float64))
        # An empty array says "not given".
        put(self, "elevation", _frozen(self.elevation if len(self.elevation) else np.full(n, np.nan), np.float64))
        if self.normals is not None:
            put(self, "normals", _frozen(self.normals, np.float64))
        for name in ("opened", "closed"):
            value = getattr(self, name)
            put(self, name, _frozen(value if len(value) else np.full(n, "NaT"), "datetime64[s]"))
        self._check(n)

    def _check(self, n: int) -> None:
        problems = Problems()
        seen: set[str] = set()
        for gauge in self.ids:
            if not gauge.strip():
                problems.add(item="a gauge", found="an empty id", expected="an id for every gauge")
            elif gauge in seen:
                problems.add(
                    item=f"gauge {gauge}",
                    found="the id twice",
                    expected="each gauge once",
                    remedy="rename or remove one of them",
                    gauge=gauge,
                )
            seen.add(gauge)
        for name in ("names", "x", "y", "elevation", "opened", "closed"):
            if len(getattr(self, name)) != n:
                problems.add(item=name, found=f"{len(getattr(self, name))} values", expected=f"{n}, one a gauge")
        if self.normals is not None and self.normals.shape not in ((n, 1), (n, 12)):
            problems.add(
                item="normals",
                found=f"an array of shape {self.normals.shape}",
                expected=f"({n}, 1) for the year or ({n}, 12) for the months",
            )
        if len(self.x) == n == len(self.y):
            for gauge, x, y in zip(self.ids, self.x, self.y, strict=True):
                if not (np.isfinite(x) and np.isfinite(y)):
                    problems.add(
                        item=f"gauge {gauge}",
                        found=f"position ({x}, {y})",
                        expected="two finite coordinates",
                        gauge=gauge,
                    )
        problems.raise_as(DataError)

    def __len__(self) -> int:
        return len(self.ids)

    def position(self, gauge: str) -> int:
        """Return the place of ``gauge`` in the network's order; ``ValueError`` when it is not there."""
        return self.ids.index(gauge)

    @cached_property
    def id_rank(self) -> npt.NDArray[np.int64]:
        """The rank of every gauge's id in sorted order, by which ties are broken; read-only."""
        rank = np.empty(len(self), dtype=np.int64)
        rank[sorted(range(len(self)), key=lambda i: self.ids[i])] = np.arange(len(self))
        rank.setflags(write=False)
        return rank

    def subset(self, mask: Sequence[bool] | npt.NDArray[np.bool_]) -> GaugeNetwork:
        """Return the network of the gauges where ``mask`` is true, in the same order.

        Parameters
        ----------
        mask : array of bool, shape (n_gauges,)
            One value a gauge.

        Returns
        -------
        GaugeNetwork
            With everything that is known of those gauges; without gauges where the mask is nowhere true.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local", elevation=[np.nan, 240.0])
        >>> network.subset([False, True]).elevation, len(network.subset([False, False]))
        (array([240.]), 0)
        """
        keep = np.arange(len(self))[np.asarray(mask, dtype=bool)]
        return replace(
            self,
            ids=tuple(self.ids[i] for i in keep),
            names=tuple(self.names[i] for i in keep),
            x=self.x[keep],
            y=self.y[keep],
            elevation=self.elevation[keep],
            normals=None if self.normals is None else self.normals[keep],
            opened=self.opened[keep],
            closed=self.closed[keep],
        )

    def to_crs(self, crs: str) -> GaugeNetwork:
        """Return the same gauges with positions in another coordinate system.

        Parameters
        ----------
        crs : str
            Anything pyproj reads; the network's own, however named, leaves positions untouched to the last bit.

        Returns
        -------
        GaugeNetwork

        Raises
        ------
        DataError
            One of the two systems is ``"local"`` and the other is not, or ``crs`` cannot show a gauge's position.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A",), x=[9.0], y=[0.0], crs="EPSG:4326")
        >>> network.to_crs("EPSG:32632").x.round(3)  # the central meridian of the zone, at its false easting
        array([500000.])
        >>> local = GaugeNetwork(ids=("A",), x=[9.0], y=[0.0], crs="local")
        >>> local.to_crs("EPSG:32632")
        Traceback (most recent call last):
            ...
        basinrain.errors.DataError: coordinate reference systems: found 'local' and 'EPSG:32632'; expected both \
'local', or both on the map; give gauges and basins in systems that can be brought together
        """
        x, y = ground.transform(self.x, self.y, self.crs, crs)
        return replace(self, x=x, y=y, crs=crs)

    def distances(self) -> npt.NDArray[np.float64]:
        """Return the distances between all gauges.

        Returns
        -------
        array of float, shape (n_gauges, n_gauges)
            m, symmetric, 0 on the diagonal: geodesic on the WGS 84 ellipsoid, planar where ``crs`` is ``"local"``.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 0.0], y=[0.0, 1.0], crs="EPSG:4326")
        >>> network.distances().round(1)  # one degree along the meridian
        array([[     0. , 110574.4],
               [110574.4,      0. ]])
        >>> network.subset([True, False]).distances()
        array([[0.]])
        """
        return ground.distances(self.x, self.y, self.x, self.y, self.crs)

    def nearest_first(
        self, distances: npt.NDArray[np.float64], gauges: npt.NDArray[np.int64] | None = None
    ) -> npt.NDArray[np.int64]:
        """Return the order of gauges by distance, the nearest first.

        Parameters
        ----------
        distances : array of float, shape (..., n)
            m, from one place or many to every gauge. Distances that differ by less than one part in 10⁹ are ties, which
            go by gauge id, so that neither the plane's origin nor the order of the file decides.
        gauges : array of int, shape (n,), optional
            Positions of the gauges that the distances lead to; all gauges where not given.

        Returns
        -------
        array of int, shape (..., n)
            Places along the last axis of ``distances``.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("B", "C", "A"), x=[0.0, 0.0, 0.0], y=[0.0, 0.0, 0.0], crs="local")
        >>> network.nearest_first(np.array([5.0, 3.0, 5.0 + 1e-10]))
        array([1, 2, 0])
        """
        order = np.argsort(distances, axis=-1, kind="stable")
        ranked = np.take_along_axis(distances, order, axis=-1)
        farther = ranked[..., 1:] > ranked[..., :-1] * (1 + _TIE)
        if farther.all():
            return order
        place = np.zeros(order.shape, dtype=np.int64)
        np.put_along_axis(place, order[..., 1:], np.cumsum(farther, axis=-1), axis=-1)
        rank = self.id_rank if gauges is None else self.id_rank[gauges]
        return np.lexsort((np.broadcast_to(rank, place.shape), place), axis=-1)

    def in_service(self, starts: npt.NDArray[np.datetime64], ends: npt.NDArray[np.datetime64]) -> npt.NDArray[np.bool_]:
        """Return whether every gauge was in service over the whole of every interval.

        Parameters
        ----------
        starts, ends : array of datetime64, shape (n_steps,)
            The intervals ``(start, end]``; one without times (NaT) counts as in service.

        Returns
        -------
        array of bool, shape (n_steps, n_gauges)

        Examples
        --------
        B closed at half past one, within the second hour.

        >>> closed = np.array(["NaT", "2031-05-04T01:30"], dtype="datetime64[s]")
        >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local", closed=closed)
        >>> ends = np.array(["2031-05-04T01", "2031-05-04T02", "NaT"], dtype="datetime64[s]")
        >>> network.in_service(ends - 3600, ends)
        array([[ True,  True],
               [ True, False],
               [ True,  True]])
        """
        begins, finishes = starts[:, None], ends[:, None]
        late = begins < self.opened[None, :]
        early = finishes > self.closed[None, :]
        return ~(late | early)


def colocated_groups(network: GaugeNetwork) -> list[tuple[str, ...]]:
    """Return the gauges that stand at one place: within 0.01 m of each other.

    Parameters
    ----------
    network
        Positions in a plane in metres.

    Returns
    -------
    list of tuple of str
        The ids of each such place, two or more, in the network's order; empty where all gauges stand apart.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 5000.0, 0.004], y=[0.0, 0.0, 0.0], crs="local")
    >>> colocated_groups(network)
    [('A', 'C')]
    """
    n = len(network)
    pairs = cKDTree(np.column_stack([network.x, network.y])).query_pairs(ONE_PLACE, output_type="ndarray")
    links = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    _, place = connected_components(links, directed=False)
    groups: dict[int, list[str]] = {}
    for gauge, label in zip(network.ids, place.tolist(), strict=True):
        groups.setdefault(label, []).append(gauge)
    return [tuple(group) for group in groups.values() if len(group) > 1]


def refuse_colocated(network: GaugeNetwork) -> None:
    """Raise where gauges stand at one place, since no method can tell their areas apart.

    Parameters
    ----------
    network
        Positions in a plane in metres.

    Raises
    ------
    DataError
        One problem a place, naming its gauges.

    Examples
    --------
    >>> refuse_colocated(GaugeNetwork(ids=("A", "B"), x=[7.0, 7.0], y=[2.0, 2.0], crs="local"))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauges A and B: found one place (x 7.00, y 2.00); expected places apart; correct a \
position, exclude all but one, or average them with colocated = "mean"
    """
    problems = Problems()
    for group in colocated_groups(network):
        first = network.position(group[0])
        problems.add(
            item=f"gauges {', '.join(group[:-1])} and {group[-1]}",
            found=f"one place (x {network.x[first]:.2f}, y {network.y[first]:.2f})",
            expected="places apart",
            remedy='correct a position, exclude all but one, or average them with colocated = "mean"',
            gauge=group[0],
        )
    problems.raise_as(DataError)


def _frozen(values: Any, dtype: Any) -> Any:  # noqa: ANN401 - any array-like, any dtype
    array = np.array(values, dtype=dtype)
    array.setflags(write=False)
    return array
