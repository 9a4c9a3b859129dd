"""What a job says about infilling."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from basinrain.errors import JobError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions


def test_defaults() -> None:
    """Inverse distance squared of the 5 nearest, at least 2 donors, gaps up to 31 days, the scale left open."""
    options = InfillOptions()
    assert (options.method, options.power, options.donors_wanted) == ("inverse-distance", 2.0, 5)
    assert (options.min_donors, options.longest_gap, options.scale, options.radius) == (2, 31.0, None, None)


@pytest.mark.parametrize(("method", "nearest"), [("normal-ratio", 4), ("inverse-distance", 5), ("station-average", 5)])
def test_the_method_decides_how_many_donate(method: str, nearest: int) -> None:
    """Unless the user does."""
    assert InfillOptions(method=method).donors_wanted == nearest
    assert InfillOptions(method=method, nearest=3).donors_wanted == 3
    assert InfillOptions(method=method, nearest="all").donors_wanted == "all"


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
        ({"power": None}, r"\[infill\] power: found None"),
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
    ratio = InfillOptions(method="normal-ratio", power=1)
    assert ratio.weights(network, 0, donors, month=5).tolist() == [0, 0.25, 0.5]
    assert ratio.weights(network, 0, donors, month=6).tolist() == [0, 0.5, 0.5]
