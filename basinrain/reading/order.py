"""Whether the rows of a file stand in order of time, each time once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problems

__all__ = ["check_order"]


def check_order(
    ends: npt.NDArray[np.datetime64],
    shown: Callable[[int], str],
    lines: npt.NDArray[np.int64],
    *,
    item: str,
    problems: Problems,
) -> None:
    """Report times that come twice, and times that go backwards.

    Parameters
    ----------
    ends : array of datetime64[s], shape (n_rows,)
        Interval ends; NaT, which is faulty in another way, is passed over.
    shown
        Gives a row's time as the file has it.
    lines
        Where they stand, from 1.
    item
        What messages call them.
    problems
        Takes one problem a row.

    Examples
    --------
    >>> problems = Problems()
    >>> ends = np.array(["2031-05-05", "2031-05-04", "2031-05-05"], dtype="datetime64[s]")
    >>> days = ["5 May", "4 May", "5.5."]
    >>> check_order(ends, days.__getitem__, np.array([2, 3, 4]), item="column day", problems=problems)
    >>> from basinrain.errors import ReadError
    >>> problems.raise_as(ReadError)
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: line 3: column day: found '4 May' after a later time; expected times in order; sort \
the rows by time
    line 4: column day: found '5.5.', as in line 2; expected each time once; remove one of the rows
    """
    known = np.flatnonzero(~np.isnat(ends))
    seconds = ends[known].astype(np.int64)
    if len(seconds) < 2 or (np.diff(seconds) > 0).all():
        return
    _, first, place = np.unique(seconds, return_index=True, return_inverse=True)
    twice = first[place] != np.arange(len(seconds))
    latest = np.maximum.accumulate(seconds)
    back = np.r_[False, seconds[1:] < latest[:-1]] & ~twice
    for k in np.flatnonzero(twice | back):
        row = int(known[k])
        if twice[k]:
            found, expected = f"'{shown(row)}', as in line {lines[known[first[place[k]]]]}", "each time once"
        else:
            found, expected = f"'{shown(row)}' after a later time", "times in order"
        problems.add(
            item=item,
            found=found,
            expected=expected,
            remedy="remove one of the rows" if twice[k] else "sort the rows by time",
            line=int(lines[row]),
            time=shown(row),
        )
