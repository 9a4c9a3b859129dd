"""The results of runs: everything that was computed, before any unit or file is chosen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from basinrain import tables, tables_comparison, tables_infill, tables_record
from basinrain.basin_depths import BasinDepths
from basinrain.infill import Completed
from basinrain.infill.leave_one_out import Comparison
from basinrain.infill_effect import InfillEffect
from basinrain.rainfall import RainRecord
from basinrain.results_common import GaugedRun
from basinrain.series_check import SeriesCheck
from basinrain.storms import Storm

if TYPE_CHECKING:
    import geopandas as gpd
    import pandas as pd

__all__ = ["AveragedRun", "InfillRun", "ScreenRun", "StormResult", "StormRun"]


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
    effect
        What the basin means would be by every other infill method; None where nothing was infilled.
    checks
        The basin series before and after infill beside the gauges' own.
    """

    storm: Storm
    completed: Completed
    depths: Mapping[str, BasinDepths]
    shapes: tuple[tuple[str, npt.NDArray[np.float64] | None], ...]
    effect: InfillEffect | None = None
    checks: SeriesCheck | None = None

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


@dataclass(frozen=True, eq=False, kw_only=True)
class AveragedRun(GaugedRun):
    """A run with basin means: of its storms, or of the whole record.

    Parameters
    ----------
    storms
        The storms, in the job's order; one, the whole record, in a comparison of infill methods.
    name, settings, depth_unit, area_unit, network, basins, plane, record, screening, edits, edit_rows, notes, inputs, \
versions, facts
        As for :class:`~basinrain.results_common.GaugedRun`.
    """

    storms: tuple[StormResult, ...]

    @property
    def methods(self) -> tuple[str, ...]:
        """Names of the averaging methods that were run."""
        return tuple(self.storms[0].depths)

    @cached_property
    def infill_effect(self) -> pd.DataFrame:
        """Basin means by every infill method: one row per storm, basin, method and infill method."""
        frames = [
            tables_infill.effect_frame(result.storm.name, self.basins.ids, result.effect, self.depth_unit)
            for result in self.storms
            if result.effect is not None
        ]
        return tables_infill.by_storm(frames, tables_infill.EFFECT)

    @cached_property
    def series_check(self) -> pd.DataFrame:
        """Wet steps, largest depths and variance before and after infill: three rows per storm, basin and method."""
        frames = [
            tables_infill.series_frame(result.storm.name, result.checks, self.depth_unit)
            for result in self.storms
            if result.checks is not None
        ]
        return tables_infill.by_storm(frames, tables_infill.SERIES)


@dataclass(frozen=True, eq=False, kw_only=True)
class StormRun(AveragedRun):
    """All storms of a job, with the tables that go to files, reports and notebooks.

    Depths inside are mm, areas m²; the tables (data frames) are in the job's units, each quantity beside its unit. They
    are :attr:`basin_means`, :attr:`storm_table`, :attr:`spread`, :attr:`weights`, :attr:`weights_compared`,
    :attr:`gauge_totals`, :attr:`gauge_depths`, :attr:`infilled`, :attr:`infill_effect`, :attr:`series_check`,
    :attr:`hyetographs`, :attr:`findings`, :attr:`edit_table` and, with polygons, :attr:`thiessen`; where the infill
    method was chosen by leave-one-out, :attr:`infill_scores` too. A number that does not exist is NaN in them, and
    blank in the files: never zero.

    Parameters
    ----------
    comparison
        The comparison of infill methods, where the job asks for its winner.
    storms, name, settings, depth_unit, area_unit, network, basins, plane, record, screening, edits, edit_rows, notes, \
inputs, versions, facts
        As for :class:`AveragedRun`.

    Examples
    --------
    See :func:`basinrain.run_storm`, which makes one from a job: ``run.basin_means[["basin", "method", "depth"]]``.
    """

    comparison: Comparison | None = None

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
    def infill_scores(self) -> pd.DataFrame:
        """How the infill methods compare, where the job asks for the winner; else no row."""
        return tables_comparison.infill_scores(self.comparison, self.depth_unit)

    @cached_property
    def infill_differences(self) -> pd.DataFrame:
        """How much worse than the best each infill method is, where the job asks for the winner; else no row."""
        return tables_comparison.infill_differences(self.comparison, self.depth_unit)

    @cached_property
    def thiessen(self) -> gpd.GeoDataFrame:
        """Thiessen polygons cut to the basins, all gauges present, in degrees: one row per basin and gauge."""
        return tables.thiessen(self)


@dataclass(frozen=True, eq=False, kw_only=True)
class ScreenRun(GaugedRun):
    """A job's record as it was screened, with the tables that go to files, reports and notebooks.

    They are :attr:`findings`, :attr:`edit_table`, :attr:`completeness`, :attr:`double_mass` and :attr:`homogeneity`.

    Parameters
    ----------
    raw
        The record before anything that the job rejects was taken out, as the checks saw it.
    name, settings, depth_unit, area_unit, network, basins, plane, record, screening, edits, edit_rows, notes, inputs, \
versions, facts
        As for :class:`~basinrain.results_common.GaugedRun`.

    Examples
    --------
    See :func:`basinrain.run_screen`, which makes one from a job.
    """

    raw: RainRecord

    @cached_property
    def completeness(self) -> pd.DataFrame:
        """What there is of every gauge: first and last value, and steps by where their values come from."""
        return tables_record.completeness(self)

    @cached_property
    def double_mass(self) -> pd.DataFrame:
        """Double-mass curves: one row per gauge and year."""
        return tables_record.double_mass(self)

    @cached_property
    def homogeneity(self) -> pd.DataFrame:
        """Tests of homogeneity: one row per gauge and test."""
        return tables_record.homogeneity(self)


@dataclass(frozen=True, eq=False, kw_only=True)
class InfillRun(AveragedRun):
    """A comparison of infill methods and the completed record, with the tables that go to files, reports, notebooks.

    They are :attr:`infill_scores`, :attr:`infill_differences`, :attr:`infill_cases`, :attr:`infilled`,
    :attr:`completed_depths`, :attr:`completed_status`, :attr:`infill_effect`, :attr:`series_check`, :attr:`findings`
    and :attr:`edit_table`.

    Parameters
    ----------
    comparison
        Every method scored on the same cases.
    completed
        The whole record infilled by the method that the job names, or by the one that the comparison takes.
    storms, name, settings, depth_unit, area_unit, network, basins, plane, record, screening, edits, edit_rows, notes, \
inputs, versions, facts
        As for :class:`AveragedRun`.

    Examples
    --------
    See :func:`basinrain.run_infill`, which makes one from a job.
    """

    comparison: Comparison
    completed: Completed

    @cached_property
    def infill_scores(self) -> pd.DataFrame:
        """How the methods compare: one row per scale, gauge (all of them first) and method."""
        return tables_comparison.infill_scores(self.comparison, self.depth_unit)

    @cached_property
    def infill_differences(self) -> pd.DataFrame:
        """How much worse than the best each method is, and whether that can be told from chance: one row per method."""
        return tables_comparison.infill_differences(self.comparison, self.depth_unit)

    @cached_property
    def infill_cases(self) -> pd.DataFrame:
        """Observed depths and what the chosen method makes of them from the other gauges: one row per case, gauge."""
        return tables_comparison.infill_cases(self.comparison, self.record.zone, self.depth_unit)

    @cached_property
    def infilled(self) -> pd.DataFrame:
        """Every infilled depth with its donors: one row per estimate."""
        return tables.estimates(self.completed, self.depth_unit)

    @cached_property
    def completed_depths(self) -> pd.DataFrame:
        """The completed record: a row per time, a column per gauge."""
        return tables_comparison.completed_depths(self.completed.record, self.depth_unit)

    @cached_property
    def completed_status(self) -> pd.DataFrame:
        """Where every value of the completed record comes from, in the same shape."""
        return tables_comparison.completed_status(self.completed.record)
