"""Averaging: how much every gauge counts in every basin, one module a method, all methods in one registry."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.averaging.arithmetic import (
    arithmetic_weights,
    prepare_arithmetic,
    prepare_arithmetic_reweigher,
)
from basinrain.averaging.grid import Grid, make_grid
from basinrain.averaging.idw import choose_grid, idw_weights, prepare_idw
from basinrain.averaging.idw_reweighing import prepare_idw_reweigher
from basinrain.averaging.registry import AveragingMethod, Weigher
from basinrain.averaging.thiessen import (
    ThiessenPieces,
    prepare_thiessen,
    thiessen_cells,
    thiessen_pieces,
    thiessen_weights,
)
from basinrain.averaging.thiessen_reweighing import prepare_thiessen_reweigher
from basinrain.errors import JobError, unknown

__all__ = [
    "METHODS",
    "AveragingMethod",
    "Grid",
    "ThiessenPieces",
    "Weigher",
    "arithmetic_weights",
    "averaging_method",
    "choose_grid",
    "idw_weights",
    "make_grid",
    "thiessen_cells",
    "thiessen_pieces",
    "thiessen_weights",
]

METHODS: Final[Mapping[str, AveragingMethod]] = MappingProxyType(
    {
        method.name: method
        for method in (
            AveragingMethod("arithmetic", prepare_arithmetic, prepare_reweigher=prepare_arithmetic_reweigher),
            AveragingMethod("thiessen", prepare_thiessen, partition=True, prepare_reweigher=prepare_thiessen_reweigher),
            AveragingMethod(
                "idw", prepare_idw, partition=True, lengths=("cell", "radius"), prepare_reweigher=prepare_idw_reweigher
            ),
        )
    }
)
"""Every averaging method by name. A new one is one module and one line here."""


def averaging_method(name: str) -> AveragingMethod:
    """Return the averaging method called ``name``.

    Raises
    ------
    JobError
        There is none; the nearest name is given.

    Examples
    --------
    >>> averaging_method("thiessen").partition
    True
    >>> averaging_method("theissen")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: averaging method: found 'theissen'; expected one of: arithmetic, thiessen, idw; did you \
mean 'thiessen'?
    """
    if name not in METHODS:
        raise JobError(unknown("averaging method", name, METHODS))
    return METHODS[name]
