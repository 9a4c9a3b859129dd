"""Values that no rain writes."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import found, rain_of, record_of


def test_a_depth_that_stands_still_is_found() -> None:
    """Nine days of 3.7 mm in a record that hardly ever repeats a depth."""
    depths = rain_of(300, 3)
    depths[100:109, 1] = 3.7
    (finding,) = found("stuck-values", record_of(depths))
    assert finding.key == "stuck-values B 2031-04-11T00:00"
    assert str(finding.end) == "2031-04-20T00:00:00"
    assert "3.7 mm in each of the 9 days 2031-04-11 to 2031-04-19;" in finding.evidence


def test_a_coarse_gauge_may_repeat_its_least_depth() -> None:
    """A gauge that writes 0.2 mm three times of four has runs of ten; the same run in a fine record is stuck."""
    rng = np.random.default_rng(1)
    coarse = np.where(rng.random((4000, 1)) < 0.75, 0.2, 0.4)
    assert max(len(run) for run in "".join("x" if d == 0.2 else " " for d in coarse[:, 0]).split()) >= 10
    assert found("stuck-values", record_of(coarse, "1h")) == []
    fine = rng.permuted(np.arange(1, 4001) / 10).reshape(-1, 1)
    fine[1000:1010] = 0.2
    assert len(found("stuck-values", record_of(fine, "1h"))) == 1


def test_zeros_do_not_stand_still() -> None:
    """Dry weather is no fault."""
    assert found("stuck-values", record_of(np.zeros((500, 1)))) == []


@pytest.mark.parametrize(
    ("depth", "name"), [(999.0, "999 mm"), (99.9, "99.9 mm"), (2537.46, "99.9 in"), (7777.0, "7777 mm")]
)
def test_a_code_that_repeats_far_above_all_else_is_named(depth: float, name: str) -> None:
    """999 mm, or 99.9 in read as 2537.46 mm, on two days, while the greatest other depth is some 40 mm."""
    depths = np.minimum(rain_of(300, 3), 40)
    depths[50, 0] = depths[51, 0] = depth
    (finding,) = found("missing-code", record_of(depths))
    assert (finding.gauge, finding.severity) == ("A", "erroneous")
    assert f"{name} is a usual code for a missing value" in finding.evidence
    assert finding.edit is not None


def test_a_loggers_full_scale_is_named_as_such() -> None:
    """3276.7 mm, the greatest tenths of a signed register of two bytes."""
    depths = np.minimum(rain_of(300, 3), 40)
    depths[50, 0] = depths[90, 0] = 3276.7
    first, _ = found("missing-code", record_of(depths))
    assert first.evidence.startswith("3276.7 mm in the day 2031-02-20, and in 2 days of the record in all.")
    assert "3276.7 mm is the full scale of a logger's register, which it writes when it fails" in first.evidence


def test_codes_apart_are_stretches_and_codes_around_a_gap_are_one() -> None:
    """Three days of 999, a missing one between the first two."""
    depths = rain_of(300, 1)
    depths[50:53, 0] = 999, np.nan, 999
    depths[200, 0] = 999
    starts = [str(f.start)[:10] for f in found("missing-code", record_of(depths))]
    assert starts == ["2031-02-20", "2031-07-20"]


def test_a_wet_day_that_looks_like_a_code_is_none() -> None:
    """99.9 mm once, or twice beside a day of 120 mm, is rain."""
    depths = np.minimum(rain_of(300, 1), 40)
    depths[50, 0] = 99.9
    assert found("missing-code", record_of(depths)) == []
    depths[51, 0], depths[52, 0] = 99.9, 120
    assert found("missing-code", record_of(depths)) == []
