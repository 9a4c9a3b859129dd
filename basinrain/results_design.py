"""The result of a run of design storms."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from basinrain import tables_design
from basinrain.design_areas import Areas, ReducedArea
from basinrain.design_asked import Asked
from basinrain.design_cautions import DESIGN_CAUTION, climate_sentence
from basinrain.design_record import RecordSource
from basinrain.design_sources import Sourced
from basinrain.designstorm.areal_reduction import ArealReduction
from basinrain.designstorm.depth_chain import DepthChain, Links
from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.designstorm.design_storms import DesignStorm
from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.storm_depths import StormRarity
from basinrain.results_common import Run

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["ComparedReduction", "DesignRun"]


@dataclass(frozen=True, eq=False, kw_only=True)
class ComparedReduction:
    """An areal reduction that is shown beside the one of the design.

    Parameters
    ----------
    method
        From the registry.
    region
        The region that it is for, in words.
    outside
        Whether the design is outside the region that it is for.
    factors
        By name of the area, frequency and duration in minutes; none where the method has no answer.
    reasons
        Why it has none, by the same.
    """

    method: ArealReduction
    region: str
    outside: bool
    factors: Mapping[tuple[str, Frequency, int], float]
    reasons: Mapping[tuple[str, Frequency, int], str]


@dataclass(frozen=True, eq=False, kw_only=True)
class DesignRun(Run):
    """Design storms with every step that led to them, and the tables that go to files, reports and notebooks.

    They are :attr:`design_depths`, :attr:`design_storms`, :attr:`design_hyetographs`, :attr:`point_depths`,
    :attr:`point_weights`, :attr:`reductions_compared`, :attr:`storm_rarity`, :attr:`record_fits` and
    :attr:`annual_maxima`; those without a row stand for what the job did not ask.

    Parameters
    ----------
    asked
        What the job asks.
    areas
        The points of interest and the basins above them.
    sourced
        The depths and the weights of their points.
    chain
        What leads from them to areal depths.
    links
        The links of every area that is reduced as one, by its name, and frequency, over the durations.
    storms
        The design storms.
    compared
        Areal reductions shown beside the one of the design.
    rarities
        How rare storms of the record were.
    from_record
        What the depths rest on where they are from the record.
    start
        The nominal start of every design storm, where the job gives one.
    zone
        The clock of the record, where one was read.
    name, settings, depth_unit, area_unit, basins, plane, notes, inputs, versions, facts
        As for :class:`~basinrain.results_common.Run`.

    Examples
    --------
    See :func:`basinrain.run_design`, which makes one from a job.
    """

    asked: Asked
    areas: Areas
    sourced: Sourced
    chain: DepthChain
    links: Mapping[tuple[str, Frequency], Links]
    storms: tuple[DesignStorm, ...]
    compared: tuple[ComparedReduction, ...] = ()
    rarities: tuple[StormRarity, ...] = ()
    from_record: RecordSource | None = None
    start: np.datetime64 | None = None
    zone: str = ""

    @property
    def reduced(self) -> tuple[ReducedArea, ...]:
        """The areas that are reduced as one: above each point of interest, or each basin where the job says so."""
        return self.areas.reduced(self.asked.design)

    @property
    def caution(self) -> str:
        """What every output of the run says of its use."""
        return " ".join([DESIGN_CAUTION, climate_sentence(self.asked.design.uplift)])

    @cached_property
    def hyetographs(self) -> tuple[DesignHyetograph, ...]:
        """The hyetographs of every design storm."""
        return tuple(
            DesignHyetograph(
                point=storm.point.name,
                frequency=storm.frequency,
                minutes=storm.minutes,
                pattern=storm.choice.label,
                step=storm.step,
                basins=storm.point.basins,
                depth=storm.depth,
            )
            for storm in self.storms
        )

    @property
    def formats(self) -> tuple[str, ...]:
        """The kinds of files that hyetographs are written to."""
        return self.asked.design.formats

    @cached_property
    def design_depths(self) -> pd.DataFrame:
        """From point depth to areal depth: one row per point of interest, frequency and duration."""
        return tables_design.design_depths(self)

    @cached_property
    def design_storms(self) -> pd.DataFrame:
        """Depth, volume and peak: one row per point of interest, frequency, duration, pattern and basin."""
        return tables_design.design_storms(self)

    @cached_property
    def design_hyetographs(self) -> pd.DataFrame:
        """Depth and cumulative depth: one row per design storm, basin and step."""
        return tables_design.design_hyetographs(self)

    @cached_property
    def point_depths(self) -> pd.DataFrame:
        """The depths of every point at what the job asks: one row per depth point, frequency and duration."""
        return tables_design.point_depths(self)

    @cached_property
    def point_weights(self) -> pd.DataFrame:
        """The weight of every depth point in every area: one row per area and depth point that counts."""
        return tables_design.point_weights(self)

    @cached_property
    def reductions_compared(self) -> pd.DataFrame:
        """Areal reductions side by side: one row per point of interest, frequency, duration and method."""
        return tables_design.reductions_compared(self)

    @cached_property
    def storm_rarity(self) -> pd.DataFrame:
        """How rare storms were: one row per storm, duration and place."""
        return tables_design.storm_rarity(self)

    @cached_property
    def record_fits(self) -> pd.DataFrame:
        """Depths from the record with their intervals: one row per area, duration, frequency and distribution."""
        return tables_design.record_fits(self)

    @cached_property
    def annual_maxima(self) -> pd.DataFrame:
        """The annual maxima of the record: one row per area, duration and year."""
        return tables_design.annual_maxima(self)
