"""Infilling by plain loops and the formulas as printed: slow, and nothing but what the methods say."""

from __future__ import annotations

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, Relations
from basinrain.rainfall import RainRecord

BY_CORRELATION = ("regression", "ratio-regression")


def quadrant(network: GaugeNetwork, g: int, i: int) -> str:
    """Return the quadrant of gauge i as gauge g sees it: each holds its first edge, clockwise from north."""
    east, north = network.x[i] - network.x[g], network.y[i] - network.y[g]
    if east >= 0 and north > 0:
        return "north-east"
    if east > 0:
        return "south-east"
    return "south-west" if north < 0 else "north-west"


def slow_donors(
    network: GaugeNetwork, g: int, usable: list[bool], options: InfillOptions, relations: Relations
) -> list[int]:
    """Return who donates to gauge g, the first first; nobody where there are too few."""
    away = network.distances()[g]
    allowed = [i for i in range(len(network)) if i != g and usable[i]]
    if options.radius is not None:
        allowed = [i for i in allowed if away[i] <= options.radius * (1 + 1e-9)]
    if options.elevation_limit is not None:
        allowed = [i for i in allowed if abs(network.elevation[i] - network.elevation[g]) <= options.elevation_limit]
    correlation, slope = slow_relation(options.method, relations)
    if options.method == "correlation-weighting":
        allowed = [i for i in allowed if correlation[g, i] > 0]
    key = away
    if options.method in BY_CORRELATION:
        allowed = [i for i in allowed if correlation[g, i] > 0 and slope[g, i] > 0]
        key = -correlation[g]
    order = sorted(allowed, key=lambda i: (round(float(key[i]), 8), network.ids[i]))
    if options.method == "four-quadrant":
        lie_in = [quadrant(network, g, i) for i in order]
        order = [i for k, i in enumerate(order) if lie_in[k] not in lie_in[:k]]
    elif options.method == "nearest-gauge":
        order = order[:1]
    elif options.donors_wanted != "all":
        order = order[: options.donors_wanted]
    return order if len(order) >= options.donors_required else []


def slow_relation(method: str, relations: Relations) -> tuple[np.ndarray, np.ndarray]:
    """Return correlation and slope as the method means them."""
    if method == "ratio-regression":
        assert relations.ratio_correlation is not None
        assert relations.ratio_slope is not None
        return relations.ratio_correlation, relations.ratio_slope
    return relations.correlation, relations.slope


def slow_weights(  # noqa: PLR0917 - one case by its place
    network: GaugeNetwork, g: int, usable: list[bool], month: int, options: InfillOptions, relations: Relations
) -> dict[int, float]:
    """Return the donor weights of one gauge."""
    donors = slow_donors(network, g, usable, options, relations)
    if not donors:
        return {}
    away, n = network.distances()[g], len(donors)
    normals = network.normals
    assert normals is not None
    ratio = {i: normals[g, month] / normals[i, month] for i in donors}
    correlation, slope = slow_relation(options.method, relations)
    power = 2 if options.power is None else options.power
    near = {i: away[i] ** -power / sum(away[j] ** -power for j in donors) for i in donors}
    r = {i: correlation[g, i] for i in donors}
    square = {i: r[i] ** 2 / sum(v**2 for v in r.values()) if any(r.values()) else np.nan for i in donors}
    alike = all(abs(normals[i, month] - normals[g, month]) <= 0.1 * normals[g, month] + 1e-9 for i in donors)
    weights = {
        "nearest-gauge": dict.fromkeys(donors, 1.0),
        "station-average": dict.fromkeys(donors, 1 / n),
        "inverse-distance": near,
        "four-quadrant": near,
        "normal-ratio": {i: ratio[i] / n for i in donors},
        "ten-percent-rule": {i: 1 / n if alike else ratio[i] / n for i in donors},
        "inverse-distance-ratios": {i: ratio[i] * near[i] for i in donors},
        "correlation-weighting": {i: r[i] / sum(r.values()) for i in donors},
        "regression": {i: slope[g, i] * square[i] for i in donors},
        "ratio-regression": {i: ratio[i] * slope[g, i] * square[i] for i in donors},
    }[options.method]
    return {i: float(weight) for i, weight in weights.items()}


def month_index(record: RainRecord, first: int, last: int) -> int:
    """Return the month of the middle of some steps, from 0."""
    middle = record.starts[first] + (record.ends[last] - record.starts[first]) // 2
    return int(str(middle)[5:7]) - 1


def slow_step(  # noqa: PLR0917 - one case by its place
    record: RainRecord, network: GaugeNetwork, t: int, g: int, options: InfillOptions, relations: Relations
) -> float:
    """Return the depth of one missing step of one gauge."""
    usable = [bool(record.measured[t, i]) for i in range(len(network))]
    weights = slow_weights(network, g, usable, month_index(record, t, t), options, relations)
    return sum(w * record.depth[t, i] for i, w in weights.items()) if weights else np.nan


def whole(record: RainRecord, i: int, steps: list[int]) -> bool:
    """Whether every total of a gauge that reaches into some steps fell in them."""
    for total in record.totals:
        if total.gauge == record.gauges[i]:
            inside = [t for t in steps if total.start <= record.starts[t] and record.ends[t] <= total.end]
            if inside and abs(sum(record.depth[t, i] for t in inside) - total.depth) > 1e-9:
                return False
    return True


def slow_span(  # noqa: PLR0917 - one case by its place
    record: RainRecord,
    network: GaugeNetwork,
    steps: list[int],
    g: int,
    options: InfillOptions,
    relations: Relations,
) -> dict[int, float]:
    """Depths of the missing steps of one gauge's day or storm, by plain loops."""
    missing = [t for t in steps if not record.reporting[t, g]]
    seen = [t for t in steps if record.reporting[t, g]]
    by_step = {t: slow_step(record, network, t, g, options, relations) for t in missing}
    if len(seen) * 2 >= len(steps):
        return by_step
    usable = [all(record.reporting[t, i] for t in steps) and whole(record, i, steps) for i in range(len(network))]
    weights = slow_weights(network, g, usable, month_index(record, steps[0], steps[-1]), options, relations)
    if not weights:
        return dict.fromkeys(missing, np.nan)
    rest = sum(w * record.depth[t, i] for i, w in weights.items() for t in steps)
    rest -= sum(record.depth[t, g] for t in seen)
    if rest < -1e-9:
        return by_step
    away = network.distances()[g]
    for _, _, i in sorted((round(float(away[i]), 6), network.ids[i], i) for i in range(len(network)) if i != g):
        caught = sum(record.depth[t, i] for t in missing)
        recorder = network.ids[i] in record.recorders and all(record.measured[t, i] for t in steps)
        if recorder and caught > 0:
            return {t: rest * record.depth[t, i] / caught for t in missing}
    return {t: rest / len(missing) for t in missing}
