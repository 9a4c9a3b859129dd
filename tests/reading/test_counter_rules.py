"""What the readings of a counter can do."""

from __future__ import annotations

import pytest

from basinrain.errors import JobError
from basinrain.reading.counter_rules import LEAST, CounterRules


def test_a_jitter_as_large_as_the_counter() -> None:
    """A jitter of half the rollover value would make every rollover noise."""
    with pytest.raises(JobError, match="jitter: found it as large as half of rollover or more; expected a smaller"):
        CounterRules(rollover=10.0, jitter=5.0)
    assert CounterRules(rollover=10.0, jitter=4.9).noise == 4.9 + LEAST
