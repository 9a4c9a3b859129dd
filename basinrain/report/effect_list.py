"""How much rests on infill: how the basin means move with its method, and what it does to the series."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Final

from basinrain.infill_effect import InfillEffect
from basinrain.report import limits
from basinrain.report.effect_figure import effect_picture
from basinrain.report.figures import Picture
from basinrain.report.hyetograph_figure import lead_method
from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, counted, depth_text, number_text, percent_text, unit_text, unit_word
from basinrain.results import AveragedRun, InfillRun, StormResult
from basinrain.series_check import COMPLETED, GAUGES, REPORTING_GAUGES, WET_DEPTH, SeriesCheck, SeriesFigures
from basinrain.units import depth_factor

__all__ = ["StormEffect", "series_table", "spread_table", "storm_effects", "totals_table"]


_SERIES: Final = (COMPLETED, REPORTING_GAUGES, GAUGES)


@dataclass(frozen=True)
class StormEffect:
    """What the section says of one storm: sentences, figures, tables."""

    storm: str
    sentences: tuple[str, ...]
    pictures: tuple[Picture, ...]
    tables: tuple[Table, ...]


def storm_effects(run: AveragedRun) -> list[StormEffect]:
    """Return the effect of the infill method in the first few storms, or in the whole record of a comparison."""
    return [_storm(run, result, k) for k, result in enumerate(limits.drawn_storms(run), start=1)]


def _storm(run: AveragedRun, result: StormResult, number: int) -> StormEffect:
    whole = isinstance(run, InfillRun)
    storm = result.storm.name.capitalize() if whole else result.storm.name
    basins = [(b, run.basins.ids[b]) for b in limits.drawn_basins(run)]
    tables: list[Table] = []
    pictures: list[Picture] = []
    sentences: list[str] = []
    effect = result.effect
    if effect is None:
        where = "the record" if whole else "this storm"
        sentences.append(f"Nothing was infilled in {where}, so no infill method moves its means.")
    else:
        lead = lead_method(result)
        picture = effect_picture(effect, lead, basins, depth_unit=run.depth_unit, name=f"effect-{number}", storm=storm)
        pictures += [picture] if picture else []
        what, methods = "record" if whole else "storm", counted(len(effect.methods), "infill method")
        sentences.append(f"The {what} was completed anew by {methods}, and averaged each time.")
        sentences += _skipped(effect)
        tables += [
            spread_table(effect, basins, depth_unit=run.depth_unit, storm=storm),
            totals_table(effect, lead, basins, depth_unit=run.depth_unit, storm=storm),
        ]
    if result.checks is not None:
        table = series_table(result.checks, [basin for _, basin in basins], depth_unit=run.depth_unit, storm=storm)
        tables += [table] if table else []
    return StormEffect(storm, tuple(sentences), tuple(pictures), tuple(tables))


def _skipped(effect: InfillEffect) -> list[str]:
    if not effect.skipped:
        return []
    reasons: dict[str, list[str]] = {}
    for label, reason in effect.skipped.items():
        reasons.setdefault(reason, []).append(label)
    parts = [f"{', '.join(labels)} ({reason})" for reason, labels in reasons.items()]
    return [f"Not possible here: {'; '.join(parts)}."]


def spread_table(effect: InfillEffect, basins: list[tuple[int, str]], *, depth_unit: str, storm: str) -> Table:
    """Return the job's own mean, the least and the greatest over the infill methods, by basin and averaging method.

    Parameters
    ----------
    effect
        The basin means by every infill method.
    basins
        Row and id of the basins to show.
    depth_unit
        ``"mm"`` or ``"in"``.
    storm
        The storm's name.
    """
    mm = depth_factor(depth_unit)
    own = effect.methods.index(effect.own)
    spreads = {averaging: effect.spread(averaging) for averaging in effect.totals}
    rows: list[Row] = []
    for b, basin in basins:
        for averaging, totals in effect.totals.items():
            spread = spreads[averaging][b]
            rows.append(
                (
                    basin,
                    averaging,
                    percent_text(float(effect.share_infilled[averaging][own, b])),
                    depth_text(float(totals[own, b]) / mm, depth_unit),
                    depth_text(spread.least / mm, depth_unit),
                    spread.least_by or DASH,
                    depth_text(spread.greatest / mm, depth_unit),
                    spread.greatest_by or DASH,
                    percent_text(spread.percent / 100),
                )
            )
    return Table(
        caption=f"{storm}: how the basin mean moves with the infill method, {unit_word(depth_unit)}",
        heads=("basin", "averaging", "share infilled", effect.own, "least", "by", "greatest", "by", "difference"),
        over=(("", 2), ("the job's own", 2), ("over the infill methods", 5)),
        align="ttnnntntn",
        rows=rows,
        notes=("Difference: greatest less least, in per cent of the mean over the infill methods.",),
    )


def totals_table(
    effect: InfillEffect, averaging: str, basins: list[tuple[int, str]], *, depth_unit: str, storm: str
) -> Table:
    """Return the basin means by one averaging method, a line an infill method.

    Parameters
    ----------
    effect, basins, depth_unit, storm
        As for :func:`spread_table`.
    averaging
        The averaging method.
    """
    totals = effect.totals[averaging] / depth_factor(depth_unit)
    rows = [
        (
            method,
            "the job's own" if method == effect.own else "",
            *(depth_text(float(totals[k, b]), depth_unit) for b, _ in basins),
            str(int(effect.left[k])),
        )
        for k, method in enumerate(effect.methods)
    ]
    notes = ["Left: values of gauges in service that the method leaves without a depth."]
    if any(averaging == name for name, _ in effect.refused):
        reasons = dict.fromkeys(reason for (name, _), reason in effect.refused.items() if name == averaging)
        notes.append(f"{DASH}: {'; '.join(reasons)}.")
    notes.append("All averaging methods are in infill_effect.csv.")
    return Table(
        caption=f"{storm}: basin means by {averaging}, by infill method, {unit_word(depth_unit)}",
        heads=("infill method", "", *(basin for _, basin in basins), "left"),
        align="tt" + "n" * (len(basins) + 1),
        rows=rows,
        notes=tuple(notes),
    )


def series_table(check: SeriesCheck, basins: list[str], *, depth_unit: str, storm: str) -> Table | None:
    """Return wet share, largest depths and variance of the series before and after infill; None without a series.

    Parameters
    ----------
    check
        The figures of all basins and averaging methods.
    basins
        Ids of the basins to show.
    depth_unit
        ``"mm"`` or ``"in"``.
    storm
        The storm's name.
    """
    mm = depth_factor(depth_unit)
    groups: dict[tuple[str, str], dict[str, SeriesFigures]] = {}
    for figures in check.figures:
        if figures.basin in basins and figures.steps:
            groups.setdefault((figures.basin, figures.method), {})[figures.series] = figures
    if not groups:
        return None

    def three(series: Mapping[str, SeriesFigures], text: Callable[[SeriesFigures], str]) -> list[str]:
        return [text(series[name]) if name in series else DASH for name in _SERIES]

    decimals = 2 if depth_unit == "mm" else 4
    rows: list[Row] = [
        (
            basin,
            method,
            *(str(series[name].steps) if name in series else DASH for name in (COMPLETED, GAUGES)),
            *three(series, lambda f: percent_text(f.wet_share)),
            *three(series, lambda f: depth_text(f.top_mean / mm, depth_unit)),
            *three(series, lambda f: number_text(f.variance / mm**2, decimals)),
        )
        for (basin, method), series in sorted(groups.items(), key=lambda item: basins.index(item[0][0]))
    ]
    most = max(figures.top_n for series in groups.values() for figures in series.values())
    notes = [
        "Completed: after infill. Reporting: without infill, weights rebuilt from the gauges that report.",
        f"Gauges: each gauge's own figures, averaged by the weights. A step is wet from {WET_DEPTH:g} mm.",
        "A mean over an area is wet more often and varies less than its gauges; infill shall not add to that.",
    ]
    if any(_silent(series) for series in groups.values()):
        notes.append(
            "Steps of gauges: the fewest of any that counts. Where they are fewer than the basin's, a gauge was silent "
            "for the rest; one that was silent over the peak lowers the gauges' figures, and they may then be below "
            "the basin's."
        )
    if len({figures.basin for figures in check.figures}) > len(basins):
        notes.append("All basins are in series_check.csv.")
    return Table(
        caption=f"{storm}: the series before and after infill",
        heads=("basin", "averaging", "completed", "gauges", *(("completed", "reporting", "gauges") * 3)),
        over=(
            ("", 2),
            ("steps", 2),
            ("wet steps", 3),
            (f"mean of the {most} largest steps, {unit_text(depth_unit)}", 3),
            (f"variance, {unit_text(depth_unit)}²", 3),
        ),
        align="tt" + "n" * 11,
        rows=rows,
        notes=tuple(notes),
    )


def _silent(series: Mapping[str, SeriesFigures]) -> bool:
    return COMPLETED in series and GAUGES in series and series[GAUGES].steps < series[COMPLETED].steps
