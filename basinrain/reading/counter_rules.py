"""What the readings of a counter can do beside rising, and what its falls were taken for."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Final

from basinrain.errors import JobError, Problem

__all__ = ["LEAST", "CounterRules", "Falls"]

LEAST: Final = 1e-6
"""mm; differences below it are of the arithmetic, not of the gauge."""


@dataclass(frozen=True, kw_only=True)
class CounterRules:
    """What the readings of a counter can do beside rising.

    Parameters
    ----------
    rollover
        mm at which the counter starts again from 0; None: it does not.
    jitter
        mm by which a reading can fall without meaning, from noise or evaporation.
    reset
        Seconds after midnight at which the counter is set to 0, right after its reading at that time; None: it is not
        known when.

    Raises
    ------
    JobError
        The jitter is not below half the rollover value.
    """

    rollover: float | None = None
    jitter: float = 0.0
    reset: int | None = None

    def __post_init__(self) -> None:
        if self.rollover is not None and self.jitter >= self.rollover / 2:
            raise JobError(
                Problem(item="jitter", found="it as large as half of rollover or more", expected="a smaller jitter")
            )

    @property
    def noise(self) -> float:
        """The greatest fall in mm that means nothing."""
        return self.jitter + LEAST


@dataclass
class Falls:
    """What the falls of a column were taken for: positions of readings, those of resets with the highest before."""

    resets: list[tuple[int, float]] = field(default_factory=list)
    noise: list[int] = field(default_factory=list)
    rollovers: list[int] = field(default_factory=list)
    doubtful: list[int] = field(default_factory=list)
    """Resets that may as well be faulty readings."""
