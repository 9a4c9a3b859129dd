"""What a job says about infilling."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillMethod, InfillOptions


def test_defaults() -> None:
    """Inverse distance squared of the 5 nearest, at least 2 donors, gaps up to 31 days, the scale left open."""
    options = InfillOptions()
    assert (options.method, options.exponent, options.donors_wanted) == ("inverse-distance", 2.0, 5)
    assert (options.donors_required, options.longest_gap, options.scale, options.radius) == (2, 31.0, None, None)


@pytest.mark.parametrize(
    ("method", "nearest"),
    [
        ("station-average", 5),
        ("inverse-distance", 5),
        ("normal-ratio", 4),
        ("ten-percent-rule", 4),
        ("inverse-distance-ratios", 5),
        ("correlation-weighting", 5),
        ("regression", 4),
        ("ratio-regression", 4),
    ],
)
def test_the_method_decides_how_many_donate(method: str, nearest: int) -> None:
    """Unless the user does."""
    assert InfillOptions(method=method).donors_wanted == nearest
    assert InfillOptions(method=method, nearest=3).donors_wanted == 3
    assert InfillOptions(method=method, nearest="all").donors_wanted == "all"


def test_one_gauge_is_enough_for_the_nearest() -> None:
    """For all other methods it takes two."""
    assert {m: InfillOptions(method=m).donors_required for m in METHODS} == {
        m: 1 if m == "nearest-gauge" else 2 for m in METHODS
    }


TAKERS = {
    "nearest": set(METHODS) - {"nearest-gauge", "four-quadrant"},
    "min_donors": set(METHODS) - {"nearest-gauge"},
    "power": {"inverse-distance", "inverse-distance-ratios"},
}


@pytest.mark.parametrize("name", TAKERS)
@pytest.mark.parametrize("method", METHODS)
def test_options_that_do_not_belong(method: str, name: str) -> None:
    """An option that the method does not take is refused, with the methods that do; else it is accepted."""
    if method in TAKERS[name]:
        assert getattr(InfillOptions(method=method, **{name: 3}), name) == 3  # type: ignore[arg-type]
        return
    listed = ", ".join(m for m in METHODS if m in TAKERS[name])
    with pytest.raises(JobError) as caught:
        InfillOptions(method=method, **{name: 3})  # type: ignore[arg-type]
    assert str(caught.value) == (
        f"[infill] {name}: found it beside method '{method}'; expected one of the methods that take it: {listed}; "
        f"remove {name}, or choose one of these"
    )


def test_options_that_do_not_belong_are_named_together() -> None:
    """Three of them, three lines."""
    with pytest.raises(JobError, match="beside method 'nearest-gauge'") as caught:
        InfillOptions(method="nearest-gauge", nearest=2, min_donors=2, power=1)
    assert [p.item for p in caught.value.problems] == ["[infill] nearest", "[infill] min_donors", "[infill] power"]


def test_another_method_with_the_same_options() -> None:
    """What the other method does not take is dropped, the rest stays."""
    options = InfillOptions(nearest=3, min_donors=3, power=1, radius=9e3, elevation_limit=200, scale="step")
    other = options.with_method("four-quadrant")
    assert (other.nearest, other.min_donors, other.power) == (None, 3, None)
    assert (other.radius, other.elevation_limit, other.scale) == (9e3, 200, "step")
    assert options.with_method("inverse-distance-ratios").exponent == 1
    assert options.with_method("nearest-gauge").exponent is None


def test_more_donors_asked_for_than_the_method_takes() -> None:
    """Six donors at least: then six are taken, not the method's five."""
    assert InfillOptions(min_donors=6).donors_wanted == 6


@pytest.mark.parametrize(
    ("wrong", "message"),
    [
        ({"method": "normal_ratio"}, r"\[infill\] method: found 'normal_ratio'; .* did you mean 'normal-ratio'\?"),
        (
            {"scale": "storms"},
            r"\[infill\] scale: found 'storms'; expected one of: step, day, storm; did you mean 'storm'",
        ),
        ({"longest_gap": 0}, r"\[infill\] longest_gap: found 0; expected a number above 0"),
        ({"longest_gap": math.nan}, r"\[infill\] longest_gap: found nan"),
        ({"power": -1}, r"\[infill\] power: found -1; expected a number above 0"),
        ({"power": "2"}, r"\[infill\] power: found '2'; expected a number above 0"),
        ({"power": math.inf}, r"\[infill\] power: found inf"),
        ({"longest_gap": None}, r"\[infill\] longest_gap: found None"),
        ({"elevation_limit": 0}, r"\[infill\] elevation_limit: found 0; expected a number above 0"),
        ({"radius": 0.0}, r"\[infill\] radius: found 0.0; expected a number above 0"),
        ({"min_donors": 0}, r"\[infill\] min_donors: found 0; expected a whole number of 1 or more"),
        ({"min_donors": True}, r"\[infill\] min_donors: found True"),
        ({"nearest": 2.5}, r"\[infill\] nearest: found 2.5; expected a whole number of 1 or more, or 'all'"),
        ({"nearest": "every"}, r"\[infill\] nearest: found 'every'; .* or 'all'"),
        ({"nearest": 1}, r"\[infill\] nearest: found 1, below min_donors = 2; .* raise nearest or lower min_donors"),
    ],
)
def test_wrong_options(wrong: dict[str, Any], message: str) -> None:
    """Each is refused when the options are made, with what would be accepted."""
    with pytest.raises(JobError, match=message):
        InfillOptions(**wrong)


def test_all_wrong_options_together() -> None:
    """Four problems, one error."""
    with pytest.raises(JobError, match="method") as caught:
        InfillOptions(method="none", scale="hour", power=0, nearest=0)  # type: ignore[arg-type]
    assert [problem.item for problem in caught.value.problems] == [
        "[infill] method",
        "[infill] scale",
        "[infill] power",
        "[infill] nearest",
    ]


def test_an_unlimited_gap_is_allowed() -> None:
    """Infinity is a number of days above 0."""
    assert InfillOptions(longest_gap=math.inf).longest_gap == math.inf


def test_weights_go_by_the_options() -> None:
    """The power reaches inverse distance, the month normal ratio, and neither the other."""
    monthly = np.ones((3, 12))
    monthly[1, 4] = 2.0
    network = GaugeNetwork(
        ids=("T", "A", "B"), x=np.array([0.0, 1e3, 2e3]), y=np.zeros(3), crs="local", normals=monthly
    )
    donors = np.array([False, True, True])
    assert InfillOptions(power=1).weights(network, 0, donors, month=5).tolist() == pytest.approx([0, 2 / 3, 1 / 3])
    ratio = InfillOptions(method="normal-ratio")
    assert ratio.weights(network, 0, donors, month=5).tolist() == [0, 0.25, 0.5]
    assert ratio.weights(network, 0, donors, month=6).tolist() == [0, 0.5, 0.5]


@pytest.mark.parametrize("method", ["correlation-weighting", "regression", "ratio-regression"])
def test_relations_are_asked_for(method: str) -> None:
    """A method that rests on them says what to give."""
    network = GaugeNetwork(ids=("T", "A"), x=np.array([0.0, 1e3]), y=np.zeros(2), crs="local")
    with pytest.raises(DataError, match=f"relations between gauges: found none; expected those of .* '{method}'; give"):
        InfillOptions(method=method).weights(network, 0, np.ones(2, dtype=bool))


@pytest.mark.parametrize("method", METHODS.values(), ids=lambda method: method.name)
def test_a_label_has_the_power_of_a_method_that_takes_one(method: InfillMethod) -> None:
    """Also the default power, and no other number."""
    powered = "power" in method.takes
    assert InfillOptions(method=method.name).label == method.name + (" (power 2)" if powered else "")
    if powered:
        assert InfillOptions(method=method.name, power=1.5, nearest=3).label == f"{method.name} (power 1.5)"
