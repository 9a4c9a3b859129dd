"""The result of a storm run: everything that was computed, before any unit or file is chosen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from basinrain import tables
from basinrain.basin_depths import BasinDepths
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.ground import Plane
from basinrain.infill import Completed
from basinrain.notes import Note
from basinrain.rainfall import RainRecord
from basinrain.storms import Storm

if TYPE_CHECKING:
    import geopandas as gpd
    import pandas as pd

__all__ = ["CAUTION", "StormResult", "StormRun"]

CAUTION = (
    "Basin rainfall estimated from point gauges, for use by a qualified hydrologist or engineer. Gauge density, "
    "exposure, wind loss and the choice of method can each change it by more than the digits suggest. For flood, "
    "dam-safety or drainage design the local code and the responsible licensed professional govern. No correction for "
    "gauge catch is made unless the job gives one."
)


@dataclass(frozen=True, eq=False)
class StormResult:
    """One storm of a run.

    Parameters
    ----------
    storm
        Its name and window.
    completed
        The window after infill, with every estimate.
    depths
        What each averaging method gives, by the method's name, in the job's order.
    shapes
        For each basin, what times its hyetograph: ``("mean", None)``, or a gauge and its shares of the storm.
    """

    storm: Storm
    completed: Completed
    depths: Mapping[str, BasinDepths]
    shapes: tuple[tuple[str, npt.NDArray[np.float64] | None], ...]

    def hyetograph(self, method: str) -> npt.NDArray[np.float64]:
        """Return the basin hyetographs, timed by the storm's pattern.

        Parameters
        ----------
        method
            One of ``depths``; ``KeyError`` for another.

        Returns
        -------
        array of float, shape (n_steps, n_basins)
            mm a step, a copy; sums to the basins' totals. NaN where the method has no number: at the step when the
            basin mean keeps its own times, throughout when a gauge times a total that is missing.
        """
        depths = self.depths[method]
        result = depths.depth.copy()
        for b, (_, shape) in enumerate(self.shapes):
            if shape is not None:
                result[:, b] = depths.total[b] * shape
        return result


@dataclass(frozen=True, eq=False)
class StormRun:
    """All storms of a job, with the tables that go to files, reports and notebooks.

    Depths inside are mm, areas m²; the tables (data frames) are in the job's units, each quantity beside its unit. They
    are :attr:`basin_means`, :attr:`storm_table`, :attr:`spread`, :attr:`weights`, :attr:`weights_compared`,
    :attr:`gauge_totals`, :attr:`gauge_depths`, :attr:`infilled`, :attr:`hyetographs` and, with polygons,
    :attr:`thiessen`. A number that does not exist is NaN in them, and blank in the files: never zero.

    Parameters
    ----------
    name
        The job's name.
    settings
        The job as resolved, every default included, as plain values.
    depth_unit, area_unit
        Units of the tables.
    network, basins
        Gauges and basins (the union's row included) in the working plane.
    plane
        The working plane.
    record
        The whole record at the common step.
    storms
        The storms, in the job's order.
    notes
        Warnings and remarks.
    inputs
        SHA-256 of every input file, by its name in the job.
    versions
        Versions of this package and of the libraries that compute.
    facts
        Facts about the run that a report states, such as the grid's cell, as name and sentence.

    Examples
    --------
    See :func:`basinrain.run_storm`, which makes one from a job: ``run.basin_means[["basin", "method", "depth"]]``.
    """

    name: str
    settings: Mapping[str, Any]
    depth_unit: str
    area_unit: str
    network: GaugeNetwork
    basins: Basins
    plane: Plane
    record: RainRecord
    storms: tuple[StormResult, ...]
    notes: tuple[Note, ...]
    inputs: Mapping[str, str] = field(default_factory=dict)
    versions: Mapping[str, str] = field(default_factory=dict)
    facts: Mapping[str, str] = field(default_factory=dict)

    @property
    def methods(self) -> tuple[str, ...]:
        """Names of the averaging methods that were run."""
        return tuple(self.storms[0].depths)

    @property
    def warnings(self) -> tuple[Note, ...]:
        """The notes that are warnings."""
        return tuple(note for note in self.notes if note.level == "warning")

    @cached_property
    def basin_means(self) -> pd.DataFrame:
        """Storm totals: one row per storm, basin and method."""
        return tables.basin_means(self)

    @cached_property
    def storm_table(self) -> pd.DataFrame:
        """Windows, totals and peaks: one row per storm, basin and method."""
        return tables.storm_table(self)

    @cached_property
    def spread(self) -> pd.DataFrame:
        """Least and greatest basin mean across methods: one row per storm and basin."""
        return tables.spread(self)

    @cached_property
    def weights(self) -> pd.DataFrame:
        """Weight, contribution and share: one row per storm, basin, method and gauge."""
        return tables.weights(self)

    @cached_property
    def weights_compared(self) -> pd.DataFrame:
        """Weights of the methods side by side, largest differences first: one row per storm, basin and gauge."""
        return tables.weights_compared(self)

    @cached_property
    def gauge_totals(self) -> pd.DataFrame:
        """Storm totals of the gauges: one row per storm and gauge."""
        return tables.gauge_totals(self)

    @cached_property
    def gauge_depths(self) -> pd.DataFrame:
        """Completed depths of the gauges with the status of every value: one row per storm, gauge and step."""
        return tables.gauge_depths(self)

    @cached_property
    def infilled(self) -> pd.DataFrame:
        """Every infilled depth with its donors: one row per estimate."""
        return tables.infilled(self)

    @cached_property
    def hyetographs(self) -> pd.DataFrame:
        """Depth and cumulative depth: one row per storm, basin, method and step."""
        return tables.hyetographs(self)

    @cached_property
    def thiessen(self) -> gpd.GeoDataFrame:
        """Thiessen polygons cut to the basins, all gauges present, in degrees: one row per basin and gauge."""
        return tables.thiessen(self)

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

        See Also
        --------
        basinrain.writing.write_run : the same as a function.
        """
        from basinrain.writing import write_run

        return write_run(self, folder)
