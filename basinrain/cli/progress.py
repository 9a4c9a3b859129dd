"""What a long run says while it works: on a terminal only, and only when it takes longer than two seconds."""

from __future__ import annotations

import sys
import time
from threading import Lock, Timer
from types import TracebackType
from typing import Final, Self

from rich.console import Console
from rich.status import Status

__all__ = ["Progress", "words_of_steps"]

AFTER_SECONDS: Final = 2.0
"""A run that is done sooner shows nothing."""


class Progress:
    """One line on standard error that says what is being done; nothing where nobody looks.

    It is a context: the line is gone when it ends. Called with words it shows them; :meth:`steps` counts.

    Parameters
    ----------
    quiet
        Show nothing.

    Examples
    --------
    >>> with Progress(quiet=True) as progress:
    ...     progress("reading")
    ...     progress.steps(0, 87600)
    """

    def __init__(self, *, quiet: bool) -> None:
        console = Console(stderr=True)
        # Of the stream itself: variables of the environment can make a console of a pipe.
        looked_at = sys.stderr.isatty() and not console.is_dumb_terminal and not quiet
        self._status: Status | None = console.status("") if looked_at else None
        self._timer = Timer(AFTER_SECONDS, self._show)
        self._timer.daemon = True
        self._lock = Lock()
        self._ended = False
        self._began: tuple[int, float] | None = None

    def __enter__(self) -> Self:
        if self._status is not None:
            self._timer.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._timer.cancel()
        with self._lock:
            self._ended = True
            if self._status is not None:
                self._status.stop()

    def __call__(self, words: str) -> None:
        """Show what is done next."""
        self._began = None
        self._tell(words)

    def steps(self, done: int, total: int) -> None:
        """Show how far a record is: steps done, rate and time left. The first call starts the clock."""
        now = time.monotonic()
        self._began = self._began or (done, now)
        first, since = self._began
        self._tell(words_of_steps(done, total, done - first, now - since))

    def _tell(self, words: str) -> None:
        with self._lock:
            if self._status is not None and not self._ended:
                self._status.update(words)

    def _show(self) -> None:
        with self._lock:
            if self._status is not None and not self._ended:
                self._status.start()


def words_of_steps(done: int, total: int, since: int, seconds: float) -> str:
    """Return how far a run is, in words.

    Parameters
    ----------
    done, total
        Steps of the record.
    since
        Steps of this run, without those that an earlier one had done.
    seconds
        How long they took.

    Examples
    --------
    >>> words_of_steps(87_600, 350_640, 43_800, 60.0)
    '87,600 of 350,640 steps, 730 steps/s, 6 min left'
    >>> words_of_steps(43_800, 350_640, 0, 0.0)
    '43,800 of 350,640 steps'
    >>> words_of_steps(10, 20, 10, 20.0), words_of_steps(10, 20, 10, 9000.0)
    ('10 of 20 steps, 0.5 steps/s, 20 s left', '10 of 20 steps, 0.0011 steps/s, 2.5 h left')
    """
    words = f"{done:,} of {total:,} steps"
    if not since or seconds <= 0:
        return words
    rate = since / seconds
    return f"{words}, {_rate(rate)} steps/s, {_time(max(total - done, 0) / rate)} left"


def _rate(rate: float) -> str:
    return f"{rate:,.0f}" if rate >= 10 else f"{rate:.2g}"


def _time(seconds: float) -> str:
    if seconds < 90:
        return f"{seconds:.0f} s"
    if seconds < 90 * 60:
        return f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.1f} h"
