"""The hours at which stations of GHCN-Daily are read, beside what the job says that a date names."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.clocks import clock_name
from basinrain.intervals import DAY
from basinrain.notes import Note
from basinrain.reading.ghcn_days import ELEMENTS, MISSING, DayCells
from basinrain.reading.stamps import StampRules

__all__ = ["ObservationHours"]

_RULE: Final = 0.5
"""A time that more than this share of a station's values has is the station's."""

_LISTED: Final = 5


class ObservationHours:
    r"""Collects the usual time of observation of every station of a source.

    Examples
    --------
    >>> from basinrain.errors import Problems
    >>> from basinrain.reading.ghcn_csv import csv_cells
    >>> from basinrain.intervals import Interval
    >>> hours = ObservationHours()
    >>> hours.add(csv_cells(b"ORX00000001,20310504,PRCP,15,,,X,0700\n", Problems()))
    >>> [note] = hours.notes(StampRules(interval=Interval("1d", DAY)))
    >>> note.code, note.text[:38]
    ('observation-hours', 'Most values of ORX00000001 were read a')
    >>> hours.notes(StampRules(interval=Interval("1d", DAY), read_hour=7 * 3600, date_means="ends"))
    ()
    """

    def __init__(self) -> None:
        self._gauges: dict[int, list[str]] = {}

    def add(self, cells: DayCells) -> None:
        """Take the cells of a file; those without a time of observation do not count, nor do files without times."""
        if cells.observed is None:
            return
        rain = (cells.element == ELEMENTS.index("PRCP")) & (cells.value != MISSING)
        for g, gauge in enumerate(cells.gauges):
            mine = cells.observed[rain & (cells.gauge == g)]
            times, counts = np.unique(mine[mine >= 0], return_counts=True)
            if len(times) and counts.max() > _RULE * len(mine):
                self._gauges.setdefault(int(times[counts.argmax()]), []).append(gauge)

    def notes(self, stamps: StampRules) -> tuple[Note, ...]:
        """Return a note for every hour that is not the one at which the source's days end."""
        declared = stamps.date_means != "calendar-day"
        ends = (stamps.read_hour or 0) if declared else 0
        notes = []
        for seconds, gauges in sorted(self._gauges.items()):
            if seconds % DAY == ends:
                continue
            hour = clock_name(seconds)[1:]
            listed = ", ".join(gauges[:_LISTED]) + (f" and {len(gauges) - _LISTED} more" if gauges[_LISTED:] else "")
            said = f"the 24 h to or from {clock_name(ends)[1:]}" if declared else "calendar days"
            notes.append(
                Note(
                    code="observation-hours",
                    text=f"Most values of {listed} were read at {hour} by the file, local time, and are taken for "
                    f"{said}. If a date names the 24 h until that reading, declare read_hour = '{hour}' and "
                    "date_means = 'ends'"
                    + ("." if len(self._gauges) == 1 else ", in a source of its own for every hour."),
                    gauge=gauges[0] if len(gauges) == 1 else "",
                )
            )
        return tuple(notes)
