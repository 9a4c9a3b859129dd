"""What all methods of areal reduction have in common: options, range, clamping, the guard of the factors."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest

from basinrain.designstorm.areal_reduction import (
    REDUCTIONS,
    ArealReduction,
    ExponentialCoefficients,
    Limits,
    ReductionTable,
    areal_reduction,
)
from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import JobError, MethodError

OPTIONS: dict[str, dict[str, Any]] = {
    "leclerc-schaake": {},
    "keers-wescott": {},
    "arr-2019": {"region": "Central NSW"},
    "exponential": {"coefficients": ExponentialCoefficients(c1=0.0021, c2=0.53, c3=0.25, source="from memory")},
    "table": {
        "table": ReductionTable(
            areas=np.array([1e6, 1e10]),
            minutes=np.array([1.0, 1e5]),
            factor=np.array([[0.9, 1.0], [0.4, 0.7]]),
            source="drawn",
        )
    },
}
every_method = pytest.mark.parametrize("method", list(REDUCTIONS.values()), ids=list(REDUCTIONS))
TEN = Frequency.of_aep(0.1)
MINUTES = np.array([360.0, 60.0, 1440.0])
CLAMP = 'outside = "clamp" takes the factor of the range\'s nearest end'


def doubling(_area: npt.NDArray[np.float64], minutes: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return a factor that is right up to 2 h, over 1 beyond and negative below half an hour."""
    return (minutes - 30) / 90


WILD = ArealReduction(
    name="wild",
    title="Wild",
    jurisdiction=(),
    region_words="nowhere",
    factor=doubling,
    limits=lambda: Limits(smallest_area=1e6, largest_areas=((0, 1e9),), minutes=(10, 600)),
    source="this test",
)


@every_method
def test_a_vector_is_its_durations_one_by_one(method: ArealReduction) -> None:
    """Durations in any order give, each, the factor that it has alone; above 0 and at most 1."""
    options = OPTIONS[method.name]
    together = method.reduce(2e8, MINUTES, TEN, **options).factor
    alone = [method.reduce(2e8, np.array([minutes]), TEN, **options).factor[0] for minutes in MINUTES]
    np.testing.assert_array_equal(together, alone)
    assert ((together > 0) & (together <= 1)).all()


@every_method
def test_clamping_changes_nothing_inside_the_range(method: ArealReduction) -> None:
    """Inside the range clamping gives the same factors and nothing to tell."""
    options = OPTIONS[method.name]
    refused, clamped = (method.reduce(2e8, MINUTES, TEN, outside=outside, **options) for outside in ("refuse", "clamp"))
    np.testing.assert_array_equal(refused.factor, clamped.factor)
    assert refused.clamped == clamped.clamped == ()


@every_method
@pytest.mark.parametrize("area", [0.0, -1e6, np.nan, np.inf])
@pytest.mark.parametrize("outside", ["refuse", "clamp"])
def test_an_area_that_is_none_is_refused(method: ArealReduction, area: float, outside: str) -> None:
    """Areas of zero, below, without a number or without an end are refused, clamped too."""
    with pytest.raises(
        MethodError, match=rf"{method.name}, area: found {area / 1e6:g} km²; expected an area above zero"
    ):
        method.reduce(area, MINUTES, TEN, outside=outside, **OPTIONS[method.name])


@every_method
@pytest.mark.parametrize("outside", ["refuse", "clamp"])
def test_a_duration_that_is_none_is_refused(method: ArealReduction, outside: str) -> None:
    """All durations of zero, below and without a number are named together, clamped too."""
    with pytest.raises(MethodError, match="duration: found 0 min, -5 min and nan min; expected durations above zero"):
        method.reduce(2e8, np.array([60.0, 0.0, -5.0, np.nan]), TEN, outside=outside, **OPTIONS[method.name])


@every_method
def test_no_durations_have_no_factors(method: ArealReduction) -> None:
    """An empty vector gives an empty one."""
    assert method.reduce(2e8, np.array([]), TEN, **OPTIONS[method.name]).factor.shape == (0,)


@every_method
def test_the_frequency_counts_only_where_it_is_used(method: ArealReduction) -> None:
    """Methods that know no probability take any frequency or none; the others give other factors for another."""
    options = OPTIONS[method.name]
    ten = method.reduce(2e8, MINUTES, TEN, **options).factor
    hundred = method.reduce(2e8, MINUTES, Frequency.of_aep(0.01), **options).factor
    assert (ten != hundred).all() == method.uses_frequency
    if not method.uses_frequency:
        np.testing.assert_array_equal(method.reduce(2e8, MINUTES, None, **options).factor, ten)
        partial = method.reduce(2e8, MINUTES, Frequency(0.5, "partial-duration"), **options).factor
        np.testing.assert_array_equal(partial, ten)


@every_method
def test_the_durations_are_left_as_they_are(method: ArealReduction) -> None:
    """The array that was given is not changed, clamped neither."""
    minutes = np.array([1e7, 60.0])
    method.reduce(2e8, minutes, TEN, outside="clamp", **OPTIONS[method.name])
    np.testing.assert_array_equal(minutes, [1e7, 60.0])


@every_method
def test_every_method_says_where_it_is_from(method: ArealReduction) -> None:
    """Title, region and source are there for reports; the two formulas that were not seen say so."""
    assert method.title
    assert method.region_words
    assert method.source
    assert ("from memory" in method.evidence) == (method.name in {"leclerc-schaake", "keers-wescott"})


def test_what_is_no_factor_is_refused() -> None:
    """Factors of 0, below and over 1 are all named and not passed on, inside the range and clamped."""
    for outside in ("refuse", "clamp"):
        with pytest.raises(MethodError) as refused:
            WILD.reduce(1e8, np.array([12.0, 30.0, 60.0, 120.0, 300.0]), outside=outside)
        assert [problem.found for problem in refused.value.problems] == [
            "a factor of -0.2 for 100 km² at 12 min",
            "a factor of 0 for 100 km² at 30 min",
            "a factor of 3 for 100 km² at 5 h",
        ]
    np.testing.assert_allclose(WILD.reduce(1e8, np.array([60.0, 120.0])).factor, [1 / 3, 1.0])


def test_an_unknown_word_for_outside() -> None:
    """What to do outside the range is one of two words."""
    with pytest.raises(JobError, match="outside: found 'clmp'; expected one of: refuse, clamp; did you mean 'clamp'"):
        WILD.reduce(1e8, MINUTES, outside="clmp")


def test_options_that_are_not_the_method_s() -> None:
    """Options that a method does not know and those that it lacks are refused together."""
    with pytest.raises(JobError) as refused:
        areal_reduction("arr-2019").check_options({"coefficients": 1})
    assert [str(problem) for problem in refused.value.problems] == [
        (
            "[design.areal_reduction] coefficients: found it beside method = 'arr-2019'; expected the method's options:"
            " region; remove it"
        ),
        "[design.areal_reduction] region: found none; expected one: 'arr-2019' needs it",
    ]
    with pytest.raises(JobError, match="region: found it beside method = 'keers-wescott'; expected no options"):
        areal_reduction("keers-wescott").reduce(1e8, MINUTES, region="Tasmania")


def test_checked_options_give_the_range() -> None:
    """A job can ask for the range before anything is computed."""
    assert areal_reduction("arr-2019").check_options({"region": "Tasmania"}).aep == (0.0005, 0.5)


def test_the_registry_s_methods_cannot_be_changed() -> None:
    """A method is a frozen value."""
    with pytest.raises(dataclasses.FrozenInstanceError, match="cannot assign to field 'name'"):
        areal_reduction("table").name = "tables"  # type: ignore[misc]
