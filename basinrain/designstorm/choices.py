"""Words that must be one of a few."""

from __future__ import annotations

from collections.abc import Iterable

from basinrain.errors import Problems, nearest_name

__all__ = ["report_unknown"]


def report_unknown(item: str, given: str, known: Iterable[str], problems: Problems) -> None:
    """Report a word that is none of those known, with the nearest of them.

    Parameters
    ----------
    item
        What the word is for, in the user's words.
    given
        The word.
    known
        What is accepted.
    problems
        Takes what is wrong.

    Examples
    --------
    >>> from basinrain.errors import JobError
    >>> problems = Problems()
    >>> report_unknown("series", "annual maximum", ["annual-maximum", "partial-duration"], problems)
    >>> report_unknown("layout", "wide", ["long", "wide"], problems)
    >>> problems.raise_as(JobError)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: series: found 'annual maximum'; expected one of: annual-maximum, partial-duration; did \
you mean 'annual-maximum'?
    """
    accepted = list(known)
    if given not in accepted:
        problems.add(
            item=item,
            found=f"'{given}'",
            expected="one of: " + ", ".join(accepted),
            remedy=nearest_name(given, accepted),
        )
