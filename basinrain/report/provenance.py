"""Sections 7 and 8: the ground, the methods with their formulas, the inputs and the job."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from markupsafe import Markup

from basinrain.ground import LOCAL
from basinrain.report.table import Table
from basinrain.report.words import NARROW_SPACE
from basinrain.results import StormRun
from basinrain.results_common import GaugedRun, Run

__all__ = [
    "Formula",
    "formulas",
    "ground_facts",
    "infill_formulas",
    "inputs_table",
    "mean_formulas",
    "settings_text",
    "versions_table",
]


@dataclass(frozen=True)
class Formula:
    """A method's formula, in a line, with its source."""

    method: str
    formula: Markup
    source: str


_MEANS: Final = {
    "arithmetic": Formula(
        "arithmetic",
        Markup("<i>w<sub>i</sub></i> = 1 / <i>n</i> for the <i>n</i> gauges that the job takes"),
        "common practice",
    ),
    "thiessen": Formula(
        "thiessen",
        Markup(
            "<i>w<sub>i</sub></i> = <i>A<sub>i</sub></i> / <i>A</i>, <i>A<sub>i</sub></i> "
            "the part of the basin that is nearer to gauge <i>i</i> than to any other"
        ),
        "Thiessen (1911), Monthly Weather Review 39, 1082–1084",
    ),
    "idw": Formula(
        "idw",
        Markup(
            "<i>w<sub>i</sub></i> = mean over the grid cells, by their area in the basin, of "
            "<i>d<sub>i</sub></i><sup>−<i>p</i></sup> / Σ<i><sub>j</sub></i> <i>d<sub>j</sub></i><sup>−<i>p</i></sup>"
        ),
        "Shepard (1968), Proceedings of the 23rd ACM National Conference, 517–524",
    ),
}
_PAULHUS: Final = "Paulhus and Kohler (1952), Monthly Weather Review 80, 129–133"
_AVERAGE: Final = Markup("<i>P<sub>x</sub></i> = (1 / <i>m</i>) Σ<i><sub>i</sub></i> <i>P<sub>i</sub></i>")
_BY_NORMALS: Final = Markup(
    "<i>P<sub>x</sub></i> = (1 / <i>m</i>) Σ<i><sub>i</sub></i> (<i>N<sub>x</sub></i> / <i>N<sub>i</sub></i>) "
    "<i>P<sub>i</sub></i>"
)
_INFILLS: Final = {
    "nearest-gauge": Formula(
        "nearest-gauge",
        Markup("<i>P<sub>x</sub></i> = <i>P</i><sub>1</sub>, the depth at the nearest reporting gauge"),
        "common practice",
    ),
    "station-average": Formula("station-average", _AVERAGE, "common practice"),
    "inverse-distance": Formula(
        "inverse-distance",
        Markup(
            "<i>P<sub>x</sub></i> = Σ<i><sub>i</sub></i> <i>d<sub>i</sub></i><sup>−<i>p</i></sup> <i>P<sub>i</sub></i> "
            "/ Σ<i><sub>i</sub></i> <i>d<sub>i</sub></i><sup>−<i>p</i></sup>"
        ),
        "Shepard (1968), as above; with p = 2 common practice for gauges",
    ),
    "four-quadrant": Formula(
        "four-quadrant",
        Markup(
            "<i>P<sub>x</sub></i> = Σ<i><sub>i</sub></i> <i>d<sub>i</sub></i><sup>−2</sup> <i>P<sub>i</sub></i> "
            "/ Σ<i><sub>i</sub></i> <i>d<sub>i</sub></i><sup>−2</sup>, one gauge from each quadrant around x"
        ),
        "US National Weather Service (1972), HYDRO-14",
    ),
    "normal-ratio": Formula("normal-ratio", _BY_NORMALS, _PAULHUS),
    "ten-percent-rule": Formula(
        "ten-percent-rule",
        _AVERAGE + Markup(" if each <i>N<sub>i</sub></i> is within 10 % of <i>N<sub>x</sub></i>, else ") + _BY_NORMALS,
        _PAULHUS,
    ),
    "inverse-distance-ratios": Formula(
        "inverse-distance-ratios",
        Markup(
            "<i>P<sub>x</sub></i> = <i>N<sub>x</sub></i> Σ<i><sub>i</sub></i> "
            "<i>d<sub>i</sub></i><sup>−<i>p</i></sup> (<i>P<sub>i</sub></i> / <i>N<sub>i</sub></i>) "
            "/ Σ<i><sub>i</sub></i> <i>d<sub>i</sub></i><sup>−<i>p</i></sup>"
        ),
        "common practice where relief makes normals differ",
    ),
    "correlation-weighting": Formula(
        "correlation-weighting",
        Markup(
            "<i>P<sub>x</sub></i> = Σ<i><sub>i</sub></i> <i>r<sub>i</sub></i> <i>P<sub>i</sub></i> "
            "/ Σ<i><sub>i</sub></i> <i>r<sub>i</sub></i>, <i>r<sub>i</sub></i> the correlation with x in the record"
        ),
        "Teegavarapu and Chandramouli (2005), Journal of Hydrology 312, 191–206",
    ),
    "regression": Formula(
        "regression",
        Markup(
            "<i>P<sub>x</sub></i> = Σ<i><sub>i</sub></i> <i>r<sub>i</sub></i><sup>2</sup> <i>b<sub>i</sub></i> "
            "<i>P<sub>i</sub></i> / Σ<i><sub>i</sub></i> <i>r<sub>i</sub></i><sup>2</sup>, <i>b<sub>i</sub></i> the "
            "slope through the origin in the record"
        ),
        "common practice",
    ),
    "ratio-regression": Formula(
        "ratio-regression",
        Markup(
            "<i>P<sub>x</sub></i> = <i>N<sub>x</sub></i> Σ<i><sub>i</sub></i> <i>r<sub>i</sub></i><sup>2</sup> "
            "<i>b<sub>i</sub></i> (<i>P<sub>i</sub></i> / <i>N<sub>i</sub></i>) / Σ<i><sub>i</sub></i> "
            "<i>r<sub>i</sub></i><sup>2</sup>, <i>b<sub>i</sub></i> the slope of the ratios through the origin"
        ),
        "common practice",
    ),
}


def formulas(run: StormRun) -> list[Formula]:
    """Return the formulas of the methods used, averages first; a method without a short one is left out."""
    used = dict.fromkeys(e.method for result in run.storms for e in result.completed.estimates)
    return mean_formulas(run.methods) + infill_formulas(used)


def mean_formulas(methods: Iterable[str]) -> list[Formula]:
    """Return the formulas of averaging methods by name, in their order; one without a short formula is left out."""
    return [_MEANS[method] for method in methods if method in _MEANS]


def infill_formulas(methods: Iterable[str]) -> list[Formula]:
    """Return the formulas of infill methods by name, in their order; one without a short formula is left out."""
    return [_INFILLS[method] for method in methods if method in _INFILLS]


def ground_facts(run: Run) -> list[tuple[str, str]]:
    """Return what is to be known of plane, distances, normals and catch, each a name and a sentence."""
    plane = run.plane
    if plane.crs == LOCAL:
        lines = [("Plane", f"{plane.name}: a flat plane without a place on the map; distances are planar.")]
    else:
        most = f"{100 * plane.distortion:.3g}{NARROW_SPACE}%"
        apart = f"The plane's own differ from them by at most {most} over the network and the basins."
        lines = [
            ("Plane", f"{plane.name} ({plane.crs}). Areas, cells and grids are taken in it."),
            ("Distances", f"Between gauges geodesic (WGS 84). {apart}"),
        ]
    lines += [
        (name.replace("-", " ").capitalize(), text)
        for name, text in run.facts.items()
        if name not in ("normals", "catch")
    ]
    if isinstance(run, GaugedRun):
        lines += _gauge_facts(run)
    if not np.isnan(run.basins.official_areas).all():
        worst = 100 * np.nanmax(np.abs(run.basins.areas / run.basins.official_areas - 1))
        most = f"{worst:{'.0f' if worst >= 10 else '.2g'}}{NARROW_SPACE}%"
        lines.append(("Areas", f"Polygon areas differ from those that the register states by at most {most}."))
    return lines


def _gauge_facts(run: GaugedRun) -> list[tuple[str, str]]:
    lines = []
    if run.network.normals is not None:
        kind = "of the months" if run.network.normals.shape[1] == 12 else "of the year"
        period = run.network.normal_period or "period not stated"
        lines.append(("Normals", f"Normals {kind}, {period}."))
    factors = run.settings.get("gauges", {}).get("catch_factor") or {}
    text = ", ".join(f"{gauge} {_value(factor)}" for gauge, factor in factors.items())
    lines.append(("Gauge catch", f"Depths were multiplied by these factors: {text}." if text else "Not corrected."))
    return lines


def inputs_table(run: Run) -> Table:
    """Return the input files with their SHA-256."""
    return Table(
        caption="Input files and their SHA-256",
        heads=("file", "SHA-256"),
        align="tt",
        rows=list(run.inputs.items()),
    )


def versions_table(run: Run) -> Table:
    """Return the versions of what computed."""
    return Table(caption="Versions", heads=("software", "version"), align="tt", rows=list(run.versions.items()))


def settings_text(settings: Mapping[str, Any]) -> str:
    """Return the job as resolved, one setting a line.

    Examples
    --------
    >>> print(settings_text({"job": {"name": "A"}, "rainfall": [{"unit": "mm"}, {"unit": "in"}], "storm": []}))
    job.name = "A"
    rainfall[1].unit = "mm"
    rainfall[2].unit = "in"
    storm = []
    """
    return "\n".join(f"{key} = {_value(value)}" for key, value in _flat(settings, ""))


def _flat(value: Any, key: str) -> Iterator[tuple[str, Any]]:  # noqa: ANN401 - any plain value
    if isinstance(value, Mapping) and value:
        for name, inner in value.items():
            yield from _flat(inner, f"{key}.{name}" if key else str(name))
    elif isinstance(value, list | tuple) and any(isinstance(inner, Mapping) for inner in value):
        for k, inner in enumerate(value, start=1):
            yield from _flat(inner, f"{key}[{k}]")
    else:
        yield key, value


def _value(value: Any) -> str:  # noqa: ANN401 - any plain value
    return json.dumps(value, ensure_ascii=False, default=str)
