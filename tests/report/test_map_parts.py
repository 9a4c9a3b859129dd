from __future__ import annotations

import math

import pytest

from basinrain.report.map_parts import nice_length


@pytest.mark.parametrize(("length", "nice"), [(7.3, 5), (19.9, 10), (0.24, 0.2), (1000, 1000)])
def test_the_scale_bar_has_a_round_length(length: float, nice: float) -> None:
    """One, two or five times a power of ten, and no longer than asked."""
    assert math.isclose(nice_length(length), nice)
