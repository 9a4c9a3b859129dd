"""Weight tables: means, contributions, missing depths, and methods side by side."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from basinrain.errors import DataError
from basinrain.weights import WeightTable, compare

NAN = float("nan")
GAUGES = ("A", "B", "C")


def table(*rows: list[float], method: str = "given") -> WeightTable:
    return WeightTable(method, tuple("uvwxyz"[: len(rows)]), GAUGES, np.array(rows))


def test_means_are_weighted_sums() -> None:
    """.5 x 10 + .425 x 30 + .075 x 100 = 25.25, at one step and at every step of a record."""
    weights = table([0.5, 0.425, 0.075], [0.0, 0.85, 0.15])
    assert weights.apply(np.array([10.0, 30.0, 100.0])) == pytest.approx([25.25, 40.5])
    steps = np.array([[10.0, 30.0, 100.0], [0.0, 0.0, 0.0], [2.0, 2.0, 2.0]])
    np.testing.assert_allclose(weights.apply(steps), [[25.25, 40.5], [0.0, 0.0], [2.0, 2.0]])


def test_a_missing_depth_is_never_zero() -> None:
    """A silent gauge makes the mean missing where it has weight, and changes nothing where it has none."""
    weights = table([0.5, 0.5, 0.0], [0.0, 0.5, 0.5])
    np.testing.assert_array_equal(weights.apply(np.array([NAN, 4.0, 6.0])), [NAN, 5.0])
    np.testing.assert_array_equal(weights.apply(np.array([[NAN, 4.0, 6.0], [2.0, 4.0, NAN]])), [[NAN, 5.0], [3.0, NAN]])


def test_a_basin_without_a_number_stays_without() -> None:
    """A row of NaN gives a NaN mean, with or without gaps, and does not touch other basins."""
    weights = table([NAN, NAN, NAN], [1.0, 0.0, 0.0])
    assert weights.answered.tolist() == [False, True]
    np.testing.assert_array_equal(weights.apply(np.array([3.0, 5.0, 7.0])), [NAN, 3.0])
    np.testing.assert_array_equal(weights.apply(np.array([3.0, NAN, 7.0])), [NAN, 3.0])


def test_contributions_are_depths_that_sum_to_the_mean() -> None:
    """Thirds of 27.5, 7 and 27: 9.167 + 2.333 + 9.000 = 20.50; a silent gauge without weight contributes 0."""
    contributions = table([1 / 3, 1 / 3, 1 / 3]).contributions(np.array([27.5, 7.0, 27.0]))
    assert contributions[0].round(3).tolist() == [9.167, 2.333, 9.0]
    assert contributions.sum() == pytest.approx(20.5)
    assert table([0.5, 0.5, 0.0]).contributions(np.array([1.0, 3.0, NAN])).tolist() == [[0.5, 1.5, 0.0]]


@given(
    weights=arrays.arrays(float, (2, 3), elements=st.floats(0, 1)),
    depths=arrays.arrays(float, (4, 3), elements=st.one_of(st.just(NAN), st.floats(0, 500))),
)
def test_steps_are_averaged_each_by_itself(weights: np.ndarray, depths: np.ndarray) -> None:
    """The mean of a step does not depend on the other steps, nor on whether any of them has a gap."""
    whole = table(*weights.tolist()).apply(depths)
    for step, row in enumerate(depths):
        np.testing.assert_allclose(table(*weights.tolist()).apply(row), whole[step], rtol=1e-12, atol=1e-12)


def test_covered_is_one_where_not_given() -> None:
    """A method that says nothing about coverage reaches the whole basin."""
    assert table([1.0, 0.0, 0.0], [0.0, 1.0, 0.0]).covered.tolist() == [1.0, 1.0]


def test_a_frame_has_basins_down_and_gauges_across() -> None:
    """The data frame keeps ids and order."""
    frame = table([0.2, 0.3, 0.5]).to_frame()
    assert frame.loc["u", "C"] == 0.5
    assert (frame.index.name, frame.columns.name) == ("basin", "gauge")


def test_shapes_and_half_missing_rows_are_refused() -> None:
    """Ids must fit the weights, and a row is missing wholly or not at all."""
    with pytest.raises(DataError, match=r"weights by x: found an array of shape \(1, 2\); expected \(1, 3\)"):
        WeightTable("x", ("u",), GAUGES, np.array([[0.5, 0.5]]))
    with pytest.raises(DataError, match="found a row that is missing in part; expected a whole row, or none of it"):
        table([0.5, NAN, 0.5])
    with pytest.raises(DataError, match="weights by x: found an array of shape"):
        WeightTable("x", ("u",), GAUGES, np.array([[0.5, 0.5, 0.0]]), covered=np.ones(2))


def test_methods_side_by_side_largest_difference_first() -> None:
    """Within a basin by falling difference, equal ones by id; gauges that no method uses are left out."""
    frame = compare(
        [
            table([0.5, 0.5, 0.0], [1.0, 0.0, 0.0], method="arithmetic"),
            table([0.5, 0.425, 0.075], [0.9, 0.1, 0.0], method="thiessen"),
        ]
    )
    assert list(frame.columns) == ["basin", "gauge", "arithmetic", "thiessen", "difference"]
    assert list(zip(frame["basin"], frame["gauge"], strict=True)) == [
        ("u", "B"),
        ("u", "C"),
        ("u", "A"),
        ("v", "A"),
        ("v", "B"),
    ]
    np.testing.assert_allclose(frame["difference"], [0.075, 0.075, 0.0, 0.1, 0.1], atol=1e-12)


def test_a_method_without_a_number_does_not_enter_the_difference() -> None:
    """Where the arithmetic mean has no number, the difference is that of the other two; alone, it is 0."""
    silent = table([NAN, NAN, NAN], method="arithmetic")
    one, two = table([0.7, 0.3, 0.0], method="thiessen"), table([0.5, 0.5, 0.0], method="idw")
    frame = compare([silent, one, two])
    np.testing.assert_allclose(frame["difference"], [0.2, 0.2])
    assert frame["arithmetic"].isna().all()
    assert compare([silent, one])["difference"].tolist() == [0.0, 0.0]
    assert len(compare([silent])) == 0


def test_tables_of_different_gauges_are_not_compared() -> None:
    """Tables must be of the same basins and gauges."""
    other = WeightTable("other", ("u",), ("A", "B", "D"), np.array([[1.0, 0.0, 0.0]]))
    with pytest.raises(DataError, match="weight tables: found different basins or gauges; expected the same in all"):
        compare([table([1.0, 0.0, 0.0]), other])
