"""The rain record."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.rainfall import MEASURED, REPORTING, WITHOUT_DEPTH, KnownTotal, RainRecord, Status

HOUR = np.timedelta64(3600, "s")
ENDS = np.datetime64("2031-05-04T00:00:00") + np.arange(1, 4) * HOUR


def record() -> RainRecord:
    """Two gauges over three hours, one gap."""
    return RainRecord.from_depths(
        ("A", "B"), ENDS - HOUR, ENDS, [[1.0, 0.0], [2.0, np.nan], [0.0, 3.0]], step="1h", zone="+01:00"
    )


def test_statuses_from_depths() -> None:
    """NaN is missing, 0 is zero, the rest is observed; gaps do not report."""
    assert record().status.tolist() == [[0, 1], [0, 3], [1, 0]]
    assert record().reporting.tolist() == [[True, True], [True, False], [True, True]]
    assert len(record()) == 3


def test_statuses_are_of_three_kinds() -> None:
    """Every status has a depth that was measured at the step, a depth of another origin, or none."""
    assert MEASURED | {Status.SPREAD} == REPORTING
    assert set(Status) == REPORTING | WITHOUT_DEPTH | {Status.INFILLED}
    assert not REPORTING & WITHOUT_DEPTH


def test_spread_values_report_but_are_not_measured() -> None:
    """A spread value is the gauge's own, but not measured at its step."""
    status = np.array([[Status.SPREAD], [Status.ESTIMATED], [Status.INFILLED]], dtype=np.uint8)
    own = RainRecord(("A",), ENDS - HOUR, ENDS, np.ones((3, 1)), status, step="1h")
    assert own.measured[:, 0].tolist() == [False, True, False]
    assert own.reporting[:, 0].tolist() == [True, True, False]


def test_all_record_unless_said_otherwise() -> None:
    """All gauges record at the step unless the recorders are given; none may be given too."""
    assert record().recorders == {"A", "B"}
    assert replace(record(), recorders=frozenset({"A"})).window(0, 1).recorders == {"A"}
    assert replace(record(), recorders=frozenset()).recorders == frozenset()


def test_window_and_order() -> None:
    """A window keeps its steps with their labels; reordering moves the columns only."""
    named = replace(record(), labels=("one", "two", "three"))
    window = named.window(1, 3).ordered(("B", "A"))
    assert (window.labels, window.gauges, window.zone) == (("two", "three"), ("B", "A"), "+01:00")
    np.testing.assert_array_equal(window.depth, [[np.nan, 2], [3, 0]])
    assert window.status.tolist() == [[3, 0], [0, 1]]


def test_shapes_and_labels_must_agree() -> None:
    """Arrays and labels of another length are refused together."""
    with pytest.raises(DataError) as caught:
        RainRecord(("A",), ENDS - HOUR, ENDS, np.ones((2, 1)), np.zeros((3, 2), np.uint8), step="1h", labels=("one",))
    assert str(caught.value).splitlines() == [
        "depth: found an array of shape (2, 1); expected (3, 1)",
        "status: found an array of shape (3, 2); expected (3, 1)",
        "labels: found 1 names; expected 3, one a step",
    ]


def test_times_must_increase() -> None:
    """A time twice is refused."""
    twice = np.repeat(ENDS[:1], 3)
    with pytest.raises(
        DataError, match=r"^times: found ends that do not increase; expected each interval once, in order$"
    ):
        RainRecord.from_depths(("A",), twice - HOUR, twice, [[1], [1], [1]], step="1h")


@pytest.mark.parametrize("depth", [-0.1, np.inf])
def test_depths_must_be_depths(depth: float) -> None:
    """A negative or infinite depth is refused, with its gauge."""
    with pytest.raises(DataError, match=rf"^gauge A: found {depth} mm; expected a depth of 0 or more$"):
        RainRecord.from_depths(("A",), ENDS - HOUR, ENDS, [[1.0], [depth], [1.0]], step="1h")


@pytest.mark.parametrize(
    ("depth", "status"), [(1.0, Status.MISSING), (np.nan, Status.OBSERVED), (0.0, Status.REJECTED)]
)
def test_depth_and_status_must_agree(depth: float, status: Status) -> None:
    """A depth where nothing is known, or none where something is, is refused."""
    cells = np.array([[depth]]), np.array([[status]], dtype=np.uint8)
    with pytest.raises(
        DataError, match=rf"^gauge A: found depth {depth} with status '{status.label}'; expected no depth"
    ):
        RainRecord(("A",), ENDS[:1] - HOUR, ENDS[:1], *cells, step="1h")


def test_storm_totals_have_no_times() -> None:
    """A record of storm totals may hold several storms without times."""
    never = np.full(2, "NaT", dtype="datetime64[s]")
    totals = RainRecord(
        ("A",), never, never, np.array([[1.0], [2.0]]), np.zeros((2, 1), np.uint8), step="storm", labels=("May", "June")
    )
    assert totals.labels == ("May", "June")


def test_steps_of_totals() -> None:
    """Hours 1 and 2 of three, what of a longer total is in the record, and none of totals beside it."""
    spans = [(0, 2), (-3, 1), (2, 9), (-3, 0), (3, 5)]
    totals = [KnownTotal("A", ENDS[0] + (a - 1) * HOUR, ENDS[0] + (b - 1) * HOUR, 1.0) for a, b in spans]
    first, stop = record().steps_of(totals)
    assert list(zip(first.tolist(), stop.tolist(), strict=True)) == [(0, 2), (0, 1), (2, 3), (0, 0), (3, 3)]
    assert [len(part) for part in record().steps_of([])] == [0, 0]
