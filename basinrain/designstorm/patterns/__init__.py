"""Temporal patterns: how a depth falls in time, one module a pattern, all patterns in one registry."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from basinrain.designstorm.patterns.alternating_block import ALTERNATING_BLOCK
from basinrain.designstorm.patterns.chicago import CHICAGO
from basinrain.designstorm.patterns.huff import HUFF
from basinrain.designstorm.patterns.nested import NESTED
from basinrain.designstorm.patterns.nrcs import NRCS
from basinrain.designstorm.patterns.observed import OBSERVED, ordinates_of
from basinrain.designstorm.patterns.ordinates import Ordinates
from basinrain.designstorm.patterns.pattern import Pattern, PatternCase, Shaped
from basinrain.designstorm.patterns.table import TABLE
from basinrain.designstorm.patterns.triangular import TRIANGULAR
from basinrain.designstorm.patterns.uniform import UNIFORM
from basinrain.errors import JobError, unknown

__all__ = ["PATTERNS", "Ordinates", "Pattern", "PatternCase", "Shaped", "ordinates_of", "pattern"]

PATTERNS: Final[Mapping[str, Pattern]] = MappingProxyType(
    {
        each.name: each
        for each in (*NRCS, *HUFF, ALTERNATING_BLOCK, CHICAGO, TRIANGULAR, UNIFORM, NESTED, TABLE, OBSERVED)
    }
)
"""Every temporal pattern by name. A new one is one module and one line here."""


def pattern(name: str) -> Pattern:
    """Return the temporal pattern called ``name``.

    Parameters
    ----------
    name
        One of :data:`PATTERNS`.

    Returns
    -------
    Pattern

    Raises
    ------
    JobError
        There is none; the nearest name is given.

    Examples
    --------
    >>> pattern("triangular").options
    ('peak',)
    >>> pattern("trianguler")  # doctest: +ELLIPSIS
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [[design.pattern]] shape: found 'trianguler'; expected one of: nrcs-type-i, ...; did \
you mean 'triangular'?
    """
    if name not in PATTERNS:
        raise JobError(unknown("[[design.pattern]] shape", name, PATTERNS))
    return PATTERNS[name]
