"""The four 24-hour distributions of the Natural Resources Conservation Service."""

from __future__ import annotations

from functools import partial
from typing import Final

from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.patterns.cumulative import fall_by, step_problems
from basinrain.designstorm.patterns.ordinates import published_ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.errors import MethodError

__all__ = ["NRCS", "NRCS_TYPES", "nrcs"]

NRCS_TYPES: Final = ("I", "IA", "II", "III")
"""The types, as they are published."""

_DAY: Final = 1440

_SPACING: Final = {"I": 6, "IA": 30, "II": 6, "III": 6}
"""Minutes between the ordinates of each type."""


def nrcs(case: PatternCase, *, kind: str) -> Shaped:
    """Return the hyetograph of a 24-hour depth by an NRCS distribution.

    Parameters
    ----------
    case
        The depth that is to fall; its duration must be 24 hours.
    kind
        One of :data:`NRCS_TYPES`.

    Returns
    -------
    Shaped
        With a remark where the step is shorter than the spacing of the ordinates: their increments are then equal over
        several steps, and the peak is no higher than over that spacing.

    Raises
    ------
    MethodError
        The duration is not 24 hours; the step does not divide it; both together.

    Notes
    -----
    Types I, II and III have an ordinate every 0.1 h, type IA one every 0.5 h; between them the curve is straight. The
    greatest depths by duration of type II are those of NRCS National Engineering Handbook, part 630, chapter 4, figure
    4-31. Of type II an older and coarser curve is also in use, with 0.357 at 11.75 h where this one has 0.3926; the two
    are never mixed here. Type III is symmetric only to 0.001.

    Examples
    --------
    Of 100 mm by type II, 42.8 mm fall in the hour before noon and 10.9 mm in the hour after it.

    >>> def curve(minutes):
    ...     return 100 * (minutes / 1440) ** 0.3
    >>> case = PatternCase(minutes=1440, step=60, total=100.0, curve=curve, curve_by_duration=curve, area=5e6)
    >>> nrcs(case, kind="II").depth[10:14].round(2)
    array([ 5.4, 42.8, 10.9,  4.8])
    """
    problems = step_problems(case)
    if case.minutes != _DAY:
        problems.add(
            item=f"pattern nrcs-type-{kind.lower()}",
            found=f"a duration of {duration_text(case.minutes)}",
            expected="24 h, the only duration that it is published for",
            remedy='give the pattern durations = ["24h"], or choose another one',
        )
    problems.raise_as(MethodError)
    spacing = _SPACING[kind]
    depth = fall_by(published_ordinates(f"nrcs_{spacing}min", f"type_{kind}").at, case)
    if case.step >= spacing:
        return Shaped(depth)
    remark = (
        f"The ordinates of NRCS type {kind} are {spacing} minutes apart, so that steps of {case.step} min between "
        f"two of them get equal depths, and the greatest intensity is that of {spacing} minutes."
    )
    return Shaped(depth, (remark,))


NRCS: Final = tuple(
    Pattern(
        name=f"nrcs-type-{kind.lower()}",
        title=f"NRCS 24-hour type {kind}",
        shape=partial(nrcs, kind=kind),
        source=f"NRCS 24-hour rainfall distributions, ordinates every {_SPACING[kind] / 60:g} h",
        evidence="The ordinates were seen in two public copies that agree digit for digit.",
    )
    for kind in NRCS_TYPES
)
"""A pattern for each type."""
