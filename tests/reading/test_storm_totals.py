"""Storm totals without times."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from basinrain.errors import DataError, JobError, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.reading.storm_totals import merge_storm_totals, storm_bounds

NETWORK = GaugeNetwork(ids=("A", "B"), x=np.array([0.0, 1000.0]), y=np.zeros(2), crs="local")


def totals(gauges: tuple[str, ...], depth: npt.ArrayLike, *labels: str) -> RainRecord:
    """Return a record of storm totals."""
    never = np.full(len(labels), "NaT", dtype="datetime64[s]")
    plain = RainRecord.from_depths(gauges, never, never, depth, step="storm")
    return RainRecord(gauges, never, never, plain.depth, plain.status, step="storm", labels=labels)


def test_sources_are_joined_by_storm() -> None:
    """Totals of one storm in several sources stand in one row, columns in the network's order."""
    record = merge_storm_totals(
        {1: totals(("B", "A"), [[2.0, 1.0], [4.0, np.nan]], "May", "June"), 2: totals(("A",), [[3]], "June")}, NETWORK
    )
    assert (record.gauges, record.labels, record.recorders) == (("A", "B"), ("May", "June"), frozenset())
    np.testing.assert_array_equal(record.depth, [[1, 2], [3, 4]])


def test_a_total_in_two_sources() -> None:
    """A gauge with two totals of one storm is refused."""
    with pytest.raises(
        DataError, match=r"^gauge A: found another total of storm 'May' in source 2; expected one source for"
    ):
        merge_storm_totals({1: totals(("A",), [[1]], "May"), 2: totals(("A",), [[1]], "May")}, NETWORK)


def test_bounds_that_cannot_be() -> None:
    """Storms without times, that end before they start, or that overlap are listed together."""
    record = totals(("A",), [[1], [1], [1], [1]], "May", "June", "July", "August")
    day = [np.datetime64(f"2031-05-0{k}T00:00:00") for k in range(1, 8)]
    problems = Problems()
    storm_bounds(
        record,
        {"May": (day[0], day[2]), "June": (day[1], day[3]), "July": (day[6], day[5])},
        "source 2 (storm)",
        problems,
    )
    with pytest.raises(JobError) as caught:
        problems.raise_as(JobError)
    assert str(caught.value).splitlines() == [
        (
            "storm August: found totals in source 2 (storm), but no start and end; expected a [[storm]] of that name "
            "with start and end, to bring its totals to the other sources' step; add it; one of: May, June, July"
        ),
        "storm July: found 2031-05-07T00:00:00 to 2031-05-06T00:00:00; expected an end after its start",
        (
            "storms May and June: found 2031-05-03T00:00:00 as end and 2031-05-02T00:00:00 as start; expected storm "
            "totals of times that do not overlap"
        ),
    ]
