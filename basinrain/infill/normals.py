"""Normal precipitation as the ratio methods need it: there, above zero, and of the right month."""

from __future__ import annotations

import calendar
from collections.abc import Iterable
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill.spans import EXACT
from basinrain.notes import Note

__all__ = ["normals_of", "require_normals", "suspect_normal_units"]

_NEIGHBOURS: Final = 5

_CLOSE: Final = 0.12
# For a gauge that stands out so much that another looks wrong beside it.
_NEAR: Final = 0.3

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
        12 % of 25.4, 10, 2.54 or the inverse of one of them. The farthest from its neighbours comes first, and the
        others are judged without it. Where a neighbour stands out more than a gauge in doubt, that neighbour is left
        out, and named if within 30 %. Of two gauges alone both are named. A doubt only: relief can do that, too.
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
    """Return the warnings of gauges whose normals differ from their neighbours' by the ratio of two units.

    A wrong normal makes those around it look wrong, too, where they have few other neighbours. So the farthest from its
    neighbours is judged first, and no further gauge is judged by it.
    """
    part = network.subset(np.isin(np.arange(len(network)), known))
    n = len(part)
    # The gauge itself comes first or among its twins; it is taken out by its number.
    order = part.nearest_first(part.distances())
    order = order[order != np.arange(n)[:, None]].reshape(n, -1)
    mine, logs = normals[known], np.log(normals[known])
    left = np.ones(n, dtype=bool)
    near = list(order[:, :_NEIGHBOURS])
    # Row k: the gauges that k is judged by.
    judged_by = np.zeros((n, n), dtype=bool)
    judged_by[np.arange(n)[:, None], order[:, :_NEIGHBOURS]] = True
    # Middle of the logarithms, so that a factor weighs the same up and down.
    off = logs - np.median(logs[order[:, :_NEIGHBOURS]], axis=1)
    factors = np.array([factor for factor, _ in _UNIT_RATIOS])
    notes: dict[int, Note] = {}
    while True:
        suspected = np.flatnonzero(left & (np.abs(np.exp(off)[:, None] / factors - 1) <= _CLOSE).any(axis=1))
        if not len(suspected):
            break
        farness = np.abs(off)
        # Of two gauges alone either may be the wrong one: both are as far.
        farthest = suspected[farness[suspected] >= farness[suspected].max() - EXACT]
        around = np.unique(np.concatenate([near[k] for k in farthest.tolist()]))
        farther = around[farness[around] > farness[farthest].max() + EXACT]
        # What stands out more than the gauge that it makes suspect is the likelier culprit, if less near a ratio.
        wrong = farther[[np.argmax(farness[farther])]] if len(farther) else farthest
        for k in wrong.tolist():
            ratio = float(np.exp(off[k]))
            words = next((words for factor, words in _UNIT_RATIOS if abs(ratio / factor - 1) <= _NEAR), None)
            if words is not None:
                beside = "" if np.array_equal(near[k], order[k, : len(near[k])]) else " that are not in doubt"
                notes[k] = Note(
                    code="normal-unit",
                    text=f"Gauge {part.ids[k]}: its normal of {mine[k]:g} mm is {ratio:.2g} times the median "
                    f"of its {len(near[k])} nearest gauges'{beside} ({mine[k] / ratio:.4g} mm), as if it were "
                    f"in {words}.",
                    gauge=part.ids[k],
                )
        left[wrong] = False
        for k in np.flatnonzero(left & judged_by[:, wrong].any(axis=1)).tolist():
            near[k] = order[k][left[order[k]]][:_NEIGHBOURS]
            judged_by[k, near[k]] = True
            # The last one left has none to be judged by.
            off[k] = logs[k] - np.median(logs[near[k]]) if len(near[k]) else 0.0
    return [notes[k] for k in sorted(notes)]
