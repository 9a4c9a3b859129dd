"""The pattern of an observed storm: its dimensionless cumulative curve."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.patterns.cumulative import fall_by
from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.errors import DataError, Problems

__all__ = ["OBSERVED", "by_observed", "ordinates_of"]

_DRY_END: Final = 0.1
"""Share of the time that may be dry at an end without a remark."""


def ordinates_of(depth: npt.NDArray[np.float64], *, step: float | None = None) -> Ordinates:
    """Return the dimensionless cumulative curve of a storm.

    Parameters
    ----------
    depth : array of float, shape (n,)
        mm in each of the equal steps of the storm's window, from its start to its end. Dry steps at the ends belong to
        the window and are kept.
    step
        Minutes, where it is to be told that the storm is stretched or shortened.

    Returns
    -------
    Ordinates
        n + 1 of them; within a step the rain is taken as even.

    Raises
    ------
    DataError
        A step has no depth (NaN), one that is infinite or negative, all of them together; there are no steps; all are
        dry.

    Examples
    --------
    >>> curve = ordinates_of(np.array([1.0, 6.0, 2.0, 1.0]))
    >>> curve.time, curve.share
    (array([0.  , 0.25, 0.5 , 0.75, 1.  ]), array([0. , 0.1, 0.7, 0.9, 1. ]))
    >>> ordinates_of(np.array([1.0, np.nan, 2.0]))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: observed storm, step 2: found no depth; expected a depth of 0 or more; infill it, or \
choose a storm without gaps
    """
    problems = Problems()
    values = np.asarray(depth, dtype=np.float64)
    if values.ndim != 1 or not len(values):
        problems.add(item="observed storm", found=f"depths of shape {values.shape}", expected="one depth a step")
        problems.raise_as(DataError)
    for place in np.flatnonzero(~(np.isfinite(values) & (values >= 0))):
        missing = np.isnan(values[place])
        problems.add(
            item=f"observed storm, step {place + 1}",
            found="no depth" if missing else f"{values[place]:g} mm",
            expected="a depth of 0 or more",
            remedy="infill it, or choose a storm without gaps" if missing else "correct it",
        )
    if not values.any():
        problems.add(
            item="observed storm",
            found=f"no rain in its {len(values)} steps",
            expected="a storm with rain",
            remedy="choose another storm",
        )
    problems.raise_as(DataError)
    fallen = np.concatenate(([0.0], np.cumsum(values)))
    minutes = None if step is None else step * len(values)
    return Ordinates(np.arange(len(fallen)) / len(values), fallen / fallen[-1], minutes)


def by_observed(case: PatternCase, *, ordinates: Ordinates) -> Shaped:
    """Return the hyetograph of a depth that falls as an observed storm did.

    The storm is stretched or shortened to the duration of the case.

    Parameters
    ----------
    case
        The depth that is to fall.
    ordinates
        Of the storm, by :func:`ordinates_of`.

    Returns
    -------
    Shaped
        With remarks: where the storm is stretched or shortened, and on an end that is dry for more than a tenth of the
        time.

    Raises
    ------
    MethodError
        The step does not divide the duration.

    Examples
    --------
    >>> def curve(minutes):
    ...     return 40 * (minutes / 120) ** 0.3
    >>> case = PatternCase(minutes=120, step=60, total=40.0, curve=curve, curve_by_duration=curve, area=5e6)
    >>> shaped = by_observed(case, ordinates=ordinates_of(np.array([0.0, 3.0, 0.5, 0.5])))
    >>> shaped.depth, shaped.remarks
    (array([30., 10.]), ('The first 25 % of the observed storm are dry; they are kept as part of its pattern.',))
    """
    return Shaped(fall_by(ordinates.at, case), tuple(_remarks(ordinates, case.minutes)))


def _remarks(ordinates: Ordinates, minutes: float) -> Iterator[str]:
    own = ordinates.minutes
    if own is not None and own != minutes:
        yield (
            f"The observed storm of {duration_text(own)} is {'shortened' if own > minutes else 'stretched'} to "
            f"{duration_text(minutes)}: equal depths fall in {minutes / own:.3g} times the time that they took."
        )
    wet = np.flatnonzero(np.diff(ordinates.share) > 0)
    before, after = ordinates.time[wet[0]], 1 - ordinates.time[wet[-1] + 1]
    for words, dry in (("first", before), ("last", after)):
        if dry > _DRY_END:
            yield f"The {words} {100 * dry:.0f} % of the observed storm are dry; they are kept as part of its pattern."


OBSERVED: Final = Pattern(
    name="observed",
    title="An observed storm",
    shape=by_observed,
    options=("ordinates",),
    source="the observed storm's own record",
)
"""The pattern, as the registry has it."""
