"""The nested storm: at every duration the greatest depth is that of this duration with its own areal reduction."""

from __future__ import annotations

from typing import Final

from basinrain.designstorm.patterns.alternating_block import blocks
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.designstorm.patterns.peak import CENTRE

__all__ = ["NESTED", "nested"]

_NAME: Final = "nested"


def nested(case: PatternCase, *, peak: str | float = CENTRE, smooth: bool = False) -> Shaped:
    """Return the nested hyetograph, also called balanced.

    The same arrangement as :func:`~basinrain.designstorm.patterns.alternating_block.alternating_block`, of depths that
    each have the areal reduction of their own duration. For every whole number of steps the greatest depth in the
    hyetograph is the reduced depth of that duration.

    Parameters
    ----------
    case
        The depth and its curve ``curve_by_duration``.
    peak
        ``"early"``, ``"centre"``, ``"late"``, or the fraction of the duration before the peak.
    smooth
        Whether increments that rise with duration may be evened out, see
        :func:`~basinrain.designstorm.patterns.increments.falling_increments`. Where they are, the greatest depths are
        nowhere below the curve, and above it in the durations that the remark names.

    Returns
    -------
    Shaped

    Raises
    ------
    JobError
        ``peak`` is no such word or number.
    MethodError
        The step does not divide the duration; the curve has no depth for a duration; increments rise with duration, or
        the reduced depth falls.

    Notes
    -----
    Common practice; the nesting of the depths of all durations in one storm is that of NRCS, National Engineering
    Handbook, part 630, chapter 4. Areal reduction is the weaker the longer the duration, which lowers short durations
    more than long ones and may make increments rise; the storm then has no such hyetograph, and is refused.

    Examples
    --------
    Short durations are reduced more: the peak is lower than in the alternating block, and the total the same.

    >>> def curve(minutes):
    ...     return 10 * minutes**0.5
    >>> def reduced(minutes):
    ...     return 10 * minutes**0.5 * (minutes / 60) ** 0.1
    >>> case = PatternCase(minutes=60, step=10, total=10 * 60**0.5, curve=curve, curve_by_duration=reduced, area=1e8)
    >>> nested(case).depth.round(1)
    array([ 8.7, 11. , 26.4, 13.6,  9.6,  8. ])
    """
    return blocks(case, case.curve_by_duration, shape=_NAME, peak=peak, smooth=smooth)


NESTED: Final = Pattern(
    name=_NAME,
    title="Nested (balanced)",
    shape=nested,
    options=("peak", "smooth"),
    by_curve=True,
    source="Common practice; NRCS, National Engineering Handbook, part 630, chapter 4, nests depths of all durations",
    evidence="The rule was seen in a public copy of NRCS material.",
)
