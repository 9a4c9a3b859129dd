"""Estimates far above all that their donors had."""

from __future__ import annotations

import numpy as np
import pytest
from windows import hourly, network

from basinrain.infill import InfillOptions, NormalRatios, complete, relations_of
from basinrain.infill.beyond import BEYOND
from basinrain.infill.completed import Completed
from basinrain.notes import Note
from basinrain.rainfall import RainRecord

NAN = float("nan")
A, C = [4.0, 8.0, 0.0], [2.0, 4.0, 0.0]
SILENT = hourly(A, [NAN] * 3, C)


def doubts(completed: Completed) -> list[Note]:
    return [note for note in completed.notes if note.code == "infill-beyond-donors"]


def by_normals(record: RainRecord, normals: object, **options: str) -> Completed:
    return complete(record, network(3, normals), InfillOptions(method="normal-ratio", **options))  # type: ignore[arg-type]


def test_a_normal_with_a_wrong_digit() -> None:
    """B's normal is ten times A's and C's: (10·12 + 10·6)/2 = 90 mm where A had 12."""
    (note,) = doubts(by_normals(SILENT, [[900], [9000], [900]]))
    assert (note.gauge, note.level, note.method) == ("B", "warning", "normal-ratio")
    assert note.text == (
        "Gauge B: 90.0 mm were infilled over 3 of 3 steps (2031-05-04T00:00 to 2031-05-04T03:00), 7.5 times what its "
        "greatest donor had, A with 12.0 mm; most of it is from A, of whose normal its own is 10 times. Check both "
        "normals."
    )


def test_the_donor_that_is_at_fault_is_named() -> None:
    """C's normal was read as inches: (12 + 6·900/35.4)/2 = 82.3 mm, and A, the greatest, has nothing to do with it."""
    (note,) = doubts(by_normals(SILENT, [[900], [900], [35.4]]))
    assert "had, A with 12.0 mm; most of it is from C, of whose normal its own is 25.4 times." in note.text


@pytest.mark.parametrize(("normal", "doubted"), [(1.7, 0), (2.0, 0), (2.05, 1)])
def test_a_wet_mountain_is_not_doubted(normal: float, doubted: int) -> None:
    """Of donors with equal depths the ratio of the normals is that of the depths: 1.7 times is relief, 2.05 is not."""
    assert BEYOND == 2
    completed = by_normals(hourly(A, [NAN] * 3, A), [[1000], [1000 * normal], [1000]])
    assert len(doubts(completed)) == doubted


def test_the_greatest_is_named_and_the_others_counted() -> None:
    """Step by step: 60 mm beside 8, 30 beside 4, and a dry step, in which nothing is beyond anything."""
    (note,) = doubts(by_normals(SILENT, [[900], [9000], [900]], scale="step"))
    assert note.text.startswith(
        "Gauge B: 60.0 mm were infilled over 1 of 3 steps (2031-05-04T01:00 to 2031-05-04T02:00)"
    )
    assert note.text.endswith("Check both normals. 1 more of its estimates is as far above their donors.")
    longer = hourly([*A, 2.0], [NAN] * 4, [*C, 1.0])
    (note,) = doubts(by_normals(longer, [[900], [9000], [900]], scale="step"))
    assert note.text.endswith("2 more of its estimates are as far above their donors.")


def test_the_ratio_is_that_of_the_month() -> None:
    """In May B has five times A's and C's normal, in the year a little more than theirs."""
    normals = np.full((3, 12), 80.0)
    normals[1, 4] = 400
    (note,) = doubts(by_normals(SILENT, normals))
    assert "from A, of whose normal its own is 5 times" in note.text


def test_the_ratio_may_be_the_records() -> None:
    """Means of the record in place of normals."""
    means = np.full((12, 3, 3), 10.0)
    means[:, 1, :] = 40.0
    ratios = NormalRatios(("A", "B", "C"), np.full((12, 3, 3), 10), means)
    completed = complete(SILENT, network(3), InfillOptions(method="normal-ratio"), ratios=ratios)
    (note,) = doubts(completed)
    assert "from A, of whose normal its own is 4 times" in note.text


def test_slopes_may_be_as_steep() -> None:
    """B had five times A's and C's rain on forty days: the weights are named, since there are no normals."""
    days = np.outer(np.arange(40.0), [1.0, 5.0, 1.0])
    options = InfillOptions(method="regression")
    completed = complete(SILENT, network(3), options, relations=relations_of(days, network(3)))
    (note,) = doubts(completed)
    assert note.text.endswith("A with 12.0 mm; its donors' weights sum to 5.")


def test_weights_that_sum_to_one_are_never_beyond() -> None:
    """A mean is not above the greatest."""
    assert doubts(complete(SILENT, network(3), InfillOptions(method="station-average"))) == []
