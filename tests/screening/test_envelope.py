"""The greatest known depths, and lines between them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.screening.envelope import envelope_depth, greatest_depths, world_depth


@pytest.mark.parametrize(
    ("hours", "depth", "place"),
    [
        (20 / 60, 206, "Curtea de Arges"),
        (42 / 60, 305, "Holt"),
        (1, 401, "Shangdi"),
        (24, 1825, "Foc-Foc"),
        (48, 2493, "Cherrapunji"),
        (72, 3930, "Commerson"),
        (96, 4936, "Commerson"),
        (744, 9300, "Cherrapunji"),
        (8760, 26461, "Cherrapunji"),
    ],
)
def test_the_envelope_runs_through_the_world_records(hours: float, depth: float, place: str) -> None:
    """World greatest point rainfalls as listed by the WMO and in handbooks (from memory)."""
    assert world_depth(hours) == pytest.approx(depth, rel=1e-5)
    assert any(place in r.place for r in greatest_depths() if r.hours == pytest.approx(hours, rel=1e-3))


def test_a_record_below_a_shorter_one_does_not_bend_the_line() -> None:
    """1144 mm in 12 h stand below 1400 mm in 10 h: at 12 h the line is 1400 (12/10)^p, p = ln(1689/1400)/ln(1.85)."""
    power = math.log(1689 / 1400) / math.log(1.85)
    assert world_depth(12) == pytest.approx(1400 * 1.2**power)
    assert any(record.hours == 12 and record.depth == 1144 for record in greatest_depths())


def test_a_line_is_straight_on_logarithms() -> None:
    """Half way between 1 h and 4 h on a logarithmic scale is 2 h; the depth is the root of the product."""
    assert envelope_depth([(1, 50), (4, 200)], 2) == pytest.approx(math.sqrt(50 * 200))
    assert envelope_depth([(4, 200), (1, 50)], 0.1) == pytest.approx(50)
    assert envelope_depth([(1, 50), (4, 200)], 4.1) == math.inf
    assert envelope_depth([], 1) == math.inf


@given(st.floats(1e-3, 17000), st.floats(1.0, 10.0))
def test_the_envelope_never_falls_with_duration(hours: float, longer: float) -> None:
    """What fell in a time fell in any longer one."""
    assert world_depth(hours * longer) >= world_depth(hours) * (1 - 1e-12)
