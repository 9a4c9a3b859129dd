"""How often planted faults are found and clean records blamed: ``python -m screening.rates``, from ``tests``."""

from __future__ import annotations

import sys
from collections import Counter
from dataclasses import dataclass
from functools import cache

from screening.planted import DAY, KINDS, Kind, clean_days, clean_hours, planted, record_of

from basinrain.screening import CHECKS, Finding, screen
from basinrain.screening.screened import Screened

PLANTINGS = 200
CLEAN = 50

_OF_OTHERS = ("one-record-two-gauges", "short-record")
"""Checks whose findings name the gauge among others."""


@dataclass(frozen=True)
class Rate:
    """Plantings of a kind and how many of them the check found."""

    kind: Kind
    scale: str
    planted: int
    found: int

    @property
    def detected(self) -> float:
        """The share that was found."""
        return self.found / self.planted


@dataclass(frozen=True)
class Alarms:
    """Findings of a check in clean records."""

    check: str
    scale: str
    findings: int
    records: int
    gauge_years: float


def hits(kind: Kind, scale: str, seed: int) -> bool:
    """Return whether the check finds the fault of this seed: at its gauge and in its stretch."""
    fault = planted(kind, scale, seed)
    view = Screened(fault.record, fault.network, fault.options)

    def meant(finding: Finding) -> bool:
        concerned = (finding.gauge, *finding.others) if kind.check in _OF_OTHERS else (finding.gauge,)
        there = finding.whole_record or (finding.start < fault.end and finding.end > fault.start)
        told = kind.severity in ("", finding.severity) and kind.evidence.format(gauge=fault.gauge) in finding.evidence
        return bool(fault.gauge in concerned and there and told)

    return any(meant(finding) for finding in CHECKS[kind.check].run(view))


@cache
def detection(kind: Kind, scale: str) -> Rate:
    """Plant a kind of fault at seeds 0, 1, 2 ...; a kind that is planted at two scales shares them."""
    n = PLANTINGS // len(kind.scales)
    return Rate(kind, scale, n, sum(hits(kind, scale, seed) for seed in range(n)))


@cache
def false_alarms(scale: str) -> dict[str, Alarms]:
    """Screen clean records, and return for every check what it found there."""
    findings: Counter[str] = Counter()
    records: Counter[str] = Counter()
    years = 0.0
    # Thresholds were chosen on seeds below 100; faults are planted in those of 100 to 119.
    for seed in range(200, 200 + CLEAN):
        network, depths = clean_days(seed) if scale == "day" else clean_hours(seed)
        seconds = DAY if scale == "day" else 3600
        screening = screen(record_of(network, depths, seconds), network)
        findings.update(finding.check for finding in screening.findings)
        records.update({finding.check for finding in screening.findings})
        years += len(network) * len(depths) * seconds / (365.25 * DAY)
    return {check: Alarms(check, scale, findings[check], records[check], years) for check in CHECKS}


def table() -> str:
    """Return the rates as the table of docs/verification.md."""
    lines = ["| fault | step | check | planted | found |", "|---|---|---|---|---|"]
    lines += [
        f"| {kind.name} | {scale} | {kind.check} | {rate.planted} | {100 * rate.detected:.1f} % |"
        for kind in KINDS
        for scale in kind.scales
        for rate in (detection(kind, scale),)
    ]
    lines += ["", "| check | step | findings in clean records | per 100 gauge-years | records with any |"]
    lines += ["|---|---|---|---|---|"]
    lines += [
        f"| {alarm.check} | {scale} | {alarm.findings} | {100 * alarm.findings / alarm.gauge_years:.2f} | "
        f"{alarm.records} of {CLEAN} |"
        for scale in ("day", "hour")
        for alarm in false_alarms(scale).values()
    ]
    return "\n".join(lines)


if __name__ == "__main__":
    sys.stdout.write(table() + "\n")
