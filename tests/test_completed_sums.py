"""Sums of a completed record, and the basin means that follow from them."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from strips import NAN, NETWORK, hourly

from basinrain.completed_sums import CompletedSums, average_sums
from basinrain.errors import MethodError, Problem
from basinrain.infill import InfillOptions, complete
from basinrain.weights import WeightTable


def thirds(present: npt.NDArray[np.bool_]) -> WeightTable:
    """Give the gauges that are there equal weights, and refuse a lone one."""
    if present.sum() < 2:
        raise MethodError(Problem(item="thirds", found="one gauge", expected="two"))
    return WeightTable("thirds", ("all",), NETWORK.ids, np.where(present, 1 / present.sum(), 0.0)[None, :])


def test_steps_are_summed_by_the_gauges_that_are_there() -> None:
    """Two hours of all three, one without C; B's second hour, (3 + 5)/2 = 4 mm, is infilled."""
    record = hourly([[1, 2, 3], [3, NAN, 5], [7, 8, NAN]])
    completed = complete(record, NETWORK, InfillOptions(method="station-average", scale="step"))
    sums = CompletedSums.of(completed.record)
    assert sums.left == 0
    assert [part.tolist() for part in sums.parts.values()] == [[[11, 14, 15.5], [0, 4, 7.5], [0, 1, 1]]]
    raw = CompletedSums.of(record)
    assert raw.left == 2
    by_mask = {tuple(np.frombuffer(key, dtype=bool).tolist()): part[0].tolist() for key, part in raw.parts.items()}
    assert by_mask == {
        (True, True, True): [1, 2, 3],
        (True, False, True): [3, 0, 5],
        (True, True, False): [7, 8, 0],
    }


def test_means_and_shares_of_several_records() -> None:
    """Infilled, B's 4 mm are a third of the 12 mm of its hour; not infilled, the others' mean is 4 mm all the same."""
    record = hourly([[3, NAN, 5]])
    filled = complete(record, NETWORK, InfillOptions(method="station-average", scale="step")).record
    total, share, refused = average_sums([CompletedSums.of(filled), CompletedSums.of(record)], thirds, 1)
    assert total.ravel().tolist() == pytest.approx([4, 4])
    assert share.ravel().tolist() == pytest.approx([1 / 3, 0])
    assert refused == {}


def test_a_set_that_is_refused_takes_the_number() -> None:
    """One hour with a lone gauge: that record has no total, the other does; where all are refused it is an error."""
    lone, whole = CompletedSums.of(hourly([[1, 2, 3], [4, NAN, NAN]])), CompletedSums.of(hourly([[1, 2, 3]]))
    total, share, refused = average_sums([lone, whole], thirds, 2)
    assert np.isnan(total[0]).all()
    assert np.isnan(share[0]).all()
    assert total[1] == pytest.approx(2)
    assert refused == {0: "thirds: found one gauge; expected two"}
    with pytest.raises(MethodError, match="thirds: found one gauge; expected two"):
        average_sums([CompletedSums.of(hourly([[4, NAN, NAN]]))], thirds, 1)
    with pytest.raises(MethodError, match="storm: found no step with a depth; expected one at least"):
        average_sums([CompletedSums.of(hourly([[NAN, NAN, NAN]]))], thirds, 1)


def test_a_record_that_is_as_it_was_is_not_set_beside() -> None:
    """One gap and several are counted in words."""
    rows: tuple[list[float], ...] = ([1, NAN, 3], [1, NAN, NAN], [1, 2, 3])
    one, two, none = (CompletedSums.of(hourly([row])) for row in rows)
    assert one.unlike(none, 1) == "it cannot infill the missing value"
    assert two.unlike(none, 2) == "it cannot infill the 2 missing values"
    assert one.unlike(none, 2) == none.unlike(none, 0) == ""
