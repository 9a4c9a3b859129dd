"""Screening as a whole."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np
import pytest
from screening.drawn_records import line_of, rain_of, record_of
from screening.planted import DAY, KINDS, clean_hours, planted
from screening.planted import record_of as dated

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.screening import (
    CHECKS,
    Finding,
    Screening,
    ScreeningOptions,
    apply_edits,
    apply_rejections,
    screen,
)


def told(screening: Screening) -> list[tuple[object, ...]]:
    """Return what is said of gauges, without what rests on the order of sums."""
    return [(f.key, str(f.end), f.severity, f.others, f.action) for f in screening.findings]


@pytest.mark.parametrize("kind", KINDS[::2], ids=lambda kind: kind.name)
def test_the_order_of_gauges_changes_nothing(kind: object) -> None:
    """Findings on permuted columns are the same findings in the same order."""
    fault = planted(kind, kind.scales[0], 11)  # type: ignore[arg-type, attr-defined]
    order = np.random.default_rng(1).permutation(len(fault.network))
    network = fault.network
    turned = GaugeNetwork(ids=tuple(network.ids[k] for k in order), x=network.x[order], y=network.y[order], crs="local")
    straight = screen(fault.record, network)
    assert straight.findings
    assert told(straight) == told(screen(fault.record.ordered(turned.ids), turned))


def test_nothing_is_changed() -> None:
    """Depths and statuses are the same to the last bit after screening."""
    depths = rain_of(400, 5)
    depths[50:52, 0] = 999
    record = record_of(depths)
    status = record.status.copy()
    screen(record, line_of(5))
    np.testing.assert_array_equal(record.depth, depths)
    np.testing.assert_array_equal(record.status, status)


def test_every_suggested_edit_can_be_made() -> None:
    """Of all planted faults, the edits that findings suggest are accepted and change their gauge only."""
    tried = 0
    for kind in KINDS:
        fault = planted(kind, kind.scales[0], 4)
        for finding in screen(fault.record, fault.network).findings:
            if finding.edit is None:
                continue
            tried += 1
            (edited,), _ = apply_edits([fault.record], [finding.edit])
            g = fault.network.position(finding.gauge)
            others = np.arange(len(fault.network)) != g
            # A shift may make the record a day longer.
            at = np.searchsorted(edited.ends, fault.record.ends)
            np.testing.assert_array_equal(edited.depth[at][:, others], fault.record.depth[:, others])
            assert not np.array_equal(edited.depth[at, g], fault.record.depth[:, g], equal_nan=True)
    assert tried >= 12


def test_what_cannot_be_checked_is_said_with_its_reason() -> None:
    """Two gauges over a day have no neighbours to compare with and no years."""
    screening = screen(record_of(np.zeros((24, 2)), "1h"), line_of(2))
    assert screening.findings == ()
    assert screening.checks_skipped["spatial-outlier"] == "the network has 2 gauges; it takes 4 or more"
    assert screening.checks_skipped["zero-run"] == "the network has 2 gauges; it takes 3 or more"
    assert set(CHECKS) <= set(screening.checks_run) | set(screening.checks_skipped)


def test_gauges_far_apart_have_no_neighbours() -> None:
    """At 200 km from each other gauges say nothing of each other's days."""
    screening = screen(record_of(rain_of(60, 5)), line_of(5, 200_000.0))
    assert screening.checks_skipped["zero-among-wet"] == "no gauge has 3 others within reach; the most is 0"


def test_too_few_days_are_said() -> None:
    """Forty hours hold no thirty days."""
    screening = screen(record_of(np.ones((40, 4)), "1h"), line_of(4))
    assert screening.checks_skipped["shifted-record"] == "the record has 1 whole day; it takes 30 or more"


def test_storm_totals_without_times_are_not_screened_by_time() -> None:
    """Totals of storms have no days; codes of missing values are still looked for."""
    never = np.full(3, np.datetime64("NaT", "s"))
    record = RainRecord(
        ("A",), never, never, np.full((3, 1), 9.0), np.zeros((3, 1), np.uint8), step="storm", labels=("a", "b", "c")
    )
    screening = screen(record, line_of(1))
    assert "missing-code" in screening.checks_run
    assert screening.checks_skipped["greatest-depths"] == "the record is of storm totals without times"


@pytest.mark.parametrize("shape", [(0, 3), (3, 0)])
def test_an_empty_record_has_no_findings(shape: tuple[int, int]) -> None:
    """Without steps or gauges there is nothing to find."""
    screening = screen(record_of(np.zeros(shape)), line_of(shape[1]))
    assert screening.findings == ()
    assert screening.checks_skipped["missing-code"] == "the record is empty"


def test_a_silent_gauge_is_no_finding() -> None:
    """A gauge without any value, or not in service, is a gap and not a fault; its neighbours are still compared."""
    depths = rain_of(400, 5)
    depths[:, 1] = np.nan
    record = record_of(depths)
    status = record.status.copy()
    status[:, 1] = Status.NOT_INSTALLED
    for silent in (record, replace(record, status=status)):
        assert [f.check for f in screen(silent, line_of(5)).findings if f.check != "short-record"] == []


def test_every_stretch_is_a_finding_however_many_there_are() -> None:
    """Thirty-one separate days of 999 mm: to reject them takes these days, and no other of the gauge's."""
    depths = rain_of(400, 1)
    depths[0:400:13, 0] = 999
    record = record_of(depths)
    settled = screen(record, line_of(1), reject=["missing-code"]).findings
    assert len([f for f in settled if f.check == "missing-code"]) == 31
    assert np.isnan(apply_rejections(record, settled).depth[:, 0]).sum() == 31


def test_evidence_and_advice_are_in_the_jobs_unit() -> None:
    """Of every planted fault: no depth in mm is said where the job is in inches, but for the names of units."""
    for kind in KINDS:
        fault = planted(kind, kind.scales[0], 4)
        inches = screen(fault.record, fault.network, options=ScreeningOptions(depth_unit="in")).findings
        plain = screen(fault.record, fault.network).findings
        assert told(Screening(findings=inches)) == told(Screening(findings=plain))
        for finding in inches:
            names = ("a usual code for a missing value", "as between")
            if not any(name in finding.evidence for name in names):
                assert " mm" not in finding.evidence + finding.action, finding


def test_evidence_says_the_stamp_that_the_file_has() -> None:
    """A day read at 08:00 is named by its end, the zero of the second morning."""
    depths = rain_of(400, 5)
    depths[:, 1:] = depths[:, 1:].clip(0, 30)
    depths[1] = [0, 20, 22, 24, 26]
    record = record_of(depths)
    read = replace(record, starts=record.starts - 57600, ends=record.ends - 57600)
    (finding,) = [f for f in screen(read, line_of(5)).findings if f.gauge == "A" and f.check == "zero-among-wet"]
    assert finding.key == "zero-among-wet A 2031-01-01T08:00"
    assert finding.evidence.startswith("No rain in the day that ends 2031-01-02 08:00.")


def test_spread_days_are_compared_and_their_hours_are_not() -> None:
    """A daily gauge in an hourly record that was spread from a total ten times too great."""
    depths = np.repeat(rain_of(40, 5), 24, axis=0) / 24
    wet = int(np.argmax(depths[:, 0])) // 24
    depths[:, 4] *= np.where(np.arange(960) // 24 == wet, 10, 1)
    record = record_of(depths, "1h")
    status = record.status.copy()
    status[:, 4] = Status.SPREAD
    ends = record.ends[23::24]
    totals = tuple(
        KnownTotal("E", end - np.timedelta64(1, "D"), end, float(depths[24 * k : 24 * k + 24, 4].sum()))
        for k, end in enumerate(ends)
    )
    spread = replace(record, status=status, totals=totals, recorders=frozenset("ABCD"))
    findings = [f for f in screen(spread, line_of(5)).findings if f.gauge == "E"]
    assert [f.check for f in findings] == ["spatial-outlier"]


def test_findings_come_in_the_order_of_checks_gauges_and_times() -> None:
    """The registry's order first, then ids, then starts."""
    depths = rain_of(400, 5)
    depths[200:202, 3] = depths[50:52, 0] = depths[60:62, 0] = 999
    findings = screen(record_of(depths), line_of(5)).findings
    place = {name: k for k, name in enumerate(CHECKS)}

    def rank(finding: Finding) -> tuple[int, str, str]:
        return place[finding.check], finding.gauge, "" if finding.whole_record else str(finding.start)

    assert list(findings) == sorted(findings, key=rank)


def test_a_usual_storm_job_is_screened_in_no_time() -> None:
    """Twelve gauges by a thousand hours; the limit is far above what it takes, so that a busy machine does not fail."""
    network, depths = clean_hours(0)
    record = dated(network, depths[:1000], DAY // 24)
    began = time.process_time()
    screen(record, network, options=ScreeningOptions())
    assert time.process_time() - began < 0.5
