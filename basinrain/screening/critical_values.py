"""Critical values of the homogeneity tests; ``critical_values.csv`` beside this module gives the source of each."""

from __future__ import annotations

import csv
import math
from collections.abc import Mapping
from functools import cache
from importlib import resources
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

__all__ = ["LEVELS", "critical_values"]

LEVELS: Final = (0.05, 0.01)
"""Levels of significance at which a test is judged."""


def critical_values(test: str, n: int) -> Mapping[float, float]:
    """Return the values from which on (for von Neumann: down from which) a test rejects, by level.

    Parameters
    ----------
    test
        A test's name.
    n
        Values in the series. Between the lengths of the table they are interpolated linearly in n: Pettitt's K as
        K/n^1.5, von Neumann's N as (2 - N) √n, which hardly vary, the others as they are. Beyond its longest, 300 (von
        Neumann 100), these quantities are held; below its shortest (10 for Buishand's tests, 20 for the others) there
        are none.

    Returns
    -------
    mapping of float to float
        By level, 0.05 and 0.01; empty below the table.

    Raises
    ------
    KeyError
        There is no such test.

    Examples
    --------
    >>> round(critical_values("buishand-range", 25)[0.05], 9)  # half way from 1.43 to 1.50
    1.465
    >>> dict(critical_values("snht", 19))
    {}
    """
    lengths, table = _table()[test]
    if n < lengths[0]:
        return MappingProxyType({})
    found = {}
    for level, column in zip(LEVELS, table.T, strict=True):
        match test:
            case "pettitt":
                value = float(np.interp(n, lengths, column / lengths**1.5)) * n**1.5
            case "von-neumann":
                value = 2 - float(np.interp(n, lengths, (2 - column) * np.sqrt(lengths))) / math.sqrt(n)
            case _:
                value = float(np.interp(n, lengths, column))
        found[level] = value
    return MappingProxyType(found)


@cache
def _table() -> dict[str, tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]]:
    """Return for every test the lengths (n,) and the critical values (n, levels)."""
    text = resources.files("basinrain.screening").joinpath("critical_values.csv").read_text(encoding="utf-8")
    rows: dict[str, list[tuple[float, float, float]]] = {}
    for row in csv.DictReader(text.splitlines()):
        rows.setdefault(row["test"], []).append(
            (float(row["n"]), float(row["at_5_percent"]), float(row["at_1_percent"]))
        )
    return {test: (np.array(found)[:, 0], np.array(found)[:, 1:]) for test, found in rows.items()}
