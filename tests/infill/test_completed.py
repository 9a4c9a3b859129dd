"""The completed record and its sources."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.rainfall import RainRecord

NAN = float("nan")


def completed(*columns: list[float], scale: str) -> Completed:
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, len(columns[0]) + 1) * np.timedelta64(3600, "s")
    ids = tuple("ABCD"[: len(columns)])
    network = GaugeNetwork(ids=ids, x=np.arange(len(ids), dtype=float) * 1000, y=np.zeros(len(ids)), crs="local")
    record = RainRecord.from_depths(ids, ends - 3600, ends, np.array(columns).T, step="1h")
    return complete(record, network, InfillOptions(method="station-average", scale=scale))  # type: ignore[arg-type]


def test_donor_table_of_a_step() -> None:
    """B is infilled in the second hour, A and C count for themselves."""
    result = completed([5, 10], [6, NAN], [4, 8], scale="step")
    assert result.donor_table(0).tolist() == np.eye(3).tolist()
    assert result.donor_table(1).tolist() == [[1, 0, 0], [0.5, 0, 0.5], [0, 0, 1]]


def test_donor_table_without_a_depth() -> None:
    """B could not be infilled: its row is zero."""
    result = completed([5, 10], [6, NAN], [4, NAN], scale="step")
    assert result.donor_table(1).tolist() == [[1, 0, 0], [0, 0, 0], [0, 0, 0]]


def test_donor_tables_group_equal_steps() -> None:
    """Hours 0 and 3 are complete, 1 and 2 rest on the same donors."""
    result = completed([5, 10, 5, 0], [6, NAN, NAN, 1], [4, 8, 6, 2], scale="step")
    groups = [(steps.tolist(), table) for steps, table in result.donor_tables()]
    assert [steps for steps, _ in groups] == [[0, 3], [1, 2]]
    assert all(np.array_equal(table, result.donor_table(steps[0])) for steps, table in groups)


def test_steps_with_other_reporting_gauges_are_another_group() -> None:
    """B's total rests on A and C at every step, but B itself reports at the first only."""
    result = completed([5, 10, 5, 0], [6, NAN, NAN, NAN], [4, 8, 6, 2], scale="storm")
    assert [steps.tolist() for steps, _ in result.donor_tables()] == [[0], [1, 2, 3]]


def test_sources_of_single_steps_add_up_to_their_depths() -> None:
    """B's 30 mm are half of A's 20 and half of C's 40; so a third of its every hour is A's and two thirds are C's."""
    result = completed([5, 10, 5, 0], [NAN] * 4, [10, 0, 0, 30], scale="storm")
    hour = result.sources(np.array([0]))
    assert result.record.depth[0] == pytest.approx([5, 7.5, 10])
    assert hour == pytest.approx(np.array([[5, 0, 0], [7.5 / 3, 0, 7.5 * 2 / 3], [0, 0, 10]]))
    assert sum(result.sources(np.array([step])) for step in range(4)) == pytest.approx(result.sources())
    assert result.sources()[1].tolist() == pytest.approx([10, 0, 20])


def test_sources_of_a_dry_total() -> None:
    """Nothing comes from nowhere."""
    assert completed([0, 0], [NAN, NAN], [0, 0], scale="storm").sources().tolist() == [[0, 0, 0]] * 3


def test_a_record_without_gaps() -> None:
    """Every gauge is its own source."""
    assert completed([1, 2], [3, 4], scale="storm").sources().tolist() == [[3, 0], [0, 7]]


@pytest.mark.parametrize("scale", ["step", "storm"])
def test_influence_is_the_least_and_most_of_all_tables(scale: str) -> None:
    """Over some steps, each gauge's own weight through the donors of every step."""
    result = completed([5, 10, 5, 0, 2], [6, NAN, NAN, NAN, 1], [4, 8, NAN, 2, NAN], [1, 1, 1, 1, 1], scale=scale)
    weights = np.array([[0.4, 0.3, 0.2, 0.1], [0.0, 0.5, 0.5, 0.0]])
    for steps in (slice(0, 5), np.array([1, 3]), np.array([2])):
        tables = [weights @ result.donor_table(int(step)) for step in np.arange(5)[steps]]
        least, most = result.influence(weights, steps)
        np.testing.assert_allclose(least, np.min(tables, axis=0), atol=1e-15)
        np.testing.assert_allclose(most, np.max(tables, axis=0), atol=1e-15)
