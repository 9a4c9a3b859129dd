"""What a job says about infilling, checked."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, JobError, Problem, Problems, unknown
from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import ALL, Nearest
from basinrain.infill.inverse_distance import POWER
from basinrain.infill.record_normals import NormalRatios
from basinrain.infill.registry import METHODS, InfillMethod, infill_method
from basinrain.infill.relations import Relations

__all__ = ["OF_SOME_METHODS", "SCALES", "InfillOptions", "Scale"]

Scale = Literal["step", "day", "storm"]
"""The time over which one infilled depth is estimated."""

SCALES: Final = ("step", "day", "storm")

OF_SOME_METHODS: Final = ("nearest", "min_donors", "power")
"""Options that not every method takes; one that a method does not take is refused beside it."""


@dataclass(frozen=True)
class InfillOptions:
    """How gaps are infilled.

    Parameters
    ----------
    method
        A registered method's name.
    scale
        ``"step"``, ``"day"`` or ``"storm"``; None: day where a daily gauge takes part or steps are a day or longer,
        else storm.
    longest_gap
        Days; longer gaps are left missing.
    nearest
        How many of the nearest reporting gauges donate (by regression: of the best correlated), or ``"all"``; None: as
        many as the method has by default (4 or 5). Not for nearest-gauge and four-quadrant.
    radius
        m; farther gauges do not donate. None: no limit.
    min_donors
        With fewer donors than this nothing is estimated; None: 2, by nearest-gauge 1, for which it cannot be given.
    power
        Exponent of the distance, for inverse-distance and inverse-distance-ratios; None: 2.
    elevation_limit
        m; gauges whose elevation differs by more from the target's do not donate. None: no limit.

    Raises
    ------
    JobError
        A choice is not known, a number is out of range, or an option is given that the method does not take; all such
        problems together.

    Examples
    --------
    >>> InfillOptions(method="normal-ratio").donors_wanted
    4
    >>> InfillOptions(scale="hour", power=0)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [infill] scale: found 'hour'; expected one of: step, day, storm
    [infill] power: found 0; expected a number above 0
    >>> InfillOptions(method="normal-ratio", power=2)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [infill] power: found it beside method 'normal-ratio'; expected one of the methods that \
take it: inverse-distance, inverse-distance-ratios; remove power, or choose one of these
    """

    method: str = "inverse-distance"
    scale: Scale | None = None
    longest_gap: float = 31.0
    nearest: Nearest | None = None
    radius: float | None = None
    min_donors: int | None = None
    power: float | None = None
    elevation_limit: float | None = None

    def __post_init__(self) -> None:
        problems = Problems()
        try:
            self._check_belonging(problems)
        except JobError as error:
            problems.extend(error)
        scale: object = self.scale
        if scale is not None and scale not in SCALES:
            problems.include(unknown("[infill] scale", scale, SCALES))
        for name in ("longest_gap", "power", "radius", "elevation_limit"):
            value = getattr(self, name)
            unlimited = value == math.inf if name == "longest_gap" else value is None
            if not (unlimited or _is_number(value)):
                problems.add(item=f"[infill] {name}", found=f"{value!r}", expected="a number above 0")
        counted = self.min_donors is None or _is_count(self.min_donors)
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
            elif counted and self._takes("nearest") and self.nearest < self.donors_required:
                problems.add(
                    item="[infill] nearest",
                    found=f"{self.nearest}, below min_donors = {self.donors_required}",
                    expected="at least as many nearest gauges as donors are asked for",
                    remedy="raise nearest or lower min_donors",
                )
        problems.raise_as(JobError)

    def _check_belonging(self, problems: Problems) -> None:
        method = infill_method(self.method)
        for name in OF_SOME_METHODS:
            if getattr(self, name) is not None and name not in method.takes:
                problems.add(
                    item=f"[infill] {name}",
                    found=f"it beside method '{self.method}'",
                    expected="one of the methods that take it: "
                    + ", ".join(other.name for other in METHODS.values() if name in other.takes),
                    remedy=f"remove {name}, or choose one of these",
                )

    def _takes(self, name: str) -> bool:
        return self.method in METHODS and name in METHODS[self.method].takes

    @property
    def chosen_method(self) -> InfillMethod:
        """The method of that name."""
        return infill_method(self.method)

    @property
    def donors_wanted(self) -> Nearest:
        """How many of the nearest reporting gauges donate: as given, else the method's default."""
        if self.nearest is None:
            return max(self.chosen_method.nearest, self.donors_required)
        return self.nearest

    @property
    def donors_required(self) -> int:
        """With fewer donors than this nothing is estimated: as given, else the method's default."""
        return self.chosen_method.min_donors if self.min_donors is None else self.min_donors

    @property
    def exponent(self) -> float | None:
        """The exponent of the distance: as given, else 2; None for a method that takes no ``power``."""
        if not self._takes("power"):
            return None
        return POWER if self.power is None else self.power

    @property
    def label(self) -> str:
        """What tables call the method with its numbers: its name, and its power where it takes one.

        Examples
        --------
        >>> InfillOptions(power=1).label, InfillOptions(method="station-average").label
        ('inverse-distance (power 1)', 'station-average')
        """
        return self.method if self.exponent is None else f"{self.method} (power {self.exponent:g})"

    def with_method(self, method: str) -> InfillOptions:
        """Return the same options with another method, without those that it does not take.

        Parameters
        ----------
        method
            A registered method's name.

        Returns
        -------
        InfillOptions

        Raises
        ------
        JobError
            The method is not known, or ``nearest`` and ``min_donors`` do not fit together under it.

        Examples
        --------
        >>> options = InfillOptions(power=3, nearest=6, scale="day").with_method("normal-ratio")
        >>> options.power, options.nearest, options.scale
        (None, 6, 'day')
        """
        takes = infill_method(method).takes
        dropped = {name: None for name in OF_SOME_METHODS if name not in takes}
        return replace(self, method=method, **dropped)  # type: ignore[arg-type]

    def weights(
        self,
        network: GaugeNetwork,
        target: int,
        reporting: npt.NDArray[np.bool_],
        *,
        month: int | None = None,
        distances: npt.NDArray[np.float64] | None = None,
        relations: Relations | None = None,
        ratios: NormalRatios | None = None,
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
        relations : Relations, optional
            Relations between the gauges in the record, for methods that need them.
        ratios : NormalRatios, optional
            Normals from the record, used instead of the network's by methods that need normals.

        Returns
        -------
        array of float, shape (..., n_gauges)
            All 0 where the gauge cannot be infilled.

        Raises
        ------
        DataError
            The method needs relations and has none, or what the method itself raises.

        Examples
        --------
        >>> network = GaugeNetwork(ids=("A", "T", "B"), x=[0.0, 1e3, 3e3], y=[0.0, 0.0, 0.0], crs="local")
        >>> InfillOptions(power=1).weights(network, 1, np.array([True, False, True])).round(4)
        array([0.6667, 0.    , 0.3333])
        """
        method = self.chosen_method
        given = {"nearest": self.donors_wanted, "min_donors": self.donors_required, "power": self.exponent}
        further: dict[str, Any] = {name: given[name] for name in method.takes}
        if method.needs_normals:
            further |= {"month": month, "ratios": ratios}
        if method.needs_relations:
            if relations is None:
                raise DataError(
                    Problem(
                        item="relations between gauges",
                        found="none",
                        expected=f"those of the record for method '{self.method}'",
                        remedy="give relations_of_record(record, network)",
                    )
                )
            further["relations"] = relations
        return method.weights(
            network,
            target,
            reporting,
            radius=self.radius,
            elevation_limit=self.elevation_limit,
            distances=distances,
            **further,
        )


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value) and value > 0


def _is_count(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool) and value >= 1
