"""Tables of depths by duration and frequency, and what lies between their entries."""

from __future__ import annotations

import math
import pickle
import re
import time
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from depth_tables import table, tables
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.depth_source import DepthSource
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.point_depths import PointDepths, report_faults
from basinrain.errors import DataError, MethodError, Problems

HOUR = np.array([60.0])


def annual(years: float) -> Frequency:
    """Return the frequency of an annual maximum return period."""
    return Frequency(years, ANNUAL_MAXIMUM)


def variate(years: float) -> float:
    """Return the Gumbel reduced variate of an annual maximum return period, written out."""
    return -math.log(-math.log(1 - 1 / years))


def test_between_frequencies() -> None:
    """2-yr 60 mm and 10-yr 90 mm: y = .3665, 1.4999 and 2.2504, so 5-yr 60 + 30 x 1.1334/1.8839 = 78.05 mm."""
    five = table([[60.0, 90.0]]).at(HOUR, annual(5.0))
    assert five.shape == (1, 1)
    assert five[0, 0] == pytest.approx(60 + 30 * (1.49994 - 0.36651) / (2.25037 - 0.36651), abs=1e-3)
    assert round(five[0, 0], 2) == 78.05


def test_between_durations() -> None:
    """10 mm in 15 min and 40 mm in 4 h: an hour is halfway in the logarithm, so 20 mm; half an hour 10 x 4^(1/4)."""
    depths = table([[10.0], [40.0]], durations=[15.0, 240.0])
    found = depths.at(np.array([60.0, 30.0]), annual(2.0))
    np.testing.assert_allclose(found, [[20.0, 10 * math.sqrt(2)]], rtol=1e-14)


def test_both_ways() -> None:
    """First between the frequencies of every duration, then between durations: 78.05 mm in 4 h, 39.02 mm in 1 h."""
    depths = table([[30.0, 45.0], [60.0, 90.0]])
    np.testing.assert_allclose(depths.at(np.array([120.0]), annual(5.0)), [[math.sqrt(39.0246 * 78.0493)]], rtol=1e-5)


def test_partial_duration_between_frequencies() -> None:
    """In a partial duration series the variate is ln T: a 1-year depth is halfway between 3 months and 4 years."""
    depths = table([[10.0, 30.0]], return_periods=[0.25, 4.0], series=PARTIAL_DURATION)
    assert depths.at(HOUR, Frequency(1.0, PARTIAL_DURATION))[0, 0] == pytest.approx(20.0, rel=1e-14)


def test_extrapolation_goes_on_along_the_last_segments() -> None:
    """10 mm in 15 min, 40 mm in 4 h: the slope 1/2 goes on to 80 mm in 16 h and 5 mm in 3.75 min."""
    depths = table([[10.0, 20.0], [40.0, 80.0]], durations=[15.0, 240.0])
    found = depths.at(np.array([960.0, 3.75]), annual(2.0), extrapolate=True)
    np.testing.assert_allclose(found, [[80.0, 5.0]], rtol=1e-14)
    rarer = depths.at(np.array([15.0]), annual(100.0), extrapolate=True)
    assert rarer[0, 0] == pytest.approx(10 + 10 * (variate(100) - variate(2)) / (variate(10) - variate(2)), rel=1e-12)


@given(tables())
def test_entries_come_back(depths: PointDepths) -> None:
    """At a duration and frequency of the table the depth is the table's, to 1e-12."""
    for t, frequency in enumerate(depths.frequencies):
        np.testing.assert_allclose(depths.at(depths.durations, frequency), depths.depth[:, :, t], rtol=1e-12)


@given(tables(), st.floats(0.0, 1.0), st.lists(st.floats(0.0, 1.0), min_size=1, max_size=5))
def test_between_neighbours(depths: PointDepths, rarity: float, along: list[float]) -> None:
    """A depth lies between the four entries around it, as a plain loop over the table finds them."""
    low, high = depths.return_periods[[0, -1]]
    asked = annual(float(min(max(low * (high / low) ** rarity, low), high)))
    minutes = np.clip(
        depths.shortest * (depths.longest / depths.shortest) ** np.array(along), *depths.durations[[0, -1]]
    )
    found = depths.at(minutes, asked)
    for p in range(len(depths.points)):
        for k, duration in enumerate(minutes):
            around = [
                depths.depth[p, d, t]
                for d in neighbours(depths.durations, float(duration))
                for t in neighbours(depths.return_periods, asked.return_period)
            ]
            assert min(around) * (1 - 1e-9) <= found[p, k] <= max(around) * (1 + 1e-9)


def neighbours(axis: npt.NDArray[np.float64], value: float) -> list[int]:
    """Return the places on either side of a value."""
    below = max(k for k, entry in enumerate(axis) if entry <= value * (1 + 1e-9))
    above = min(k for k, entry in enumerate(axis) if entry >= value * (1 - 1e-9))
    return [below, above]


@given(tables(), st.floats(0.0, 1.0), st.floats(0.0, 1.0))
def test_depth_grows_and_intensity_falls_between_entries(depths: PointDepths, one: float, other: float) -> None:
    """What holds in the table holds between its entries: depth grows with duration and rarity, intensity falls."""
    low, high = depths.return_periods[[0, -1]]
    often, rare = (annual(float(min(low + (high - low) * share, high))) for share in sorted((one, other)))
    minutes = np.clip(np.geomspace(depths.shortest, depths.longest, 37), depths.shortest, depths.longest)
    first, second = depths.at(minutes, often), depths.at(minutes, rare)
    assert (second >= first * (1 - 1e-9)).all()
    assert (np.diff(first, axis=1) >= -1e-9 * first[:, 1:]).all()
    assert (np.diff(first / minutes, axis=1) <= 1e-9 * (first / minutes)[:, 1:]).all()


@given(tables(), st.permutations(range(5)))
def test_order_of_what_is_asked(depths: PointDepths, order: list[int]) -> None:
    """Durations may be asked in any order, one at a time or together."""
    minutes = np.clip(np.geomspace(depths.shortest, depths.longest, 5), depths.shortest, depths.longest)
    together = depths.at(minutes, depths.frequencies[0])
    np.testing.assert_allclose(depths.at(minutes[order], depths.frequencies[0]), together[:, order], rtol=1e-14)
    for k, duration in enumerate(minutes):
        alone = depths.at(np.array([duration]), depths.frequencies[0])
        np.testing.assert_allclose(alone[:, 0], together[:, k], rtol=1e-14)


def test_against_plain_interpolation() -> None:
    """The same numbers as numpy.interp gives on logarithms, point by point and duration by duration."""
    depths = table(
        [
            [[20.0, 31.0, 44.0], [35.0, 52.0, 70.0], [48.0, 77.0, 99.0]],
            [[9.0, 10.0, 30.0], [9.0, 13.0, 31.0], [12.0, 13.5, 60.0]],
        ]
    )
    known = [variate(years) for years in (2.0, 10.0, 50.0)]
    minutes = np.array([61.0, 100.0, 240.0, 500.0, 959.0])
    for years in (2.5, 10.0, 33.0):
        expected = [
            np.exp(
                np.interp(
                    np.log(minutes),
                    np.log(depths.durations),
                    [math.log(np.interp(variate(years), known, row)) for row in point],
                )
            )
            for point in depths.depth
        ]
        np.testing.assert_allclose(depths.at(minutes, annual(years)), expected, rtol=1e-12)


def test_many_points() -> None:
    """Ten thousand raster cells take well under a second."""
    one = table([[20.0, 31.0, 44.0], [35.0, 52.0, 70.0], [48.0, 77.0, 99.0]])
    scale = np.linspace(0.5, 2.0, 10_000)
    many = table(scale[:, None, None] * one.depth)
    minutes = np.array([75.0, 240.0, 900.0])
    begun = time.perf_counter()
    found = many.at(minutes, annual(20.0))
    assert time.perf_counter() - begun < 0.5
    np.testing.assert_allclose(found, scale[:, None] * one.at(minutes, annual(20.0)), rtol=1e-12)


def test_what_a_table_says_of_itself() -> None:
    """A table is a source of depths; its arrays are its own and cannot be written; it survives pickling."""
    depth = np.array([[[30.0, 45.0], [60.0, 90.0]]])
    depths = table(depth)
    source: DepthSource = depths
    assert (source.points, source.series, source.areal) == (("P1",), ANNUAL_MAXIMUM, False)
    assert (source.shortest, source.longest) == (60.0, 240.0)
    assert depths.frequencies == (annual(2.0), annual(10.0))
    assert np.isnan(depths.positions).all()
    depth[:] = 0.0
    assert depths.depth[0, 0, 0] == 30.0
    with pytest.raises(ValueError, match="read-only"):
        depths.depth[0, 0, 0] = 1.0
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(depths)).depth, depths.depth)  # noqa: S301


def test_equal_depths_and_equal_intensities_are_accepted() -> None:
    """Depth may stand still, and may grow as fast as duration: rain that ended, and rain that was steady."""
    depths = table([[10.0], [10.0], [40.0]])
    np.testing.assert_allclose(depths.at(np.array([120.0, 480.0]), annual(2.0)), [[10.0, 20.0]], rtol=1e-12)


@pytest.mark.parametrize(
    ("minutes", "years", "extrapolate", "message"),
    [
        (30.0, 5.0, False, r"^duration 30 min: found that the depths are of 1 h to 4 h; expected a duration within"),
        (300.0, 5.0, False, r"^duration 5 h: found that the depths are of 1 h to 4 h; .* extrapolate = true$"),
        (60.0, 1.5, False, r"^AEP 0\.6667 \(1 in 1\.5\): found that the depths are of AEP 0\.5 \(1 in 2\) to AEP 0\.1"),
        (60.0, 11.0, False, r"^AEP 0\.09091 .* expected a frequency within them; give .* extrapolate = true$"),
        (0.0, 5.0, True, r"^duration: found 0 minutes; expected more than 0 and finite$"),
        (-5.0, 5.0, True, r"^duration: found -5 minutes; expected more than 0"),
        (np.nan, 5.0, False, r"^duration: found nan minutes; expected more than 0"),
        (np.inf, 5.0, True, r"^duration: found inf minutes; expected more than 0"),
    ],
)  # fmt: skip
def test_outside(minutes: float, years: float, extrapolate: bool, message: str) -> None:  # noqa: FBT001 - a case
    """What lies outside is refused unless asked for, naming what was asked, the reach and the way out."""
    with pytest.raises(MethodError, match=message) as caught:
        table([[30.0, 45.0], [60.0, 90.0]]).at(np.array([minutes]), annual(years), extrapolate=extrapolate)
    assert len(caught.value.problems) == 1


def test_everything_outside_is_said_at_once() -> None:
    """Two durations and the frequency outside: three lines."""
    with pytest.raises(MethodError, match=r"duration 10 min.*\n.*duration 24 h.*\n.*AEP 0\.01 \(1 in 100\)") as caught:
        table([[30.0, 45.0], [60.0, 90.0]]).at(np.array([10.0, 60.0, 1440.0]), annual(100.0))
    assert len(caught.value.problems) == 3


def test_ends_are_within() -> None:
    """The ends themselves, and what rounding puts a hair outside, are within."""
    depths = table([[30.0, 45.0], [60.0, 90.0]])
    hair = np.array([60.0 * (1 - 1e-12), 240.0 * (1 + 1e-12)])
    np.testing.assert_allclose(depths.at(hair, annual(10.0 * (1 + 1e-12))), [[45.0, 90.0]], rtol=1e-10)


@pytest.mark.parametrize("asked", [annual(5.0), Frequency(5.0, PARTIAL_DURATION)])
def test_another_series(asked: Frequency) -> None:
    """A frequency of the other series is refused, with the way over."""
    other = PARTIAL_DURATION if asked.series == ANNUAL_MAXIMUM else ANNUAL_MAXIMUM
    with pytest.raises(
        MethodError, match=r"found that it is counted in an? .* series, the depths in an? .* series; .*convert = true$"
    ):
        table([[30.0, 45.0]], series=other).at(HOUR, asked)


def test_one_duration_or_frequency_has_no_segment_to_go_on() -> None:
    """A table of one duration and one frequency gives its entry, and nothing else even when asked to go on."""
    depths = table([[30.0]])
    assert depths.at(HOUR, annual(2.0))[0, 0] == 30.0
    with pytest.raises(MethodError) as caught:
        depths.at(np.array([120.0]), annual(10.0), extrapolate=True)
    assert [problem.found for problem in caught.value.problems] == [
        "that the depths have only 1 h",
        "that the depths have only AEP 0.5 (1 in 2)",
    ]
    assert [problem.remedy for problem in caught.value.problems] == [
        "give depths of two durations or more",
        "give depths of two frequencies or more",
    ]


@pytest.mark.parametrize(
    ("depth", "years", "message"),
    [
        ([[10.0, 40.0], [20.0, 60.0]], 1.05, r"^point P1, 1 h, AEP 0\.9524 .*: found -.* by extrapolation; "),
        ([[10.0, 39.0], [20.0, 40.0]], 100.0, r"^point P1, 4 h, AEP 0\.01 .*: found .* after .* of 1 h by"),
        ([[10.0, 20.0], [20.0, 70.0]], 1000.0, r"^point P1, 4 h, AEP 0\.001 .*: found .* mm/h\) of 1 h by"),
    ],
)  # fmt: skip
def test_extrapolation_that_no_rain_can_have(depth: list[list[float]], years: float, message: str) -> None:
    """Going on to a depth below 0, one that falls with duration, or an intensity that rises, is refused."""
    with pytest.raises(MethodError, match=message):
        table(depth).at(HOUR, annual(years), extrapolate=True)


@pytest.mark.parametrize(
    ("depth", "message"),
    [
        ([[20, 30], [18, 40]], ("4 h, AEP 0.5 (1 in 2): found 18 mm (4.5 mm/h), less than 20 mm (20 mm/h) of 1 h; "
                               "expected a depth that does not fall with duration; correct one of them")),
        ([[20, 30], [41, 40]], ("4 h, AEP 0.1 (1 in 10): found 40 mm (10 mm/h), less than 41 mm (10.25 mm/h) of AEP "
                               "0.5 (1 in 2); expected a depth that does not fall with rarity; correct one of them")),
        ([[20, 30], [81, 110]], ("4 h, AEP 0.5 (1 in 2): found 81 mm (20.25 mm/h), more intense than 20 mm (20 mm/h) "
                                "of 1 h; expected an intensity that does not rise with duration; correct one of them")),
        ([[20, 30], [np.nan, 40]], ("4 h, AEP 0.5 (1 in 2): found no depth; expected a depth for every duration and "
                                   "frequency of a point; add it")),
        ([[20, 30], [0, 40]], "4 h, AEP 0.5 (1 in 2): found 0 mm (0 mm/h); expected a depth above 0; correct it"),
        ([[-20, 30], [30, 40]], "1 h, AEP 0.5 (1 in 2): found -20 mm (-20 mm/h); expected a depth above 0; correct it"),
        ([[20, 30], [30, np.inf]], ("4 h, AEP 0.1 (1 in 10): found inf mm (inf mm/h); expected a depth above 0; "
                                   "correct it")),
    ],
)  # fmt: skip
def test_entries_that_cannot_be(depth: list[list[float]], message: str) -> None:
    """An entry that cannot be is named by point, duration and frequency, with both numbers."""
    with pytest.raises(DataError, match=f"^point P1, {re.escape(message)}$") as caught:
        table(depth)
    assert len(caught.value.problems) == 1


def test_all_entries_that_cannot_be() -> None:
    """All are said together, of every point."""
    with pytest.raises(DataError, match=r"point P1, 4 h, AEP 0\.1") as caught:
        table([[[20.0, 30.0], [30.0, 25.0]], [[20.0, 30.0], [np.nan, 40.0]]])
    assert [problem.item for problem in caught.value.problems] == [
        "point P2, 4 h, AEP 0.5 (1 in 2)",
        "point P1, 4 h, AEP 0.1 (1 in 10)",
        "point P1, 4 h, AEP 0.1 (1 in 10)",
    ]


def test_many_faults_are_counted() -> None:
    """Of ten thousand points that are all wrong, fifty lines are said and the rest counted."""
    problems = Problems()
    depth = np.repeat(np.array([[[20.0], [10.0]]]), 10_000, axis=0)
    points = [str(k) for k in range(10_000)]
    report_faults(points, np.array([60.0, 120.0]), [annual(2.0)], depth, problems)
    assert len(problems) == 10_000
    with pytest.raises(DataError, match=r"^point 0, 2 h, .*\n(?:.*\n){49}9950 more problems: found but not listed$"):
        problems.raise_as(DataError)


@pytest.mark.parametrize(
    ("fields", "message"),
    [
        ({"series": "annual"}, r"^series: found 'annual'; expected one of: annual-maximum, partial-duration"),
        ({"source": " "}, r"^source: found nothing; expected the source of the depths$"),
        ({"date": ""}, r"^date: found nothing; expected the date of the depths$"),
        ({"points": ("",)}, r"^a point: found a blank id; expected an id for every point$"),
        ({"durations": [240.0, 60.0]}, r"^durations: found 60 minutes after 240; expected each once, rising$"),
        ({"durations": [60.0, 60.0]}, r"^durations: found 60 minutes after 60; expected each once, rising$"),
        ({"durations": [0.0, 60.0]}, r"^a duration: found 0 minutes; expected more than 0 and finite$"),
        ({"durations": [60.0, np.inf]}, r"^a duration: found inf minutes; expected more than 0 and finite$"),
        ({"durations": [60.0]}, r"^the table's depth: found an array of shape \(1, 2, 2\); expected \(1, 1, 2\)$"),
        ({"durations": [[60.0, 240.0]]}, r"^the table's durations: found an array of shape \(1, 2\); expected \(2,\)$"),
        ({"return_periods": [10.0, 2.0]}, r"^return periods: found 2 years after 10; expected each once, rising$"),
        ({"return_periods": [1.0, 2.0]}, r"^return period: found 1 years of an annual maximum series; "),
        ({"positions": [[1.0]]}, r"^the points' positions: found an array of shape \(1, 1\); expected \(1, 2\)$"),
        ({"positions": [[1.0, np.nan]], "crs": "local"}, r"^point P1: found position \(1, nan\); expected two"),
        ({"positions": [[1.0, 2.0]]}, r"^the points' positions: found no CRS; expected their coord"),
    ],
)  # fmt: skip
def test_tables_that_cannot_be(fields: dict[str, Any], message: str) -> None:
    """Whatever is wrong with the axes of a table is named."""
    with pytest.raises(DataError, match=message) as caught:
        table([[30.0, 45.0], [60.0, 90.0]], **fields)
    assert len(caught.value.problems) == 1


def test_all_that_is_wrong_with_the_axes() -> None:
    """The problems of the axes are said together; nothing is said of depths whose places are not known."""
    with pytest.raises(DataError, match="series: found") as caught:
        table([[30.0], [20.0]], series="x", source="", date="", durations=[60.0, 30.0])
    assert [problem.item for problem in caught.value.problems] == ["series", "source", "date", "durations"]


def test_repeated_points() -> None:
    """Two points may not have one id."""
    with pytest.raises(DataError, match=r"^point Quill: found the id twice; expected each point once$"):
        table([[[30.0]], [[31.0]]], points=("Quill", "Quill"))


def test_a_table_of_nothing() -> None:
    """No points, durations or frequencies: refused in words."""
    with pytest.raises(
        DataError, match=r"^the table of depths: found no points; .*\n.* found no durations; .*\n.* return"
    ):
        PointDepths(
            points=(),
            durations=np.empty(0),
            return_periods=np.empty(0),
            depth=np.empty((0, 0, 0)),
            series=ANNUAL_MAXIMUM,
            source="invented",
            date="2031",
        )
