"""Consistency over the years: slopes of the double-mass curves, and the tests of homogeneity."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

from basinrain.report import limits
from basinrain.report.double_mass_figure import MOST_CURVES, drawn_curves
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, counted, number_text
from basinrain.screening.double_mass import DoubleMass
from basinrain.screening.homogeneity import Homogeneity, TestResult

__all__ = ["curve_sentence", "double_mass_table", "homogeneity_table"]

_NAMES: Final = {
    "snht": "SNHT T₀",
    "buishand-range": "Buishand R/√n",
    "pettitt": "Pettitt K",
    "von-neumann": "von Neumann N",
}
_DECIMALS: Final = {"snht": 2, "buishand-range": 2, "pettitt": 0, "von-neumann": 2}
_ORDER: Final = {"suspect": 0, "doubtful": 1, "useful": 2, None: 3}


def curve_sentence(curves: Sequence[DoubleMass]) -> str:
    """Return how many curves were looked at, how many break, and how many are drawn."""
    if not curves:
        return "No gauge has years and neighbours enough for a double-mass curve."
    broken = sum(curve.break_after is not None and curve.significant for curve in curves)
    text = f"{counted(len(curves), 'curve was', 'curves were')} looked at; "
    if not broken:
        return f"{text}none breaks."
    text += f"{counted(broken, 'breaks', 'break')} at the level of 1 %."
    if broken > len(drawn_curves(curves)):
        text += f" Drawn are the {MOST_CURVES} clearest; all are in double_mass.csv."
    return text


def double_mass_table(curves: Sequence[DoubleMass]) -> Table | None:
    """Return break, slopes and significance of every curve, the clearest breaks first; None without a curve."""
    if not curves:
        return None
    ordered = sorted(curves, key=lambda c: (not c.significant, -_known(c.f), c.gauge))
    shown = ordered[: limits.GAUGES]
    rows: list[Row] = []
    for curve in shown:
        after = curve.break_after
        rows.append(
            (
                curve.gauge,
                ", ".join(curve.reference),
                str(len(curve.years)),
                str(curve.days.min()),
                str(after) if after is not None else DASH,
                number_text(curve.slopes[0], 3),
                number_text(curve.slopes[1], 3) if after is not None else DASH,
                number_text(curve.ratio, 3),
                number_text(curve.f, 1),
                _probability(curve.significance),
                "breaks" if curve.significant else "no break",
            )
        )
    notes = [
        "Years: sums are over the days that the gauge and three neighbours share, 90 % or more of the year's.",
        "Fewest days: of the year with the fewest.",
        "Slopes: gauge over the mean of its neighbours, before and after the most likely break.",
        "Ratio: newer over older years, by which the older would be multiplied; the record is not changed by it.",
        "Probability: of so large an F by chance, over all breaks tried; at most 0.01 counts as a break.",
    ]
    if len(shown) < len(curves):
        notes.append(f"Shown: {len(shown)} of {len(curves)} gauges. All are in double_mass.csv.")
    return Table(
        caption="Double-mass curves",
        heads=(
            "gauge",
            "neighbours",
            "years",
            "fewest days",
            "most likely break after",
            "slope before",
            "slope after",
            "ratio",
            "F",
            "probability",
            "judged",
        ),
        align="ttnnnnnnnnt",
        rows=rows,
        notes=tuple(notes),
    )


def _known(value: float) -> float:
    return -1.0 if math.isnan(value) else value


def _probability(value: float) -> str:
    return "<\u202f0.001" if value < 0.001 else number_text(value, 3)


def homogeneity_table(tested: Sequence[Homogeneity]) -> Table | None:
    """Return the four statistics with their critical values and the grade, the worst first; None where none was tested.

    Parameters
    ----------
    tested
        One a gauge.
    """
    if not tested:
        return None
    ordered = sorted(tested, key=lambda t: (_ORDER[t.grade], -t.rejections, t.gauge))
    shown = ordered[: limits.GAUGES]
    rows: list[Row] = []
    for one in shown:
        by_name = {test.test: test for test in one.counted}
        rows.append(
            (
                one.gauge,
                str(len(one.years)),
                "ratios" if one.reference else "alone",
                *(_cell(by_name[name]) if name in by_name else DASH for name in _NAMES),
                str(one.rejections),
                one.grade or "no grade",
                str(one.break_after) if one.break_after is not None else DASH,
            )
        )
    notes = [
        "Statistic, and in brackets the critical value at 1 %; von Neumann's rejects below it, the others above.",
        "Ratios: of annual totals to the neighbours' mean over the days that they share, 90 % or more of the year's.",
        "Alone: the gauge's mean depths of a day, in years with 95 % of their days, where it has no such neighbours.",
        "Grade: none or one of the four rejects at 1 %, useful; two, doubtful; three or four, suspect.",
        "Grades after Wijngaard, Klein Tank and Können (2003). With fewer than 20 years there is none.",
    ]
    if len(shown) < len(tested):
        notes.append(f"Shown: {len(shown)} of {len(tested)} gauges, the worst first. All are in homogeneity.csv.")
    return Table(
        caption="Tests of homogeneity",
        heads=("gauge", "years", "tested", *_NAMES.values(), "rejecting", "grade", "change after"),
        align="tntttttntn",
        rows=rows,
        notes=tuple(notes),
    )


def _cell(test: TestResult) -> str:
    digits = _DECIMALS[test.test]
    text = number_text(test.statistic, digits)
    if 0.01 not in test.critical:
        return text
    rejects = " rejects" if test.rejected_at == 0.01 else ""
    return f"{text} ({number_text(test.critical[0.01], digits)}){rejects}"
