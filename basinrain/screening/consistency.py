"""Consistency of a network's years: the double-mass curve and the homogeneity of every gauge against its neighbours."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final, NamedTuple, cast

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening.annual import (
    COMPARED,
    FEWEST_NEIGHBOURS,
    Beside,
    CalendarYears,
    beside_neighbours,
    calendar_years,
)
from basinrain.screening.double_mass import PERSISTENCE, DoubleMass, double_mass
from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.homogeneity import Homogeneity, homogeneity_of

__all__ = ["DOUBLE_MASS_BREAK", "INHOMOGENEOUS", "Consistency", "consistency"]

_TEST_WORDS: Final = {
    "snht": "SNHT",
    "buishand-range": "Buishand's range",
    "pettitt": "Pettitt",
    "von-neumann": "von Neumann",
}

DOUBLE_MASS_BREAK: Final = "double-mass-break"
INHOMOGENEOUS: Final = "inhomogeneous"

_YEARS: Final = {DOUBLE_MASS_BREAK: 2 * PERSISTENCE, INHOMOGENEOUS: 20}
"""Years that each takes."""

_LISTED: Final = 5


class Consistency(NamedTuple):
    """What the years of a network show.

    Parameters
    ----------
    double_mass, homogeneity
        One a gauge that has years enough, in the network's order.
    findings
        ``double-mass-break`` and ``inhomogeneous``, each in the network's order.
    skipped
        By check, one sentence on the gauges for which it could not be made.
    """

    double_mass: tuple[DoubleMass, ...]
    homogeneity: tuple[Homogeneity, ...]
    findings: tuple[Finding, ...]
    skipped: Mapping[str, str]


def consistency(record: RainRecord, network: GaugeNetwork) -> Consistency:
    """Return the double-mass curves and homogeneity tests of all gauges, and what they find.

    Parameters
    ----------
    record
        At any step, columns in the network's order, with what was edited and without what was rejected.
    network
        The gauges.

    Returns
    -------
    Consistency
        The reference of a gauge is the mean of its three to five nearest neighbours with enough years in common (10 for
        the curve, 20 for the tests). A year's totals of both are over the days that they share, 90 % or more of the
        year's (:func:`basinrain.screening.annual.beside_neighbours`). A gauge with too few years for a curve, or whose
        own curve breaks, is no neighbour to others: the clearest break is found first and its gauge left out of all
        references, and so on until none is left. Homogeneity is tested on the ratios to the reference; where there is
        none, on the gauge's mean depths of a day in the years of which it has 95 % of the days.

    Examples
    --------
    >>> ends = np.arange("2001-02", "2031-02", dtype="datetime64[M]").astype("datetime64[s]")
    >>> starts = np.arange("2001-01", "2031-01", dtype="datetime64[M]").astype("datetime64[s]")
    >>> depths = np.random.default_rng(1).gamma(8.0, 10.0, (360, 1)) * np.random.default_rng(2).normal(1, 0.1, (360, 5))
    >>> depths[:180, 2] *= 0.7
    >>> network = GaugeNetwork(ids=tuple("ABCDE"), x=np.arange(5.0), y=np.zeros(5), crs="local")
    >>> found = consistency(RainRecord.from_depths(network.ids, starts, ends, depths, step="1mo"), network)
    >>> [(finding.check, finding.gauge) for finding in found.findings]
    [('double-mass-break', 'C'), ('inhomogeneous', 'C')]
    >>> found.findings[0].edit.end, round(found.findings[0].edit.value, 2)
    (np.datetime64('2016-01-01T00:00:00'), 1.41)
    """
    years = calendar_years(record)
    distances = network.distances()
    curves, trusted = _curves(years, network, distances)
    tested = _tests(years, network, distances, trusted)
    findings = [
        *(_break_finding(curve, years, record.starts[0]) for curve in curves.values() if curve.significant),
        *(_homogeneity_finding(one) for one in tested.values() if one.grade in {"doubtful", "suspect"}),
    ]
    skipped = {
        check: _why(check, years, sorted(set(range(len(network))) - set(done)), trusted)
        for check, done in ((DOUBLE_MASS_BREAK, curves), (INHOMOGENEOUS, tested))
        if len(done) < len(network)
    }
    return Consistency(tuple(curves.values()), tuple(tested.values()), tuple(findings), skipped)


def _curves(
    years: CalendarYears, network: GaugeNetwork, distances: npt.NDArray[np.float64]
) -> tuple[dict[int, DoubleMass], npt.NDArray[np.bool_]]:
    """Return the curves by gauge, and which gauges may be neighbours: those with years enough to see a break in."""
    trusted = _judged(years)
    groups: dict[int, npt.NDArray[np.int64]] = {}
    curves: dict[int, DoubleMass] = {}

    def draw(target: int) -> None:
        beside = beside_neighbours(
            years, network, target, at_least=_YEARS[DOUBLE_MASS_BREAK], distances=distances, trusted=trusted
        )
        groups.pop(target, None)
        curves.pop(target, None)
        if beside is not None:
            groups[target] = beside.group
            curves[target] = double_mass(
                beside.totals,
                beside.reference,
                years.years,
                gauge=network.ids[target],
                reference=_ids(network, beside),
                days=beside.days,
            )

    for target in range(len(network)):
        draw(target)
    while True:
        broken = [g for g, curve in curves.items() if trusted[g] and curve.significant]
        if not broken:
            return dict(sorted(curves.items())), trusted
        # Equal breaks go by gauge id, so that the order of the file does not decide.
        worst = min(broken, key=lambda g: (-curves[g].f, network.ids[g]))
        trusted[worst] = False
        for target in [g for g, group in groups.items() if worst in group]:
            draw(target)


def _tests(
    years: CalendarYears, network: GaugeNetwork, distances: npt.NDArray[np.float64], trusted: npt.NDArray[np.bool_]
) -> dict[int, Homogeneity]:
    at_least = _YEARS[INHOMOGENEOUS]
    tested = {}
    for target in np.flatnonzero(years.compared.sum(axis=0) >= at_least).tolist():
        beside = beside_neighbours(years, network, target, at_least=at_least, distances=distances, trusted=trusted)
        gauge = network.ids[target]
        if beside is None:
            days = years.covered[:, target]
            by_day = np.divide(years.totals[:, target], days, out=np.full(len(years), np.nan), where=days > 0)
            one = homogeneity_of(years.years, by_day, gauge=gauge, days=np.rint(days).astype(np.int64))
        else:
            one = homogeneity_of(
                years.years,
                beside.totals,
                gauge=gauge,
                reference=beside.reference,
                reference_gauges=_ids(network, beside),
                days=beside.days,
            )
        if one.grade is not None:
            tested[target] = one
    return tested


def _judged(years: CalendarYears) -> npt.NDArray[np.bool_]:
    """Return which gauges have years enough for a curve of their own."""
    return np.asarray(years.compared.sum(axis=0) >= _YEARS[DOUBLE_MASS_BREAK])


def _ids(network: GaugeNetwork, beside: Beside) -> tuple[str, ...]:
    return tuple(network.ids[g] for g in beside.group)


def _break_finding(curve: DoubleMass, years: CalendarYears, start: np.datetime64) -> Finding:
    until = cast("int", curve.older_until)  # one that is significant has a break
    end = years.ends[int(np.flatnonzero(years.years == until)[0])]
    then = int(curve.years[int(np.flatnonzero(curve.years == until)[0]) + 1])
    after, between = "after", ""
    if then > until + 1:
        after = f"from {then}"
        between = f" The years between {until} and {then} are left out, so that the change may lie there."
    evidence = (
        f"Against the mean of {', '.join(curve.reference)} over {_span(curve, years)}, the slope of the double-mass "
        f"curve is {curve.slopes[0]:.3f} to {until} and {curve.slopes[1]:.3f} {after} (F = {curve.f:.1f}, probability "
        f"{_probability(curve.significance)})."
    )
    action = (
        f"Look for a move, a new instrument or a change around the gauge after {until}; where one is known, scale the "
        f"record to {until} by {curve.ratio:.3f} with an edit.{between}"
    )
    scale = (
        Edit(gauge=curve.gauge, end=end, action="scale", value=round(curve.ratio, 4), reason=evidence, by=SUGGESTED)
        if np.isfinite(curve.ratio)
        else None
    )
    return Finding(
        check=DOUBLE_MASS_BREAK,
        gauge=curve.gauge,
        start=start,
        end=end,
        severity="doubtful",
        evidence=f"{evidence} The finding's stretch is the older part.",
        action=action if scale else "Look for what happened to the gauge: one part of its record has no rain.",
        others=tuple(sorted(curve.reference)),
        edit=scale,
    )


def _span(curve: DoubleMass, years: CalendarYears) -> str:
    """Return in words the years of a curve, those left out between them, and how much of their days is shared."""
    first, last = int(curve.years[0]), int(curve.years[-1])
    span = f"{len(curve.years)} years, {first} to {last}"
    if left := sorted(set(range(first, last + 1)) - set(curve.years.tolist())):
        named = ", ".join(map(str, left[:_LISTED])) + (
            f" and {len(left) - _LISTED} more" if len(left) > _LISTED else ""
        )
        span += f" without {named}, of which they share less than {100 * COMPARED:.0f} % of the days"
    share = curve.days.sum() / years.length[np.isin(years.years, curve.years)].sum()
    if share < 1:
        # Cut, not rounded, so that some days missing are never told as 100 %.
        span += f", on the {np.floor(1000 * share) / 10:g} % of their days that they share"
    return span


def _homogeneity_finding(tested: Homogeneity) -> Finding:
    rejecting = [_TEST_WORDS[test.test] for test in tested.counted if test.rejected_at == 0.01]
    what = (
        f"ratios of annual totals to the mean of {', '.join(tested.reference)}"
        if tested.reference
        else "annual means of the gauge alone"
    )
    after = f"; the change is most likely after {tested.break_after}" if tested.break_after is not None else ""
    return Finding(
        check=INHOMOGENEOUS,
        gauge=tested.gauge,
        severity="doubtful" if tested.grade == "suspect" else "remark",
        evidence=f"{len(rejecting)} of 4 tests ({', '.join(rejecting)}) reject homogeneity at 1 % for "
        f"{len(tested.years)} {what}, which grades the record {tested.grade}{after}.",
        action="Compare with the gauge's history and its double-mass curve before using its normals or long means.",
        others=tuple(sorted(tested.reference)),
    )


def _probability(value: float) -> str:
    return f"{value:.3f}" if value >= 0.001 else "below 0.001"


def _why(check: str, years: CalendarYears, gauges: list[int], trusted: npt.NDArray[np.bool_]) -> str:
    needed = _YEARS[check]
    counts = years.compared.sum(axis=0)
    short = [g for g in gauges if counts[g] < needed]
    alone = [g for g in gauges if counts[g] >= needed]
    parts = []
    if short:
        most = int(counts[short].max())
        some = "at most " if len(short) > 1 and most else ""
        parts.append(
            f"{_named(years, short)}: {some}{most or 'no'} calendar year{'' if most < 2 else 's'} with "
            f"{100 * COMPARED:.0f} % of the days; it takes {needed}"
        )
    if alone and len(years.gauges) <= FEWEST_NEIGHBOURS:
        there = len(years.gauges) - 1
        parts.append(
            f"{_named(years, alone)}: {there or 'no'} neighbour{'' if there < 2 else 's'}; it takes {FEWEST_NEIGHBOURS}"
        )
    elif alone:
        broken = np.flatnonzero(_judged(years) & ~trusted).tolist()
        without = f", not counting {_named(years, broken)} with a break of their own" if broken else ""
        parts.append(
            f"{_named(years, alone)}: fewer than {needed} years in which {FEWEST_NEIGHBOURS} neighbours report beside "
            f"it on {100 * COMPARED:.0f} % of the days{without}"
        )
    return "; ".join(parts)


def _named(years: CalendarYears, gauges: list[int]) -> str:
    names = [years.gauges[g] for g in gauges]
    more = f" and {len(names) - _LISTED} more" if len(names) > _LISTED else ""
    return ", ".join(names[:_LISTED]) + more
