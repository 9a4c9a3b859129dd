"""Areal reduction by a table of the user's own."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.interpolate import RegularGridInterpolator

from basinrain.designstorm.areal_reduction import ReductionTable, areal_reduction, tabulated
from basinrain.errors import DataError, MethodError

KM2 = 1e6
METHOD = areal_reduction("table")


def table(*, first: tuple[float, ...] = (), changed: Mapping[str, Any] = MappingProxyType({})) -> ReductionTable:
    """Return a table of 10, 100 and 1000 km² (and of area 0 with ``first``) at 1, 4 and 24 h."""
    factor = [*([list(first)] if first else []), [0.90, 0.94, 0.98], [0.80, 0.88, 0.95], [0.60, 0.75, 0.90]]
    areas = [*([0.0] if first else []), 10 * KM2, 100 * KM2, 1000 * KM2]
    values: dict[str, Any] = {"areas": areas, "minutes": [60, 240, 1440], "factor": factor, "source": "study of Ambler"}
    return ReductionTable(**{**values, **changed})


def test_the_tabulated_factors_are_kept() -> None:
    """At the table's areas and durations its own factors come back, the corners included."""
    given_one = table()
    for area, expected in zip(given_one.areas, given_one.factor, strict=True):
        np.testing.assert_array_equal(METHOD.reduce(area, given_one.minutes, table=given_one).factor, expected)


def test_linear_in_the_logarithms() -> None:
    """2 h are midway from 1 to 4 h and 31.6 km² from 10 to 100 km²: means of the neighbours, by hand."""
    midway = np.sqrt(10 * 100) * KM2
    factor = METHOD.reduce(midway, np.array([60.0, 120.0]), table=table()).factor
    assert factor == pytest.approx([(0.90 + 0.80) / 2, (0.90 + 0.94 + 0.80 + 0.88) / 4], abs=1e-12)


@given(area=st.floats(10 * KM2, 1000 * KM2), minutes=st.floats(60, 1440))
def test_as_the_interpolator_of_a_general_library(area: float, minutes: float) -> None:
    """The bilinear interpolator of SciPy on the logarithms gives the same factor."""
    given_one = table()
    reference = RegularGridInterpolator((np.log(given_one.areas), np.log(given_one.minutes)), given_one.factor)
    expected = reference(
        np.clip([np.log(area), np.log(minutes)], [np.log(1e7), np.log(60)], [np.log(1e9), np.log(1440)])
    )
    assert tabulated(area, minutes, table=given_one) == pytest.approx(expected[0], abs=1e-12)


def test_no_factor_below_the_smallest_area() -> None:
    """Nothing says that the factor is 1 at area 0: below the first area it is refused, or that area's, and said."""
    minutes = np.array([60.0])
    with pytest.raises(MethodError, match="table, area: found 5 km²; expected at least 10 km²; outside"):
        METHOD.reduce(5 * KM2, minutes, table=table())
    reduced = METHOD.reduce(5 * KM2, minutes, outside="clamp", table=table())
    assert reduced.factor == pytest.approx([0.90])
    assert reduced.clamped == (
        (
            "Areal reduction by the given table: the factor of 5 km² is that of 10 km², the nearest end of the method's"
            " range (at least 10 km²)."
        ),
    )


def test_a_row_of_area_zero() -> None:
    """From a row of area 0, with what it says, the factor is linear in the area to the next: 0.99 to 0.90, midway."""
    with_zero = table(first=(0.99, 1.0, 1.0))
    factor = METHOD.reduce(5 * KM2, np.array([60.0, 240.0]), table=with_zero).factor
    assert factor == pytest.approx([(0.99 + 0.90) / 2, (1.0 + 0.94) / 2], abs=1e-15)
    assert tabulated(0.0, 60, table=with_zero) == 0.99
    np.testing.assert_array_equal(
        tabulated([1e7, 3e7, 1e9], 100, table=with_zero), tabulated([1e7, 3e7, 1e9], 100, table=table())
    )


def test_outside_the_table_is_refused() -> None:
    """Durations on both sides and the area are named together."""
    with pytest.raises(
        MethodError, match=r"(?s)found 30 min and 48 h; expected 1 to 24 h.*found 1500 km²; .*at most 1000 km²"
    ):
        METHOD.reduce(1500 * KM2, np.array([30.0, 60.0, 2880.0]), table=table())
    assert np.isnan(tabulated([5e6, 2e9, 1e8, 1e8], [60, 60, 59, 1441], table=table())).all()


def test_clamped_to_the_corners() -> None:
    """What lies beyond a corner on both sides gets the corner's factor."""
    reduced = METHOD.reduce(1e11, np.array([1.0, 1e5]), outside="clamp", table=table())
    assert reduced.factor == pytest.approx([0.60, 0.90], abs=1e-15)
    assert len(reduced.clamped) == 3


def test_gaps_of_a_table() -> None:
    """A missing factor is refused where it counts, and does not count where its share is 0."""
    gappy = table(changed={"factor": [[0.90, 0.94, 0.98], [0.80, 0.88, 0.95], [np.nan, 0.75, 0.90]]})
    assert METHOD.reduce(100 * KM2, np.array([60.0, 120.0]), table=gappy).factor == pytest.approx([0.80, 0.84])
    assert METHOD.reduce(1000 * KM2, np.array([240.0]), table=gappy).factor == pytest.approx([0.75])
    with pytest.raises(MethodError, match=r"table: found no factor for 500 km² at 2 h; expected a factor above 0"):
        METHOD.reduce(500 * KM2, np.array([120.0, 240.0]), table=gappy)


def test_one_area_or_one_duration() -> None:
    """A table of one row or one column answers along it; clamped, shorter and longer durations get the one column."""
    row = ReductionTable(areas=[1e8], minutes=[60, 240], factor=[[0.8, 0.9]], source="a study")  # type: ignore[arg-type]
    assert METHOD.reduce(1e8, np.array([60.0, 120.0, 240.0]), table=row).factor == pytest.approx([0.8, 0.85, 0.9])
    column = ReductionTable(areas=[1e8, 1e10], minutes=[60], factor=[[0.8], [0.6]], source="a study")  # type: ignore[arg-type]
    reduced = METHOD.reduce(1e9, np.array([30.0, 60.0, 90.0]), outside="clamp", table=column)
    assert reduced.factor == pytest.approx([0.7, 0.7, 0.7])
    assert [sentence.partition(" is that")[0].rpartition("of ")[2] for sentence in reduced.clamped] == [
        "30 min",
        "90 min",
    ]


def test_the_source_is_told() -> None:
    """Factors of a table come with the table's source."""
    remarks = METHOD.reduce(100 * KM2, np.array([60.0]), table=table()).remarks
    assert remarks == ("The areal reduction factors are from a table given with the job: study of Ambler.",)


@given(
    values=st.lists(st.floats(0.01, 1), min_size=9, max_size=9), area=st.floats(1e7, 1e9), minutes=st.floats(60, 1440)
)
def test_between_the_least_and_the_greatest(values: list[float], area: float, minutes: float) -> None:
    """No factor is outside the table's own, whatever they are."""
    drawn = table(changed={"factor": np.reshape(values, (3, 3))})
    factor = METHOD.reduce(area, np.array([minutes]), table=drawn).factor[0]
    assert min(values) * (1 - 1e-12) <= factor <= min(max(values) * (1 + 1e-12), 1)


def test_a_table_of_ones_gives_ones() -> None:
    """Where nothing is reduced no factor exceeds 1 by its last bit, at a thousand places between the table's own."""
    ones = table(changed={"factor": np.ones((3, 3))})
    minutes = np.geomspace(60, 1440, 1000)
    factor = METHOD.reduce(31.4159 * KM2, minutes, table=ones).factor
    np.testing.assert_allclose(factor, 1.0, rtol=1e-15)
    assert (factor <= 1).all()


def test_the_given_arrays_are_not_kept() -> None:
    """A table is not changed by changing the arrays that it was made of."""
    areas = np.array([1e7, 1e8, 1e9])
    made = table(changed={"areas": areas})
    areas[0] = 1.0
    assert made.areas[0] == 1e7


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"areas": [1e7, 1e7, 1e9]}, r"areas: found \[10000000.0, 10000000.0, .*each more than the one before"),
        ({"minutes": [60, 30, 1440]}, r"durations: found \[60.0, 30.0, 1440.0\]; expected each more than"),
        ({"minutes": [0, 30, 1440]}, r"durations: found \[0.0, .*; expected numbers, above 0"),
        ({"areas": [-1, 1e8, 1e9]}, r"areas: found \[-1.0, .*; expected numbers, 0 or more"),
        ({"areas": [1e7, 1e8, np.nan]}, "areas: found .*nan.*; expected numbers, 0 or more"),
        ({"areas": [], "factor": np.empty((0, 3))}, r"areas: found an array of shape \(0,\); expected a row of them"),
        ({"areas": [1e7, 1e8]}, r"factors: found shape \(3, 3\); expected shape \(2, 3\): a row for every area"),
        ({"factor": 0.9}, r"factors: found shape \(\); expected shape \(3, 3\)"),
        ({"source": " "}, "source: found none; say where the table is from"),
    ],
)
def test_tables_that_cannot_be(changes: dict[str, Any], message: str) -> None:
    """What is wrong with a table's axes, shape and source is told."""
    with pytest.raises(DataError, match=message):
        table(changed=changes)


def test_all_wrong_factors_are_named() -> None:
    """Every factor that is not above 0 and at most 1 is named with its area and duration; percent is recognised."""
    with pytest.raises(DataError) as refused:
        table(changed={"factor": [[90, 0.94, 0.98], [0.80, 0, 0.95], [0.60, 0.75, -1]]})
    assert [str(problem) for problem in refused.value.problems] == [
        "reduction table: 10 km², 1 h: found 90; expected a factor above 0 and at most 1; write percent as fractions",
        "reduction table: 100 km², 4 h: found 0; expected a factor above 0 and at most 1; correct it",
        "reduction table: 1000 km², 24 h: found -1; expected a factor above 0 and at most 1; correct it",
    ]


def test_problems_of_axes_and_source_together() -> None:
    """Axes, shape and source are refused in one error."""
    with pytest.raises(DataError) as refused:
        table(changed={"areas": [1e8, 1e7], "minutes": [0], "source": ""})
    assert [problem.item for problem in refused.value.problems] == [
        f"reduction table: {part}" for part in ("areas", "durations", "source", "factors")
    ]
