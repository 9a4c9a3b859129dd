"""Screening: is the record fit to use."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import groupby
from typing import Final

import numpy as np

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening.checks import CHECKS
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS, consistency
from basinrain.screening.findings import SEVERITIES, Finding, Screening, ScreeningOptions
from basinrain.screening.screened import Screened

__all__ = ["screen"]

MOST_STRETCHES: Final = 20
"""Stretches of one gauge that a check lists one by one; with more, the fault is the gauge's, and one finding says
so."""


def screen(record: RainRecord, network: GaugeNetwork, *, options: ScreeningOptions | None = None) -> Screening:
    """Return what every check of the registry finds in a record; nothing is changed.

    Parameters
    ----------
    record
        Columns in the network's order.
    network
        The gauges.
    options
        What the user says about region and gauges.

    Returns
    -------
    Screening
        A check that lacks what it needs is named in ``checks_skipped`` with the reason; the two on years, which some
        gauges may lack, are then named in ``checks_run`` as well where other gauges have them. A record without steps
        or gauges has no findings.

    Examples
    --------
    >>> import numpy as np
    >>> network = GaugeNetwork(ids=("A",), x=[0.0], y=[0.0], crs="local")
    >>> ends = np.datetime64("2031-05-04", "s") + np.arange(1, 49) * np.timedelta64(3600, "s")
    >>> depths = np.zeros((48, 1))
    >>> depths[7] = 999.0
    >>> screening = screen(RainRecord.from_depths(network.ids, ends - 3600, ends, depths, step="1h"), network)
    >>> [finding.key for finding in screening.findings]
    ['greatest-depths A 2031-05-04T07:00']
    >>> screening.checks_skipped["spatial-outlier"]
    'the network has 1 gauge; it takes 4 or more'
    """
    view = Screened(record, network, options or ScreeningOptions())
    findings: list[Finding] = []
    ran: list[str] = []
    skipped: dict[str, str] = {}
    for name, check in CHECKS.items():
        reason = check.lacks(view) if len(record) and len(network) else "the record is empty"
        if reason:
            skipped[name] = reason
            continue
        ran.append(name)
        findings += _gathered(sorted(check.run(view), key=_by_gauge_and_time))
    years = consistency(record, network)
    findings += sorted(years.findings, key=lambda finding: (finding.check, finding.gauge))
    ran += [name for name, made in ((DOUBLE_MASS_BREAK, years.double_mass), (INHOMOGENEOUS, years.homogeneity)) if made]
    return Screening(
        findings=tuple(findings),
        double_mass=years.double_mass,
        homogeneity=years.homogeneity,
        checks_run=tuple(ran),
        checks_skipped=skipped | dict(years.skipped),
    )


def _by_gauge_and_time(finding: Finding) -> tuple[str, str, str]:
    return finding.gauge, "" if finding.whole_record else str(finding.start), str(finding.end)


def _gathered(findings: Sequence[Finding]) -> Iterator[Finding]:
    """Yield the findings of a check, those of a gauge as one where they are too many to read."""
    never = np.datetime64("NaT", "s")
    for _, group in groupby(findings, key=lambda finding: finding.gauge):
        members = list(group)
        if len(members) <= MOST_STRETCHES:
            yield from members
            continue
        worst = max(members, key=lambda finding: SEVERITIES.index(finding.severity))
        yield replace(
            worst,
            start=never,
            end=never,
            evidence=f"{len(members)} stretches between {members[0].start} and {members[-1].end}. One of them: "
            f"{worst.evidence}",
            action=f"Look at the gauge's whole record before using any of it. Of one stretch: {worst.action}",
            edit=None,
        )
