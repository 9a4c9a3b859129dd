"""The tables of a leave-one-out comparison of infill methods."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Comparison, Difference, Score
from basinrain.report import limits
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, counted, error_text, number_text, percent_text, unit_word
from basinrain.units import depth_factor

__all__ = [
    "choice_tables",
    "comparison_facts",
    "gauge_table",
    "scale_words",
    "score_table",
    "skipped_table",
    "step_table",
]

_NUMBERS: Final = (
    "Bias: mean of estimated less observed. Wet found: observed wet cases that were estimated wet; false alarms: cases "
    "estimated wet that were observed dry. Top 20: mean of the 20 largest estimated depths over that of the 20 largest "
    "observed; below 1 the method flattens storms."
)


def scale_words(scale: str) -> str:
    """Return what a case is.

    Examples
    --------
    >>> scale_words("day"), scale_words("step")
    ('rainfall days', "the record's steps")
    """
    return "rainfall days" if scale == "day" else "the record's steps"


def comparison_facts(comparison: Comparison) -> list[tuple[str, str]]:
    """Return what was compared, each a name and a text."""
    score = comparison.score(comparison.chosen)
    skipped = f"; {len(comparison.skipped)} could not be" if comparison.skipped else ""
    gauges = counted(len(comparison.gauges), "gauge")
    facts = [
        ("Taken", comparison.chosen),
        ("Least error", comparison.best),
        ("Compared", counted(len(comparison.candidates), "method") + skipped),
        ("Cases", f"{_count(score.n)} values at {gauges}, {scale_words(comparison.scale)}"),
    ]
    return [*facts, ("Donors", _donors(comparison.chosen_options))]


def _donors(options: InfillOptions) -> str:
    wanted = options.donors_wanted
    parts = [f"{counted(wanted, 'donor')} at most" if isinstance(wanted, int) else "all gauges that report"]
    if options.radius is not None:
        parts.append(f"within {options.radius / 1000:g} km")
    if options.elevation_limit is not None:
        parts.append(f"within {options.elevation_limit:g} m of elevation")
    return ", ".join(parts)


def score_table(comparison: Comparison, *, depth_unit: str) -> Table:
    """Return the scores of all gauges together, with the interval of every difference to the best.

    Parameters
    ----------
    comparison
        The comparison.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    apart = {difference.candidate: difference for difference in comparison.differences}
    rows: list[Row] = []
    for candidate in comparison.candidates:
        score = comparison.score(candidate)
        rows.append(
            (
                candidate,
                _judged(comparison, candidate, apart[candidate]),
                _error(score.rmse, depth_unit),
                *_interval(apart[candidate], depth_unit),
                *_others(score, depth_unit),
            )
        )
    unit = unit_word(depth_unit)
    return Table(
        caption=f"Scores over {scale_words(comparison.scale)}, all gauges together; errors in {unit}",
        heads=("method", "", "RMSE", "RMSE less the best's", "95 % interval", *_OTHER_HEADS),
        align="ttnnnnnnnnn",
        rows=rows,
        notes=(
            f"From simple to complex; all on the same {_cases(comparison, comparison.scale)} cases.",
            "RMSE: root mean square error.",
            _drawn(comparison),
            _NUMBERS,
        ),
    )


_OTHER_HEADS: Final = ("mean abs. error", "bias", "correlation", "wet found", "false alarms", "top 20")


def _drawn(comparison: Comparison) -> str:
    """Return what the intervals come from."""
    times = "days" if comparison.scale == "day" else "steps"
    what = {"week": "weeks", "time": times, "case": "single cases", "": ""}[comparison.drawn]
    if not what:
        return "There are too few cases for an interval: nothing can be told apart."
    return (
        f"Interval: of the difference, by bootstrap ({what} drawn anew); where it reaches 0, chance may have made the "
        "difference."
    )


def _cases(comparison: Comparison, scale: str) -> str:
    return _count(comparison.score(comparison.chosen, scale=scale).n)


def _count(n: int) -> str:
    return number_text(n, 0, grouped=True)


def _judged(comparison: Comparison, candidate: str, difference: Difference) -> str:
    if candidate == comparison.chosen:
        return "taken" + (", best" if candidate == comparison.best else "")
    if candidate == comparison.best:
        return "best"
    return "worse" if difference.distinguishable else "not told apart"


def _error(value: float, depth_unit: str) -> str:
    return error_text(value / depth_factor(depth_unit), depth_unit)


def _interval(difference: Difference, depth_unit: str) -> tuple[str, str]:
    if difference.candidate == difference.best:
        return DASH, DASH
    if math.isnan(difference.low):
        return _error(difference.difference, depth_unit), DASH
    low, high = _error(difference.low, depth_unit), _error(difference.high, depth_unit)
    return _error(difference.difference, depth_unit), f"{low} to {high}"


def _others(score: Score, depth_unit: str) -> tuple[str, ...]:
    wet, called = score.hits + score.misses, score.hits + score.false_alarms
    return (
        _error(score.mae, depth_unit),
        _error(score.bias, depth_unit),
        number_text(score.correlation, 3),
        percent_text(score.hits / wet if wet else math.nan),
        percent_text(score.false_alarms / called if called else math.nan),
        number_text(score.top20_ratio, 2),
    )


def step_table(comparison: Comparison, *, depth_unit: str) -> Table | None:
    """Return the scores at the record's own step, where that is finer than the cases; else None."""
    if comparison.scale == "step" or not any(s.scale == "step" and not s.gauge for s in comparison.scores):
        return None
    rows: list[Row] = []
    for candidate in comparison.candidates:
        score = comparison.score(candidate, scale="step")
        taken = "taken" if candidate == comparison.chosen else ""
        rows.append((candidate, taken, _error(score.rmse, depth_unit), *_others(score, depth_unit)))
    return Table(
        caption=f"Scores step by step, all gauges together; errors in {unit_word(depth_unit)}",
        heads=("method", "", "RMSE", *_OTHER_HEADS),
        align="ttnnnnnnn",
        rows=rows,
        notes=(
            f"{_cases(comparison, 'step')} values, dry steps too, each step estimated by itself.",
            "These scores do not decide: they show how estimating step by step turns drizzle on and clips peaks.",
        ),
    )


def gauge_table(comparison: Comparison, *, depth_unit: str) -> Table | None:
    """Return the chosen method's scores gauge by gauge, the largest errors first; None where no gauge has one."""
    mine = [s for s in comparison.scores if s.gauge and s.scale == comparison.scale]
    chosen = sorted((s for s in mine if s.candidate == comparison.chosen and s.n), key=lambda s: (-s.rmse, s.gauge))
    if not chosen:
        return None
    place = {candidate: k for k, candidate in enumerate(comparison.candidates)}
    least: dict[str, Score] = {}
    for score in sorted(mine, key=lambda s: place[s.candidate]):
        if not math.isnan(score.rmse) and (score.gauge not in least or score.rmse < least[score.gauge].rmse):
            least[score.gauge] = score
    shown = chosen[: limits.GAUGES]
    rows = [
        (
            s.gauge,
            str(s.n),
            _error(s.rmse, depth_unit),
            *_others(s, depth_unit),
            least[s.gauge].candidate,
            _error(least[s.gauge].rmse, depth_unit),
        )
        for s in shown
    ]
    notes = ["The largest errors first. Least error here: the method that does best at this gauge alone."]
    if len(shown) < len(chosen):
        notes.append(f"Shown: {len(shown)} of {len(chosen)} gauges. All are in infill_scores.csv.")
    return Table(
        caption=f"Scores by gauge of {comparison.chosen}; errors in {unit_word(depth_unit)}",
        heads=("gauge", "cases", "RMSE", *_OTHER_HEADS, "method", "RMSE"),
        over=(("", 9), ("least error here", 2)),
        align="tnnnnnnnntn",
        rows=rows,
        notes=tuple(notes),
    )


def skipped_table(skipped: Sequence[tuple[str, str]]) -> Table | None:
    """Return the methods that could not take part, with why; None where all did."""
    if not skipped:
        return None
    return Table(
        caption="Methods that could not take part",
        heads=("method", "why not"),
        align="tt",
        rows=[(label, reason) for label, reason in skipped],
    )


def choice_tables(comparison: Comparison | None, *, depth_unit: str) -> list[Table]:
    """Return the tables of a comparison that a storm report prints; none without a comparison."""
    if comparison is None:
        return []
    tables = [
        score_table(comparison, depth_unit=depth_unit),
        step_table(comparison, depth_unit=depth_unit),
        skipped_table(tuple(comparison.skipped.items())),
    ]
    return [table for table in tables if table]
