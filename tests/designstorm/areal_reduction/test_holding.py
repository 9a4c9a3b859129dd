"""What lies outside a range: refused together, or moved to the nearest end and told."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import Limits, areal_reduction
from basinrain.designstorm.areal_reduction.holding import Held, Holder
from basinrain.designstorm.exceedance import Frequency
from basinrain.errors import MethodError

LIMITS = Limits(
    minutes=(60, 1440), smallest_area=1e6, largest_areas=((0, 1e9), (720, 1e10)), aep=(0.001, 0.5), area_unit="km2"
)
TEN = Frequency.of_aep(0.1)
MI2 = 1609.344**2
CLAMP = 'outside = "clamp" takes the factor of the range\'s nearest end'


def hold(
    area: float,
    minutes: npt.ArrayLike,
    frequency: Frequency | None = TEN,
    *,
    limits: Limits = LIMITS,
    clamp: bool = True,
) -> Held:
    """Hold to a range from 1 to 24 h and from 1 km² to 1000 km², to 10 000 km² from 12 h on."""
    holder = Holder(name="a-method", title="A method", limits=limits, uses_frequency=True, clamp=clamp)
    return holder.hold(area, np.asarray(minutes, dtype=float), frequency)


def test_everything_outside_is_refused_together() -> None:
    """Durations, areas by duration and probability are refused in one error."""
    with pytest.raises(MethodError) as refused:
        areal_reduction("arr-2019").reduce(
            5e10, np.array([0.5, 60.0, 20_160.0]), Frequency.of_aep(0.9), region="Tasmania"
        )
    item = "[design.areal_reduction] arr-2019,"
    assert [str(problem) for problem in refused.value.problems] == [
        f"{item} duration: found 0.5 min and 14 days; expected 1 min to 7 days; {CLAMP}",
        f"{item} area: found 50000 km² at 1 min and 1 h; expected at most 1000 km² below 24 h; {CLAMP}",
        f"{item} area: found 50000 km² at 7 days; expected at most 30000 km²; {CLAMP}",
        f"{item} frequency: found AEP 0.9; expected AEP 0.0005 to 0.5; {CLAMP}",
    ]


def test_everything_outside_is_clamped_to_the_nearest_end() -> None:
    """36 h and 700 square miles get the factor of 24 h and 400 square miles, and both are said."""
    method = areal_reduction("leclerc-schaake")
    reduced = method.reduce(700 * MI2, np.array([10.0, 360.0, 2160.0]), outside="clamp")
    np.testing.assert_array_equal(reduced.factor, method.reduce(400 * MI2, np.array([30.0, 360.0, 1440.0])).factor)
    end = "the nearest end of the method's range"
    assert reduced.clamped == (
        f"{method.title}: the factor of 10 min is that of 30 min, {end} (30 min to 24 h).",
        f"{method.title}: the factor of 36 h is that of 24 h, {end} (30 min to 24 h).",
        (
            f"{method.title}: the factor of 1812.99 km² (700 mi²) is that of 1036 km² (400 mi²), {end} (at most"
            " 1036 km² (400 mi²))."
        ),
    )


def test_the_area_is_moved_by_duration() -> None:
    """5000 km² are 1000 km² below 12 h and stay from there on; only that is told."""
    held = hold(5e9, [60, 90, 720, 1440])
    assert held.areas.tolist() == [1e9, 1e9, 5e9, 5e9]
    assert held.sentences == (
        (
            "A method: the factor of 5000 km² at 1 h and 90 min is that of 1000 km², the nearest end of the method's"
            " range (at most 1000 km² below 12 h)."
        ),
    )


def test_a_duration_is_moved_before_the_area_is_looked_at() -> None:
    """30 h count as 24 h and 6 min as 1 h, and each has the largest area of what it counts as."""
    held = hold(5e9, [6, 1800])
    assert held.minutes.tolist() == [60, 1440]
    assert held.areas.tolist() == [1e9, 5e9]
    assert len(held.sentences) == 3


def test_the_smallest_area_is_held() -> None:
    """An area under the smallest is refused, or taken as the smallest, which is said."""
    with pytest.raises(MethodError, match=r"a-method, area: found 0\.5 km²; expected at least 1 km²; outside"):
        hold(5e5, [60], clamp=False)
    held = hold(5e5, [60])
    assert held.areas.tolist() == [1e6]
    assert "the factor of 0.5 km² is that of 1 km²" in held.sentences[0]


def test_last_bits_are_not_outside() -> None:
    """Ends of the range missed by the last bits of a conversion are the ends, and nothing is told."""
    held = hold(1e10 * (1 + 1e-13), [1440 * (1 + 1e-13), 720 * (1 - 1e-13)], Frequency(1000 * (1 + 1e-13), TEN.series))
    assert held.sentences == ()
    assert held.areas.tolist() == [1e10, 1e10]
    assert held.minutes[0] == 1440
    assert held.aep == 0.001
    with pytest.raises(MethodError, match=r"area: found 10000\.1 km² at 24 h; expected at most 10000 km²"):
        hold(1.00001e10, [1440], clamp=False)


def test_both_sides_of_one_duration() -> None:
    """Where one duration alone is in the range, shorter and longer ones are told apart."""
    held = hold(1e8, [30, 60, 90], limits=Limits(minutes=(60, 60)))
    assert held.minutes.tolist() == [60, 60, 60]
    assert [sentence.partition(" is that")[0] for sentence in held.sentences] == [
        "A method: the factor of 30 min",
        "A method: the factor of 90 min",
    ]


def test_what_cannot_be_is_told_with_what_is_outside() -> None:
    """A duration of zero, no area and no annual maximum series are in one error with a duration that is too long."""
    with pytest.raises(MethodError) as refused:
        hold(0.0, [0, 3000], Frequency(2.0, "partial-duration"), clamp=False)
    assert [str(problem).partition("a-method, ")[2] for problem in refused.value.problems] == [
        "duration: found 0 min; expected durations above zero",
        f"duration: found 50 h; expected 1 to 24 h; {CLAMP}",
        "area: found 0 km²; expected an area above zero",
        (
            "frequency: found 2 years of a partial duration series; expected a frequency of the annual maximum series;"
            " [design.depths] convert = true finds the probability by AEP = 1 - exp(-1/T)"
        ),
    ]


@given(
    area=st.floats(1e3, 1e12),
    minutes=st.lists(st.floats(0.1, 1e5), max_size=4),
    aep=st.floats(1e-6, 0.999),
)
def test_clamped_is_inside_and_holds_again(area: float, minutes: list[float], aep: float) -> None:
    """What was moved lies within the range; held once more nothing moves; and only what was outside was moved."""
    held = hold(area, minutes, Frequency.of_aep(aep))
    assert ((held.minutes >= 60) & (held.minutes <= 1440)).all()
    assert ((held.areas >= 1e6) & (held.areas <= LIMITS.largest_area(held.minutes))).all()
    assert held.aep is not None
    assert 0.001 <= held.aep <= 0.5
    for one_area, one_duration in zip(held.areas, held.minutes, strict=True):
        again = hold(one_area, [one_duration], Frequency.of_aep(held.aep), clamp=False)
        assert (again.areas[0], again.minutes[0], again.sentences) == (one_area, one_duration, ())
    inside = [60 <= value <= 1440 for value in minutes]
    assert held.minutes[inside].tolist() == [value for value, is_in in zip(minutes, inside, strict=True) if is_in]
