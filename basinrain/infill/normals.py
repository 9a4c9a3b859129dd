"""Normal precipitation as the ratio methods need it: there, above zero, and of the right month."""

from __future__ import annotations

import calendar
from collections.abc import Iterable
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.notes import Note

__all__ = ["normals_of", "require_normals", "suspect_normal_units"]

_NEIGHBOURS: Final = 5

_CLOSE: Final = 0.12

_DRIEST, _WETTEST = 10.0, 13000.0

_LISTED: Final = 3

_UNIT_RATIOS: Final = (
    (25.4, "mm where the others are inches"),
    (10.0, "mm where the others are cm"),
    (2.54, "cm where the others are inches"),
    (1 / 2.54, "inches where the others are cm"),
    (1 / 10.0, "cm where the others are mm"),
    (1 / 25.4, "inches where the others are mm"),
)


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


def require_normals(
    network: GaugeNetwork, gauges: npt.NDArray[np.bool_], months: Iterable[int | None], *, method: str
) -> None:
    """Raise an error that names every gauge whose normals cannot be used.

    Parameters
    ----------
    network
        The gauges.
    gauges : array of bool, shape (n_gauges,)
        The gauges whose normals are needed.
    months
        The months that are needed; None for the year.
    method
        The infill method that needs them, for the message.

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
    >>> require_normals(network, np.array([True, True, False]), [None], method="normal-ratio")
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge B: found a normal of 0 mm for the year; expected a normal above 0 for the \
normal-ratio method; give it, leave the gauge out, or choose another infill method
    """
    remedy = "give it, leave the gauge out, or choose another infill method"
    expected = f"a normal above 0 for the {method} method"
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


def suspect_normal_units(network: GaugeNetwork) -> tuple[Note, ...]:
    """Return warnings of normals that look as if they were in another unit than the neighbours', or than mm.

    Parameters
    ----------
    network
        The gauges; those without a normal above 0 for the year are left out.

    Returns
    -------
    tuple of Note
        ``normal-unit`` where the gauge's normal for the year over the median of those of its 5 nearest gauges is within
        12 % of 25.4, 10, 2.54 or the inverse of one of them. A doubt only: relief can do that, too.
        ``normal-out-of-range``, one for all other gauges whose normal for the year is below 10 or above 13,000 mm: the
        wettest place known, Mawsynram, has about 11,900 mm a year (from memory), and what is drier than 10 mm a year
        is no country to take ratios in.

    Examples
    --------
    C's 33.1 would be 841 mm if it were inches.

    >>> normals = np.array([[820.0], [850.0], [33.1], [900.0]])
    >>> network = GaugeNetwork(
    ...     ids=("A", "B", "C", "D"), x=[0.0, 1e3, 2e3, 3e3], y=[0.0, 0.0, 0.0, 0.0], crs="local", normals=normals
    ... )
    >>> print(*suspect_normal_units(network))
    Gauge C: its normal of 33.1 mm is 0.039 times the median of its 3 nearest gauges' (850 mm), as if it were in \
inches where the others are mm.
    >>> suspect_normal_units(network.subset([True, True, False, True]))
    ()
    """
    normals = normals_of(network, None)
    known = np.flatnonzero(np.isfinite(normals) & (normals > 0))
    notes = _unlike_neighbours(network, known, normals) if len(known) >= 2 else []
    named = {note.gauge for note in notes}
    outside = [
        f"{network.ids[g]} {normals[g]:{',.0f' if normals[g] >= 100 else '.3g'}} mm"
        for g in known.tolist()
        if network.ids[g] not in named and not _DRIEST <= normals[g] <= _WETTEST
    ]
    if outside:
        listed = ", ".join(outside[:_LISTED])
        more = f" and {len(outside) - _LISTED:,} more" if len(outside) > _LISTED else ""
        notes.append(
            Note(
                code="normal-out-of-range",
                text=f"{'A normal' if len(outside) == 1 else 'Normals'} for the year below {_DRIEST:g} or above "
                f"{_WETTEST:,.0f} mm (the wettest place known has about 11,900 mm): {listed}{more}; "
                "check normal_unit, and that normals are those of the year or of its twelve months.",
            )
        )
    return tuple(notes)


def _unlike_neighbours(
    network: GaugeNetwork, known: npt.NDArray[np.int64], normals: npt.NDArray[np.float64]
) -> list[Note]:
    """Return the warnings of gauges whose normals differ from their neighbours' by the ratio of two units."""
    part = network.subset(np.isin(np.arange(len(network)), known))
    # The gauge itself comes first or among its twins; it is taken out by its number.
    order = part.nearest_first(part.distances())
    others = order[order != np.arange(len(part))[:, None]].reshape(len(part), -1)[:, :_NEIGHBOURS]
    mine = normals[known]
    # Middle of the logarithms, so that a factor weighs the same up and down.
    median = np.exp(np.median(np.log(mine[others]), axis=1))
    notes = []
    for k, (gauge, ratio) in enumerate(zip(part.ids, (mine / median).tolist(), strict=True)):
        for factor, words in _UNIT_RATIOS:
            if abs(ratio / factor - 1) <= _CLOSE:
                notes.append(
                    Note(
                        code="normal-unit",
                        text=f"Gauge {gauge}: its normal of {mine[k]:g} mm is {ratio:.2g} times the median of its "
                        f"{others.shape[1]} nearest gauges' ({median[k]:.4g} mm), as if it were in {words}.",
                        gauge=gauge,
                    )
                )
    return notes
