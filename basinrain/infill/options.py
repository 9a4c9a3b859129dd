"""What a job says about infilling, checked."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.errors import JobError, Problems, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import ALL, Nearest
from basinrain.infill.registry import InfillMethod, infill_method

__all__ = ["SCALES", "InfillOptions", "Scale"]

Scale = Literal["step", "day", "storm"]
"""The time over which one infilled depth is estimated."""

SCALES: Final = ("step", "day", "storm")


@dataclass(frozen=True)
class InfillOptions:
    """How gaps are infilled.

    Parameters
    ----------
    method
        A registered method's name.
    scale
        ``"step"``, ``"day"`` or ``"storm"``; None: day where a daily gauge takes part, else storm.
    longest_gap
        Days; longer gaps are left missing.
    nearest
        How many of the nearest reporting gauges donate, or ``"all"``; None: as many as the method has by default
        (inverse distance 5, normal ratio 4, station average 5).
    radius
        m; farther gauges do not donate. None: no limit.
    min_donors
        With fewer donors than this nothing is estimated.
    power
        Exponent of inverse distance.

    Raises
    ------
    JobError
        A choice is not known or a number is out of range; all such problems together.

    Examples
    --------
    >>> InfillOptions(method="normal-ratio").donors_wanted
    4
    >>> InfillOptions(scale="hour", power=0)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [infill] scale: found 'hour'; expected one of: step, day, storm
    [infill] power: found 0; expected a number above 0
    """

    method: str = "inverse-distance"
    scale: Scale | None = None
    longest_gap: float = 31.0
    nearest: Nearest | None = None
    radius: float | None = None
    min_donors: int = 2
    power: float = 2.0

    def __post_init__(self) -> None:
        problems = Problems()
        try:
            infill_method(self.method)
        except JobError as error:
            problems.extend(error)
        scale: object = self.scale
        if scale is not None and scale not in SCALES:
            advice = nearest_name(str(scale), SCALES)
            problems.add(
                item="[infill] scale",
                found=f"'{scale}'",
                expected="one of: " + ", ".join(SCALES),
                remedy=advice if advice.startswith("did") else "",
            )
        for name, value in (("longest_gap", self.longest_gap), ("power", self.power), ("radius", self.radius)):
            unlimited = name == "longest_gap" and value == math.inf
            if not (unlimited or _is_number(value) or (name == "radius" and value is None)):
                problems.add(item=f"[infill] {name}", found=f"{value!r}", expected="a number above 0")
        counted = _is_count(self.min_donors)
        if not counted:
            problems.add(
                item="[infill] min_donors", found=f"{self.min_donors!r}", expected="a whole number of 1 or more"
            )
        if self.nearest is not None and self.nearest != ALL:
            if not _is_count(self.nearest):
                problems.add(
                    item="[infill] nearest",
                    found=f"{self.nearest!r}",
                    expected="a whole number of 1 or more, or 'all'",
                )
            elif counted and self.nearest < self.min_donors:
                problems.add(
                    item="[infill] nearest",
                    found=f"{self.nearest}, below min_donors = {self.min_donors}",
                    expected="at least as many nearest gauges as donors are asked for",
                    remedy="raise nearest or lower min_donors",
                )
        problems.raise_as(JobError)

    @property
    def chosen_method(self) -> InfillMethod:
        """The method of that name."""
        return infill_method(self.method)

    @property
    def donors_wanted(self) -> Nearest:
        """How many of the nearest reporting gauges donate: as given, else the method's default."""
        if self.nearest is None:
            return max(self.chosen_method.nearest, self.min_donors)
        return self.nearest

    def weights(
        self,
        network: GaugeNetwork,
        target: int,
        reporting: npt.NDArray[np.bool_],
        *,
        month: int | None = None,
        distances: npt.NDArray[np.float64] | None = None,
    ) -> npt.NDArray[np.float64]:
        """Return the donor weights of one gauge by the method and numbers of these options.

        Parameters
        ----------
        network
            The gauges.
        target
            Position of the gauge to infill.
        reporting : array of bool, shape (..., n_gauges)
            Which gauges have a value of their own, for one case or many.
        month
            1 to 12, for methods that need normals; None for the year's.
        distances : array of float, shape (n_gauges,), optional
            m, from the target to every gauge.

        Returns
        -------
        array of float, shape (..., n_gauges)
            All 0 where the gauge cannot be infilled.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "T", "B"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
        >>> InfillOptions(power=1).weights(network, 1, np.array([True, False, True])).round(4)
        array([0.6667, 0.    , 0.3333])
        """
        method = self.chosen_method
        further: dict[str, Any] = {name: getattr(self, name) for name in method.takes}
        if method.needs_normals:
            further["month"] = month
        return method.weights(
            network,
            target,
            reporting,
            nearest=self.donors_wanted,
            radius=self.radius,
            min_donors=self.min_donors,
            distances=distances,
            **further,
        )


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value) and value > 0


def _is_count(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool) and value >= 1
