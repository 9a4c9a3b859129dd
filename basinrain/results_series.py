"""The result of a run over the whole record."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from basinrain import tables_series
from basinrain.results_common import GaugedRun
from basinrain.series.engine import SeriesSetup
from basinrain.series.found_storms import FoundStorms
from basinrain.series.long_term import LeftOut
from basinrain.series.network_changes import NetworkChange
from basinrain.series.regrouping import Regrouping
from basinrain.series.summary import SeriesSummary
from basinrain.series_store import SeriesStore

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["SeriesRun"]

Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True, eq=False, kw_only=True)
class SeriesRun(GaugedRun):
    """The whole record averaged over the basins, with the tables that go to files, reports and notebooks.

    They are :attr:`series_means`, :attr:`left_out_means`, :attr:`network_changes`, :attr:`period_totals`,
    :attr:`greatest_depths`, :attr:`storms_found`, :attr:`findings` and :attr:`edit_table`; :attr:`series` is the series
    themselves.

    Parameters
    ----------
    setup
        What the series rest on.
    starts, ends : array of datetime64[s], shape (n_steps,)
        The record's steps.
    store
        Depths in mm, observed shares and flags, (n_steps, n_basins), by policy and method.
    grouping
        The steps and the clock in which series are written.
    summaries
        What every series comes to, by policy and method.
    storms
        The storms of one series.
    left_out
        Means without single gauges.
    changes
        When the network changed.
    name, settings, depth_unit, area_unit, network, basins, plane, record, screening, edits, edit_rows, notes, inputs, \
versions, facts
        As for :class:`~basinrain.results_common.GaugedRun`.

    Examples
    --------
    See :func:`basinrain.run_series`, which makes one from a job.
    """

    setup: SeriesSetup
    starts: Times
    ends: Times
    store: SeriesStore
    grouping: Regrouping
    summaries: Mapping[tuple[str, str], SeriesSummary]
    storms: FoundStorms
    left_out: tuple[LeftOut, ...]
    changes: tuple[NetworkChange, ...]

    @property
    def formats(self) -> tuple[str, ...]:
        """The kinds of files that the series are written to."""
        return tuple(self.settings["series"]["formats"])

    @property
    def series(self) -> pd.DataFrame:
        """The series at the step and in the clock asked for: one row per policy, method, basin and step."""
        return tables_series.series(self)

    @cached_property
    def series_means(self) -> pd.DataFrame:
        """What every series comes to: one row per policy, method and basin."""
        return tables_series.series_means(self)

    @cached_property
    def left_out_means(self) -> pd.DataFrame:
        """What the means would be without single gauges: one row per gauge, policy, method and basin."""
        return tables_series.left_out_means(self)

    @cached_property
    def network_changes(self) -> pd.DataFrame:
        """When gauges came and went: one row per change."""
        return tables_series.network_changes(self)

    @cached_property
    def period_totals(self) -> pd.DataFrame:
        """Totals by month, year and water year: one row per policy, method, basin and period."""
        return tables_series.period_totals(self)

    @cached_property
    def greatest_depths(self) -> pd.DataFrame:
        """Greatest depths by duration: one row per policy, method, basin and duration."""
        return tables_series.greatest_depths(self)

    @cached_property
    def storms_found(self) -> pd.DataFrame:
        """The largest storms, and those that are not complete: one row per storm."""
        return tables_series.storms_found(self)
