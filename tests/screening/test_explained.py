"""Findings on single days within one on the whole stretch."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import line_of, rain_of, record_of

from basinrain.screening import Finding, apply_rejections, screen
from basinrain.screening.explained import without_explained
from basinrain.screening.findings import Severity

DAY = np.datetime64("2031-05-04", "s") + np.arange(40) * np.timedelta64(86400, "s")


def of(check: str, first: int, stop: int, *, gauge: str = "A", severity: Severity = "doubtful") -> Finding:
    """Return a finding of days, from the fourth of May 2031."""
    return Finding(
        check=check,
        gauge=gauge,
        start=DAY[first],
        end=DAY[stop],
        severity=severity,
        evidence="Odd.",
        action="Look.",
    )


def test_days_of_a_late_record_go_and_are_counted() -> None:
    """Three within the stretch go; one at its edge, one of another gauge and one of another kind stay."""
    late = of("shifted-record", 5, 20)
    inside = [of("zero-among-wet", 5, 6), of("zero-among-wet", 9, 10), of("spatial-outlier", 19, 20)]
    outside = [of("zero-among-wet", 4, 6), of("zero-among-wet", 7, 8, gauge="B"), of("stuck-values", 10, 14)]
    kept = without_explained([*inside, *outside, late])
    assert kept[:3] == tuple(outside)
    (told,) = kept[3:]
    assert told.evidence == (
        "Odd. 3 findings on single days follow from it (1 spatial-outlier, 2 zero-among-wet), listed only where this "
        "is accepted."
    )


def test_what_is_accepted_explains_nothing() -> None:
    """The values stand then, and nothing of them is hidden; entries by leading words count."""
    findings = [of("shifted-record", 5, 20), of("zero-among-wet", 9, 10)]
    assert len(without_explained(findings)) == 1
    for entry in ("shifted-record", "shifted-record A", "shifted-record A 2031-05-09"):
        assert without_explained(findings, [entry]) == tuple(findings)


def test_what_cannot_be_right_is_not_hidden_by_what_may_be_wrong() -> None:
    """An impossible depth in a record that may be late stays; in one of codes it goes."""
    impossible = of("greatest-depths", 9, 10, severity="erroneous")
    assert impossible in without_explained([impossible, of("shifted-record", 5, 20)])
    assert impossible not in without_explained([impossible, of("missing-code", 9, 10, severity="erroneous")])


def test_a_chain_is_counted_at_its_head() -> None:
    """A code is too great a depth, which is far from the neighbours: one finding, with two that follow."""
    chain = [
        of("missing-code", 9, 10, severity="erroneous"),
        of("greatest-depths", 9, 10, severity="erroneous"),
        of("spatial-outlier", 9, 10),
    ]
    (head,) = without_explained(chain)
    assert "2 findings on single days follow from it (1 greatest-depths, 1 spatial-outlier)" in head.evidence
    code, depth = without_explained(chain, ["missing-code"])
    assert code.evidence == "Odd."
    assert "1 finding on single days follows from it (1 spatial-outlier)" in depth.evidence


def test_of_the_whole_record_everything_is_a_part() -> None:
    """A record in another unit throughout explains any of its days."""
    whole = Finding(check="unit-mixup", gauge="A", severity="erroneous", evidence="Odd.", action="Look.")
    assert len(without_explained([of("zero-run", 3, 30, severity="erroneous"), whole])) == 1


@pytest.mark.parametrize("entry", ["reject", "accept"])
def test_a_code_is_one_finding_whose_rejection_takes_all_of_it(entry: str) -> None:
    """3276.7 mm on two days: two findings; rejected both values go, accepted each day is odd twice more."""
    depths = rain_of(400, 5)
    depths[[50, 90], 2] = 3276.7
    record = record_of(depths)
    findings = screen(record, line_of(5), **{entry: ["missing-code C"]}).findings  # type: ignore[arg-type]
    checks = [finding.check for finding in findings if finding.gauge == "C"]
    if entry == "reject":
        assert checks == ["missing-code"] * 2
        assert np.flatnonzero(np.isnan(apply_rejections(record, findings).depth[:, 2])).tolist() == [50, 90]
    else:
        assert checks == ["missing-code"] * 2 + ["greatest-depths"] * 2
