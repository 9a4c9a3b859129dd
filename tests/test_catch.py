"""Catch factors: given ones are applied, others are not invented."""

from __future__ import annotations

import numpy as np

from basinrain.catch import correct_catch
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def test_factors_by_month_and_status() -> None:
    """1.1 in January and 1 in February: 10 becomes 11, then stays 10; zero and missing stay what they are."""
    ends = np.array(["2031-01-31T22", "2031-01-31T23", "2031-02-01T01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[10.0, 5.0], [0.0, 5.0], [10.0, NAN]], step="1h")
    corrected = correct_catch(record, {"A": np.array([1.1] + [1.0] * 11), "B": np.full(12, 1.2)})
    np.testing.assert_allclose(corrected.depth, [[11.0, 6.0], [0.0, 6.0], [10.0, NAN]])
    labels = [[Status(s).label for s in row] for row in corrected.status]
    assert labels == [["adjusted", "adjusted"], ["zero", "adjusted"], ["observed", "missing"]]


def test_without_factors_the_record_is_the_same() -> None:
    """No factor, no change."""
    ends = np.array(["2031-01-31T22"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), ends - 3600, ends, [[10.0]], step="1h")
    assert correct_catch(record, {}) is record


def test_storm_totals_without_times_take_the_mean_factor() -> None:
    """A total without a date is multiplied by the mean of the twelve factors, (6·1.0 + 6·1.2)/12 = 1.1."""
    nat = np.array(["NaT"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), nat, nat, [[10.0]], step="storm")
    corrected = correct_catch(record, {"A": np.array([1.0] * 6 + [1.2] * 6)})
    np.testing.assert_allclose(corrected.depth, [[11.0]])
