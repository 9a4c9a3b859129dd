"""Days that end at different hours."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from screening.drawn_records import found, line_of, rain_of, record_of

from basinrain.rainfall import KnownTotal


def totals(gauge: str, hour: int, days: int) -> tuple[KnownTotal, ...]:
    """Return so many daily totals that end at an hour of the day."""
    ends = np.datetime64("2031-01-02T00:00:00") + np.arange(days) * np.timedelta64(1, "D") + np.timedelta64(hour, "h")
    return tuple(KnownTotal(gauge, end - np.timedelta64(1, "D"), end, 3.0) for end in ends)


def test_gauges_that_are_read_at_another_hour_are_named() -> None:
    """Two gauges are read at 7, one at 9, one at 7 and later at 9."""
    record = replace(
        record_of(np.zeros((240, 4)), "1h"),
        totals=totals("A", 7, 8) + totals("B", 7, 8) + totals("C", 9, 8) + totals("D", 7, 5) + totals("D", 9, 3),
    )
    findings = {finding.gauge: finding for finding in found("reading-hours", record, line_of(4))}
    assert sorted(findings) == ["C", "D"]
    assert findings["C"].evidence.startswith("Its days end at 09:00 on 8 days; those of most daily gauges end at 07:00")
    assert findings["C"].severity == "remark"
    assert findings["C"].others == ("A", "B", "D")
    assert "07:00 on 5 days, 09:00 on 3 days" in findings["D"].evidence
    assert findings["D"].severity == "doubtful"


def test_one_hour_for_all_is_nothing() -> None:
    """Gauges read at the same hour raise no question."""
    record = replace(record_of(np.zeros((240, 2)), "1h"), totals=totals("A", 7, 8) + totals("B", 7, 8))
    assert found("reading-hours", record) == []


def test_days_that_end_earlier_are_seen_in_the_rain() -> None:
    """Of D's rain one part in three falls, by its book, on the next date: its day ends some eight hours early."""
    fallen = rain_of(800, 5)
    depths = fallen.copy()
    evening = np.random.default_rng(4).random(800) < 1 / 3
    late = np.where(evening, fallen[:, 3], 0.0)
    depths[:, 3] = fallen[:, 3] - late + np.concatenate([[0.0], late[:-1]])
    (finding,) = found("reading-hours", record_of(depths))
    assert finding.gauge == "D"
    assert "earlier than those of its neighbours" in finding.evidence
    assert found("shifted-record", record_of(depths)) == []


def test_a_whole_day_off_belongs_to_the_other_check() -> None:
    """A record that is a day late is shifted, not read at another hour."""
    depths = rain_of(800, 5)
    depths[:, 3] = np.roll(depths[:, 3], 1)
    assert found("reading-hours", record_of(depths)) == []
