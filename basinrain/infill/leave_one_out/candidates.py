"""Which infill methods take part in a comparison, in which order, and what tables call them."""

from __future__ import annotations

from dataclasses import replace

from basinrain.infill.leave_one_out.comparison import Candidate
from basinrain.infill.options import InfillOptions
from basinrain.infill.registry import METHODS, InfillMethod

__all__ = ["candidates_of"]

_INVERSE_DISTANCE = "inverse-distance"
_POWERS = (1.0, 2.0)


def candidates_of(options: InfillOptions) -> tuple[Candidate, ...]:
    """Return every registered method as a candidate, from simple to complex.

    Parameters
    ----------
    options
        The job's: its radius and elevation limit, and its scale and longest gap, go to all; ``nearest`` and
        ``min_donors``, where given, to the methods that take them, else each has its own. Inverse distance takes part
        with the powers 1 and 2, and with the job's where that is another.

    Returns
    -------
    tuple of Candidate

    Examples
    --------
    >>> [candidate.label for candidate in candidates_of(InfillOptions(power=3))][:5]
    ['nearest-gauge', 'station-average', 'inverse-distance (power 1)', 'inverse-distance (power 2)', \
'inverse-distance (power 3)']
    """
    return tuple(
        Candidate(label=variant.label, options=variant)
        for method in sorted(METHODS.values(), key=lambda method: method.order)
        for variant in _variants(method, options)
    )


def _variants(method: InfillMethod, options: InfillOptions) -> list[InfillOptions]:
    """Return the job's options with this method, once for each power that takes part."""
    own = options.with_method(method.name)
    if method.name != _INVERSE_DISTANCE:
        return [own]
    powers = sorted({*_POWERS, *(() if options.power is None else (float(options.power),))})
    return [replace(own, power=power) for power in powers]
