"""Catch factors: given ones are applied, others are not invented."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from basinrain.catch import correct_catch
from basinrain.rainfall import KnownTotal, RainRecord, Status

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


FACTORS = np.array([1.1, 1.2] + [1.0] * 10)


def test_the_last_step_of_a_month_is_that_months() -> None:
    """An hour that ends at the first moment of February is January's: 10 x 1.1; the next is February's: 10 x 1.2."""
    ends = np.array(["2031-02-01T00", "2031-02-01T01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), ends - 3600, ends, [[10.0], [10.0]], step="1h")
    np.testing.assert_allclose(correct_catch(record, {"A": FACTORS}).depth, [[11.0], [12.0]])


def test_a_monthly_record() -> None:
    """January's depth ends at the first moment of February, and is January's; December's takes December's factor."""
    bounds = np.array(["2030-12-01", "2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(("A",), bounds[:-1], bounds[1:], [[100.0]] * 3, step="1mo")
    np.testing.assert_allclose(correct_catch(record, {"A": FACTORS}).depth, [[100.0], [110.0], [120.0]])


def test_spread_totals_are_corrected_with_their_steps() -> None:
    """20 mm over an hour of January and one of February become 11 + 12 = 23; another gauge's total stays."""
    ends = np.array(["2031-02-01T00", "2031-02-01T01"], dtype="datetime64[s]")
    bare = RainRecord.from_depths(("A", "B"), ends - 3600, ends, [[10.0, 4.0], [10.0, 5.0]], step="1h")
    record = replace(
        bare,
        status=np.full((2, 2), Status.SPREAD, dtype=np.uint8),
        totals=tuple(KnownTotal(gauge, ends[0] - 3600, ends[1], mm) for gauge, mm in (("A", 20.0), ("B", 9.0))),
    )
    corrected = correct_catch(record, {"A": FACTORS})
    assert [total.depth for total in corrected.totals] == [23.0, 9.0]
    assert (corrected.status == Status.SPREAD).all()
