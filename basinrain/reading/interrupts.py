"""Ctrl-C while pandas reads text."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

import pandas as pd

__all__ = ["interrupts_seen"]

_HIDDEN = "on source failed"
"""What the C parser says of any exception between two parts of its input, whose kind it does not tell."""


@contextmanager
def interrupts_seen() -> Iterator[None]:
    """Let Ctrl-C be seen that falls into pandas' reading of text in memory, which can fail of nothing else.

    Raises
    ------
    KeyboardInterrupt
        The reading was stopped.

    Examples
    --------
    >>> try:
    ...     with interrupts_seen():
    ...         raise pd.errors.ParserError("Error tokenizing data. C error: Calling read(nbytes) on source failed.")
    ... except KeyboardInterrupt:
    ...     print("stopped")
    stopped
    """
    try:
        yield
    except pd.errors.ParserError as error:
        if _HIDDEN in str(error):
            raise KeyboardInterrupt from error
        raise
