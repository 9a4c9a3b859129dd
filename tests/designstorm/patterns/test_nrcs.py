"""The NRCS distributions against published ordinates and greatest depths by duration.

Sources and how far each figure was seen in print: tests/data/published/README.md.
"""

from __future__ import annotations

import csv
import re
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from pattern_cases import pattern_case

from basinrain.designstorm.patterns import pattern
from basinrain.designstorm.patterns.nrcs import NRCS_TYPES, nrcs
from basinrain.errors import MethodError

FOLDER = Path(__file__).parents[2] / "data" / "published"
Array = npt.NDArray[np.float64]


def read(name: str) -> list[dict[str, str]]:
    with (FOLDER / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def cumulative(kind: str, step: int) -> Array:
    """Return what share has fallen by every border of steps of ``step`` minutes."""
    return np.concatenate(([0.0], np.cumsum(nrcs(pattern_case(1440, step, total=1), kind=kind).depth)))


def greatest(kind: str, minutes: int, step: int) -> float:
    """Return the greatest share that falls in a duration, of all windows that begin with a step."""
    fallen = cumulative(kind, step)
    n = minutes // step
    return float((fallen[n:] - fallen[:-n]).max())


@pytest.mark.parametrize("kind", NRCS_TYPES)
def test_hourly_ordinates_digit_for_digit(kind: str) -> None:
    """On hourly steps the cumulative curve has the four published decimals of every hour."""
    rows = read("nrcs_24h_hourly.csv")
    assert len(rows) == 25
    assert [f"{share:.4f}" for share in cumulative(kind, 60)] == [row[f"type_{kind}"] for row in rows]


@pytest.mark.parametrize("row", read("neh630_ch4_duration_ratios.csv"), ids=lambda row: f"{row['duration_min']} min")
def test_type_ii_has_the_ratios_of_the_handbook(row: dict[str, str]) -> None:
    """NEH 630, chapter 4, figure 4-31: greatest depth of 5 min to 24 h over that of 24 h, to 6e-4."""
    minutes = int(row["duration_min"])
    assert greatest("II", minutes, 1) == pytest.approx(float(row["type_II_fig4_31"]), abs=6e-4)


@pytest.mark.parametrize(
    ("kind", "minutes", "expected"),
    [
        ("I", 60, 0.2813),
        ("I", 360, 0.5777),
        ("IA", 60, 0.170),
        ("IA", 360, 0.467),
        ("II", 30, 0.380),
        ("II", 60, 0.4537),
        ("II", 120, 0.5376),
        ("II", 180, 0.5953),
        ("II", 360, 0.7067),
        ("II", 720, 0.841),
        ("III", 60, 0.404),
        ("III", 360, 0.7085),
    ],
)
def test_greatest_shares_by_duration(kind: str, minutes: int, expected: float) -> None:
    """Greatest shares derived from the published ordinates at their own spacing, apart from the package."""
    assert greatest(kind, minutes, 30 if kind == "IA" else 6) == pytest.approx(expected, abs=5e-5)


def test_type_ii_is_the_fine_curve_and_not_the_coarse_one() -> None:
    """At 11.75 h it has 0.3926, not the 0.357 of the coarser curve; 0.735 is at 12.5 h, not at 12.25 h."""
    fallen = cumulative("II", 15)
    assert fallen[47] == pytest.approx(0.3926, abs=5e-5)
    assert fallen[50] == pytest.approx(0.7350, abs=5e-5)
    assert fallen[49] < 0.71


def test_type_iii_is_symmetric_to_a_thousandth_but_not_exactly() -> None:
    """What has fallen by t and what falls after 24 h - t differ by up to 0.001, and do differ."""
    fallen = cumulative("III", 6)
    off = np.abs(fallen + fallen[::-1] - 1).max()
    assert 1e-4 < off <= 0.001 + 1e-9


@pytest.mark.parametrize(("kind", "spacing"), [("I", 6), ("IA", 30), ("II", 6), ("III", 6)])
def test_steps_between_two_ordinates_get_equal_depths_and_that_is_told(kind: str, spacing: int) -> None:
    """Thirds of the spacing come in equal threes with a remark; at the spacing and above there is none."""
    shaped = nrcs(pattern_case(1440, spacing // 3), kind=kind)
    threes = shaped.depth.reshape(-1, 3)
    np.testing.assert_allclose(threes, threes[:, :1].repeat(3, axis=1), rtol=0, atol=1e-12)
    (remark,) = shaped.remarks
    assert remark == (
        f"The ordinates of NRCS type {kind} are {spacing} minutes apart, so that steps of {spacing // 3} min between "
        f"two of them get equal depths, and the greatest intensity is that of {spacing} minutes."
    )
    for step in (spacing, 60):
        assert nrcs(pattern_case(1440, step), kind=kind).remarks == ()


def test_the_registered_patterns_are_the_four_types() -> None:
    """Each registered name gives its own type."""
    case = pattern_case(1440, 60)
    for kind in NRCS_TYPES:
        registered = pattern(f"nrcs-type-{kind.lower()}")
        np.testing.assert_array_equal(registered.shape(case).depth, nrcs(case, kind=kind).depth)


def test_another_duration_than_24_hours_is_refused() -> None:
    """6 h have no NRCS distribution; a step that does not divide them is told in the same error."""
    with pytest.raises(
        MethodError, match=re.escape("pattern nrcs-type-ii: found a duration of 6 h; expected 24 h, the only duration")
    ) as caught:
        nrcs(pattern_case(360, 7), kind="II")
    assert {problem.item for problem in caught.value.problems} == {"pattern nrcs-type-ii", "[design] step"}
