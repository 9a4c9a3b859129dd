"""Warnings that a reviewer would raise: drawn from the results of a run, not from any method's code.

The limits are conventions of this package, chosen to make a reader look, not to pass or fail a result.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np
import numpy.typing as npt
import shapely

from basinrain.basin_depths import BasinDepths, spread_across_methods
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.screening import Finding, Screening
from basinrain.storms import Storm
from basinrain.units import depth_factor

__all__ = ["network_cautions", "record_cautions", "screening_cautions", "storm_cautions"]

_DOMINANT_WEIGHT = 0.5
_INFILLED_SHARE = 0.25
_SPREAD_PERCENT = 10.0
_TOUCH = 1e-3
_ROUNDING = 1e-9


def network_cautions(network: GaugeNetwork, basins: Basins) -> Iterator[Note]:
    """Yield warnings about where the gauges lie in each basin and at what height.

    Parameters
    ----------
    network, basins
        In the same plane.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A", "B"), x=[2000.0, 90000.0], y=[2000.0, 0.0], crs="local")
    >>> basins = Basins(ids=("all",), polygons=[shapely.box(0, 0, 10000, 10000)], crs="local")
    >>> [note.code for note in network_cautions(network, basins)]
    ['one-gauge-inside']
    """
    points = shapely.points(network.x, network.y)
    for basin, polygon, area, (low, high) in zip(
        basins.ids, basins.polygons, basins.areas, basins.elevations, strict=True
    ):
        inside = np.flatnonzero(shapely.dwithin(points, polygon, _TOUCH))
        if len(inside) == 0:
            yield Note(
                code="no-gauge-inside",
                text=f"No gauge lies inside basin {basin}; its mean rests on gauges outside, and the arithmetic mean "
                "has no number unless the job widens it.",
                basin=basin,
            )
        elif len(inside) == 1:
            gauge = network.ids[inside[0]]
            yield Note(
                code="one-gauge-inside",
                text=f"Only gauge {gauge} lies inside basin {basin}.",
                basin=basin,
                gauge=gauge,
            )
        away = shapely.distance(points, polygon.centroid)
        nearest = int(np.argmin(away))
        if away[nearest] > np.sqrt(area):
            yield Note(
                code="far-gauge",
                text=f"The gauge nearest to the centre of basin {basin}, {network.ids[nearest]}, is "
                f"{away[nearest] / 1000:.1f} km away, farther than the square root of the basin's area "
                f"({np.sqrt(area) / 1000:.1f} km).",
                basin=basin,
                gauge=network.ids[nearest],
            )
        yield from _elevation_caution(network, basin, inside if len(inside) else np.array([nearest]), low, high)


def _elevation_caution(
    network: GaugeNetwork, basin: str, gauges: npt.NDArray[np.int64], low: float, high: float
) -> Iterator[Note]:
    heights = network.elevation[gauges]
    if np.isnan(heights).all() or np.isnan(low) or np.isnan(high):
        return
    lowest, highest = float(np.nanmin(heights)), float(np.nanmax(heights))
    middle = (low + high) / 2
    if highest < middle or lowest > middle:
        side = "above" if highest < middle else "below"
        yield Note(
            code="elevation-missed",
            text=f"Basin {basin} reaches from {low:.0f} to {high:.0f} m, its gauges from {lowest:.0f} to {highest:.0f} "
            f"m: the half of its range {side} {middle:.0f} m has no gauge.",
            basin=basin,
        )


def record_cautions(record: RainRecord) -> Iterator[Note]:
    """Yield a warning when the network changed during the record.

    Examples
    --------
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 3) * np.timedelta64(3600, "s")
    >>> record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[1.0, 2.0], [1.0, 2.0]], step="1h")
    >>> list(record_cautions(record))
    []
    """
    absent = record.status == Status.NOT_INSTALLED
    changed = absent.any(axis=0)
    if changed.any():
        gauges = ", ".join(gauge for gauge, c in zip(record.gauges, changed, strict=True) if c)
        yield Note(
            code="network-changed",
            text=f"The network changed during the record: {gauges} not in service throughout; nothing was infilled for "
            "them while they were not there.",
        )


def storm_cautions(
    storm: str,
    network: GaugeNetwork,
    basins: Basins,
    depths: Mapping[str, BasinDepths],
    *,
    depth_unit: str = "mm",
) -> Iterator[Note]:
    """Yield warnings about one storm's results: dominant gauges, infilled shares, rebuilt weights, methods apart.

    Parameters
    ----------
    storm
        The storm's name.
    network, basins
        Gauges and basins of the run.
    depths
        Results by averaging method.
    depth_unit
        Unit of the depths that the warnings name.
    """
    for b, basin in enumerate(basins.ids):
        yield from _dominant_gauge(storm, network, basin, {m: result.table.weights[b] for m, result in depths.items()})
        yield from _no_number(storm, basin, {m: result.depth[:, b] for m, result in depths.items()})
        shares = {m: _share(float(result.infilled[b]), float(result.total[b])) for m, result in depths.items()}
        much = {method: share for method, share in shares.items() if share > _INFILLED_SHARE + _ROUNDING}
        if much:
            yield Note(
                code="much-infilled",
                text=f"Much of the mean of basin {basin} rests on infilled values: {_by_method(much)}.",
                storm=storm,
                basin=basin,
            )
        least, most, apart, percent = spread_across_methods([result.total[b] for result in depths.values()])
        if percent > _SPREAD_PERCENT:
            low, high, wide = (_depth(value, depth_unit) for value in (least, most, apart))
            yield Note(
                code="methods-apart",
                text=f"The methods give basin {basin} from {low} to {high} {depth_unit}, {wide} {depth_unit} or "
                f"{percent:.0f} % apart.",
                storm=storm,
                basin=basin,
            )
    without = next(iter(depths.values())).without_depth
    if without.any():
        gauges = ", ".join(f"{network.ids[g]} ({without[g]})" for g in np.flatnonzero(without))
        yield Note(
            code="weights-rebuilt",
            text=f"Gauges without a value even after infill (steps): {gauges}; where others have one, the "
            "weights were rebuilt from them.",
            storm=storm,
        )


def screening_cautions(screening: Screening, storms: Sequence[Storm]) -> Iterator[Note]:
    """Yield what screening found in the storms and the job has not settled: one warning a finding, one for the rest.

    Parameters
    ----------
    screening
        Findings with their states.
    storms
        The storms of the run.

    Examples
    --------
    >>> may = [np.datetime64(f"2031-05-0{day}", "s") for day in range(1, 6)]
    >>> finding = Finding(
    ...     check="stuck-values",
    ...     gauge="A",
    ...     start=may[1],
    ...     end=may[2],
    ...     evidence="0.4 mm stands at 14 steps on end.",
    ...     action="Reject the stretch.",
    ... )
    >>> storms = [Storm("Quill", 0, 24, may[0], may[1]), Storm("Reed", 24, 48, may[1], may[2])]
    >>> [str(note) for note in screening_cautions(Screening(findings=(finding,)), storms)]
    ['Reed: Screening, stuck-values: gauge A: 0.4 mm stands at 14 steps on end.']
    """
    unsettled = [found for found in screening.findings if found.state == "open" and found.severity != "remark"]
    told = set()
    for storm in storms:
        for k, found in enumerate(unsettled):
            if found.whole_record or np.isnat(storm.end) or (found.start < storm.end and found.end > storm.start):
                told.add(k)
                yield Note(
                    code="screening",
                    text=f"Screening, {found.check}: {_of_gauge(found)}{found.evidence}",
                    storm=storm.name,
                    gauge=found.gauge,
                )
    rest = len(unsettled) - len(told)
    if rest:
        yield Note(
            code="screening-elsewhere",
            text=f"Screening found {rest} other doubtful or erroneous stretch{'es' if rest > 1 else ''} of the record, "
            "outside the storms; normals and the relations between gauges rest on them too.",
            level="info",
        )


def _of_gauge(found: Finding) -> str:
    return f"gauge {found.gauge}: " if found.gauge else ""


def _no_number(storm: str, basin: str, series: Mapping[str, npt.NDArray[np.float64]]) -> Iterator[Note]:
    """Yield a warning for methods that have a number at some steps and none at others."""
    gaps = {method: int(np.isnan(depth).sum()) for method, depth in series.items()}
    blank = {method: gap for method, gap in gaps.items() if 0 < gap < len(series[method])}
    if blank:
        methods = ", ".join(f"{gap} by {method}" for method, gap in blank.items())
        yield Note(
            code="no-basin-total",
            text=f"Basin {basin} has no total: at some steps no gauge has a value ({methods}).",
            storm=storm,
            basin=basin,
        )


def _dominant_gauge(
    storm: str, network: GaugeNetwork, basin: str, weights: Mapping[str, npt.NDArray[np.float64]]
) -> Iterator[Note]:
    """Yield one warning for every gauge that has over half of the weight by some method."""
    by_gauge: dict[str, dict[str, float]] = {}
    for method, row in weights.items():
        if np.isnan(row).any():
            continue
        g = int(np.argmax(row))
        share = _share(float(row[g]), float(row.sum()))
        if share > _DOMINANT_WEIGHT + _ROUNDING:
            by_gauge.setdefault(network.ids[g], {})[method] = share
    for gauge, shares in by_gauge.items():
        yield Note(
            code="one-gauge-dominates",
            text=f"Gauge {gauge} has over half of the weight in basin {basin}: {_by_method(shares)}.",
            storm=storm,
            basin=basin,
            gauge=gauge,
        )


def _share(part: float, whole: float) -> float:
    return part / whole if whole > 0 else 0.0


def _by_method(shares: Mapping[str, float]) -> str:
    return ", ".join(f"{100 * share:.0f} % by {method}" for method, share in shares.items())


def _depth(depth: float, unit: str) -> str:
    return f"{depth / depth_factor(unit):.{2 if unit == 'in' else 1}f}"
