"""Section 5: the gauges, and what each recorded in every storm."""

from __future__ import annotations

from typing import Final

import numpy as np
import shapely

from basinrain.basins import UNION
from basinrain.report import limits
from basinrain.report.table import Table, lines
from basinrain.report.words import DASH, counted, depth_text, number_text, unit_text, unit_word
from basinrain.results import StormRun
from basinrain.units import length_factor

__all__ = ["network_table", "totals_tables"]

_TOUCH: Final = 1e-3
_STORMS_ABREAST: Final = 3


def network_table(run: StormRun) -> Table:
    """Return where the gauges are: position in the working plane, elevation, the basin that they lie in."""
    network = run.network
    listed = np.flatnonzero(limits.listed_gauges(run))
    points = shapely.points(network.x, network.y)
    basins = [b for b, basin in enumerate(run.basins.ids) if basin != UNION]
    inside = np.array([shapely.dwithin(points, run.basins.polygons[b], _TOUCH) for b in basins])
    unit = str(run.settings.get("gauges", {}).get("elevation_unit", "m"))
    metres = length_factor(unit)
    normals = network.normals is not None
    rows = []
    for g in listed:
        where = [run.basins.ids[basins[k]] for k in np.flatnonzero(inside[:, g])]
        cells = [
            network.ids[g],
            network.names[g],
            number_text(float(network.x[g]) / 1000, 2),
            number_text(float(network.y[g]) / 1000, 2),
            number_text(float(network.elevation[g]) / metres, 0),
            ", ".join(where) or "outside",
        ]
        if network.normals is not None:
            cells.append(depth_text(float(network.normals[g].sum()) / _mm(run), run.depth_unit))
        rows.append(tuple(cells))
    heads = ["gauge", "name", "easting, km", "northing, km", f"elevation, {unit}", "basin"]
    period = f" {network.normal_period}" if network.normal_period else ""
    if normals:
        heads.append(f"normal of the year{period}, {unit_text(run.depth_unit)}")
    return Table(
        caption="The gauges in the working plane",
        heads=tuple(heads),
        align="ttnnnt" + "n" * normals,
        rows=rows,
        notes=_others(run, len(listed)),
    )


def _mm(run: StormRun) -> float:
    return 25.4 if run.depth_unit == "in" else 1.0


def _others(run: StormRun, listed: int) -> tuple[str, ...]:
    rest = len(run.network) - listed
    if not rest:
        return ()
    return (
        f"Not shown: {counted(rest, 'gauge')} with a weight below {limits.LISTED_WEIGHT} everywhere.",
        "All are in gauge_totals.csv.",
    )


def totals_tables(run: StormRun) -> list[Table]:
    """Return what the gauges recorded, a few storms side by side in each table."""
    totals = {(row.storm, row.gauge): row for row in lines(run.gauge_totals)}
    listed = [run.network.ids[g] for g in np.flatnonzero(limits.listed_gauges(run))]
    tables = []
    names = [result.storm.name for result in run.storms][: 2 * _STORMS_ABREAST]
    for first in range(0, len(names), _STORMS_ABREAST):
        storms = names[first : first + _STORMS_ABREAST]
        rows = []
        for gauge in listed:
            cells = [gauge]
            for storm in storms:
                found = totals[storm, gauge]
                cells += [
                    depth_text(found.depth, run.depth_unit),
                    found.status,
                    f"{found.steps_observed} of {found.steps_total}",
                ]
            rows.append(tuple(cells))
        more = len(run.storms) - len(names)
        tables.append(
            Table(
                caption=f"Storm totals of the gauges, {unit_word(run.depth_unit)}",
                heads=("gauge", *(("depth", "status", "steps observed") * len(storms))),
                over=(("", 1), *((storm, 3) for storm in storms)),
                align="t" + "ntn" * len(storms),
                rows=rows,
                notes=(
                    f"{DASH}: no total is known or could be estimated.",
                    "Spread: a depth measured over a longer time.",
                    *_others(run, len(listed)),
                    *(
                        (f"{counted(more, 'more storm is', 'more storms are')} in gauge_totals.csv.",)
                        if more and first + len(storms) == len(names)
                        else ()
                    ),
                ),
            )
        )
    return tables
