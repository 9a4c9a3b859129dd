"""The registry of infill methods: a name, its donor weights, and the laws it promises."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problem, nearest_name
from basinrain.infill.inverse_distance import inverse_distance_weights
from basinrain.infill.normal_ratio import normal_ratio_weights
from basinrain.infill.station_average import station_average_weights

__all__ = ["METHODS", "InfillMethod", "infill_method"]


@dataclass(frozen=True)
class InfillMethod:
    """One method of infilling.

    Parameters
    ----------
    name
        What jobs and tables call it.
    weights
        ``weights(network, target, reporting, *, nearest, radius, min_donors, distances)`` returns the donor weights of
        one target gauge, shape (..., n_gauges), for reporting gauges of that shape; all 0 where it cannot be infilled.
        A method that needs normals also takes ``month``.
    nearest
        How many of the nearest reporting gauges donate unless the user says otherwise.
    sums_to_one, needs_normals
        The laws it promises: weights sum to 1, so that constant rain gives the constant; or it works on ratios to
        normals, so that rain equal to the normals gives the target's normal.
    takes
        Options of :class:`~basinrain.infill.options.InfillOptions` that it takes besides those of every method.

    Examples
    --------
    A method of one's own, which takes the mean of the two nearest gauges:

    >>> from functools import partial
    >>> InfillMethod("nearest-pair", partial(station_average_weights, nearest=2), nearest=2).sums_to_one
    True
    """

    name: str
    weights: Callable[..., npt.NDArray[np.float64]]
    nearest: int = 5
    sums_to_one: bool = True
    needs_normals: bool = False
    takes: tuple[str, ...] = ()


METHODS: Final[Mapping[str, InfillMethod]] = MappingProxyType(
    {
        method.name: method
        for method in (
            InfillMethod("inverse-distance", inverse_distance_weights, takes=("power",)),
            InfillMethod("normal-ratio", normal_ratio_weights, nearest=4, sums_to_one=False, needs_normals=True),
            InfillMethod("station-average", station_average_weights),
        )
    }
)
"""The infill methods by name."""


def infill_method(name: str) -> InfillMethod:
    """Return the infill method of that name.

    Raises
    ------
    JobError
        No method has that name; the nearest known one is named.

    Examples
    --------
    >>> infill_method("normal-ratio").needs_normals
    True
    >>> infill_method("normal ratio")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [infill] method: found 'normal ratio'; expected one of: inverse-distance, normal-ratio, \
station-average; did you mean 'normal-ratio'?
    """
    try:
        return METHODS[name]
    except (KeyError, TypeError):
        raise JobError(
            Problem(
                item="[infill] method",
                found=f"'{name}'",
                expected="one of: " + ", ".join(METHODS),
                remedy=nearest_name(str(name), METHODS),
            )
        ) from None
