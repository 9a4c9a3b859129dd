"""How rare observed storms were: what it means, and every depth that was compared."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.storm_depths import RarityRow, StormRarity
from basinrain.report import design_shown, limits
from basinrain.report.figures import Picture
from basinrain.report.rarity_figure import rarity_picture
from basinrain.report.table import Row, Table
from basinrain.report.words import counted, depth_text, unbroken, unit_word, when_text, zone_text
from basinrain.results_design import DesignRun
from basinrain.units import depth_factor

__all__ = ["StormShown", "rarity_facts", "rarity_meaning", "rarity_shown"]

_ROWS: Final = 48


@dataclass(frozen=True)
class StormShown:
    """What the page shows of one storm.

    Parameters
    ----------
    storm
        Its name.
    sentences
        What is said of this storm; of several storms what is said of it alone.
    picture
        Its figure; None where there is nothing to draw.
    tables
        Its depths over areas, and at the wettest gauges.
    """

    storm: str
    sentences: tuple[str, ...]
    picture: Picture | None
    tables: tuple[Table, ...]


def rarity_facts(run: DesignRun) -> list[tuple[str, str]]:
    """Return how the storms were averaged and what they were compared with; nothing where no storm was."""
    table = run.asked.design.rarity
    if table is None or not run.rarities:
        return []
    lines = [
        ("Storms", design_shown.cut([found.storm for found in run.rarities], design_shown.AREAS)),
        ("Average", table.average),
        ("Infill", design_shown.infill_words(run)),
    ]
    uplift = " without the uplift, which is for a climate to come"
    lines.append(("Compared with", f"the depths of the design{uplift if run.asked.design.uplift is not None else ''}"))
    return lines


def rarity_meaning(run: DesignRun) -> list[str]:
    """Return what is said of every one of several storms, so that it stands once: what a probability means.

    The first sentence of a storm says which of its depths was the rarest, and stays with it.
    """
    if len(run.rarities) < 2:
        return []
    every = [found.sentences[1:] for found in run.rarities]
    return [text for text in every[0] if all(text in sentences for sentences in every)]


def rarity_shown(run: DesignRun) -> list[StormShown]:
    """Return what is shown of the first storms."""
    common = rarity_meaning(run)
    shown = []
    for number, found in enumerate(run.rarities[: limits.STORMS], start=1):
        shown.append(
            StormShown(
                storm=found.storm,
                sentences=tuple(text for text in found.sentences if text not in common),
                picture=rarity_picture(found, _area(run, found), depth_unit=run.depth_unit, name=f"rarity-{number}"),
                tables=_tables(run, found),
            )
        )
    return shown


def _area(run: DesignRun, found: StormRarity) -> str:
    """Return the area of the figure: that of the rarest depth, or the first point of interest where none stands out."""
    places = {row.place for row in found.rarest}
    return places.pop() if len(places) == 1 else run.areas.points[0].name


def _tables(run: DesignRun, found: StormRarity) -> tuple[Table, ...]:
    shown, more = _shown(found)
    unit = unit_word(run.depth_unit)
    clock = any(row.aligned == row.aligned for row in found.rows)
    tables = [
        Table(
            caption=f"{found.storm}: greatest mean depths over areas, {unit}, and how rare",
            heads=("area", *_heads(unit, clock=clock)),
            align=_align(clock=clock),
            rows=[_row(run, row, clock=clock) for row in shown],
            notes=(
                f"Times are in {zone_text(run.zone)}.",
                *_remarks(found.rows),
                *((f"Not compared: {'; '.join(found.left_out)}.",) if found.left_out else ()),
                *((f"{counted(more, 'more area is', 'more areas are')} in storm_rarity.csv.",) if more else ()),
            ),
        )
    ]
    if found.gauge_rows:
        tables.append(
            Table(
                caption=f"{found.storm}: the wettest gauge of each duration, {unit}, and how rare at a point",
                heads=("gauge", *_heads(unit, clock=clock)),
                align=_align(clock=clock),
                rows=[_row(run, row, clock=clock) for row in found.gauge_rows],
            )
        )
    return tuple(tables)


def _heads(unit: str, *, clock: bool) -> Row:
    return ("duration", f"depth, {unit}", "ending", *((f"by the clock, {unit}",) if clock else ()), "how rare")


def _align(*, clock: bool) -> str:
    return "ttn" + "n" * (2 if clock else 1) + "t"


def _row(run: DesignRun, row: RarityRow, *, clock: bool) -> Row:
    mm = depth_factor(run.depth_unit)
    aligned = (depth_text(row.aligned / mm, run.depth_unit),) if clock else ()
    return (
        row.place,
        duration_text(row.minutes) + ("*" if row.remark else ""),
        depth_text(row.found.depth / mm, run.depth_unit),
        unbroken(when_text(row.end)),
        *aligned,
        row.found.words,
    )


def _shown(found: StormRarity) -> tuple[list[RarityRow], int]:
    """Return the rows of points of interest and of the first basins, and how many areas are left out."""
    areas = list(dict.fromkeys(row.place for row in found.rows))
    most = max(1, _ROWS // max(1, sum(row.place == areas[0] for row in found.rows))) if areas else 0
    rarest = [row.place for row in found.rarest][:1]
    kept = set([*rarest, *(area for area in areas if area not in rarest)][:most])
    return [row for row in found.rows if row.place in kept], len(areas) - len(kept)


def _remarks(rows: Sequence[RarityRow]) -> tuple[str, ...]:
    """Return what is remarked of durations, each once."""
    remarks = list(dict.fromkeys((duration_text(row.minutes), row.remark) for row in rows if row.remark))
    if not remarks:
        return ()
    # They differ by the number of steps only: the first and the last tell the others.
    told = "; ".join(f"{duration}: {remark}" for duration, remark in design_shown.spread(remarks, 2))
    return (f"* {told}.", *(("The remarks between are in storm_rarity.csv.",) if remarks[2:] else ()))
