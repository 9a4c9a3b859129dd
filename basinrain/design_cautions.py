"""What a reviewer of design storms would ask about, drawn from the results of a run.

The limits are conventions of this package, chosen to make a reader look, not to pass or fail a result.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Final

import numpy as np

from basinrain.design_areas import Areas
from basinrain.design_asked import Asked
from basinrain.design_record import RecordSource
from basinrain.design_sources import Sourced
from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.depth_chain import Links
from basinrain.designstorm.design_storms import DesignStorm
from basinrain.designstorm.exceedance import PARTIAL_DURATION, Frequency
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.reach import SLACK
from basinrain.designstorm.storm_depths import StormRarity
from basinrain.jobfile.design_tables import NO_REDUCTION, UpliftTable
from basinrain.notes import Note
from basinrain.units import area_factor

__all__ = ["DESIGN_CAUTION", "OF_CURVES", "climate_sentence", "design_cautions"]

DESIGN_CAUTION: Final = (
    "Inputs for the judgement of a licensed engineer, not a design. Local criteria govern: which depths, areal "
    "reduction, duration, pattern and probability apply is theirs to say. A design storm is no storm that has fallen, "
    "and the probability of its depth is not that of the flood it causes."
)

OF_CURVES: Final = frozenset({"alternating-block", "chicago", "nested"})
"""Shapes that ask for depths of durations down to a step."""

_UNREDUCED: Final = 25e6
"""m²; a point's depth is often taken for areas up to about this one (common practice; ten square miles)."""


def design_cautions(
    asked: Asked,
    areas: Areas,
    sourced: Sourced,
    *,
    links: Mapping[tuple[str, Frequency], Links],
    storms: Sequence[DesignStorm],
    rarities: Sequence[StormRarity],
    record: RecordSource | None,
    area_unit: str,
) -> Iterator[Note]:
    """Yield warnings and remarks about design storms.

    Parameters
    ----------
    asked, areas, sourced, links, storms, rarities, record
        Parts of a run.
    area_unit
        The unit in which areas are said.
    """
    design = asked.design
    yield Note(code="climate", level="info", text=climate_sentence(design.uplift))
    yield from _of_reduction(asked, areas, sourced, links, area_unit)
    yield from _of_falling(links)
    points = (f"{name}: {text}" for (name, _), found in links.items() for text in found.clamped)
    for text in dict.fromkeys((*points, *(text for storm in storms for text in storm.clamped))):
        yield Note(code="reduction-clamped", text=text)
    if sourced.source.series == PARTIAL_DURATION and design.depths.convert:
        yield from _of_conversion(asked)
    if design.depths.extrapolate:
        yield from _of_extrapolation(asked, sourced)
    if design.depths.interval_factor is not None:
        yield Note(
            code="interval-factor",
            level="info",
            text=f"Depths were multiplied by factors for fixed intervals ({design.depths.interval_factor}), since the "
            "job says so.",
        )
    if record is not None:
        for remark in record.depths.remarks:
            yield Note(code="depths-from-record", text=remark)
        if design.depths.interval_factor is None:
            yield Note(
                code="fixed-intervals",
                text=f"Depths from the record are sums of its steps of {duration_text(record.step)}: for durations of "
                "few steps they read lower than true-interval depths, and nothing was done about it.",
            )
    made = {storm.minutes for storm in storms}
    if bare := [duration_text(minutes) for minutes in asked.minutes if minutes not in made]:
        yield Note(
            code="no-pattern",
            text=f"No hyetograph is made for {', '.join(bare)}: every pattern's own durations leave it out.",
        )
    for storm in storms:
        for remark in storm.remarks:
            yield Note(
                code="pattern", level="info", text=f"{storm.choice.label}, {duration_text(storm.minutes)}: {remark}"
            )
    for found in rarities:
        for text in found.left_out:
            yield Note(code="rarity-left-out", level="info", storm=found.storm, text=text)
        for text in found.clamped:
            yield Note(code="rarity-clamped", storm=found.storm, text=f"Areal depths that it is compared with: {text}")


def climate_sentence(uplift: UpliftTable | None) -> str:
    """Return what a design says of the climate to come."""
    if uplift is None:
        return "Climate change is not included: the depths are those of the source, and the job gives no uplift."
    return f"Depths were multiplied by {uplift.factor:g} for the climate of {uplift.horizon} ({uplift.source})."


def _of_conversion(asked: Asked) -> Iterator[Note]:
    design = asked.design
    by = "by AEP = 1 - exp(-1/T) (Langbein 1949)"
    same = [f"AEP {each.aep:.4g} is {each.return_period:.4g} years" for each in asked.frequencies]
    if design.aep is not None:
        text = (
            "The depths are of a partial duration series; annual exceedance probabilities were brought to its return "
            f"periods T {by}: {', '.join(same)}."
        )
        yield Note(code="series-converted", level="info", text=text)
    table = design.areal_reduction
    if table is not None and table.method in REDUCTIONS and REDUCTIONS[table.method].uses_frequency:
        text = (
            "The areal reduction goes by the annual exceedance probability, which return periods T of the depths' "
            f"partial duration series have {by}{'' if design.aep is not None else ': ' + ', '.join(same)}."
        )
        yield Note(code="series-converted", level="info", text=text)


def _of_reduction(
    asked: Asked, areas: Areas, sourced: Sourced, links: Mapping[tuple[str, Frequency], Links], area_unit: str
) -> Iterator[Note]:
    table = asked.design.areal_reduction
    if sourced.source.areal:
        return
    if table is None or table.method == NO_REDUCTION:
        for point in areas.points:
            if (area := areas.basins.areas[point.row]) > _UNREDUCED:
                yield Note(
                    code="not-reduced",
                    text=f"{point.name}: point depths are used over {area / area_factor(area_unit):.4g} {area_unit} "
                    "without an areal reduction, which overstates the depth of an area of this size.",
                )
        return
    method = REDUCTIONS[table.method]
    if method.evidence:
        yield Note(code="reduction-evidence", level="info", text=f"{method.title}: {method.evidence}")
    for text in dict.fromkeys(remark for found in links.values() for remark in found.remarks):
        yield Note(code="areal-reduction", level="info", text=text)
    if table.area == "own":
        yield Note(
            code="own-area",
            text="Each basin's depth is reduced by its own area, since the job says so: together they are more rain "
            "than the areal depth to the point of interest, and belong to no one storm over all of them.",
        )


def _of_falling(links: Mapping[tuple[str, Frequency], Links]) -> Iterator[Note]:
    """Yield where an areal depth is less than that of a shorter duration, the most of all frequencies."""
    most: dict[tuple[str, str, str], float] = {}
    for (name, _), found in links.items():
        fallen = 1 - found.areal[1:] / found.areal[:-1]
        for k in np.flatnonzero(fallen > SLACK):
            place = (name, duration_text(found.minutes[k]), duration_text(found.minutes[k + 1]))
            most[place] = max(most.get(place, 0.0), float(fallen[k]))
    for (name, shorter, longer), share in most.items():
        yield Note(
            code="depth-falls",
            text=f"{name}: the areal depth of {longer} is up to {100 * share:.2g} % less than that of {shorter}, "
            "which no rain can be: the areal reductions of the two durations, or their factors for fixed intervals, do "
            "not go together.",
        )


def _of_extrapolation(asked: Asked, sourced: Sourced) -> Iterator[Note]:
    source = sourced.source
    known = source.frequencies
    outside = [f.label for f in asked.frequencies if not known[0] <= f <= known[-1]]
    longer = [duration_text(m) for m in asked.minutes if not source.shortest <= m <= source.longest]
    if asked.step < source.shortest and any(pattern.shape in OF_CURVES for pattern in asked.design.pattern):
        longer.insert(0, f"steps of {duration_text(asked.step)}")
    if outside or longer:
        yield Note(
            code="extrapolated",
            text="Depths were extrapolated beyond their source, since the job says so: "
            f"{', '.join([*outside, *longer])}.",
        )
