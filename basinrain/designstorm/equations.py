"""Depths by duration and frequency from an intensity equation."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import SERIES, Frequency
from basinrain.designstorm.measures import DURATION_UNITS, INTENSITY_UNITS, depth_words, duration_text, in_mm
from basinrain.designstorm.reach import SLACK, bracket, check_reach, refuse_unphysical
from basinrain.errors import JobError, Problems, nearest_name

__all__ = ["EQUATIONS", "Equation", "EquationDepths"]

Floats = npt.NDArray[np.float64]
Coefficients = Mapping[str, float]

_POWER: Final = "x"
_GRID: Final = 400
"""Durations, even in their logarithm, at which curves of two return periods are compared."""


@dataclass(frozen=True, kw_only=True)
class Equation:
    """A form of intensity equation: a numerator over a function of duration.

    Parameters
    ----------
    name
        As a job says it.
    formula
        As a report says it.
    coefficients
        Names of the coefficients, the numerator's first.
    power
        Whether the numerator may be multiplied by the return period, in years, to the power of a coefficient ``x``.
    denominator
        Its values at durations, in the equation's unit of time.
    steepness
        By how many per cent intensity falls where duration grows by one: -d(ln i)/d(ln t). Monotone in duration.
    source
        Where it is published.
    """

    name: str
    formula: str
    coefficients: tuple[str, ...]
    power: bool
    denominator: Callable[[Floats, Coefficients], Floats]
    steepness: Callable[[Floats, Coefficients], Floats]
    source: str


EQUATIONS: Final[Mapping[str, Equation]] = MappingProxyType(
    {
        equation.name: equation
        for equation in (
            Equation(
                name="bernard",
                formula="i = k T^x / t^n",
                coefficients=("k", "n"),
                power=True,
                denominator=lambda t, c: t ** c["n"],
                steepness=lambda t, c: np.full(t.shape, c["n"]),
                source="Bernard, M. M. (1932): Formulas for rainfall intensities of long duration, Transactions of the "
                "American Society of Civil Engineers, 96",
            ),
            Equation(
                name="general",
                formula="i = c / (t^e + f)",
                coefficients=("c", "e", "f"),
                power=False,
                denominator=lambda t, c: t ** c["e"] + c["f"],
                steepness=lambda t, c: c["e"] * t ** c["e"] / (t ** c["e"] + c["f"]),
                source="Wenzel, H. G. (1982): Rainfall for urban stormwater design, American Geophysical Union, Water "
                "Resources Monograph 7",
            ),
            Equation(
                name="sherman",
                formula="i = k T^x / (t + b)^n",
                coefficients=("k", "b", "n"),
                power=True,
                denominator=lambda t, c: np.sign(t + c["b"]) * np.abs(t + c["b"]) ** c["n"],
                steepness=lambda t, c: c["n"] * t / (t + c["b"]),
                source="Sherman, C. W. (1931): Frequency and intensity of excessive rainfalls at Boston, "
                "Massachusetts, Transactions of the American Society of Civil Engineers, 95",
            ),
            Equation(
                name="talbot",
                formula="i = a / (t + b)",
                coefficients=("a", "b"),
                power=False,
                denominator=lambda t, c: t + c["b"],
                steepness=lambda t, c: t / (t + c["b"]),
                source="Talbot's formula (common practice)",
            ),
        )
    }
)
"""The equations, by the name that a job gives."""


@dataclass(frozen=True, eq=False, kw_only=True)
class EquationDepths:
    """Depths of one point by an intensity equation, which is a source of depths.

    Parameters
    ----------
    point : str
        Its id.
    equation : str
        One of :data:`EQUATIONS`.
    coefficients : tuple of mapping
        With an ``x`` ("bernard" and "sherman"): one set, for all return periods. Else one set a return period.
    return_periods : array of float, shape (n,)
        Years, rising, counted in ``series``. With an ``x`` the first and the last bound the equation's validity.
    valid : tuple of float
        The shortest and the longest duration for which the coefficients are valid, minutes.
    unit : str
        Of the equation's intensity, one of :data:`~basinrain.designstorm.measures.INTENSITY_UNITS`.
    duration_unit : str
        Of the equation's duration, one of :data:`~basinrain.designstorm.measures.DURATION_UNITS`.
    series : str
        One of :data:`~basinrain.designstorm.exceedance.SERIES`.
    source, date : str
        Where the coefficients come from, and of when they are; not blank.

    Raises
    ------
    JobError
        All of: names, units or ranges that are not known or cannot be; coefficients that are missing, not known or not
        finite. Then all of: coefficients by which, within the validity, intensity is not above 0 or rises with
        duration, or depth falls with duration or rarity; it is said where.

    Notes
    -----
    Between return periods that have a set each, depth is linear in the Gumbel reduced variate. Beyond the validity,
    when asked, the equation goes on, and so does the last segment between two sets.

    Examples
    --------
    >>> denver = EquationDepths(
    ...     point="Denver",
    ...     equation="general",
    ...     coefficients=({"c": 96.6, "e": 0.97, "f": 13.9},),
    ...     return_periods=np.array([10.0]),
    ...     valid=(5.0, 120.0),
    ...     unit="in/h",
    ...     duration_unit="min",
    ...     series="annual-maximum",
    ...     source="Wenzel (1982), from memory",
    ...     date="1982",
    ... )
    >>> depth = denver.at(np.array([20.0]), Frequency(10.0, "annual-maximum"))
    >>> (depth / 25.4 * 3).round(4)  # in/h
    array([[3.0018]])
    """

    point: str
    equation: str
    coefficients: tuple[Coefficients, ...]
    return_periods: Floats
    valid: tuple[float, float]
    unit: str
    duration_unit: str
    series: str
    source: str
    date: str

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "coefficients", tuple(dict(one) for one in self.coefficients))
        periods = np.array(self.return_periods, dtype=np.float64)
        periods.setflags(write=False)
        put(self, "return_periods", periods)
        put(self, "valid", tuple(float(minutes) for minutes in self.valid))
        problems = Problems()
        self._check_choices(problems)
        problems.raise_as(JobError)
        self._check_periods(problems)
        problems.raise_as(JobError)
        for one in range(len(self.coefficients)):
            self._check_names(one, problems)
        problems.raise_as(JobError)
        for one in range(len(self.coefficients)):
            self._check_shape(one, problems)
        problems.raise_as(JobError)
        self._check_rarity(problems)
        problems.raise_as(JobError)

    def _check_choices(self, problems: Problems) -> None:
        for key, value, known in (
            ("equation", self.equation, tuple(EQUATIONS)),
            ("unit", self.unit, INTENSITY_UNITS),
            ("duration_unit", self.duration_unit, tuple(DURATION_UNITS)),
            ("series", self.series, SERIES),
        ):
            problems.check_known(f"[design.depths] {key}", value, known)
        for key in ("point", "source", "date"):
            if not getattr(self, key).strip():
                problems.add(item=f"[design.depths] {key}", found="nothing", expected=f"the {key} of the depths")
        if not 0 < self.valid[0] < self.valid[1] < np.inf:
            problems.add(
                item="[design.depths] valid",
                found=" to ".join(f"{minutes:g}" for minutes in self.valid) + " minutes",
                expected="the shortest and the longest valid duration, above 0 and rising",
            )

    def _check_periods(self, problems: Problems) -> None:
        for years in self.return_periods:
            try:
                Frequency(float(years), self.series)
            except JobError as error:
                problems.extend(error)
        for place in np.flatnonzero(np.diff(self.return_periods) <= 0):
            problems.add(
                item="return periods",
                found=f"{self.return_periods[place + 1]:g} years after {self.return_periods[place]:g}",
                expected="each once, rising",
            )
        if not self.return_periods.size:
            problems.add(item="return periods", found="none", expected="those for which the coefficients are valid")
        powers = sum(_POWER in one for one in self.coefficients)
        wanted = 1 if powers else len(self.return_periods)
        if len(self.coefficients) != wanted:
            problems.add(
                item="[design.depths] coefficients",
                found=f"{len(self.coefficients)} set{'' if len(self.coefficients) == 1 else 's'}",
                expected=f"one set, since it has {_POWER}"
                if powers
                else f"{wanted}, one a return period"
                + (f", or one set with {_POWER}" if EQUATIONS[self.equation].power else ""),
            )

    def _item(self, one: int, name: str = "") -> str:
        whose = f" of {self.frequencies[one].label}" if len(self.coefficients) > 1 else ""
        return f"[design.depths] coefficients{'.' if name else ''}{name}{whose}"

    def _check_names(self, one: int, problems: Problems) -> None:
        given, form = self.coefficients[one], EQUATIONS[self.equation]
        known = (*form.coefficients, _POWER) if form.power else form.coefficients
        for name in form.coefficients:
            if name not in given:
                problems.add(
                    item=self._item(one, name), found="nothing", expected=f"the coefficient {name} of {form.formula}"
                )
        for name, value in given.items():
            if name not in known:
                problems.add(
                    item=self._item(one, name),
                    found="that the equation does not have it",
                    expected=form.formula,
                    remedy=nearest_name(name, known),
                )
            elif not np.isfinite(value) or (name == form.coefficients[0] and value <= 0):
                finite = "a number above 0" if name == form.coefficients[0] else "a finite number"
                problems.add(item=self._item(one, name), found=f"{value:g}", expected=finite)

    def _check_shape(self, one: int, problems: Problems) -> None:
        """Depth must grow and intensity fall; how steeply intensity falls is monotone, so the ends decide."""
        form, given = EQUATIONS[self.equation], self.coefficients[one]
        ends = np.array(self.valid)
        with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
            depth = self._depth(one, ends)
        sound = np.isfinite(depth) & (depth > 0)
        if not sound.all():
            problems.add(
                item=self._item(one),
                found=f"that {form.formula} has no value above 0 at {duration_text(ends[int(sound[0])])}",
                expected="intensities above 0 at every valid duration",
                remedy="correct the coefficients, or narrow valid",
            )
            return
        between = np.geomspace(*self.valid, _GRID)
        steepness = form.steepness(self._time(between), given)
        for wrong, found in (
            (steepness > 1 + SLACK, "depth falls with duration"),
            (steepness < -SLACK, "intensity rises with duration"),
        ):
            if wrong.any():
                first, last = (duration_text(float(f"{between[wrong][k]:.3g}")) for k in (0, -1))
                problems.add(
                    item=self._item(one),
                    found=f"that by {form.formula} {found} from {first} to {last}",
                    expected="depth that grows and intensity that falls at every valid duration",
                    remedy="correct the coefficients, or narrow valid",
                )

    def _check_rarity(self, problems: Problems) -> None:
        if len(self.coefficients) == 1:
            power = self.coefficients[0].get(_POWER, 0.0)
            with np.errstate(over="ignore"):
                finite = np.isfinite(self.return_periods[-1] ** power)
            if power < 0 or not finite:
                found = f"{power:g}, by which depth " + ("falls with rarity" if power < 0 else "has no bounds")
                problems.add(item=self._item(0, _POWER), found=found, expected="0 or more", remedy="correct it")
            return
        between = np.geomspace(*self.valid, _GRID)
        depth = np.array([self._depth(one, between) for one in range(len(self.coefficients))])
        wrong = depth[1:] < depth[:-1] * (1 - SLACK)
        for one in np.flatnonzero(wrong.any(axis=1)).tolist():
            k = int(wrong[one].argmax())
            minutes = float(between[k])
            problems.add(
                item=self._item(one + 1),
                found=f"{depth_words(depth[one + 1, k], minutes, self.unit)} of {duration_text(minutes)}, less than "
                f"{depth_words(depth[one, k], minutes, self.unit)} of {self.frequencies[one].label}",
                expected="a depth that does not fall with rarity at any valid duration",
                remedy="correct the coefficients, or narrow valid",
            )

    @property
    def points(self) -> tuple[str, ...]:
        """The id of the point."""
        return (self.point,)

    @property
    def areal(self) -> bool:
        """False: equations are of points."""
        return False

    @property
    def shortest(self) -> float:
        """The shortest valid duration, minutes."""
        return self.valid[0]

    @property
    def longest(self) -> float:
        """The longest valid duration, minutes."""
        return self.valid[1]

    @cached_property
    def frequencies(self) -> tuple[Frequency, ...]:
        """The frequencies that have coefficients, or that bound them, the most frequent first."""
        return tuple(Frequency(float(years), self.series) for years in self.return_periods)

    def at(self, minutes: Floats, frequency: Frequency, *, extrapolate: bool = False) -> Floats:
        """Return depths of durations at one frequency.

        Parameters
        ----------
        minutes : array of float, shape (n,)
            Durations, in any order.
        frequency
            Counted in the series of the equation.
        extrapolate
            Whether to go on beyond the validity.

        Returns
        -------
        array of float, shape (1, n)
            mm.

        Raises
        ------
        MethodError
            A duration or the frequency lies outside the validity and ``extrapolate`` is false; the frequency is counted
            in another series; going on gives a depth that is not above 0 or falls with duration, or an intensity that
            rises.
        """
        minutes = np.atleast_1d(np.asarray(minutes, dtype=np.float64))
        power = _POWER in self.coefficients[0]
        outside = check_reach(
            minutes,
            frequency,
            durations=self.valid,
            frequencies=self.frequencies,
            extrapolate=extrapolate,
            fixed_law=power,
        )
        if outside:
            known = np.unique(np.concatenate((minutes, self.valid)))
            with np.errstate(divide="ignore", invalid="ignore"):
                refuse_unphysical(self._between(known, frequency), known, self.points, frequency)
        return self._between(minutes, frequency)

    def _between(self, minutes: Floats, frequency: Frequency) -> Floats:
        if _POWER in self.coefficients[0]:
            growth = np.float64(frequency.return_period) ** self.coefficients[0][_POWER]
            grown: Floats = self._depth(0, minutes)[None] * growth
            return grown
        variates = np.array([known.variate for known in self.frequencies])
        below, above, share = (v[0] for v in bracket(variates, np.array([frequency.variate])))
        depth: Floats = self._depth(below, minutes) * (1 - share) + self._depth(above, minutes) * share
        return depth[None]

    def _time(self, minutes: Floats) -> Floats:
        return minutes / DURATION_UNITS[self.duration_unit]

    def _depth(self, one: int, minutes: Floats) -> Floats:
        """Depths in mm of one set of coefficients, without the power of the return period."""
        form, given = EQUATIONS[self.equation], self.coefficients[one]
        numerator = given[form.coefficients[0]]
        return in_mm(numerator / form.denominator(self._time(minutes), given), minutes, self.unit)
