"""Depths from intensity equations."""

from __future__ import annotations

import copy
import math
import re
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.depth_source import DepthSource
from basinrain.designstorm.equations import EQUATIONS, EquationDepths
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.errors import JobError, MethodError

PUBLISHED = Path(__file__).parents[1] / "data" / "published"
TEN = Frequency(10.0, ANNUAL_MAXIMUM)
TWO = [2.0, 10.0]
AB = {"a": 1.0, "b": 0.0}
DENVER = {"c": 96.6, "e": 0.97, "f": 13.9}


def equation(name: str, *sets: dict[str, float], **other: Any) -> EquationDepths:  # noqa: ANN401 - any field
    """Return an equation in mm/h and minutes, of 10 years and 5 min to 24 h unless the other fields say otherwise."""
    fields: dict[str, Any] = {
        "point": "Quill",
        "return_periods": [10.0],
        "valid": (5.0, 1440.0),
        "unit": "mm/h",
        "duration_unit": "min",
        "series": ANNUAL_MAXIMUM,
        "source": "invented",
        "date": "2031",
    }
    return EquationDepths(equation=name, coefficients=sets, **(fields | other))


def variate(years: float) -> float:
    """Return the Gumbel reduced variate of an annual maximum return period, written out."""
    return -math.log(-math.log(1 - 1 / years))


@pytest.mark.parametrize("city", pd.read_csv(PUBLISHED / "idf_wenzel_1982_10yr.csv").to_dict("records"), ids=str)
def test_ten_cities(city: dict[str, Any]) -> None:
    """General equation, 10 years, min and in/h: Wenzel (1982) in Chow et al. (1988), table 14.2.3, from memory."""
    depths = equation("general", {name: city[name] for name in "cef"}, unit="in/h")
    minutes = np.array([10.0, 30.0, 60.0, 120.0])
    intensity = depths.at(minutes, TEN)[0] / 25.4 / (minutes / 60)
    expected = [city["i_10min_in_h"], city["i_30min"], city["i_60min"], city["i_120min"]]
    np.testing.assert_allclose(intensity, expected, atol=5.1e-5)


def test_denver() -> None:
    """96.6/(20^.97 + 13.9) = 3.0018 in/h, printed as 3.002: 1.0006 in and 25.415 mm in 20 min."""
    depth = equation("general", DENVER, unit="in/h").at(np.array([20.0]), TEN)[0, 0]
    assert depth / 25.4 * 3 == pytest.approx(96.6 / (20**0.97 + 13.9), rel=1e-14)
    assert round(depth / 25.4 * 3, 4) == 3.0018


def test_alternating_block_example() -> None:
    """Intensities and depths of Chow et al. (1988), example 14.4.1, to the printed digits (from memory)."""
    printed = pd.read_csv(PUBLISHED / "alternating_block_chow_14_4_1.csv")
    minutes = printed["duration_min"].to_numpy(float)
    depth = equation("general", DENVER, unit="in/h").at(minutes, TEN)[0] / 25.4
    np.testing.assert_allclose(depth, printed["published_cum"], atol=5.1e-4)
    np.testing.assert_allclose(depth / minutes * 60, printed["published_intensity"], atol=5.1e-4)


@pytest.mark.parametrize(
    ("name", "coefficients", "minutes", "mm"),
    [
        # 600 x 10^.2 / 60^.5 mm/h over an hour
        ("bernard", {"k": 600.0, "x": 0.2, "n": 0.5}, 60.0, 600 * 10**0.2 / 60**0.5),
        # 1000 x 10^.2 / (20 + 5)^.5 mm/h over 20 min
        ("sherman", {"k": 1000.0, "x": 0.2, "b": 5.0, "n": 0.5}, 20.0, 1000 * 10**0.2 / 5 / 3),
        # 3000 / (30 + 20) = 60 mm/h over half an hour
        ("talbot", {"a": 3000.0, "b": 20.0}, 30.0, 30.0),
        # 800 / (100^.5 + 6) = 50 mm/h over 100 min
        ("general", {"c": 800.0, "e": 0.5, "f": 6.0}, 100.0, 50 * 100 / 60),
    ],
)
def test_by_hand(name: str, coefficients: dict[str, float], minutes: float, mm: float) -> None:
    """Each equation as it is written."""
    assert equation(name, coefficients).at(np.array([minutes]), TEN)[0, 0] == pytest.approx(mm, rel=1e-14)


def test_equations_that_coincide() -> None:
    """Sherman with n = 1 is Talbot; with b = 0 it is Bernard; general with e = 1 is Talbot, with f = 0 Bernard."""
    minutes = np.geomspace(5.0, 1440.0, 9)

    def depth(name: str, **coefficients: float) -> Any:  # noqa: ANN401 - an array
        return equation(name, coefficients).at(minutes, TEN)

    talbot, bernard = depth("talbot", a=3000.0, b=20.0), depth("bernard", k=400.0, n=0.6)
    np.testing.assert_allclose(depth("sherman", k=3000.0, b=20.0, n=1.0), talbot, rtol=1e-13)
    np.testing.assert_allclose(depth("general", c=3000.0, e=1.0, f=20.0), talbot, rtol=1e-13)
    np.testing.assert_allclose(depth("sherman", k=400.0, b=0.0, n=0.6), bernard, rtol=1e-13)
    np.testing.assert_allclose(depth("general", c=400.0, e=0.6, f=0.0), bernard, rtol=1e-13)


def test_units_of_time_and_intensity() -> None:
    """3000/(t + 30) mm/h of t in min is 50/(t + 0.5) of t in h, and 50/25.4 as much in in/h."""
    minutes = np.array([10.0, 45.0, 360.0])
    by_minutes = equation("talbot", {"a": 3000.0, "b": 30.0}).at(minutes, TEN)
    by_hours = equation("talbot", {"a": 50.0, "b": 0.5}, duration_unit="h").at(minutes, TEN)
    by_inches = equation("talbot", {"a": 50.0 / 25.4, "b": 0.5}, duration_unit="h", unit="in/h").at(minutes, TEN)
    np.testing.assert_allclose(by_hours, by_minutes, rtol=1e-13)
    np.testing.assert_allclose(by_inches, by_minutes, rtol=1e-13)


def test_return_period_as_a_power() -> None:
    """With T^.2 a depth of 32 years is twice that of 1 year; T is counted in the equation's own series."""
    depths = equation("bernard", {"k": 300.0, "x": 0.2, "n": 0.5}, return_periods=[0.5, 100.0], series=PARTIAL_DURATION)
    often, rare = (depths.at(np.array([30.0, 60.0]), Frequency(years, PARTIAL_DURATION)) for years in (1.0, 32.0))
    np.testing.assert_allclose(rare, 2 * often, rtol=1e-14)


def test_between_return_periods() -> None:
    """Sets of 2 years (60 mm in 1 h) and 10 years (90 mm): 5 years is 78.05 mm, linear in the reduced variate."""
    sets = ({"a": 4800.0, "b": 20.0}, {"a": 7200.0, "b": 20.0})
    depths = equation("talbot", *sets, return_periods=[2.0, 10.0])
    found = [depths.at(np.array([60.0]), Frequency(years, ANNUAL_MAXIMUM))[0, 0] for years in (2.0, 5.0, 10.0)]
    assert [round(depth, 2) for depth in found] == [60.0, 78.05, 90.0]
    beyond = depths.at(np.array([60.0]), Frequency(100.0, ANNUAL_MAXIMUM), extrapolate=True)[0, 0]
    assert beyond == pytest.approx(60 + 30 * (variate(100) - variate(2)) / (variate(10) - variate(2)), rel=1e-12)


def test_sherman_without_a_power_has_a_set_for_every_return_period() -> None:
    """k/(t + b)^n of two return periods, each with its own coefficients."""
    sets = ({"k": 500.0, "b": 5.0, "n": 0.7}, {"k": 900.0, "b": 6.0, "n": 0.72})
    depths = equation("sherman", *sets, return_periods=[2.0, 50.0])
    assert depths.at(np.array([60.0]), Frequency(50.0, ANNUAL_MAXIMUM))[0, 0] == pytest.approx(900 / 66**0.72)
    assert [frequency.return_period for frequency in depths.frequencies] == [2.0, 50.0]


def test_what_an_equation_says_of_itself() -> None:
    """An equation is a source of point depths; it can be copied whole, and its inputs are its own."""
    coefficients = dict(DENVER)
    depths = equation("general", coefficients, valid=(5.0, 120.0))
    source: DepthSource = depths
    assert (source.points, source.series, source.areal) == (("Quill",), ANNUAL_MAXIMUM, False)
    assert (source.shortest, source.longest) == (5.0, 120.0)
    assert depths.frequencies == (TEN,)
    coefficients["c"] = 0.0
    assert copy.deepcopy(depths).coefficients[0]["c"] == 96.6


def test_registry() -> None:
    """Four equations, each under its own name and with its source."""
    assert sorted(EQUATIONS) == ["bernard", "general", "sherman", "talbot"]
    assert all(EQUATIONS[name].name == name and EQUATIONS[name].source for name in EQUATIONS)


@given(
    st.sampled_from(sorted(EQUATIONS)),
    st.floats(1.0, 1e4),
    st.integers(-10, 60).map(float),
    st.integers(-5, 25).map(lambda tenths: tenths / 10),
    st.integers(-2, 5).map(lambda tenths: tenths / 10),
)
def test_depth_grows_and_intensity_falls_or_it_is_refused(
    name: str, first: float, shift: float, power: float, x: float
) -> None:
    """An equation that is accepted gives depth that grows with duration and rarity and intensity that falls.

    Whether a refusal was right is seen from the depths themselves, by the equation written out.
    """
    sets = {
        "bernard": {"k": first, "x": x, "n": power},
        "general": {"c": first, "e": power, "f": shift},
        "sherman": {"k": first, "x": x, "b": shift, "n": power},
        "talbot": {"a": first, "b": shift},
    }[name]
    minutes = np.geomspace(5.0, 1440.0, 500)
    base = {"bernard": minutes, "general": minutes, "sherman": minutes + shift, "talbot": minutes + shift}[name]
    exponent = 1.0 if name == "talbot" else power
    with np.errstate(invalid="ignore", divide="ignore"):
        below = base**exponent + (shift if name == "general" else 0.0)
        written = first / below * minutes / 60
        below[base <= 0] = 0.0
    sound = bool(
        (below > 0).all()
        and (np.diff(written) >= -1e-9 * written[1:]).all()
        and (np.diff(written / minutes) <= 1e-9 * (written / minutes)[1:]).all()
        and (x >= 0 or name in {"general", "talbot"})
    )
    periods = [2.0, 50.0] if name in {"bernard", "sherman"} else [10.0]
    try:
        depths = equation(name, sets, return_periods=periods)
    except JobError:
        assert not sound
        return
    assert sound
    growth = 10.0**x if name in {"bernard", "sherman"} else 1.0
    np.testing.assert_allclose(depths.at(minutes[1:-1], TEN)[0], (written * growth)[1:-1], rtol=1e-9)


@pytest.mark.parametrize(
    ("minutes", "years", "message"),
    [
        (4.0, 10.0, "duration 4 min: found that the depths are of 5 min to 24 h; expected a duration within them; "),
        (
            2880.0,
            10.0,
            "duration 48 h: found that the depths are of 5 min to 24 h; expected a duration within them; give ",
        ),
        (60.0, 11.0, "AEP 0.09091 (1 in 11): found that the depths are of AEP 0.5 (1 in 2) to AEP 0.1 (1 in 10); "),
        (60.0, 1.9, "AEP 0.5263 (1 in 1.9): found that the depths are of AEP 0.5 (1 in 2) to AEP 0.1 (1 in 10); "),
        (0.0, 2.0, "duration: found 0 minutes; expected more than 0 and finite"),
    ],
)
def test_outside_the_validity(minutes: float, years: float, message: str) -> None:
    """Durations and frequencies for which the coefficients are not valid are refused, with and without a power of T."""
    power = equation("bernard", {"k": 300.0, "x": 0.2, "n": 0.5}, return_periods=[2.0, 10.0])
    sets = ({"a": 4800.0, "b": 20.0}, {"a": 7200.0, "b": 20.0})
    for depths in (power, equation("talbot", *sets, return_periods=[2.0, 10.0])):
        with pytest.raises(MethodError, match=f"^{re.escape(message)}") as caught:
            depths.at(np.array([minutes]), Frequency(years, ANNUAL_MAXIMUM))
        assert len(caught.value.problems) == 1


def test_extrapolation() -> None:
    """Asked to, the equation goes on beyond its durations, and a power of T beyond its return periods."""
    depths = equation("bernard", {"k": 300.0, "x": 0.2, "n": 0.5}, return_periods=[10.0], valid=(10.0, 60.0))
    found = depths.at(np.array([240.0, 5.0]), Frequency(100.0, ANNUAL_MAXIMUM), extrapolate=True)
    expected = [300 * 100**0.2 / 240**0.5 * 4, 300 * 100**0.2 / 5**0.5 / 12]
    np.testing.assert_allclose(found[0], expected, rtol=1e-14)


@pytest.mark.parametrize("minutes", [1440.0, 2.0])
def test_extrapolation_that_no_rain_can_have(minutes: float) -> None:
    """Sherman with n above 1 falls after b/(n - 1) = 200 min; with b below 0 it has no depth at 2 min."""
    sets = {1440.0: {"k": 9000.0, "b": 40.0, "n": 1.2}, 2.0: {"k": 900.0, "b": -2.0, "n": 0.5}}
    depths = equation("sherman", sets[minutes], valid=(10.0, 180.0))
    with pytest.raises(MethodError, match=r"^point Quill, .* by extrapolation; expected a depth above 0 that does not"):
        depths.at(np.array([minutes]), TEN, extrapolate=True)


def test_one_set_has_no_segment_to_go_on() -> None:
    """Coefficients of one return period say nothing of another, asked to go on or not."""
    with pytest.raises(MethodError, match=r"^AEP 0\.05 .*: found that the depths have only AEP 0\.1 \(1 in 10\)"):
        equation("general", DENVER).at(np.array([60.0]), Frequency(20.0, ANNUAL_MAXIMUM), extrapolate=True)


def test_another_series() -> None:
    """A partial duration frequency is not asked of annual maximum coefficients."""
    with pytest.raises(MethodError, match=r"counted in a partial duration series, the depths in an annual maximum"):
        equation("general", DENVER).at(np.array([60.0]), Frequency(10.0, PARTIAL_DURATION))


@pytest.mark.parametrize(
    ("name", "sets", "other", "message"),
    [
        ("shermann", [{}], {}, "equation: found 'shermann'; expected one of: bernard, general, sherman, talbot; "),
        ("talbot", [AB], {"unit": "mm"}, "unit: found 'mm'; expected one of: mm/h, "),
        ("talbot", [AB], {"duration_unit": "s"}, "duration_unit: found 's'; expected one of: min, h, d"),
        ("talbot", [AB], {"series": "pds"}, "series: found 'pds'; expected one of: annual-maximum, partial-duration"),
        ("talbot", [AB], {"source": ""}, "source: found nothing; expected the source of the depths"),
        ("talbot", [AB], {"valid": (60.0, 60.0)}, "valid: found 60 to 60 minutes; expected the shortest"),
        ("talbot", [AB], {"valid": (0.0, 60.0)}, "valid: found 0 to 60 minutes; expected the shortest and the longest"),
        ("talbot", [AB], {"return_periods": TWO}, "coefficients: found 1 set; expected 2, one a return period"),
        ("bernard", [{"k": 900.0, "n": 0.7}], {"return_periods": TWO},
         "coefficients: found 1 set; expected 2, one a return period, or one set with x"),
        ("bernard", [{"k": 1.0, "x": 0.1, "n": 0.5}] * 2, {"return_periods": TWO},
         "coefficients: found 2 sets; expected one set, since it has x"),
        ("talbot", [{"a": 1.0}], {}, "coefficients.b: found nothing; expected the coefficient b of i = a / (t + b)"),
        ("talbot", [AB | {"c": 2.0}], {},
         "coefficients.c: found that the equation does not have it; expected i = a / (t + b)"),
        ("talbot", [{"a": 0.0, "b": 0.0}], {}, "coefficients.a: found 0; expected a number above 0"),
        ("talbot", [{"a": 1.0, "b": math.nan}], {}, "coefficients.b: found nan; expected a finite number"),
        ("general", [{"c": 1.0, "e": 0.5, "f": -10.0}], {},
         "coefficients: found that i = c / (t^e + f) has no value above 0 at 5 min; expected intensities above 0"),
        ("talbot", [{"a": 1.0, "b": -5.0}], {}, "coefficients: found that i = a / (t + b) has no value above 0 at 5 "),
        ("talbot", [{"a": 1.0, "b": -4.0}], {},
         "coefficients: found that by i = a / (t + b) depth falls with duration from 5 min to 24 h; expected depth"),
        ("sherman", [{"k": 1.0, "b": 40.0, "n": 1.2}], {},
         "coefficients: found that by i = k T^x / (t + b)^n depth falls with duration from 200 min to 24 h; expected"),
        ("bernard", [{"k": 1.0, "n": -0.1}], {},
         "coefficients: found that by i = k T^x / t^n intensity rises with duration from 5 min to 24 h; expected"),
        ("bernard", [{"k": 1.0, "x": -0.1, "n": 0.5}], {},
         "coefficients.x: found -0.1, by which depth falls with rarity; expected 0 or more"),
        ("talbot", [{"a": 20.0, "b": 9.0}, {"a": 30.0, "b": -9.0}], {"return_periods": TWO},
         "coefficients of AEP 0.1 (1 in 10): found that i = a / (t + b) has no value above 0 at 5 min"),
    ],
)  # fmt: skip
def test_equations_that_cannot_be(name: str, sets: list[dict[str, float]], other: dict[str, Any], message: str) -> None:
    """What is wrong with an equation is one line, in the words of the job."""
    with pytest.raises(JobError, match=re.escape(f"[design.depths] {message}")) as caught:
        equation(name, *sets, **other)
    assert len(caught.value.problems) == 1


@pytest.mark.parametrize(
    ("sets", "periods", "message"),
    [
        ([AB], [1.0], r"^return period: found 1 years of an annual maximum series; expected more than 1; "),
        ([AB] * 2, [10.0, 2.0], r"^return periods: found 2 years after 10; expected each once, rising$"),
        ([], [], r"^return periods: found none; expected those for which the coefficients are valid$"),
    ],
)
def test_return_periods_that_cannot_be(sets: list[dict[str, float]], periods: list[float], message: str) -> None:
    """Return periods are those of the series, rising, one at least."""
    with pytest.raises(JobError, match=message) as caught:
        equation("talbot", *sets, return_periods=periods)
    assert len(caught.value.problems) == 1


def test_curves_that_cross() -> None:
    """20/(t + 9) and 19/(t + 8) cross at t = 11: the first duration after it, of those looked at, is named."""
    sets = ({"a": 20.0, "b": 9.0}, {"a": 19.0, "b": 8.0})
    with pytest.raises(JobError, match=r"mm/h\) of 11\.\d+ min, less than .* of AEP 0\.5 \(1 in 2\); expected a depth"):
        equation("talbot", *sets, return_periods=[2.0, 10.0])


def test_everything_wrong_is_said_at_once() -> None:
    """Names and units together; then all coefficients of all sets together."""
    with pytest.raises(JobError, match="equation") as caught:
        equation("x", {}, unit="x", duration_unit="x", series="x", point="", date="", valid=(2.0, 1.0))
    assert len(caught.value.problems) == 7
    with pytest.raises(JobError, match=r"coefficients\.b of AEP 0\.5") as caught:
        equation("talbot", {"a": -1.0}, {"a": 2.0, "b": math.inf, "bb": 1.0}, return_periods=[2.0, 10.0])
    assert [problem.item.removeprefix("[design.depths] ") for problem in caught.value.problems] == [
        "coefficients.b of AEP 0.5 (1 in 2)",
        "coefficients.a of AEP 0.5 (1 in 2)",
        "coefficients.b of AEP 0.1 (1 in 10)",
        "coefficients.bb of AEP 0.1 (1 in 10)",
    ]


def test_coefficients_out_of_all_bounds() -> None:
    """Powers that a computer cannot hold are refused, not passed on as zero."""
    with pytest.raises(JobError, match=r"has no value above 0 at 5 min; expected intensities above 0 at every valid"):
        equation("general", {"c": 1.0, "e": 1000.0, "f": 1.0})
    with pytest.raises(
        JobError, match=r"coefficients\.x: found 1000, by which depth has no bounds; expected 0 or more"
    ):
        equation("bernard", {"k": 1.0, "x": 1000.0, "n": 0.5})
