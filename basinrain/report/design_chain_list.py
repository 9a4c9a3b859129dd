"""From point depth to areal depth, link by link, printed so that it can be reckoned again by hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from decimal import ROUND_HALF_UP, Decimal
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.design_areas import ReducedArea
from basinrain.designstorm.depth_chain import Links
from basinrain.designstorm.measures import duration_text
from basinrain.jobfile.design_tables import NO_REDUCTION
from basinrain.report import design_shown
from basinrain.report.design_depths_figure import depths_picture
from basinrain.report.figures import Picture
from basinrain.report.table import Row, Table
from basinrain.report.words import area_text, depth_decimals, depth_text, number_text, unit_text, unit_word
from basinrain.results_design import DesignRun
from basinrain.units import area_factor, depth_factor

__all__ = ["chain_pictures", "chain_sentences", "chain_tables", "reduces"]

_FACTOR: Final = 4
"""Decimals of a factor, at least."""

_MORE: Final = 5
"""Decimals that may be added so that what is printed multiplies to what is printed."""

Floats = npt.NDArray[np.float64]


def reduces(run: DesignRun) -> bool:
    """Return whether depths were reduced over an area."""
    table = run.asked.design.areal_reduction
    return not run.sourced.source.areal and table is not None and table.method != NO_REDUCTION


def chain_sentences(run: DesignRun) -> list[str]:
    """Return how areal depths come about, and which links there are none of."""
    design, areal = run.asked.design, run.sourced.source.areal
    sentences = []
    if areal:
        sentences.append(
            "The depths are areal already: they were fitted to the means over each area, so that nothing is reduced."
        )
    if _factored(run) or not areal:
        sentences.append(
            f"Areal depth = {'depth from the record' if areal else 'point depth'} × interval factor × uplift"
            f"{'' if areal else ' × areal reduction'}, each factor as it stands in the tables."
        )
    if not areal:
        sentences.append(
            "The point depth is the mean over the area above the point of interest of the depths at its points."
        )
    none = []
    if design.depths.interval_factor is None:
        none.append("interval factor")
    if design.uplift is None:
        none.append("uplift")
    if not areal and not reduces(run):
        none.append("areal reduction")
    if none:
        stands = f": 1 stands for {'it' if len(none) == 1 else 'them'}" if _factored(run) or not areal else ""
        sentences.append(f"The job asks for no {' and no '.join(none)}{stands}.")
    return sentences


def _factored(run: DesignRun) -> bool:
    return run.asked.design.depths.interval_factor is not None or run.asked.design.uplift is not None


def chain_tables(run: DesignRun) -> list[Table]:
    """Return a table for every area that is shown: one row per frequency and duration."""
    tables = [_table(run, area) for area in design_shown.reduced(run)]
    left_out = design_shown.left_out(run, "design_depths.csv", areas=True)
    tables[-1] = replace(tables[-1], notes=(*tables[-1].notes, *left_out))
    return tables


def _table(run: DesignRun, area: ReducedArea) -> Table:
    areal, unit, factored = run.sourced.source.areal, unit_word(run.depth_unit), _factored(run)
    shown = [(frequency, run.links[area.name, frequency]) for frequency in design_shown.frequencies(run)]
    places = [run.asked.minutes.index(minutes) for minutes in design_shown.durations(run)]
    more = _decimals_more([links for _, links in shown], places, run.depth_unit)
    rows: list[Row] = []
    for frequency, links in shown:
        for d in places:
            *factors, depth = _printed(links, d, run.depth_unit, more)
            links_shown = (factors[:-1] if factored else []) if areal else factors
            rows.append((frequency.label, duration_text(float(links.minutes[d])), *links_shown, depth))
    size = area_text(float(run.areas.basins.areas[area.reduced_as]) / area_factor(run.area_unit))
    first = f"{'from the record' if areal else 'point depth'}, {unit}"
    last = () if areal else ("× areal reduction",)
    products = (first, "× interval factor", "× uplift", *last, "= ") if factored or not areal else ("",)
    heads = ("frequency", "duration", *products[:-1], f"{products[-1]}areal depth, {unit}")
    return Table(
        caption=f"{area.name}: {'areal depth' if areal else 'from point depth to areal depth'} over {size} "
        f"{unit_text(run.area_unit)}",
        heads=heads,
        align="tn" + "n" * (len(heads) - 2),
        rows=rows,
    )


def _decimals_more(shown: Sequence[Links], places: Sequence[int], unit: str) -> int:
    """Return how many more decimals it takes so that all that is printed multiplies to what is printed."""
    for more in range(_MORE):
        every = [_printed(links, d, unit, more) for links in shown for d in places]
        if all(_product(cells[:-1], unit) == cells[-1] for cells in every):
            return more
    return _MORE


def _printed(links: Links, d: int, unit: str, more: int) -> list[str]:
    """Return point depth, the three factors and the areal depth; the uplift is as the job has it."""
    mm = depth_factor(unit)
    interval, reduction = (
        "1" if factor == 1 else number_text(float(factor), _FACTOR + more)
        for factor in (links.interval_factor[d], links.reduction[d])
    )
    return [
        number_text(float(links.point[d]) / mm, depth_decimals(unit) + 1 + more),
        interval,
        f"{links.uplift:.12g}",
        reduction,
        depth_text(float(links.areal[d]) / mm, unit),
    ]


def _product(cells: Sequence[str], unit: str) -> str:
    product = Decimal(1)
    for cell in cells:
        product *= Decimal(cell)
    return str(product.quantize(Decimal(1).scaleb(-depth_decimals(unit)), ROUND_HALF_UP))


def chain_pictures(run: DesignRun) -> list[Picture]:
    """Return a figure for every area that is shown; none where there is one duration only."""
    if len(run.asked.minutes) < 2:
        return []
    minutes = np.array(run.asked.minutes, dtype=float)
    pictures = []
    for number, area in enumerate(design_shown.reduced(run), start=1):
        every = [run.links[area.name, frequency] for frequency in run.asked.frequencies]
        areal = np.array([links.areal for links in every])
        before = np.array([links.unreduced for links in every])
        picture = depths_picture(
            minutes,
            run.asked.frequencies,
            # Two curves in one place tell nothing.
            before if reduces(run) else np.full_like(before, np.nan),
            areal,
            depth_unit=run.depth_unit,
            title=area.name,
            name=f"design-depths-{number}",
        )
        pictures.append(replace(picture, caption=" ".join([picture.caption, *_with_words(run)])))
    return pictures


def _with_words(run: DesignRun) -> list[str]:
    design = run.asked.design
    words = [
        word
        for word, here in (
            ("the interval factor", design.depths.interval_factor is not None),
            ("the uplift", design.uplift is not None),
        )
        if here
    ]
    if not words or not reduces(run):
        return []
    return [
        f"Point depths are drawn with {' and '.join(words)}, so that what lies between the curves is the reduction."
    ]
