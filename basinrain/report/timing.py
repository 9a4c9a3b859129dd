"""Section 4: hyetographs, mass curves and what timed them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from basinrain.report import limits
from basinrain.report.figures import Picture
from basinrain.report.hyetograph_figure import hyetograph_pictures, lead_method
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    DASH,
    depth_text,
    depth_texts,
    number_text,
    step_text,
    unit_word,
    when_text,
    zone_text,
)
from basinrain.results import StormResult, StormRun
from basinrain.storms import MEAN
from basinrain.tables import peaks
from basinrain.units import depth_factor

__all__ = ["StormTimes", "storm_times"]


@dataclass(frozen=True)
class StormTimes:
    """What section 4 says of one storm: sentences, figures, tables."""

    storm: str
    sentences: tuple[str, ...]
    pictures: tuple[Picture, ...]
    tables: tuple[Table, ...]


def storm_times(run: StormRun, result: StormResult, number: int) -> StormTimes:
    """Return the hyetographs of one storm.

    Parameters
    ----------
    run, result
        The run and one of its storms.
    number
        The storm's place in the report, from 1.
    """
    storm, record = result.storm.name, result.completed.record
    if len(record) < 2:
        return StormTimes(storm, ("This storm is one total without steps: it has no hyetograph.",), (), ())
    lead = lead_method(result)
    why = (
        "with the most numbers"
        if np.isnan(result.depths[lead].depth).all(axis=0).any()
        else "with a number in every basin"
    )
    sentences = [
        f"Bars are depths over their intervals of {step_text(record.step)} by {lead}, the first method {why}.",
        "Mass curves are by every method. All basins of a storm have the same scales.",
        _timed_by(result),
    ]
    tables = [_peaks(run, result, lead)]
    if len(record) <= limits.STEPS:
        tables.append(_printed(run, result, lead))
    else:
        sentences.append(f"The {len(record)} steps are in hyetographs.csv.")
    return StormTimes(storm, tuple(sentences), tuple(hyetograph_pictures(run, result, number)), tuple(tables))


def _timed_by(result: StormResult) -> str:
    by = list(dict.fromkeys(name for name, _ in result.shapes))
    if by == [MEAN]:
        return (
            "Each basin's own mean times its hyetograph. Where the storm moved, such a mean is as a rule flatter than "
            "the rain at a gauge; the ratio below tells how much."
        )
    if len(by) == 1:
        return f"The pattern of gauge {by[0]} times every hyetograph; the total is the basin mean's."
    return "The pattern of the nearest recording gauge times each hyetograph; the total is the basin mean's."


def _peaks(run: StormRun, result: StormResult, lead: str) -> Table:
    mm = depth_factor(run.depth_unit)
    record = result.completed.record
    series = result.hyetograph(lead)
    of_mean, of_gauges = peaks(result, lead)
    rows: list[Row] = []
    for b in limits.drawn_basins(run):
        column = series[:, b]
        at = int(np.nanargmax(column)) if not np.isnan(column).all() else None
        rows.append(
            (
                run.basins.ids[b],
                DASH if at is None else depth_text(float(column[at]) / mm, run.depth_unit),
                DASH if at is None or column[at] == 0 else when_text(record.ends[at]),
                result.shapes[b][0] if result.shapes[b][0] != MEAN else "basin mean",
                depth_text(float(of_mean[b]) / mm, run.depth_unit),
                depth_text(float(of_gauges[b]) / mm, run.depth_unit),
                number_text(float(of_mean[b] / of_gauges[b]), 2) if of_gauges[b] > 0 else DASH,
            )
        )
    unit, step = unit_word(run.depth_unit), step_text(record.step)
    return Table(
        caption=f"{result.storm.name}: peaks by {lead}, {unit} in {step}",
        heads=(
            "basin",
            "peak",
            f"step ending, {zone_text(run.record.zone)}",
            "timed by",
            "peak of the mean",
            "mean of the peaks",
            "ratio",
        ),
        over=(("", 1), ("hyetograph", 3), ("flattening", 3)),
        align="tnttnnn",
        rows=rows,
        notes=(
            "Mean of the peaks: the gauges' own largest steps, whenever they came, weighted as the basin mean is.",
            *limits.left_out(run, "storms.csv"),
        ),
    )


def _printed(run: StormRun, result: StormResult, lead: str) -> Table:
    mm = depth_factor(run.depth_unit)
    record = result.completed.record
    drawn = limits.drawn_basins(run)
    depth = result.hyetograph(lead)[:, drawn] / mm
    columns = [depth_texts(depth[:, k], run.depth_unit) for k in range(len(drawn))]
    times = [str(t + 1) if np.isnat(end) else when_text(end) for t, end in enumerate(record.ends)]
    totals = (depth_text(float(depth[:, k].sum()), run.depth_unit) for k in range(len(drawn)))
    return Table(
        caption=f"{result.storm.name}: hyetographs by {lead}, {unit_word(run.depth_unit)} in {step_text(record.step)}",
        heads=(f"step ending, {zone_text(run.record.zone)}", *(run.basins.ids[b] for b in drawn)),
        align="t" + "n" * len(drawn),
        rows=list(zip(times, *columns, strict=True)),
        foot=[("sum", *totals)],
        notes=(
            "Rounded so that every column adds up to its total; full digits are in hyetographs.csv.",
            *limits.left_out(run, "hyetographs.csv"),
        ),
    )
