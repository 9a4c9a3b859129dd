"""The registry of infill methods: a name, its donor weights, and the laws it promises."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, unknown
from basinrain.infill.correlation_weighting import correlation_weights
from basinrain.infill.four_quadrant import four_quadrant_weights
from basinrain.infill.inverse_distance import inverse_distance_weights
from basinrain.infill.inverse_distance_ratios import inverse_distance_ratio_weights
from basinrain.infill.nearest_gauge import nearest_gauge_weights
from basinrain.infill.normal_ratio import normal_ratio_weights
from basinrain.infill.ratio_regression import ratio_regression_weights
from basinrain.infill.regression import regression_weights
from basinrain.infill.station_average import station_average_weights
from basinrain.infill.ten_percent_rule import ten_percent_rule_weights

__all__ = ["METHODS", "InfillMethod", "infill_method"]


@dataclass(frozen=True)
class InfillMethod:
    """One method of infilling.

    Parameters
    ----------
    name
        What jobs and tables call it.
    weights
        ``weights(network, target, reporting, *, radius, elevation_limit, distances)`` returns the donor weights of one
        target gauge, shape (..., n_gauges), for reporting gauges of that shape; all 0 where it cannot be infilled. It
        also takes the options that ``takes`` names; ``month`` and ``ratios`` where it needs normals; ``relations``
        where it needs these. A gauge of weight 0 may go missing without any weight changing.
    nearest
        How many of the nearest (or best-correlated) reporting gauges donate unless the user says otherwise.
    min_donors
        With fewer donors than this nothing is estimated unless the user says otherwise.
    sums_to_one, keeps_normals
        The laws it promises: weights sum to 1, so that constant rain gives the constant; rain equal to the normals
        gives the target's normal.
    needs_normals, needs_relations
        What it rests on besides positions: normals; the relations between gauges in the record.
    takes
        Options of :class:`~basinrain.infill.options.InfillOptions` that it takes besides those of every method.
    share_factors
        Given where, with all reporting gauges as donors, weights are shares in a fixed proportion, whoever reports,
        times something that each donor has by itself; names what that is the product of: ``"normals"`` (the target's
        over the donor's), ``"slope"`` (of the target on the donor), ``"slope of ratios"``. Estimates at many steps then
        need no weights of their own. None where weights are not of that form.
    donors_are
        What donors must be besides reporting, in words that follow "gauges"; empty where that is all.
    order
        Its place from simple to complex: of two methods that do equally well, the simpler is to be preferred.

    Examples
    --------
    A method of one's own, which takes the mean of the two nearest gauges:

    >>> from functools import partial
    >>> pair = InfillMethod("nearest-pair", partial(station_average_weights, nearest=2), takes=("min_donors",))
    >>> pair.sums_to_one, pair.needs_relations
    (True, False)
    """

    name: str
    weights: Callable[..., npt.NDArray[np.float64]]
    nearest: int = 5
    min_donors: int = 2
    sums_to_one: bool = True
    keeps_normals: bool = False
    needs_normals: bool = False
    needs_relations: bool = False
    takes: tuple[str, ...] = ("nearest", "min_donors")
    share_factors: tuple[str, ...] | None = None
    donors_are: str = ""
    order: int = 0


_POWERED: Final = ("nearest", "min_donors", "power")
_CORRELATED: Final = "with a known correlation above 0"

METHODS: Final[Mapping[str, InfillMethod]] = MappingProxyType(
    {
        method.name: method
        for method in (
            InfillMethod("nearest-gauge", nearest_gauge_weights, nearest=1, min_donors=1, takes=(), order=1),
            InfillMethod("station-average", station_average_weights, share_factors=(), order=2),
            InfillMethod("inverse-distance", inverse_distance_weights, takes=_POWERED, share_factors=(), order=3),
            InfillMethod(
                "four-quadrant",
                four_quadrant_weights,
                nearest=4,
                takes=("min_donors",),
                donors_are="in different quadrants",
                order=4,
            ),
            InfillMethod(
                "normal-ratio",
                normal_ratio_weights,
                nearest=4,
                sums_to_one=False,
                keeps_normals=True,
                needs_normals=True,
                share_factors=("normals",),
                order=5,
            ),
            InfillMethod(
                "ten-percent-rule",
                ten_percent_rule_weights,
                nearest=4,
                sums_to_one=False,
                needs_normals=True,
                order=6,
            ),
            InfillMethod(
                "inverse-distance-ratios",
                inverse_distance_ratio_weights,
                sums_to_one=False,
                keeps_normals=True,
                needs_normals=True,
                takes=_POWERED,
                share_factors=("normals",),
                order=7,
            ),
            InfillMethod(
                "correlation-weighting",
                correlation_weights,
                needs_relations=True,
                share_factors=(),
                donors_are=_CORRELATED,
                order=8,
            ),
            InfillMethod(
                "regression",
                regression_weights,
                nearest=4,
                sums_to_one=False,
                needs_relations=True,
                share_factors=("slope",),
                donors_are=_CORRELATED,
                order=9,
            ),
            InfillMethod(
                "ratio-regression",
                ratio_regression_weights,
                nearest=4,
                sums_to_one=False,
                needs_normals=True,
                needs_relations=True,
                share_factors=("normals", "slope of ratios"),
                donors_are=_CORRELATED,
                order=10,
            ),
        )
    }
)
"""The infill methods by name, from simple to complex."""


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
    basinrain.errors.JobError: [infill] method: found 'normal ratio'; expected one of: nearest-gauge, \
station-average, inverse-distance, four-quadrant, normal-ratio, ten-percent-rule, inverse-distance-ratios, \
correlation-weighting, regression, ratio-regression; did you mean 'normal-ratio'?
    """
    try:
        return METHODS[name]
    except (KeyError, TypeError):
        raise JobError(unknown("[infill] method", name, METHODS)) from None
