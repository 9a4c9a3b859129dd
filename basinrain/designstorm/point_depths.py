"""Depths by duration and frequency, tabulated for points or for areas."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import SERIES, Frequency
from basinrain.designstorm.measures import depth_words, duration_text
from basinrain.designstorm.reach import SLACK, bracket, check_reach, refuse_unphysical
from basinrain.errors import DataError, JobError, Problems

__all__ = ["PointDepths", "report_faults"]

Floats = npt.NDArray[np.float64]
_Place = tuple[int, ...]

_LISTED: Final = 50


@dataclass(frozen=True, eq=False, kw_only=True)
class PointDepths:
    """A depth-duration-frequency table of one point or several, which is a source of depths.

    Parameters
    ----------
    points : tuple of str
        Ids of the points, or of the areas where ``areal``; all different.
    durations : array of float, shape (n_durations,)
        Minutes, rising.
    return_periods : array of float, shape (n_frequencies,)
        Years, rising, counted in ``series``.
    depth : array of float, shape (n_points, n_durations, n_frequencies)
        mm, above 0; no NaN.
    series : str
        One of :data:`~basinrain.designstorm.exceedance.SERIES`.
    source, date : str
        Where the depths come from, and of when they are; not blank.
    areal : bool
        Whether the depths are of areas already, so that none may be reduced again.
    positions : array of float, shape (n_points, 2), optional
        x (or longitude) and y (or latitude) in ``crs``; both NaN where a point has none.
    crs : str
        The positions' coordinate system; needed where there are positions.

    Raises
    ------
    DataError
        All of: shapes that do not fit, ids that are blank or repeated, durations or return periods that are not rising
        or cannot be, gaps, depths not above 0, depths that fall with duration or with rarity, intensities that rise
        with duration.

    Notes
    -----
    Between the durations of the table the logarithm of depth is linear in the logarithm of duration, between its
    frequencies depth is linear in the Gumbel reduced variate -ln(-ln(1 - AEP)) (common practice). Depths that grow in
    the table so grow between its entries too.

    Examples
    --------
    >>> table = PointDepths(
    ...     points=("Quill",),
    ...     durations=np.array([60.0, 240.0]),
    ...     return_periods=np.array([2.0, 10.0]),
    ...     depth=np.array([[[32.0, 48.0], [60.0, 90.0]]]),
    ...     series="annual-maximum",
    ...     source="invented",
    ...     date="2031",
    ... )
    >>> five = Frequency(5.0, "annual-maximum")
    >>> table.at(np.array([60.0, 120.0, 240.0]), five).round(2)
    array([[41.63, 57.  , 78.05]])
    >>> table.at(np.array([30.0]), five)
    Traceback (most recent call last):
        ...
    basinrain.errors.MethodError: duration 30 min: found that the depths are of 1 h to 4 h; expected a duration within \
them; give depths for it, or allow it with extrapolate = true
    >>> table.at(np.array([30.0]), five, extrapolate=True).round(2)
    array([[30.4]])
    """

    points: tuple[str, ...]
    durations: Floats
    return_periods: Floats
    depth: Floats
    series: str
    source: str
    date: str
    areal: bool = False
    positions: Floats = field(default_factory=lambda: np.empty((0, 2)))
    crs: str = ""

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "points", tuple(self.points))
        for name in ("durations", "return_periods", "depth", "positions"):
            value = np.array(getattr(self, name), dtype=np.float64)
            # An empty array says "not given".
            if name == "positions" and not value.size:
                value = np.full((len(self.points), 2), np.nan)
            value.setflags(write=False)
            put(self, name, value)
        problems = Problems()
        self._check_shapes(problems)
        problems.raise_as(DataError)
        self._check_axes(problems)
        problems.raise_as(DataError)
        report_faults(self.points, self.durations, self.frequencies, self.depth, problems)
        problems.raise_as(DataError)

    def _check_shapes(self, problems: Problems) -> None:
        sizes = (len(self.points), self.durations.size, self.return_periods.size)
        for what, size in zip(("points", "durations", "return periods"), sizes, strict=True):
            if not size:
                problems.add(item="the table of depths", found=f"no {what}", expected="one at least")
        for name, shape in (("durations", sizes[1:2]), ("return_periods", sizes[2:]), ("depth", sizes)):
            if (found := getattr(self, name).shape) != shape:
                problems.add(item=f"the table's {name}", found=f"an array of shape {found}", expected=f"{shape}")
        if self.positions.shape != (sizes[0], 2):
            problems.add(
                item="the points' positions",
                found=f"an array of shape {self.positions.shape}",
                expected=f"{(sizes[0], 2)}",
            )

    def _check_axes(self, problems: Problems) -> None:
        problems.check_known("series", self.series, SERIES)
        for years in self.return_periods if self.series in SERIES else ():
            try:
                Frequency(float(years), self.series)
            except JobError as error:
                problems.extend(error)
        for name in ("source", "date"):
            if not getattr(self, name).strip():
                problems.add(item=name, found="nothing", expected=f"the {name} of the depths")
        _check_ids(self.points, problems)
        for minutes in self.durations[~(np.isfinite(self.durations) & (self.durations > 0))]:
            problems.add(item="a duration", found=f"{minutes:g} minutes", expected="more than 0 and finite")
        for what, axis, unit in (
            ("duration", self.durations, "minutes"),
            ("return period", self.return_periods, "years"),
        ):
            for place in np.flatnonzero(np.diff(axis) <= 0):
                problems.add(
                    item=f"{what}s",
                    found=f"{axis[place + 1]:g} {unit} after {axis[place]:g}",
                    expected="each once, rising",
                )
        known = np.isfinite(self.positions)
        for place in np.flatnonzero(~(known.all(axis=1) | np.isnan(self.positions).all(axis=1))):
            x, y = self.positions[place]
            problems.add(
                item=f"point {self.points[place]}", found=f"position ({x:g}, {y:g})", expected="two coordinates or none"
            )
        if known.any() and not self.crs:
            problems.add(item="the points' positions", found="no CRS", expected="their coordinate reference system")

    @cached_property
    def frequencies(self) -> tuple[Frequency, ...]:
        """The frequencies of the table, the most frequent first."""
        return tuple(Frequency(float(years), self.series) for years in self.return_periods)

    @cached_property
    def _variates(self) -> Floats:
        return np.array([frequency.variate for frequency in self.frequencies])

    @property
    def shortest(self) -> float:
        """The shortest duration of the table, minutes."""
        return float(self.durations[0])

    @property
    def longest(self) -> float:
        """The longest duration of the table, minutes."""
        return float(self.durations[-1])

    def at(self, minutes: Floats, frequency: Frequency, *, extrapolate: bool = False) -> Floats:
        """Return depths of durations at one frequency.

        Parameters
        ----------
        minutes : array of float, shape (n,)
            Durations, in any order.
        frequency
            Counted in the table's series.
        extrapolate
            Whether to go on along the last segments beyond the table's ends.

        Returns
        -------
        array of float, shape (n_points, n)
            mm; of an entry of the table, that entry.

        Raises
        ------
        MethodError
            A duration or the frequency lies outside the table and ``extrapolate`` is false; the frequency is counted in
            another series; going on gives a depth that is not above 0 or falls with duration, or an intensity that
            rises.
        """
        minutes = np.atleast_1d(np.asarray(minutes, dtype=np.float64))
        outside = check_reach(
            minutes, frequency, durations=self.durations, frequencies=self.frequencies, extrapolate=extrapolate
        )
        below, above, share = (v[0] for v in bracket(self._variates, np.array([frequency.variate])))
        rows = self.depth[:, :, below] * (1 - share) + self.depth[:, :, above] * share
        if outside:
            refuse_unphysical(rows, self.durations, self.points, frequency)
        below, above, share = bracket(np.log(self.durations), np.log(minutes))
        # Powers of 0 and 1 are exact: an entry of the table comes back to the last digit.
        between: Floats = rows[:, below] ** (1 - share) * rows[:, above] ** share
        return between


def _check_ids(points: Sequence[str], problems: Problems) -> None:
    seen: set[str] = set()
    for point in points:
        if not point.strip():
            problems.add(item="a point", found="a blank id", expected="an id for every point")
        elif point in seen:
            problems.add(item=f"point {point}", found="the id twice", expected="each point once")
        seen.add(point)


def report_faults(
    points: Sequence[str],
    durations: Floats,
    frequencies: Sequence[Frequency],
    depth: Floats,
    problems: Problems,
    *,
    unit: str = "mm",
    lines: npt.NDArray[np.int64] | None = None,
    gaps: bool = True,
) -> None:
    """Report the entries of a table of depths that cannot be.

    Parameters
    ----------
    points, durations, frequencies
        Its axes: ids, minutes, frequencies; the last two rising.
    depth : array of float, shape (n_points, n_durations, n_frequencies)
        mm; NaN is a gap.
    problems
        Takes gaps, depths not above 0, depths that fall with duration or with rarity, intensities that rise with
        duration. Neighbours of the table are compared; a gap or a depth that is not above 0 with nothing.
    unit
        In which depths are shown.
    lines : array of int, shape as ``depth``, optional
        The line of the file on which every entry stands, 0 for none; a gap with a line has been reported already.
    gaps
        Whether to report gaps.

    Examples
    --------
    >>> problems = Problems(file="depths.csv")
    >>> frequencies = [Frequency(10.0, "annual-maximum")]
    >>> depth = np.array([[[20.0], [18.0], [60.0]]])
    >>> report_faults(["Quill"], np.array([30.0, 60.0, 120.0]), frequencies, depth, problems)
    >>> problems.raise_as(DataError)
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: depths.csv: point Quill, 1 h, AEP 0.1 (1 in 10): found 18 mm (18 mm/h), less than 20 \
mm (40 mm/h) of 30 min; expected a depth that does not fall with duration; correct one of them
    depths.csv: point Quill, 2 h, AEP 0.1 (1 in 10): found 60 mm (30 mm/h), more intense than 18 mm (18 mm/h) of 1 h; \
expected an intensity that does not rise with duration; correct one of them
    """
    table = _Entries(points, durations, frequencies, depth, problems, unit, lines)
    if gaps:
        absent = np.isnan(depth) if lines is None else np.isnan(depth) & (lines == 0)
        table.report(absent, lambda _: "no depth", "a depth for every duration and frequency of a point", "add it")
    sound = np.isfinite(depth) & (depth > 0)
    table.report(~sound & ~np.isnan(depth), table.value, "a depth above 0", "correct it")
    known = np.where(sound, depth, np.nan)
    rate = known / durations[:, None]
    for axis, falling, than, expected in (
        (1, known, "less than", "a depth that does not fall with duration"),
        (2, known, "less than", "a depth that does not fall with rarity"),
        (1, -rate, "more intense than", "an intensity that does not rise with duration"),
    ):
        table.report(_falls(falling, axis), table.beside(than, axis), expected, "correct one of them")


def _falls(values: Floats, axis: int) -> npt.NDArray[np.bool_]:
    """Return where a value is less, by more than rounding, than the one before it along an axis."""
    before, after = (np.moveaxis(values, axis, 0)[part] for part in (slice(None, -1), slice(1, None)))
    falls = np.zeros(values.shape, dtype=bool)
    np.moveaxis(falls, axis, 0)[1:] = after < before - SLACK * np.abs(before)
    return falls


@dataclass(frozen=True, eq=False)
class _Entries:
    """A table of depths whose entries are reported in words, by their places on its three axes."""

    points: Sequence[str]
    durations: Floats
    frequencies: Sequence[Frequency]
    depth: Floats
    problems: Problems
    unit: str
    lines: npt.NDArray[np.int64] | None

    def value(self, place: _Place) -> str:
        return depth_words(self.depth[place], self.durations[place[1]], self.unit)

    def beside(self, than: str, axis: int) -> Callable[[_Place], str]:
        """Return what says an entry's value beside that of the one before it along an axis."""

        def words(place: _Place) -> str:
            other = tuple(index - (k == axis) for k, index in enumerate(place))
            whose = duration_text(self.durations[other[1]]) if axis == 1 else self.frequencies[other[2]].label
            where = f" (line {self.lines[other]})" if self.lines is not None else ""
            return f"{self.value(place)}, {than} {self.value(other)} of {whose}{where}"

        return words

    def report(self, wrong: npt.NDArray[np.bool_], found: Callable[[_Place], str], expected: str, remedy: str) -> None:
        places = np.argwhere(wrong)
        for row in places[:_LISTED]:
            place = p, d, t = tuple(row.tolist())
            self.problems.add(
                item=f"point {self.points[p]}, {duration_text(self.durations[d])}, {self.frequencies[t].label}",
                found=found(place),
                expected=expected,
                remedy=remedy,
                line=int(self.lines[place]) if self.lines is not None and self.lines[place] else None,
            )
        # Sentences for a million entries of a wrong table would take longer than reading it.
        if len(places) > _LISTED:
            self.problems.extend(DataError((), unlisted=len(places) - _LISTED))
