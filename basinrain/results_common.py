"""What the results of all runs have in common."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from basinrain import tables_record
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import Plane
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.screening import Edit, Screening

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["CAUTION", "GaugedRun", "Run"]

CAUTION = (
    "Basin rainfall estimated from point gauges, for use by a qualified hydrologist or engineer. Gauge density, "
    "exposure, wind loss and the choice of method can each change it by more than the digits suggest. For flood, "
    "dam-safety or drainage design the local code and the responsible licensed professional govern. No correction for "
    "gauge catch is made unless the job gives one."
)


@dataclass(frozen=True, eq=False, kw_only=True)
class Run:
    """What every run of a job has, whatever was computed.

    Parameters
    ----------
    name
        The job's name.
    settings
        The job as resolved, every default included, as plain values.
    depth_unit, area_unit
        Units of the tables.
    basins
        The basins (the union's row included) in the working plane.
    plane
        The working plane.
    notes
        Warnings and remarks.
    inputs
        SHA-256 of every input file, by its name in the job.
    versions
        Versions of this package and of the libraries that compute.
    facts
        Facts about the run that a report states, such as the grid's cell, as name and sentence.
    """

    name: str
    settings: Mapping[str, Any]
    depth_unit: str
    area_unit: str
    basins: Basins
    plane: Plane
    notes: tuple[Note, ...] = ()
    inputs: Mapping[str, str] = field(default_factory=dict)
    versions: Mapping[str, str] = field(default_factory=dict)
    facts: Mapping[str, str] = field(default_factory=dict)

    @property
    def caution(self) -> str:
        """What every output of the run says of its use."""
        return CAUTION

    @property
    def warnings(self) -> tuple[Note, ...]:
        """The notes that are warnings."""
        return tuple(note for note in self.notes if note.level == "warning")

    def write(self, folder: str | Path) -> Path:
        """Write every table, the record of the run and the report into a folder.

        Parameters
        ----------
        folder
            Made where it does not exist, its parents too; an earlier output there is replaced as a whole, once every
            file of the new one is complete.

        Returns
        -------
        Path
            The folder.

        Raises
        ------
        WriteError
            It is a file, holds something that no earlier run wrote, or cannot be written.
        """
        from basinrain.writing import write_run

        return write_run(self, folder)


@dataclass(frozen=True, eq=False, kw_only=True)
class GaugedRun(Run):
    """A run that rests on the record of gauges.

    Parameters
    ----------
    network
        The gauges in the working plane.
    record
        The whole record at the common step, edited, without what was rejected.
    screening
        What the checks found, and what the job says of it.
    edits
        The job's changes of the record.
    edit_rows
        What each of them did, as plain values in mm.
    name, settings, depth_unit, area_unit, basins, plane, notes, inputs, versions, facts
        As for :class:`Run`.
    """

    network: GaugeNetwork
    record: RainRecord
    screening: Screening = field(default_factory=Screening)
    edits: tuple[Edit, ...] = ()
    edit_rows: tuple[Mapping[str, Any], ...] = ()

    @cached_property
    def findings(self) -> pd.DataFrame:
        """What screening found: one row per finding."""
        return tables_record.findings(self)

    @cached_property
    def edit_table(self) -> pd.DataFrame:
        """The job's changes of the record and what each did: one row per edit."""
        return tables_record.edit_table(self)
