"""What a basin mean rests on, as one byte of marks."""

from __future__ import annotations

from enum import IntFlag

__all__ = ["Flag", "flag_words"]


class Flag(IntFlag):
    """Marks of a basin mean; several may hold at once.

    Examples
    --------
    >>> Flag.INFILLED | Flag.SPREAD == 5
    True
    >>> flag_words(5), flag_words(0), flag_words(16)
    ('infilled spread', '', 'missing')
    """

    INFILLED = 1
    """Rests in part on infilled values."""
    REWEIGHTED = 2
    """A gauge in service that has weight had no depth, so that the others have more."""
    SPREAD = 4
    """Rests in part on readings over several steps, spread in the times of recording gauges."""
    ESTIMATED = 8
    """Rests in part on values that their source estimated, or that an edit adjusted."""
    MISSING = 16
    """No number: no gauge has a depth, or the method has no answer with those that have."""

    @property
    def word(self) -> str:
        """What tables call a single mark."""
        return (self.name or "").lower()


def flag_words(code: int) -> str:
    """Return the words of all marks of a code, separated by blanks; empty where there is none."""
    return " ".join(flag.word for flag in Flag if code & flag)
