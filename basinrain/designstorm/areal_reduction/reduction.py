"""What a method of areal reduction is, and how its range is held."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.areal_reduction.holding import Held, Holder
from basinrain.designstorm.areal_reduction.limits import Limits, area_words
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.errors import JobError, MethodError, Problems, unknown

__all__ = ["OUTSIDE", "ArealReduction", "Reduced"]

Floats = npt.NDArray[np.float64]

OUTSIDE: Final = ("refuse", "clamp")
"""What may be done with what lies outside a method's range: refuse it, or take the factor of the nearest end."""


def _no_remarks(**_: object) -> tuple[str, ...]:
    return ()


@dataclass(frozen=True, eq=False)
class Reduced:
    """Areal reduction factors of one area, by duration.

    Parameters
    ----------
    factor : array of float, shape (n_durations,)
        Above 0 and at most 1.
    clamped : tuple of str
        A sentence for everything that was outside the range and taken at its nearest end.
    remarks : tuple of str
        Whole sentences on what a reader must know of the factors.
    """

    factor: Floats
    clamped: tuple[str, ...] = ()
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False, kw_only=True)
class ArealReduction:
    """A method of areal reduction, as the registry has it.

    Parameters
    ----------
    name
        As a job says it.
    title
        As a report says it.
    jurisdiction
        Words, in lower case, by which a job may name the region that the method is for; empty for a user's own factors.
    region_words
        That region, as a heading says it.
    factor
        ``factor(area, minutes, **options)`` gives the factors of areas in m² and durations in minutes, arrays that
        broadcast, by the formula alone: :meth:`reduce` holds the range. With ``aep`` where ``uses_frequency``.
    limits
        ``limits(**options)`` gives the range; it also refuses an option that cannot be.
    uses_frequency
        Whether the factor depends on the annual exceedance probability.
    options
        Names of the keyword arguments that ``factor`` and ``limits`` take; all must be given.
    remarks
        ``remarks(**options)`` gives sentences on the factors; with ``aep`` where ``uses_frequency``.
    falls_with_area
        Whether it promises that a larger area never has a greater factor.
    rises_with_duration
        Whether it promises that a longer duration never has a smaller factor.
    source
        Where it is published.
    evidence
        Where the formula is not from a text that was seen, that is said; else empty.

    Examples
    --------
    A method is one function, its range and one line in :data:`basinrain.designstorm.areal_reduction.REDUCTIONS`:

    >>> halved = ArealReduction(
    ...     name="halved",
    ...     title="Half of it",
    ...     jurisdiction=(),
    ...     region_words="anywhere",
    ...     factor=lambda area, minutes: np.full(np.broadcast(area, minutes).shape, 0.5),
    ...     limits=lambda: Limits(minutes=(60, 1440)),
    ...     source="this example",
    ... )
    >>> halved.reduce(1e8, np.array([60.0, 360.0])).factor
    array([0.5, 0.5])
    >>> halved.reduce(1e8, np.array([30.0, 360.0, 2880.0]))
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: [design.areal_reduction] halved, duration: found 30 min and 48 h; expected 1 to 24 h\
; outside = "clamp" takes the factor of the range's nearest end
    >>> halved.reduce(1e8, np.array([30.0]), outside="clamp").clamped
    ("Half of it: the factor of 30 min is that of 1 h, the nearest end of the method's range (1 to 24 h).",)
    """

    name: str
    title: str
    jurisdiction: tuple[str, ...]
    region_words: str
    factor: Callable[..., Floats]
    limits: Callable[..., Limits]
    uses_frequency: bool = False
    options: tuple[str, ...] = ()
    remarks: Callable[..., tuple[str, ...]] = _no_remarks
    falls_with_area: bool = False
    rises_with_duration: bool = False
    source: str
    evidence: str = ""

    def check_options(self, options: Mapping[str, Any]) -> Limits:
        """Return the range with these options, or refuse them.

        Raises
        ------
        JobError
            One is not an option of the method, is missing, or cannot be.
        """
        problems = Problems()
        for option in options:
            if option not in self.options:
                problems.add(
                    item=f"[design.areal_reduction] {option}",
                    found=f"it beside method = '{self.name}'",
                    expected="the method's options: " + ", ".join(self.options) if self.options else "no options",
                    remedy="remove it",
                )
        for option in self.options:
            if option not in options:
                problems.add(
                    item=f"[design.areal_reduction] {option}", found="none", expected=f"one: '{self.name}' needs it"
                )
        problems.raise_as(JobError)
        return self.limits(**options)

    def reduce(
        self,
        area: float,
        minutes: Floats,
        frequency: Frequency | None = None,
        *,
        outside: str = "refuse",
        **options: Any,  # noqa: ANN401 - every method has options of its own types
    ) -> Reduced:
        """Return the factors of an area for durations at one frequency.

        Parameters
        ----------
        area : float
            m².
        minutes : array of float, shape (n_durations,)
            Durations in minutes, in any order.
        frequency : Frequency, optional
            Of the annual maximum series, for a method that uses it; others take no notice of it.
        outside : {"refuse", "clamp"}
            What to do with an area, a duration or a probability outside the range.
        **options
            All of the method's ``options``.

        Returns
        -------
        Reduced
            Its factors have shape (n_durations,), without NaN.

        Raises
        ------
        JobError
            ``outside`` or an option cannot be.
        MethodError
            The area or a duration is not a number above zero; something is outside the range and shall be refused; the
            frequency is missing or of a partial duration series; the formula has no factor above 0 and at most 1
            there. All such problems together.
        """
        if outside not in OUTSIDE:
            raise JobError(unknown("[design.areal_reduction] outside", outside, OUTSIDE))
        holder = Holder(
            name=self.name,
            title=self.title,
            limits=self.check_options(options),
            uses_frequency=self.uses_frequency,
            clamp=outside == "clamp",
        )
        held = holder.hold(area, minutes, frequency)
        of_frequency = {} if held.aep is None else {"aep": held.aep}
        factor = np.asarray(self.factor(held.areas, held.minutes, **of_frequency, **options), dtype=float)
        self._check_factors(factor, held)
        return Reduced(factor, held.sentences, self.remarks(**of_frequency, **options))

    def _check_factors(self, factor: Floats, held: Held) -> None:
        """Refuse what is no factor: a formula beyond where it holds, a gap of a table."""
        problems = Problems()
        for wrong in np.flatnonzero(~((factor > 0) & (factor <= 1))):
            value = float(factor[wrong])
            problems.add(
                item=f"[design.areal_reduction] {self.name}",
                found=f"{'no factor' if np.isnan(value) else f'a factor of {value:.4g}'} for"
                f" {area_words(held.areas[wrong])} at {duration_text(held.minutes[wrong])}",
                expected="a factor above 0 and at most 1",
                remedy="ask for a duration or an area that the method can answer, or take another method",
            )
        problems.raise_as(MethodError)
