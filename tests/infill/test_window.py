"""The spans of a window: which gauges know their depth over them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from windows import average, column, hourly, with_status

from basinrain.rainfall import KnownTotal, RainRecord, Status

NAN = float("nan")
HOURS = np.datetime64("2031-05-04T00", "s") + np.arange(7) * np.timedelta64(3600, "s")


def with_total(record: RainRecord, first: int, stop: int, depth: float) -> RainRecord:
    """C knows the depth of the hours ``first`` to ``stop`` as a total only; its depths at these steps were spread."""
    total = KnownTotal("C", HOURS[first], HOURS[stop], depth)
    spread = with_status(record, "C", slice(first, stop), Status.SPREAD)
    return replace(spread, totals=(*record.totals, total))


class TestCutTotals:
    """A gauge knows its storm or day only where its totals do not reach beyond it. B is silent; A, C and D report."""

    RECORD = hourly([1.0] * 6, [NAN] * 6, [2.0] * 6, [3.0] * 6)

    @pytest.mark.parametrize(("first", "stop"), [(0, 4), (1, 3), (3, 6), (0, 6)])
    def test_a_total_that_reaches_beyond_the_storm(self, first: int, stop: int) -> None:
        """The storm is hours 2 to 5, and C's total begins before it, ends after it, or both: only A and D donate."""
        window = with_total(self.RECORD, first, stop, 2.0 * (stop - first)).window(2, 5)
        (estimate,) = average(window, scale="storm").estimates
        assert (sorted(estimate.donors), estimate.depth) == (["A", "D"], 6)

    @pytest.mark.parametrize(("first", "stop"), [(2, 5), (2, 4), (3, 5), (0, 2), (5, 6)])
    def test_a_total_within_or_beside_the_storm(self, first: int, stop: int) -> None:
        """A total that begins and ends in hours 2 to 5, or lies beside them, is whole: C donates with A and D."""
        window = with_total(self.RECORD, first, stop, 2.0 * (stop - first)).window(2, 5)
        (estimate,) = average(window, scale="storm").estimates
        assert (sorted(estimate.donors), estimate.depth) == (["A", "C", "D"], 6)

    def test_a_total_that_all_fell_inside(self) -> None:
        """C's 4 mm of hours 0 to 4 were spread over the two that lie in the storm: all of it is known to be there."""
        dry = replace(self.RECORD, depth=self.RECORD.depth * np.array([[1, 1, k, 1] for k in (0, 0, 1, 1, 1, 1)]))
        for depth, donors in ((4.0, ["A", "C", "D"]), (4.0 + 1e-6, ["A", "D"])):
            window = with_total(dry, 0, 4, depth).window(2, 5)
            (estimate,) = average(window, scale="storm").estimates
            assert sorted(estimate.donors) == donors

    def test_two_totals_one_of_which_is_cut(self) -> None:
        """C's second total lies in the storm, its first begins before it: C is no donor."""
        window = with_total(with_total(self.RECORD, 1, 3, 4.0), 3, 5, 4.0).window(2, 5)
        (estimate,) = average(window, scale="storm").estimates
        assert sorted(estimate.donors) == ["A", "D"]

    def test_days_are_looked_at_one_by_one(self) -> None:
        """C's total goes over midnight between two days of three steps: it donates to neither, but to the storm."""
        record = hourly([1.0] * 6, [NAN] * 6, [2.0] * 6, [3.0] * 6, hours=8)
        total = KnownTotal("C", record.starts[1], record.ends[3], 6.0)
        record = replace(with_status(record, "C", slice(None), Status.SPREAD), totals=(total,))
        donors = {s: [sorted(e.donors) for e in average(record, scale=s).estimates] for s in ("day", "storm")}
        assert donors == {"day": [["A", "D"], ["A", "D"]], "storm": [["A", "C", "D"]]}

    def test_a_gauge_that_opens_during_a_total(self) -> None:
        """B was installed for the last two hours; C's total of all four reaches beyond these."""
        record = with_status(hourly([1.0] * 4, [NAN] * 4, [2.0] * 4, [3.0] * 4), "B", slice(0, 2), Status.NOT_INSTALLED)
        (estimate,) = average(with_total(record, 0, 4, 8.0)).estimates
        assert (estimate.first, sorted(estimate.donors)) == (2, ["A", "D"])

    def test_too_few_whole_totals(self) -> None:
        """Only A and C report, C's total is cut: B stays missing, and it is said why."""
        record = hourly([1.0] * 6, [NAN] * 6, [2.0] * 6)
        completed = average(with_total(record, 0, 4, 8.0).window(2, 5), scale="storm")
        assert np.isnan(column(completed)).all()
        (note,) = [n for n in completed.notes if n.code == "not-infilled"]
        assert note.text.endswith(
            "fewer than 2 other gauges have values of their own at every step of the storm, totals that reach beyond "
            "it left out."
        )

    def test_steps_do_not_ask_for_totals(self) -> None:
        """C's measured hours donate step by step, whatever total it has elsewhere."""
        completed = average(with_total(self.RECORD, 0, 3, 6.0).window(2, 5), scale="step")
        assert [sorted(e.donors) for e in completed.estimates] == [["A", "D"], ["A", "C", "D"], ["A", "C", "D"]]
