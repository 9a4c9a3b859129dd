"""What a run over a whole record was asked for, what its policies are, and which files hold what."""

from __future__ import annotations

from typing import Final

import numpy as np

from basinrain.report import overview, series_names
from basinrain.report.table import Row, Table
from basinrain.report.words import (
    number_text,
    percent_text,
    step_text,
    unit_word,
    when_text,
    zone_text,
)
from basinrain.results_series import SeriesRun
from basinrain.series.flags import Flag
from basinrain.series.policies import INFILL, INFILL_THEN_REWEIGHT, REWEIGHT

__all__ = ["files_table", "flag_facts", "policy_facts", "record_facts", "ways_facts"]

_SERIES_FILES: Final = {
    "csv": "series.csv",
    "csv-per-basin": "hyetographs/",
    "parquet": "series.parquet",
    "netcdf": "series.nc",
}
_FLAGS: Final = {
    Flag.INFILLED: "rests in part on infilled values",
    Flag.REWEIGHTED: "a gauge in service that has weight had no depth, so that the others have more",
    Flag.SPREAD: "rests in part on readings over several steps, spread in the times of recording gauges",
    Flag.ESTIMATED: "rests in part on values that their source estimated, or that an edit adjusted",
    Flag.MISSING: "no number: no gauge has a depth, or the method has no answer with those that have; never zero",
}

_SERVICE: Final = (
    "A gauge has no weight before it comes into service and after it goes out of it, and is never infilled then. A "
    "step at which no gauge has a depth is missing."
)
_OWN: Final = "This page is at the record's own step and clock."


def record_facts(run: SeriesRun) -> list[tuple[str, str]]:
    """Return the run in short, each line a name and a text."""
    first = run.summaries[run.setup.series[0]].terms
    b = series_names.lead_basin(run)
    n = number_text(len(run.starts), 0, grouped=True)
    step = step_text(run.record.step)
    lines = [
        ("Record", f"{when_text(run.starts[0])} to {when_text(run.ends[-1])}, {zone_text(run.record.zone)}"),
        ("Step", f"{step}; {n} {'step' if len(run.starts) == 1 else 'steps'}"),
        *overview.where_asked(run),
        ("Averages", ", ".join(run.setup.methods)),
        ("Policies for gaps", ", ".join(run.setup.gaps)),
    ]
    if _infills(run):
        lines.append(("Infill", _infill(run)))
    observed = f"{percent_text(float(first.observed_share[b]))} of the weight in basin {run.basins.ids[b]}"
    known = first.observed_share[~np.isnan(first.observed_share)]
    if len(known) > 1:
        observed += f", {percent_text(float(known.min()))} to {percent_text(float(known.max()))} over the basins"
    lines.append(("Observed", f"{observed}, by {series_names.series_word(run.setup.series[0])}"))
    lines.append(("Units", f"depths in {unit_word(run.depth_unit)}"))
    return lines


def _infills(run: SeriesRun) -> bool:
    return set(run.setup.gaps) != {REWEIGHT}


def _longest(run: SeriesRun) -> str:
    longest = run.setup.infill.longest_gap
    return "of any length" if longest == float("inf") else f"up to {longest:g} day{'' if longest == 1 else 's'}"


def _infill(run: SeriesRun) -> str:
    return f"{run.setup.infill.label} at the scale of the {run.setup.infill.scale or 'step'}"


def policy_facts(run: SeriesRun) -> list[tuple[str, str]]:
    """Return the policies in words, and what holds for all of them."""
    by = f" by {_infill(run)}" if _infills(run) else ""
    words = {
        INFILL: f"Every gap of a gauge in service is infilled{by}, however long; the gauges in service keep their "
        "weights. What no donor can fill is reweighted.",
        REWEIGHT: "Nothing is infilled. At every step the gauges that report share the basin, with weights that are "
        "rebuilt for them.",
        INFILL_THEN_REWEIGHT: f"Gaps {_longest(run)} are infilled{by}; while a gauge is out for longer, and where no "
        "donor can fill, the others share the basin.",
    }
    lines = [(policy, words[policy]) for policy in run.setup.gaps]
    lines.append(
        (
            "By every policy",
            _SERVICE,
        )
    )
    if run.setup.ratios:
        text = (
            "Ratios: weights are given to the ratios of depths to the gauges' normals, and their mean is multiplied by "
            "the basin's normal, the weighted mean of those of all gauges."
        )
    else:
        text = "Depths: weights are given to the depths themselves."
    return [*lines, ("What is weighed", text)]


def flag_facts() -> list[tuple[str, str]]:
    """Return the marks of a value, in words."""
    return [(flag.word, text) for flag, text in _FLAGS.items()]


def ways_facts(run: SeriesRun) -> list[tuple[str, str]]:
    """Return how the series are written."""
    grouping = run.grouping
    if grouping.parts == 1:
        step = f"at the record's own step of {step_text(run.record.step)}"
    else:
        length = series_names.length_text(grouping.ends[0] - grouping.starts[0])
        step = (
            f"at a step of {length}, each the sum of {grouping.parts} steps of the record, without a number where one "
            "of these is"
        )
    return [
        (
            "As written",
            f"Series stand {step}, in {zone_text(grouping.zone)}; a time is the end of its step. {_OWN}",
        )
    ]


def files_table(run: SeriesRun) -> Table:
    """Return the files that stand beside the page, with what each holds."""
    content = f"basin means in {unit_word(run.depth_unit)} with observed share and marks"
    rows: list[Row] = [
        (
            _SERIES_FILES[word],
            f"{content}, one CSV file a basin with its series side by side; index.csv says which is whose"
            if word == "csv-per-basin"
            else f"{content}, of every policy, method and basin",
        )
        for word in run.formats
    ]
    rows += [
        ("series_means.csv", "what every series comes to, and what it rests on: basin, method, policy"),
        ("left_out_means.csv", "means with and without single gauges"),
        ("network_changes.csv", "when gauges come into service, go out of it, fall silent for long and report again"),
        ("period_totals.csv", "totals of months, years and water years with the share of their time that has a number"),
        ("greatest_depths.csv", "greatest depths by duration, sliding and tied to the clock, with their times"),
        ("storms_found.csv", "the largest storms with what fell before them, and those that are not complete"),
        ("findings.csv", "what screening found"),
        ("edits.csv", "the job's changes of the record, and what each did"),
        ("record.json", "the job as resolved, all warnings, and the tables above but for series and totals"),
    ]
    return Table(caption="Files beside this page", heads=("file", "what it holds"), align="tt", rows=rows)
