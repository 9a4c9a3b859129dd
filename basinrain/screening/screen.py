"""Screening: is the record fit to use."""

from __future__ import annotations

from collections.abc import Sequence

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening.checks import CHECKS
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS, consistency
from basinrain.screening.explained import without_explained
from basinrain.screening.findings import Finding, Screening, ScreeningOptions
from basinrain.screening.rejection import apply_rejections, rejected_findings, settle_findings
from basinrain.screening.screened import Screened

__all__ = ["screen"]


def screen(
    record: RainRecord,
    network: GaugeNetwork,
    *,
    options: ScreeningOptions | None = None,
    reject: Sequence[str] = (),
    accept: Sequence[str] = (),
) -> Screening:
    """Return what every check of the registry finds in a record, and how consistent its years are; nothing is changed.

    Parameters
    ----------
    record
        Columns in the network's order.
    network
        The gauges.
    options
        What the user says about region and gauges.
    reject, accept
        What the user says about findings, as for :func:`basinrain.screening.settle_findings`. The checks see the record
        as it is; consistency is that of the record without what is rejected. What a finding explains is listed beside
        it only where that is accepted.

    Returns
    -------
    Screening
        A check that lacks what it needs is named in ``checks_skipped`` with the reason; the two on years, which some
        gauges may lack, are then named in ``checks_run`` as well where other gauges have them. A record without steps
        or gauges has no findings.

    Raises
    ------
    JobError
        An entry of ``reject`` or ``accept`` does not fit.

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
        findings += sorted(check.run(view), key=_by_gauge_and_time)
    findings = list(without_explained(findings, accept))
    years = consistency(apply_rejections(record, rejected_findings(findings, reject)), network)
    findings += sorted(years.findings, key=lambda finding: (finding.check, finding.gauge))
    ran += [name for name, made in ((DOUBLE_MASS_BREAK, years.double_mass), (INHOMOGENEOUS, years.homogeneity)) if made]
    return Screening(
        findings=settle_findings(findings, reject=reject, accept=accept),
        double_mass=years.double_mass,
        homogeneity=years.homogeneity,
        checks_run=tuple(ran),
        checks_skipped=skipped | dict(years.skipped),
    )


def _by_gauge_and_time(finding: Finding) -> tuple[str, str, str]:
    return finding.gauge, "" if finding.whole_record else str(finding.start), str(finding.end)
