"""Normal precipitation as the ratio methods need it: there, above zero, and of the right month."""

from __future__ import annotations

import calendar
from collections.abc import Iterable

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork

__all__ = ["normals_of", "require_normals"]


def normals_of(network: GaugeNetwork, month: int | None) -> npt.NDArray[np.float64]:
    """Return every gauge's normal for a month.

    Parameters
    ----------
    network
        The gauges.
    month
        1 to 12; None for the year.

    Returns
    -------
    array of float, shape (n_gauges,)
        mm: the month's normal where the network has 12 of them, the year's where it has one or where ``month`` is None
        (the sum of the 12). NaN where not known.

    Examples
    --------
    >>> normals = np.array([[20.0] * 6 + [50.0] * 6, [30.0] * 12])
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 1.0], y=[0.0, 0.0], crs="local", normals=normals)
    >>> normals_of(network, 7), normals_of(network, None)
    (array([50., 30.]), array([420., 360.]))
    """
    if network.normals is None:
        return np.full(len(network), np.nan)
    if month is None or network.normals.shape[1] == 1:
        return np.asarray(network.normals.sum(axis=1), dtype=float)
    return network.normals[:, month - 1]


def require_normals(network: GaugeNetwork, gauges: npt.NDArray[np.bool_], months: Iterable[int | None]) -> None:
    """Raise an error that names every gauge whose normals cannot be used.

    Parameters
    ----------
    network
        The gauges.
    gauges : array of bool, shape (n_gauges,)
        The gauges whose normals are needed.
    months
        The months that are needed; None for the year.

    Raises
    ------
    DataError
        A normal is missing, infinite, or not above 0.

    Examples
    --------
    >>> normals = np.array([[900.0], [0.0], [np.nan]])
    >>> network = GaugeNetwork(
    ...     ids=("A", "B", "C"), x=[0.0, 1.0, 2.0], y=[0.0, 0.0, 0.0], crs="local", normals=normals
    ... )
    >>> require_normals(network, np.array([True, True, False]), [None])
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge B: found a normal of 0 mm for the year; expected a normal above 0 for the \
normal-ratio method; give it, leave the gauge out, or choose another infill method
    """
    remedy = "give it, leave the gauge out, or choose another infill method"
    expected = "a normal above 0 for the normal-ratio method"
    if network.normals is None:
        raise DataError(Problem(item="gauges", found="no normals", expected=expected, remedy=remedy))
    wanted: list[int | None] = list(months) if network.normals.shape[1] == 12 else [None]
    table = np.column_stack([normals_of(network, month) for month in wanted])
    bad = ~(np.isfinite(table) & (table > 0)) & np.asarray(gauges, dtype=bool)[:, None]
    problems = Problems()
    for g in np.flatnonzero(bad.any(axis=1)):
        first = int(np.flatnonzero(bad[g])[0])
        month = wanted[first]
        when = "the year" if month is None else calendar.month_name[month]
        value = table[g, first]
        problems.add(
            item=f"gauge {network.ids[g]}",
            found=f"no normal for {when}" if np.isnan(value) else f"a normal of {value:g} mm for {when}",
            expected=expected,
            remedy=remedy,
            gauge=network.ids[g],
        )
    problems.raise_as(DataError)
