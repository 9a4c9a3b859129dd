"""When the network changed: gauges that open, close, or are silent for long."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

__all__ = ["CLOSES", "OPENS", "RETURNS", "SILENT", "NetworkChange", "network_changes"]

Bools = npt.NDArray[np.bool_]

OPENS: Final = "comes into service"
CLOSES: Final = "goes out of service"
SILENT: Final = "falls silent"
RETURNS: Final = "reports again"

_HERE, _SILENT, _ABSENT = range(3)
_WORDS: Final = {
    (_ABSENT, _HERE): OPENS,
    (_HERE, _ABSENT): CLOSES,
    (_SILENT, _ABSENT): CLOSES,
    (_HERE, _SILENT): SILENT,
    (_ABSENT, _SILENT): OPENS,
    (_SILENT, _HERE): RETURNS,
}


@dataclass(frozen=True, kw_only=True)
class NetworkChange:
    """One gauge that joins the others or leaves them, for longer than the longest gap that is infilled.

    Parameters
    ----------
    time
        The start of the first step from which it holds.
    gauge
        The gauge's id.
    change
        In words: :data:`OPENS`, :data:`CLOSES`, :data:`SILENT` or :data:`RETURNS`.
    gauges
        How many gauges are there from then on, all changes of that time together: in service and not silent for long.
    """

    time: np.datetime64
    gauge: str
    change: str
    gauges: int


def network_changes(
    gauges: Sequence[str],
    starts: npt.NDArray[np.datetime64],
    blocks: Sequence[tuple[int, int]],
    absent: Callable[[int, int], Bools],
    silent: Callable[[int, int], Bools],
) -> tuple[NetworkChange, ...]:
    """Return every change of a network within its record, in time, then by gauge.

    Parameters
    ----------
    gauges
        Ids of the columns.
    starts : array of datetime64, shape (n_steps,)
        Starts of the steps.
    blocks
        First step and the one after the last of stretches that cover the record, in order, each looked at as a whole.
    absent, silent
        Given a first step and the one after the last, which gauges are not in service, and which are silent for longer
        than is infilled, shape (n, n_gauges).

    Examples
    --------
    >>> day = np.datetime64("2031-05-04", "s") + np.arange(4) * np.timedelta64(86400, "s")
    >>> absent = np.array([[False, True], [False, True], [False, False], [False, False]])
    >>> silent = np.array([[False, False], [False, False], [False, False], [True, False]])
    >>> for change in network_changes(
    ...     ("A", "B"), day, [(0, 4)], lambda first, stop: absent[first:stop], lambda first, stop: silent[first:stop]
    ... ):
    ...     print(change.time, change.gauge, change.change, change.gauges)
    2031-05-06T00:00:00 B comes into service 2
    2031-05-07T00:00:00 A falls silent 1
    """
    found: list[NetworkChange] = []
    last: npt.NDArray[np.int8] | None = None
    for first, stop in blocks:
        state = np.where(absent(first, stop), _ABSENT, np.where(silent(first, stop), _SILENT, _HERE)).astype(np.int8)
        joined = state if last is None else np.vstack([last, state])
        step, gauge = np.nonzero(joined[1:] != joined[:-1])
        # The first row of a later block is the last one of the block before.
        offset = first + (last is None)
        here = (joined == _HERE).sum(axis=1)
        for t, g in zip(step.tolist(), gauge.tolist(), strict=True):
            change = _WORDS[int(joined[t, g]), int(joined[t + 1, g])]
            found.append(
                NetworkChange(time=starts[t + offset], gauge=gauges[g], change=change, gauges=int(here[t + 1]))
            )
        last = state[-1:]
    return tuple(found)
