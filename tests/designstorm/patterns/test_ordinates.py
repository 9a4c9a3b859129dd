"""Cumulative curves: what they are checked for, straight lines between ordinates, the tables of the package."""

from __future__ import annotations

import re

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pattern_cases import ordinates

from basinrain.designstorm.patterns.ordinates import Ordinates, published_ordinates
from basinrain.errors import DataError

TABLES = [
    *(("nrcs_6min", f"type_{kind}", 241) for kind in ("I", "II", "III")),
    ("nrcs_30min", "type_IA", 49),
    *((f"huff_{basis}", f"Q{quartile}", 21) for basis in ("point", "area") for quartile in (1, 2, 3, 4)),
]


def test_the_curve_is_straight_between_ordinates() -> None:
    """A curve through (0.4, 0.1) has 0.05 at half of that time, and (0.1 + 1) / 2 midway to the end."""
    curve = Ordinates(np.array([0.0, 0.4, 1.0]), np.array([0.0, 0.1, 1.0]))
    np.testing.assert_allclose(curve.at(np.array([0.0, 0.2, 0.4, 0.7, 1.0])), [0, 0.05, 0.1, 0.55, 1], rtol=1e-15)


def test_the_curve_is_a_copy_that_nobody_can_change() -> None:
    """Writing to what a curve was made of leaves it as it is, and the curve itself cannot be written to."""
    time, share = np.array([0.0, 1.0]), np.array([0.0, 1.0])
    curve = Ordinates(time, share)
    time[1] = share[1] = 7
    assert (curve.time[1], curve.share[1]) == (1, 1)
    with pytest.raises(ValueError, match="read-only"):
        curve.share[0] = 0.5


@pytest.mark.parametrize(
    ("time", "share", "said"),
    [
        ([0, 0.5, 1], [0, 1], "found times of shape (3,) and shares of shape (2,); expected two columns of one length"),
        (
            [[0, 1]],
            [[0, 1]],
            "found times of shape (1, 2) and shares of shape (1, 2); expected two columns of one length",
        ),
        ([], [], "found no rows; expected two at least, the first 0, 0 and the last 1, 1"),
        ([0], [0], "found one row; expected two at least, the first 0, 0 and the last 1, 1"),
        ([0, 1], [0, 100], "found shares that end at 100; expected 1; declare percent = true"),
        ([0, 0.01], [0, 1], "found times that end at 0.01; expected 1; leave percent = true out"),
        ([0, 24], [0, 1], "found times that end at 24; expected 1; divide the times by their last"),
        ([0, 1], [0.1, 1], "found shares that begin at 0.1; expected 0; add the row 0, 0"),
        ([0, 0.5, 0.5, 1], [0, 0.2, 0.3, 1], "row 3: found time 0.5 after 0.5; expected a later one"),
        ([0, 0.5, 0.7, 1], [0, 0.4, 0.3, 1], "row 3: found share 0.3 after 0.4; expected none smaller, since"),
        ([0, 0.5, 1], [0, np.nan, 1], "row 2: found share nan; expected a number from 0 to 1"),
        ([0, np.inf, 1], [0, 0.5, 1], "row 2: found time inf; expected a number from 0 to 1"),
        ([np.nan, 1], [0, 1], "row 1: found time nan; expected a number from 0 to 1"),
    ],
)
def test_what_is_no_curve_is_refused(time: list[float], share: list[float], said: str) -> None:
    """A curve that does not run from 0, 0 to 1, 1, times that do not rise and shares that fall are named by row."""
    with pytest.raises(DataError, match="^ordinates of a temporal pattern.*" + re.escape(said)):
        Ordinates(np.array(time), np.array(share))


def test_all_that_is_wrong_is_said_at_once() -> None:
    """Five faults of one curve make five problems of one error."""
    with pytest.raises(DataError, match="times that end at 2") as caught:
        Ordinates(np.array([0.0, 0.6, 0.5, 2.0]), np.array([0.1, 0.7, np.nan, 0.6]))
    assert len(caught.value.problems) == 5


@given(ordinates(), st.lists(st.floats(0, 1), min_size=2, max_size=20))
def test_curves_never_fall_by_more_than_rounding(curve: Ordinates, times: list[float]) -> None:
    """Shares at rising times rise or stay, between 0 and 1."""
    shares = curve.at(np.sort(times))
    assert (np.diff(shares) > -1e-15).all()
    assert ((shares >= 0) & (shares <= 1)).all()


@given(ordinates(), st.integers(1, 50))
def test_curves_equal_a_plain_line_through_two_ordinates(curve: Ordinates, n: int) -> None:
    """Every share is that of the line through the ordinates on both sides, found by looking at one after the other."""

    def plain(t: float, time: npt.NDArray[np.float64], share: npt.NDArray[np.float64]) -> float:
        for k in range(1, len(time)):
            if t <= time[k]:
                part = (t - time[k - 1]) / (time[k] - time[k - 1])
                return float(share[k - 1] * (1 - part) + share[k] * part)
        raise AssertionError

    times = np.arange(n + 1) / n
    expected = [plain(t, curve.time, curve.share) for t in times]
    np.testing.assert_allclose(curve.at(times), expected, rtol=0, atol=1e-14)


@pytest.mark.parametrize(("table", "column", "rows"), TABLES)
def test_the_tables_of_the_package_are_curves(table: str, column: str, rows: int) -> None:
    """Every published column is read whole, at even times."""
    curve = published_ordinates(table, column)
    assert len(curve.time) == rows
    np.testing.assert_allclose(np.diff(curve.time), 1 / (rows - 1), rtol=1e-12)
