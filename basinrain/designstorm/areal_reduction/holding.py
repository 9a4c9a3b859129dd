"""Holding an area, durations and a probability to the range of a method of areal reduction."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.limits import TOLERANCE, Limits, area_words, joined
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.errors import MethodError, Problems

__all__ = ["Held", "Holder"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class Held:
    """What a formula is evaluated at.

    Parameters
    ----------
    areas : array of float, shape (n,)
        m², one a duration.
    minutes : array of float, shape (n,)
        Durations in minutes.
    aep : float, optional
        Annual exceedance probability.
    sentences : tuple of str
        What was moved to the nearest end of the range.
    """

    areas: Floats
    minutes: Floats
    aep: float | None
    sentences: tuple[str, ...]


@dataclass(eq=False, kw_only=True)
class Holder:
    """Collects what lies outside one method's range, to refuse it together or to tell where it was moved.

    Parameters
    ----------
    name, title
        The method's, for messages and sentences.
    limits
        Its range.
    uses_frequency
        Whether it knows a probability.
    clamp
        Whether what is outside is moved to the nearest end.
    """

    name: str
    title: str
    limits: Limits
    uses_frequency: bool
    clamp: bool
    _problems: Problems = field(default_factory=Problems, init=False)
    _sentences: list[str] = field(default_factory=list, init=False)

    def hold(self, area: float, minutes: Floats, frequency: Frequency | None) -> Held:
        """Return where the formula is to be evaluated.

        Raises
        ------
        MethodError
            Something is no number above zero, is missing, or is outside and not to be moved; all together.
        """
        minutes = np.array(minutes, dtype=float, ndmin=1)
        within = self._durations(minutes)
        areas = self._areas(area, within)
        aep = self._probability(frequency) if self.uses_frequency else None
        self._problems.raise_as(MethodError)
        return Held(areas=areas, minutes=within, aep=aep, sentences=tuple(self._sentences))

    def _add(self, what: str, found: str, expected: str, remedy: str = "") -> None:
        self._problems.add(
            item=f"[design.areal_reduction] {self.name}, {what}", found=found, expected=expected, remedy=remedy
        )

    def _outside(self, what: str, found: str, expected: str, moved: dict[str, str]) -> None:
        if self.clamp:
            for values, end in moved.items():
                self._sentences.append(
                    f"{self.title}: the factor of {values} is that of {end}, the nearest end of the method's range"
                    f" ({expected})."
                )
        else:
            self._add(what, found, expected, 'outside = "clamp" takes the factor of the range\'s nearest end')

    def _durations(self, minutes: Floats) -> Floats:
        """Return durations within the range; those that are no durations are left out, and told."""
        durations = np.isfinite(minutes) & (minutes > 0)
        if not durations.all():
            wrong = joined([f"{value:g} min" for value in minutes[~durations]])
            self._add("duration", wrong, "durations above zero")
        minutes = minutes[durations]
        low, high = self.limits.minutes
        sides = ((minutes < low * (1 - TOLERANCE), low), (minutes > high * (1 + TOLERANCE), high))
        moved = [([duration_text(value) for value in minutes[side]], end) for side, end in sides if side.any()]
        if moved:
            self._outside(
                "duration",
                joined([word for words, _ in moved for word in words]),
                self.limits.duration_words(),
                {joined(words): duration_text(end) for words, end in moved},
            )
        return np.clip(minutes, low, high)

    def _areas(self, area: float, minutes: Floats) -> Floats:
        """Return the area at every duration, within the range."""
        if not (np.isfinite(area) and area > 0):
            self._add("area", f"{area / 1e6:g} km²", "an area above zero")
            return np.full(minutes.shape, np.nan)
        unit, smallest = self.limits.area_unit, self.limits.smallest_area
        asked = area_words(area, unit)
        if area < smallest * (1 - TOLERANCE):
            end = area_words(smallest, unit)
            self._outside("area", asked, f"at least {end}", {asked: end})
        largest = self.limits.largest_area(minutes)
        for over in np.unique(largest[area > largest * (1 + TOLERANCE)]):
            found, end = asked, area_words(over, unit)
            if len(self.limits.largest_areas) > 1:
                found += f" at {joined([duration_text(value) for value in np.unique(minutes[largest == over])])}"
            self._outside("area", found, f"at most {end}{self.limits.below_words(over)}", {found: end})
        areas: Floats = np.clip(area, smallest, largest)
        return areas

    def _probability(self, frequency: Frequency | None) -> float:
        """Return the annual exceedance probability, within the range."""
        if frequency is None or frequency.series != ANNUAL_MAXIMUM:
            self._add(
                "frequency",
                "none" if frequency is None else f"{frequency.return_period:g} years of a partial duration series",
                "a frequency of the annual maximum series",
                ""
                if frequency is None
                else "[design.depths] convert = true finds the probability by AEP = 1 - exp(-1/T)",
            )
            return np.nan
        if self.limits.aep is None:
            return frequency.aep
        low, high = self.limits.aep
        aep = frequency.aep
        if not low * (1 - TOLERANCE) <= aep <= high * (1 + TOLERANCE):
            asked, end = f"AEP {aep:.6g}", f"AEP {low if aep < low else high:g}"
            self._outside("frequency", asked, f"AEP {low:g} to {high:g}", {asked: end})
        return min(max(aep, low), high)
