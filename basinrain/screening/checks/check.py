"""What a check is, and what a record must have for it."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from basinrain.screening.findings import Finding
from basinrain.screening.screened import DAY, Screened

__all__ = ["Check", "needs_cases", "needs_days", "needs_gauges", "needs_neighbours", "needs_times"]

Need = Callable[[Screened], str]
"""Says in words what a record lacks; empty where it lacks nothing."""


@dataclass(frozen=True)
class Check:
    """One check of the record.

    Parameters
    ----------
    name
        What findings, jobs and tables call it.
    about
        One sentence for the report: what it looks for.
    run
        Takes the :class:`Screened` view and yields findings, one a gauge and stretch. It changes nothing.
    limits
        One sentence for the report: the thresholds.
    needs
        What must be there for it to mean anything, the first thing that is lacking is named.

    Examples
    --------
    A check is one function and one line in :data:`basinrain.screening.CHECKS`. A whole one:

    >>> def run(view):
    ...     for gauge, depths in zip(view.network.ids, view.cases.depths.T, strict=True):
    ...         if (depths == 0).all():
    ...             yield Finding(
    ...                 check="never-wet", gauge=gauge, evidence="It never rained.", action="Ask the observer."
    ...             )
    >>> Check("never-wet", "Gauges that were dry throughout.", run, "Every depth is 0.").needs
    ()
    """

    name: str
    about: str
    run: Callable[[Screened], Iterator[Finding]]
    limits: str
    needs: tuple[Need, ...] = ()

    def lacks(self, view: Screened) -> str:
        """Return in words why it cannot be made, empty where it can."""
        return next((reason for need in self.needs if (reason := need(view))), "")


def needs_times(view: Screened) -> str:
    """Say whether intervals have times."""
    return "" if view.timed else "the record is of storm totals without times"


def needs_gauges(least: int) -> Need:
    """Return the need of so many gauges."""

    def need(view: Screened) -> str:
        n = len(view.network)
        have = f"the network has {n} gauge{'' if n == 1 else 's'}"
        return "" if n >= least else f"{have}; it takes {least} or more"

    return need


def needs_neighbours(least: int) -> Need:
    """Return the need of a gauge with so many neighbours within reach."""

    def need(view: Screened) -> str:
        most = max((len(near) for near in view.neighbours), default=0)
        return "" if most >= least else f"no gauge has {least} others within reach; the most is {most}"

    return need


def needs_cases(least: int) -> Need:
    """Return the need of so many rainfall days, or steps where those are longer."""

    def need(view: Screened) -> str:
        n = len(view.cases.ends)
        have = f"the record has {n} whole {view.cases.unit}{'' if n == 1 else 's'}"
        return "" if n >= least else f"{have}; it takes {least} or more"

    return need


def needs_days(view: Screened) -> str:
    """Say whether steps are a day at most."""
    return "" if view.timed and view.seconds <= DAY else f"steps of {view.record.step} are longer than a day"
