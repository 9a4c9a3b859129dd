"""Areal reduction of Australian Rainfall and Runoff 2019; equations and coefficients seen, two outputs published."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import REGIONS, areal_reduction, arr_2019, arr_2019_long, arr_2019_short
from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import JobError, MethodError

FOLDER = Path(__file__).parents[2] / "data" / "published"


def rows(name: str) -> list[dict[str, str]]:
    return list(csv.DictReader((FOLDER / name).read_text(encoding="utf-8").splitlines()))


CHECKS = rows("arr2019_arf_checks.csv")
COEFFICIENTS = rows("arr2019_long_arf_coefficients.csv")
KM2 = 1e6
METHOD = areal_reduction("arr-2019")
ONE_PERCENT = Frequency.of_aep(0.01)
every_region = pytest.mark.parametrize("region", list(REGIONS))


def test_the_checks_are_all_there() -> None:
    """One published factor, the short equation, and every region's long one are in the table of checks."""
    assert len(CHECKS) == 34
    assert {row["region"] for row in CHECKS} == {"(short)", *REGIONS}


def test_coefficients_of_all_ten_regions() -> None:
    """The nine coefficients of every region are those of the table (book 2, chapter 4)."""
    assert {row["region"]: tuple(float(row[key]) for key in "abcdefghi") for row in COEFFICIENTS} == REGIONS


def test_two_published_outputs() -> None:
    """26 km², AEP 1 in 2000: short at 12 h and Tasmania's long at 24 h, published by Ladson (2020), to 5e-8."""
    assert arr_2019_short(26 * KM2, 720, aep=0.0005) == pytest.approx(0.9377527, abs=5e-8)
    assert arr_2019_long(26 * KM2, 1440, aep=0.0005, region="Tasmania") == pytest.approx(0.9322746, abs=5e-8)


def test_the_factor_may_fall_from_12_to_24_hours() -> None:
    """The published outputs fall from 0.93775 to 0.93227, and 18 h lies midway: no monotone law is promised."""
    factor = METHOD.reduce(
        26 * KM2, np.array([720.0, 1080.0, 1440.0]), Frequency.of_aep(0.0005), region="Tasmania"
    ).factor
    assert factor == pytest.approx([0.9377527, (0.9377527 + 0.9322746) / 2, 0.9322746], abs=5e-8)
    assert not METHOD.rises_with_duration


@pytest.mark.parametrize("row", CHECKS, ids=lambda row: "-".join(list(row.values())[:4]))
def test_factors_computed_elsewhere(row: dict[str, str]) -> None:
    """Every factor of the table, published or recomputed there, to its six or seven decimals."""
    region = "Tasmania" if row["region"] == "(short)" else row["region"]
    reduced = METHOD.reduce(
        float(row["area_km2"]) * KM2,
        np.array([float(row["duration_min"])]),
        Frequency.of_aep(float(row["aep"])),
        region=region,
    )
    assert reduced.factor == pytest.approx([float(row["arf"])], abs=5.01e-7 if "recomputed" in row["kind"] else 5e-8)


@every_region
def test_linear_between_12_and_24_hours(region: str) -> None:
    """Between 12 and 24 h the factor is linear in the duration, and both ends belong to their equations."""
    at = arr_2019(300 * KM2, [720, 900, 1440], aep=0.02, region=region)
    short = arr_2019_short(300 * KM2, 720, aep=0.02)
    long = arr_2019_long(300 * KM2, 1440, aep=0.02, region=region)
    assert at == pytest.approx([short, short + (long - short) / 4, long], abs=1e-15)


@every_region
@pytest.mark.parametrize("minutes", [60.0, 1080.0, 4320.0])
def test_small_areas(region: str, minutes: float) -> None:
    """Up to 1 km² nothing is reduced; to 10 km² the factor of 10 km² comes in, and joins at 4e-5 of the reduction."""
    factor = [arr_2019(km2 * KM2, minutes, aep=0.01, region=region) for km2 in (0.01, 1, 4, 10 * (1 - 1e-12), 10)]
    at_ten = factor[4]
    assert factor[:2] == [1.0, 1.0]
    assert factor[2] == pytest.approx(1 - 0.6614 * (1 - at_ten) * (4**0.4 - 1), abs=1e-15)
    assert abs(factor[3] - at_ten) <= 4.2e-5 * (1 - at_ten)


def test_a_half_is_not_without_a_term() -> None:
    """At AEP 0.5 the terms of the probability have 0.3 + log10(0.5) = -0.00103, which is small and not 0."""
    with_terms = arr_2019_short(100 * KM2, 60, aep=0.5)
    without = arr_2019_short(100 * KM2, 60, aep=10**-0.3)
    terms = 2.26e-3 * 100**0.226 * 60**0.125 + 0.0141 * 100**0.213 * 10 ** (-0.021 * 120**2 / 1440)
    assert with_terms - without == pytest.approx(-0.001029995664 * terms, abs=1e-12)


@every_region
def test_a_factor_is_at_most_one(region: str) -> None:
    """Both equations exceed 1 for small areas and long durations; they are held to 1."""
    assert arr_2019_short(0.01 * KM2, 720, aep=0.5) == 1.0
    factor = arr_2019_long([1.0, 1e4, 1e7], 10_080, aep=0.5, region=region)
    assert (factor <= 1).all()


@pytest.mark.parametrize("name", ["tasmania", "TASMANIA", " Tasmania "])
def test_the_letters_of_a_region_may_be_cased_at_will(name: str) -> None:
    """A region is found however its letters are cased."""
    minutes = np.array([1440.0])
    expected = METHOD.reduce(100 * KM2, minutes, ONE_PERCENT, region="Tasmania").factor
    np.testing.assert_array_equal(METHOD.reduce(100 * KM2, minutes, ONE_PERCENT, region=name).factor, expected)


def test_an_unknown_region_is_refused_with_the_nearest() -> None:
    """A misspelt region is an error that names the one meant and all ten; none at all too."""
    with pytest.raises(JobError, match=r"region: found 'SE Cost'; expected one of: East.*did you mean 'SE Coast'"):
        METHOD.reduce(100 * KM2, np.array([60.0]), ONE_PERCENT, region="SE Cost")
    with pytest.raises(JobError, match=r"\] region: found none; expected one: 'arr-2019' needs it"):
        METHOD.reduce(100 * KM2, np.array([60.0]), ONE_PERCENT)


def test_over_1000_km2_below_a_day_is_refused() -> None:
    """Neither the short equation nor the way from 12 to 24 h reaches over 1000 km²; from a day on 30 000 km² do."""
    minutes = np.array([60.0, 1080.0, 1440.0])
    with pytest.raises(MethodError) as refused:
        METHOD.reduce(1001 * KM2, minutes, ONE_PERCENT, region="SW WA")
    assert str(refused.value) == (
        "[design.areal_reduction] arr-2019, area: found 1001 km² at 1 h and 18 h; expected at most 1000 km² below 24 h;"
        ' outside = "clamp" takes the factor of the range\'s nearest end'
    )
    assert (METHOD.reduce(1000 * KM2, minutes, ONE_PERCENT, region="SW WA").factor < 1).all()
    assert METHOD.reduce(30_000 * KM2, minutes[2:], ONE_PERCENT, region="SW WA").factor[0] < 0.9
    with pytest.raises(MethodError, match="found 30001 km² at 24 h; expected at most 30000 km²;"):
        METHOD.reduce(30_001 * KM2, minutes[2:], ONE_PERCENT, region="SW WA")


def test_clamping_the_area_by_duration() -> None:
    """Clamped, 2000 km² count as 1000 km² below a day and as they are from a day on, and that is said."""
    minutes = np.array([60.0, 1440.0])
    reduced = METHOD.reduce(2000 * KM2, minutes, ONE_PERCENT, outside="clamp", region="SW WA")
    assert reduced.factor[0] == METHOD.reduce(1000 * KM2, minutes[:1], ONE_PERCENT, region="SW WA").factor[0]
    assert reduced.factor[1] == METHOD.reduce(2000 * KM2, minutes[1:], ONE_PERCENT, region="SW WA").factor[0]
    assert reduced.clamped == (
        (
            "Australian Rainfall and Runoff 2019: the factor of 2000 km² at 1 h is that of 1000 km², the nearest end"
            " of the method's range (at most 1000 km² below 24 h)."
        ),
    )


def test_over_a_week_is_refused() -> None:
    """10 080 minutes are the longest."""
    METHOD.reduce(100 * KM2, np.array([10_080.0]), ONE_PERCENT, region="SE Coast")
    with pytest.raises(MethodError, match="duration: found 169 h; expected 1 min to 7 days"):
        METHOD.reduce(100 * KM2, np.array([10_140.0]), ONE_PERCENT, region="SE Coast")


@pytest.mark.parametrize(("aep", "remarked"), [(0.5, False), (0.005, False), (0.0049, True), (0.0005, True)])
def test_probabilities_of_which_sources_disagree(aep: float, remarked: bool) -> None:  # noqa: FBT001
    """AEP 0.5 to 0.0005 is answered; below 0.005 the factors are remarked to be extrapolated."""
    reduced = METHOD.reduce(100 * KM2, np.array([60.0]), Frequency.of_aep(aep), region="SE Coast")
    assert reduced.factor[0] < 1
    remark = (
        f"The areal reduction factors at AEP {aep:g} are extrapolated: sources disagree whether those of Australian"
        " Rainfall and Runoff 2019 reach AEP 0.005 or 0.0005."
    )
    assert reduced.remarks == ((remark,) if remarked else ())


@pytest.mark.parametrize(("aep", "end"), [(0.6, 0.5), (0.0004, 0.0005)])
def test_probabilities_beyond_the_range(aep: float, end: float) -> None:
    """A probability beyond the range is refused, or taken at the nearest end, which is said."""
    minutes = np.array([60.0])
    with pytest.raises(MethodError, match=f"frequency: found AEP {aep:g}; expected AEP 0.0005 to 0.5; outside"):
        METHOD.reduce(100 * KM2, minutes, Frequency.of_aep(aep), region="SE Coast")
    reduced = METHOD.reduce(100 * KM2, minutes, Frequency.of_aep(aep), outside="clamp", region="SE Coast")
    expected = METHOD.reduce(100 * KM2, minutes, Frequency.of_aep(end), region="SE Coast").factor
    np.testing.assert_allclose(reduced.factor, expected, rtol=1e-14)
    assert f"the factor of AEP {aep:g} is that of AEP {end:g}, the nearest end" in reduced.clamped[0]


def test_a_frequency_of_the_annual_maximum_series_is_needed() -> None:
    """Return periods of a partial duration series are refused, told how to convert them, and none at all too."""
    minutes = np.array([60.0])
    with pytest.raises(MethodError, match=r"found 2 years of a partial duration series; .*convert = true"):
        METHOD.reduce(100 * KM2, minutes, Frequency(2.0, "partial-duration"), region="SE Coast")
    with pytest.raises(MethodError, match=r"frequency: found none; expected a frequency of the annual maximum series$"):
        METHOD.reduce(100 * KM2, minutes, region="SE Coast")


def test_the_short_equation_outside_its_reach() -> None:
    """It is negative for 1000 km² in a minute (-0.844 at AEP 0.01): refused, and clamping does not help."""
    assert arr_2019_short(1000 * KM2, 1, aep=0.01) == pytest.approx(-0.844, abs=5e-4)
    for outside in ("refuse", "clamp"):
        with pytest.raises(MethodError, match=r"arr-2019: found a factor of -0\.844 for 1000 km² at 1 min; expected"):
            METHOD.reduce(1000 * KM2, np.array([1.0, 60.0]), ONE_PERCENT, outside=outside, region="SE Coast")


@given(
    km2=st.lists(st.floats(0.01, 1000), min_size=2, max_size=2),
    minutes=st.floats(10, 720),
    aep=st.floats(0.0005, 0.5),
)
def test_the_short_equation_falls_with_area(km2: list[float], minutes: float, aep: float) -> None:
    """Up to 12 h a larger area has no greater factor, also across 1 and 10 km²."""
    small, large = arr_2019(np.sort(km2) * KM2, minutes, aep=aep, region="SE Coast")
    assert 0 < large <= small <= 1


@given(
    region=st.sampled_from(list(REGIONS)),
    km2=st.floats(0.01, 1000),
    minutes=st.floats(30, 10_080),
    aep=st.floats(0.0005, 0.5),
)
def test_every_region_has_factors_in_its_whole_range(region: str, km2: float, minutes: float, aep: float) -> None:
    """From half an hour on every area, duration and probability of the range has a factor above 0 and at most 1."""
    factor = METHOD.reduce(km2 * KM2, np.array([minutes]), Frequency.of_aep(aep), region=region).factor[0]
    assert 0 < factor <= 1
