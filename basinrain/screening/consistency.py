"""Consistency of a network's years: the double-mass curve and the homogeneity of every gauge against its neighbours."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening.annual import FEWEST_NEIGHBOURS, AnnualTotals, annual_totals, reference_group
from basinrain.screening.double_mass import PERSISTENCE, DoubleMass, double_mass
from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.homogeneity import Homogeneity, homogeneity_of

__all__ = ["DOUBLE_MASS_BREAK", "INHOMOGENEOUS", "Consistency", "consistency"]

DOUBLE_MASS_BREAK: Final = "double-mass-break"
INHOMOGENEOUS: Final = "inhomogeneous"

_YEARS: Final = {DOUBLE_MASS_BREAK: 2 * PERSISTENCE, INHOMOGENEOUS: 20}
"""Complete years that each takes."""

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
        At any step, columns in the network's order; complete calendar years count.
    network
        The gauges.

    Returns
    -------
    Consistency
        The reference of a gauge is the mean of its three to five nearest neighbours with enough years in common (10 for
        the curve, 20 for the tests). A gauge whose own curve breaks is no neighbour to others: the clearest break is
        found first and its gauge left out of all references, and so on until none is left. Homogeneity is tested on
        the ratios to the reference, on the totals themselves where there is none.

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
    annual = annual_totals(record)
    distances = network.distances()
    curves, trusted = _curves(annual, network, distances)
    tested = _tests(annual, network, distances, trusted)
    findings = [
        *(_break_finding(curve, annual, record.starts[0]) for curve in curves.values() if curve.significant),
        *(_homogeneity_finding(one) for one in tested.values() if one.grade in {"doubtful", "suspect"}),
    ]
    skipped = {
        check: _why(check, annual, sorted(set(range(len(network))) - set(done)), trusted)
        for check, done in ((DOUBLE_MASS_BREAK, curves), (INHOMOGENEOUS, tested))
        if len(done) < len(network)
    }
    return Consistency(tuple(curves.values()), tuple(tested.values()), tuple(findings), skipped)


def _curves(
    annual: AnnualTotals, network: GaugeNetwork, distances: npt.NDArray[np.float64]
) -> tuple[dict[int, DoubleMass], npt.NDArray[np.bool_]]:
    """Return the curves by gauge, and which gauges have no break of their own."""
    trusted = np.ones(len(network), dtype=bool)
    groups: dict[int, npt.NDArray[np.int64]] = {}
    curves: dict[int, DoubleMass] = {}

    def draw(target: int) -> None:
        group = reference_group(
            annual, network, target, at_least=_YEARS[DOUBLE_MASS_BREAK], distances=distances, trusted=trusted
        )
        groups[target] = group
        curves.pop(target, None)
        if len(group):
            curves[target] = double_mass(
                annual.totals[:, target],
                annual.totals[:, group].mean(axis=1),
                annual.years,
                gauge=network.ids[target],
                reference=tuple(network.ids[g] for g in group),
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
    annual: AnnualTotals, network: GaugeNetwork, distances: npt.NDArray[np.float64], trusted: npt.NDArray[np.bool_]
) -> dict[int, Homogeneity]:
    at_least = _YEARS[INHOMOGENEOUS]
    tested = {}
    for target in np.flatnonzero(np.isfinite(annual.totals).sum(axis=0) >= at_least).tolist():
        group = reference_group(annual, network, target, at_least=at_least, distances=distances, trusted=trusted)
        one = homogeneity_of(
            annual.years,
            annual.totals[:, target],
            gauge=network.ids[target],
            reference=annual.totals[:, group].mean(axis=1) if len(group) else None,
            reference_gauges=tuple(network.ids[g] for g in group),
        )
        if one.grade is not None:
            tested[target] = one
    return tested


def _break_finding(curve: DoubleMass, annual: AnnualTotals, start: np.datetime64) -> Finding:
    until = curve.older_until
    end = annual.ends[int(np.flatnonzero(annual.years == until)[0])]
    evidence = (
        f"Against the mean of {', '.join(curve.reference)} over {len(curve.years)} years, {curve.years[0]} to "
        f"{curve.years[-1]}, the slope of the double-mass curve is {curve.slopes[0]:.3f} to {until} and "
        f"{curve.slopes[1]:.3f} after (F = {curve.f:.1f}, probability {_probability(curve.significance)})."
    )
    action = (
        f"Look for a move, a new instrument or a change around the gauge after {until}; where one is known, scale the "
        f"record to {until} by {curve.ratio:.3f} with an edit."
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
        evidence=evidence,
        action=action if scale else "Look for what happened to the gauge: one part of its record has no rain.",
        others=tuple(sorted(curve.reference)),
        edit=scale,
    )


def _homogeneity_finding(tested: Homogeneity) -> Finding:
    rejecting = [test.test for test in tested.counted if test.rejected_at == 0.01]
    what = (
        f"ratios of annual totals to the mean of {', '.join(tested.reference)}" if tested.reference else "annual totals"
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


def _why(check: str, annual: AnnualTotals, gauges: list[int], trusted: npt.NDArray[np.bool_]) -> str:
    needed = _YEARS[check]
    counts = np.isfinite(annual.totals).sum(axis=0)
    short = [g for g in gauges if counts[g] < needed]
    alone = [g for g in gauges if counts[g] >= needed]
    parts = []
    if short:
        most = int(counts[short].max())
        years = f"{most or 'no'} complete calendar year{'' if most < 2 else 's'}"
        some = "at most " if len(short) > 1 and most else ""
        parts.append(f"{_named(annual, short)}: {some}{years}; it takes {needed}")
    if alone:
        broken = np.flatnonzero(~trusted).tolist()
        without = f", not counting {_named(annual, broken)} with a break of their own" if broken else ""
        parts.append(
            f"{_named(annual, alone)}: fewer than {FEWEST_NEIGHBOURS} neighbours with {needed} complete years in common"
            f"{without}"
        )
    return "; ".join(parts)


def _named(annual: AnnualTotals, gauges: list[int]) -> str:
    names = [annual.gauges[g] for g in gauges]
    more = f" and {len(names) - _LISTED} more" if len(names) > _LISTED else ""
    return ", ".join(names[:_LISTED]) + more
