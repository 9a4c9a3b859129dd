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
from basinrain.designstorm.patterns import PATTERNS
from basinrain.designstorm.reach import SLACK
from basinrain.designstorm.storm_depths import StormRarity
from basinrain.jobfile.design_tables import NO_REDUCTION, UpliftTable
from basinrain.notes import Note
from basinrain.screening.envelope import world_depth
from basinrain.units import area_factor, depth_factor

__all__ = ["DESIGN_CAUTION", "climate_sentence", "design_cautions"]

DESIGN_CAUTION: Final = (
    "Inputs for the judgement of a licensed engineer, not a design. Local criteria govern: which depths, areal "
    "reduction, duration, pattern and probability apply is theirs to say. A design storm is no storm that has fallen, "
    "and the probability of its depth is not that of the flood it causes."
)

_LISTED: Final = 5

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
    depth_unit: str,
) -> Iterator[Note]:
    """Yield warnings and remarks about design storms.

    Parameters
    ----------
    asked, areas, sourced, links, storms, rarities, record
        Parts of a run.
    area_unit, depth_unit
        The units in which areas and depths are said.
    """
    design = asked.design
    yield Note(code="climate", level="info", text=climate_sentence(design.uplift))
    yield from _of_reduction(asked, areas, sourced, links, area_unit)
    yield from _of_falling(links)
    yield from _of_points(sourced, links, depth_unit)
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
    same = [f"{each.label} is {each.to(PARTIAL_DURATION).return_period:.4g} years" for each in asked.frequencies]
    yield Note(
        code="series-converted",
        level="info",
        text="The depths are of a partial duration series; its return periods T were brought to annual exceedance "
        f"probabilities by AEP = 1 - exp(-1/T) (Langbein 1949): {', '.join(same)}.",
    )


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
    if asked.design.own_area:
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


def _of_points(sourced: Sourced, links: Mapping[tuple[str, Frequency], Links], unit: str) -> Iterator[Note]:
    """Yield depths that were never measured anywhere, and depth points that count nowhere."""
    beyond: dict[str, float] = {}
    for (name, _), found in links.items():
        world = np.array([world_depth(minutes / 60) for minutes in found.minutes])
        for k in np.flatnonzero(found.unreduced > world):
            place = f"{name}, {duration_text(found.minutes[k])}"
            beyond[place] = max(beyond.get(place, 0.0), float(found.unreduced[k]))
    if beyond:
        places = [f"{place}: {depth / depth_factor(unit):.4g} {unit}" for place, depth in beyond.items()]
        more = " and more" if places[_LISTED:] else ""
        yield Note(
            code="beyond-envelope",
            text="Depths are over the greatest known in the world for their duration (about 422 mm times the 0.475th "
            f"power of hours, from memory): {', '.join(places[:_LISTED])}{more}. Check unit and duration_unit.",
        )
    nowhere = [
        point
        for point, counts in zip(sourced.source.points, np.any(sourced.weights > 0, axis=0).tolist(), strict=True)
        if not counts
    ]
    if nowhere and not sourced.source.areal:
        yield Note(
            code="points-not-counted",
            level="info",
            text=f"Depth points that count in no area: {', '.join(nowhere[:_LISTED])}"
            f"{f' and {len(nowhere) - _LISTED} more' if nowhere[_LISTED:] else ''}.",
        )


def _of_extrapolation(asked: Asked, sourced: Sourced) -> Iterator[Note]:
    source = sourced.source
    least, most = source.frequencies[0].variate, source.frequencies[-1].variate
    outside = [f.label for f in asked.frequencies if not least - SLACK <= f.variate <= most + SLACK]
    longer = [duration_text(m) for m in asked.minutes if not source.shortest <= m <= source.longest]
    if asked.step < source.shortest and any(PATTERNS[table.shape].by_curve for table in asked.design.pattern):
        longer.insert(0, f"steps of {duration_text(asked.step)}")
    if outside or longer:
        yield Note(
            code="extrapolated",
            text="Depths were extrapolated beyond their source, since the job says so: "
            f"{', '.join([*outside, *longer])}.",
        )
