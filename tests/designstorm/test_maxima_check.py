"""Annual maxima that cannot be used, and frequencies that they cannot tell."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.l_moments import l_moments
from basinrain.designstorm.maxima_check import check_asked, check_depths, check_maxima, check_series
from basinrain.errors import DataError, MethodError, Problems

Floats = npt.NDArray[np.float64]

MINUTES = np.array([60.0, 720.0])


def annual(years: float) -> Frequency:
    """Return one frequency of an annual maximum series."""
    return Frequency(years, "annual-maximum")


def series(*columns: Floats) -> Floats:
    """Return maxima of shape (n_durations, n_areas) columns: one area, one column a duration."""
    return np.stack(columns, axis=1)[:, None, :]


def test_all_problems_of_maxima_together() -> None:
    """Years and durations out of order, an area twice, a depth below 0 and an infinite one are told in one error."""
    maxima = np.ones((3, 2, 2))
    maxima[1, 0, 1] = -3.0
    maxima[2, 1, 0] = np.inf
    maxima[0, 0, 0] = np.nan
    with pytest.raises(DataError) as caught:
        check_maxima(maxima, np.array([2001, 2003, 2002]), MINUTES[::-1], ["Quill", "Quill"])
    assert str(caught.value).splitlines() == [
        "years: found 2002 after 2003; expected each once, rising",
        "durations: found 60 after 720; expected each once, rising",
        "area Quill: found the id twice; expected each area once",
        "area Quill, 12 h, 2003: found -3 mm; expected a finite depth of 0 or more, or none",
        "area Quill, 1 h, 2002: found inf mm; expected a finite depth of 0 or more, or none",
    ]


def test_axes_that_do_not_fit() -> None:
    """An array of another shape than its axes is refused, with both shapes."""
    with pytest.raises(DataError, match=r"^annual maxima: found an array of shape \(3, 2\); expected \(3, 2, 1\)$"):
        check_maxima(np.ones((3, 2)), np.arange(3), MINUTES, ["Quill"])


def test_empty_axes_and_impossible_durations() -> None:
    """No areas are no maxima, and a duration of 0 minutes is none."""
    with pytest.raises(
        DataError, match=r"^annual maxima: found no areas; expected one at least\na duration: found 0 min"
    ):
        check_maxima(np.ones((3, 2, 0)), np.arange(3), np.array([0.0, 60.0]), [])


def test_series_that_no_distribution_fits() -> None:
    """Nine years, equal maxima, and one wet year among dry ones are told together, by area and duration."""
    nine = np.append(np.arange(9.0), np.nan)
    maxima = np.stack([series(nine, np.full(10, 7.0)), series(np.arange(10.0), np.eye(10)[3])], axis=1)[:, :, 0]
    moments = l_moments(maxima)
    problems = Problems()
    check_series(moments, MINUTES, ["Quill", "Reed"], problems, shape_wanted=True)
    with pytest.raises(MethodError) as caught:
        problems.raise_as(MethodError)
    short, equal, lone = str(caught.value).splitlines()
    assert short == (
        "area Quill, 1 h: found 9 years with an annual maximum; expected 10 at least; take a longer record, or depths "
        "of a table"
    )
    assert equal == (
        "area Quill, 12 h: found annual maxima that are all 7 mm; expected maxima that differ; look at the record"
    )
    assert lone == (
        "area Reed, 12 h: found annual maxima of which all but one are equal; expected maxima that differ, to fit a "
        'shape to; look at the record, or write distribution = "gumbel"'
    )
    fewer = Problems()
    check_series(moments, MINUTES, ["Quill", "Reed"], fewer, shape_wanted=False)
    assert len(fewer) == 2


def test_twice_the_years_of_the_shortest_series_is_the_reach() -> None:
    """With 20 and 17 years 34 years are told and 35 are not, but for those who ask beyond the record."""
    short = np.arange(20.0)
    short[:3] = np.nan
    moments = l_moments(series(np.arange(20.0), short))
    asked = [annual(35), annual(34), annual(2), annual(34)]
    problems = Problems()
    check_asked(asked, moments, MINUTES, ["Quill"], problems, beyond_record=False)
    with pytest.raises(
        MethodError,
        match=r"^AEP 0\.02857 \(1 in 35\): found a return period of over 2 times the 17 years of area Quill, 12 h; "
        r"expected 34 years at most; ask for a less rare one, or allow it with beyond_record = true$",
    ):
        problems.raise_as(MethodError)
    problems = Problems()
    found = check_asked(asked, moments, MINUTES, ["Quill"], problems, beyond_record=True)
    assert [each.return_period for each in found] == [2, 34, 35]
    assert not len(problems)


def test_a_probability_in_decimals_reaches_as_far() -> None:
    """1 / 0.025 years is 40 years, twice the record of 20, and is told."""
    problems = Problems()
    check_asked(
        [Frequency.of_aep(0.025)],
        l_moments(series(np.arange(20.0))),
        MINUTES[:1],
        ["Quill"],
        problems,
        beyond_record=False,
    )
    assert not len(problems)


def test_frequencies_of_another_series_and_none() -> None:
    """A partial duration frequency is to be brought over first; no frequency at all is refused."""
    moments = l_moments(series(np.arange(20.0)))
    problems = Problems()
    check_asked([Frequency(5.0, "partial-duration")], moments, MINUTES, ["Quill"], problems, beyond_record=True)
    check_asked([], moments, MINUTES, ["Quill"], problems, beyond_record=True)
    with pytest.raises(
        MethodError,
        match=r"^5-year, partial duration: found that it is not counted in an annual maximum series.*convert = true\n"
        r"frequencies: found none; expected one at least$",
    ):
        problems.raise_as(MethodError)


def test_depths_not_above_zero_are_refused() -> None:
    """Every depth at or below 0 is named with its area, duration and frequency; others pass."""
    depth = np.array([[[3.0, 4.0], [5.0, 6.0]]])
    check_depths(depth, MINUTES, ["Quill"], [annual(2), annual(10)])
    depth[0, 0, 0] = -1.25
    with pytest.raises(
        MethodError,
        match=r"^area Quill, 1 h, AEP 0\.5 \(1 in 2\): found -1\.25 mm from the fitted distribution; expected a depth "
        r"above 0; ask for a rarer frequency",
    ):
        check_depths(depth, MINUTES, ["Quill"], [annual(2), annual(10)])
