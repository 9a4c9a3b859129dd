"""Progress is for people who look at a terminal and wait; nobody else sees a word of it."""

from __future__ import annotations

import io
import os
import pty
import re
import subprocess
import sys
import termios
import threading
import time
from typing import TextIO

import pytest

from basinrain.cli import progress as module
from basinrain.cli.progress import Progress, words_of_steps

ERASED = "\x1b[?25h\r\x1b[1A\x1b[2K"
"""The cursor shown again, then back, up, and the line erased."""


class Terminal:
    """A terminal of our own: what is written to its stream can be read."""

    def __init__(self) -> None:
        self._ours, theirs = pty.openpty()
        termios.tcsetwinsize(theirs, (24, 100))
        self.stream: TextIO = os.fdopen(theirs, "w", encoding="utf-8")
        self._seen: list[bytes] = []
        self._reader = threading.Thread(target=self._read, daemon=True)
        self._reader.start()

    def _read(self) -> None:
        while True:
            try:
                block = os.read(self._ours, 4096)
            except OSError:
                return
            if not block:
                return
            self._seen.append(block)

    def seen(self) -> str:
        """Return what a person has seen so far, without colours and movements."""
        return re.sub(r"\x1b\[[0-9;?]*[A-Za-z]|\r", "", b"".join(self._seen).decode("utf-8", "ignore"))

    def raw(self) -> str:
        """Close it, and return all that was written to it."""
        self.text()
        return b"".join(self._seen).decode("utf-8")

    def wait_for(self, words: str) -> None:
        """Wait until words are seen."""
        until = time.monotonic() + 20
        while words not in self.seen():
            assert time.monotonic() < until, f"{words!r} never came; seen: {self.seen()!r}"
            time.sleep(0.01)

    def text(self) -> str:
        """Close it, and return all that a person has seen."""
        self.stream.close()
        self._reader.join(5)
        os.close(self._ours)
        return self.seen()


def terminal_of(monkeypatch: pytest.MonkeyPatch, *, after: float = 0.05, term: str = "xterm") -> Terminal:
    """Put a terminal in the place of standard error, and wait a twentieth of a second instead of two.

    Within the test, since the stream that a fixture sets is replaced when the test begins.
    """
    shown = Terminal()
    monkeypatch.setattr(sys, "stderr", shown.stream)
    monkeypatch.setattr(module, "AFTER_SECONDS", after)
    monkeypatch.setenv("TERM", term)
    return shown


def test_words_and_steps_are_shown_on_a_terminal(monkeypatch: pytest.MonkeyPatch) -> None:
    """A run that takes its time shows what it does, then steps with their rate and the time left."""
    terminal = terminal_of(monkeypatch)
    with Progress(quiet=False) as progress:
        progress("reading")
        terminal.wait_for("reading")
        progress("series")
        began = time.monotonic()
        progress.steps(1000, 9000)
        terminal.wait_for("1,000 of 9,000 steps")
        progress.steps(3000, 9000)
        seconds = time.monotonic() - began
        terminal.wait_for("3,000 of 9,000 steps")
    shown = re.search(r"3,000 of 9,000 steps, ([\d,]+) steps/s, (\d+) (s|min) left", terminal.text())
    assert shown is not None
    assert int(shown[1].replace(",", "")) == pytest.approx(2000 / seconds, rel=0.2)


def test_the_rate_counts_from_where_this_run_began(monkeypatch: pytest.MonkeyPatch) -> None:
    """Steps that an earlier run had finished are no speed of this one, and words in between start the clock anew."""
    clock = iter([100.0, 110.0, 500.0, 502.0])
    monkeypatch.setattr(time, "monotonic", lambda: next(clock))
    told: list[str] = []
    progress = Progress(quiet=False)
    monkeypatch.setattr(progress, "_tell", told.append)
    progress.steps(5000, 9000)
    progress.steps(6000, 9000)
    progress("another part")
    progress.steps(0, 100)
    progress.steps(40, 100)
    assert told == [
        "5,000 of 9,000 steps",
        "6,000 of 9,000 steps, 100 steps/s, 30 s left",
        "another part",
        "0 of 100 steps",
        "40 of 100 steps, 20 steps/s, 3 s left",
    ]


def test_a_run_that_is_soon_done_shows_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    """Within the two seconds not a character is written, and nothing comes after the end."""
    terminal = terminal_of(monkeypatch, after=0.2)
    with Progress(quiet=False) as progress:
        progress("reading")
        progress.steps(1, 2)
    progress("afterwards")
    time.sleep(0.4)
    assert terminal.text() == ""


def test_two_seconds_are_what_is_waited() -> None:
    """The bound is that of the documentation."""
    assert module.AFTER_SECONDS == 2.0


def test_quiet_shows_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    """Not even on a terminal."""
    terminal = terminal_of(monkeypatch)
    with Progress(quiet=True) as progress:
        progress("reading")
        progress.steps(1, 2)
        time.sleep(0.2)
    assert terminal.text() == ""


def test_the_line_is_gone_when_a_run_fails(monkeypatch: pytest.MonkeyPatch) -> None:
    """An error ends the display; it is not followed by more of it, and the cursor is back."""
    terminal = terminal_of(monkeypatch)

    def fail() -> None:
        with Progress(quiet=False) as progress:
            progress("dividing")
            terminal.wait_for("dividing")
            _ = 1 / 0

    with pytest.raises(ZeroDivisionError, match="zero"):
        fail()
    # Long enough for more of it, if there were any.
    time.sleep(0.3)
    assert terminal.raw().rstrip().endswith(ERASED)


@pytest.mark.parametrize("variable", ["FORCE_COLOR", "TTY_COMPATIBLE"])
def test_a_pipe_gets_nothing(monkeypatch: pytest.MonkeyPatch, variable: str) -> None:
    """Nor when the environment asks for colours in pipes."""
    pipe = io.StringIO()
    monkeypatch.setattr(sys, "stderr", pipe)
    monkeypatch.setattr(module, "AFTER_SECONDS", 0.01)
    monkeypatch.setenv(variable, "1")
    with Progress(quiet=False) as progress:
        progress("reading")
        progress.steps(1, 2)
        time.sleep(0.2)
    assert pipe.getvalue() == ""


def test_a_terminal_that_cannot_go_back_gets_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    """A dumb terminal would be filled with lines."""
    terminal = terminal_of(monkeypatch, term="dumb")
    with Progress(quiet=False) as progress:
        progress("reading")
        time.sleep(0.2)
    assert terminal.text() == ""


RUN = """
import time
from basinrain.cli.progress import Progress
with Progress(quiet=False) as progress:
    progress("reading")
    time.sleep(2.6)
"""


@pytest.mark.parametrize("looked_at", [True, False], ids=["terminal", "pipe"])
def test_a_process_of_its_own_shows_it_after_two_seconds(looked_at: bool) -> None:  # noqa: FBT001 - drawn
    """On a real standard error: words on a terminal after two seconds, not a byte in a pipe."""
    terminal = Terminal()
    environment = os.environ | {"TERM": "xterm"}
    run = subprocess.run(
        [sys.executable, "-c", RUN],
        stdout=subprocess.PIPE,
        stderr=terminal.stream if looked_at else subprocess.PIPE,
        env=environment,
        check=True,
    )
    assert run.stdout == b""
    assert ("reading" in terminal.text()) == looked_at
    if not looked_at:
        assert run.stderr == b""


@pytest.mark.parametrize(
    ("done", "total", "since", "seconds", "words"),
    [
        (0, 100, 0, 5.0, "0 of 100 steps"),
        (50, 100, 50, 0.0, "50 of 100 steps"),
        (100, 100, 100, 10.0, "100 of 100 steps, 10 steps/s, 0 s left"),
        (11, 100, 11, 11.0, "11 of 100 steps, 1 steps/s, 89 s left"),
        (9, 100, 9, 9.0, "9 of 100 steps, 1 steps/s, 2 min left"),
        (10, 90_010, 10, 1.0, "10 of 90,010 steps, 10 steps/s, 2.5 h left"),
        (1_000_000, 3_000_000, 1_000_000, 10.0, "1,000,000 of 3,000,000 steps, 100,000 steps/s, 20 s left"),
    ],
)
def test_words_by_hand(done: int, total: int, since: int, seconds: float, words: str) -> None:
    """Rates and times of hand arithmetic, in the unit that is read best."""
    assert words_of_steps(done, total, since, seconds) == words
