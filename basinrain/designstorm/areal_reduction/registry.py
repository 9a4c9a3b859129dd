"""Every method of areal reduction by name."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.designstorm.areal_reduction.arr_2019 import ARR_2019
from basinrain.designstorm.areal_reduction.exponential import EXPONENTIAL
from basinrain.designstorm.areal_reduction.keers_wescott import KEERS_WESCOTT
from basinrain.designstorm.areal_reduction.leclerc_schaake import LECLERC_SCHAAKE
from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.designstorm.areal_reduction.table import TABLE
from basinrain.errors import JobError, unknown

__all__ = ["REDUCTIONS", "areal_reduction"]

REDUCTIONS: Final[Mapping[str, ArealReduction]] = MappingProxyType(
    {method.name: method for method in (LECLERC_SCHAAKE, KEERS_WESCOTT, ARR_2019, EXPONENTIAL, TABLE)}
)
"""Every method of areal reduction by name. A new one is one module and one line here."""


def areal_reduction(name: str) -> ArealReduction:
    """Return the method of areal reduction called ``name``.

    Parameters
    ----------
    name
        One of :data:`REDUCTIONS`.

    Returns
    -------
    ArealReduction

    Raises
    ------
    JobError
        There is none; the nearest name is given.

    Examples
    --------
    >>> areal_reduction("arr-2019").title
    'Australian Rainfall and Runoff 2019'
    >>> areal_reduction("arr-2016")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design.areal_reduction] method: found 'arr-2016'; expected one of: leclerc-schaake, \
keers-wescott, arr-2019, exponential, table; did you mean 'arr-2019'?
    """
    if name not in REDUCTIONS:
        raise JobError(unknown("[design.areal_reduction] method", name, REDUCTIONS))
    return REDUCTIONS[name]
