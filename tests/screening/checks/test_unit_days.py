"""Weeks in another unit."""

from __future__ import annotations

import numpy as np
import pytest
from screening.drawn_records import found, rain_of, record_of

from basinrain.screening import apply_edits


@pytest.mark.parametrize(("factor", "words"), [(10.0, "10"), (25.4, "25.4")])
def test_three_weeks_in_another_unit_are_found_by_their_days(factor: float, words: str) -> None:
    """Twenty-one days in the middle of two months: from the first wet one to the last, and the edit mends them."""
    clean = rain_of(800, 5)
    depths = clean.copy()
    depths[250:271, 1] *= factor
    record = record_of(depths)
    (finding,) = found("unit-mixup", record)
    wet = 250 + np.flatnonzero(clean[250:271].min(axis=1) >= 1)
    day = np.datetime64("2031-01-01")
    assert len(wet) >= 6
    assert day + 250 <= finding.start <= day + wet[0]
    assert day + wet[-1] + 1 <= finding.end <= day + 271
    assert (finding.gauge, finding.severity) == ("B", "doubtful")
    assert f"near {words}, as between" in finding.evidence
    assert finding.edit is not None
    (mended,), _ = apply_edits([record], [finding.edit])
    assert mended.depth[wet, 1] == pytest.approx(clean[wet, 1])


def test_five_wet_days_tell_too_little() -> None:
    """Of a wet spell the first five days are ten times too great; of six the check would know."""
    depths = rain_of(800, 5)
    wet = np.flatnonzero(depths.min(axis=1) >= 1)[100:106]
    depths[wet[:5], 1] *= 10
    assert found("unit-mixup", record_of(depths)) == []
    depths[wet[5], 1] *= 10
    assert len(found("unit-mixup", record_of(depths))) == 1


def test_a_tenth_over_weeks_is_weather_to_this_check() -> None:
    """Showers miss a gauge for three weeks; only months of a tenth are held against its unit."""
    depths = rain_of(800, 5)
    depths[250:271, 1] /= 10
    assert found("unit-mixup", record_of(depths)) == []
