"""Areal reduction after Keers and Wescott; formula, coefficients and the Flood Studies Report's table from memory."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.areal_reduction import areal_reduction, keers_wescott
from basinrain.errors import MethodError

FILE = Path(__file__).parents[2] / "data" / "published" / "arf_uk_fsr_vs_feh.csv"
ROWS = [
    {key: float(value) for key, value in row.items()}
    for row in csv.DictReader(FILE.read_text(encoding="utf-8").splitlines())
]
KM2 = 1e6
METHOD = areal_reduction("keers-wescott")


def test_the_checks_are_all_there() -> None:
    """Every row of the comparison is read; most of them are of half an hour and longer."""
    assert len(ROWS) == 120
    assert sum(row["duration_h"] >= 0.5 for row in ROWS) == 89


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row['area_km2']:g}km2-{row['duration_h']:.3g}h")
def test_the_formula_computed_elsewhere(row: dict[str, float]) -> None:
    """The formula (from memory) gives what it gave apart from this package, to four decimals, outside its range too."""
    factor = keers_wescott(row["area_km2"] * KM2, row["duration_h"] * 60)
    assert factor == pytest.approx(row["feh_formula_from_memory"], abs=5.01e-5)


def test_the_table_of_the_flood_studies_report() -> None:
    """From half an hour on the factors are within 0.032 of table 5.1 (from memory); all its areas are in the range."""
    for row in (row for row in ROWS if row["duration_h"] >= 0.5):
        factor = METHOD.reduce(row["area_km2"] * KM2, np.array([row["duration_h"] * 60])).factor
        assert factor == pytest.approx([row["fsr_table_from_memory"]], abs=0.032)


def test_it_diverges_below_a_quarter_of_an_hour() -> None:
    """The formula leaves the table below 15 minutes, to a factor below 0: such durations are refused."""
    wrong = [row for row in ROWS if abs(row["feh_formula_from_memory"] - row["fsr_table_from_memory"]) > 0.06]
    assert max(row["duration_h"] for row in wrong) == pytest.approx(5 / 60)
    assert keers_wescott(100 * KM2, 1.0) < 0
    with pytest.raises(MethodError, match=r"duration: found 10 min; expected 15 min to 25 days"):
        METHOD.reduce(100 * KM2, np.array([10.0, 15.0, 60.0]))


@pytest.mark.parametrize(
    ("km2", "hours", "expected"),
    [
        (10, 1, 0.91098),
        (100, 6, 0.90137),
        (100, 24, 0.94335),
        (500, 12, 0.88468),
        (1000, 24, 0.89208),
        (10_000, 24, 0.82901),
    ],
)
def test_five_decimals(km2: float, hours: float, expected: float) -> None:
    """Factors of every row of the coefficients (from memory), those of exactly 100 and 1000 km² included, to 1e-5."""
    assert METHOD.reduce(km2 * KM2, np.array([hours * 60])).factor == pytest.approx([expected], abs=1e-5)


@pytest.mark.parametrize(
    ("km2", "step", "tolerance"), [(20, 0.0, 1e-8), (100, 4e-4, 5e-5), (500, 0.0, 1e-5), (1000, 8e-4, 5e-5)]
)
def test_steps_where_the_rows_join(km2: float, step: float, tolerance: float) -> None:
    """At 6 h the factor steps down by 0.0004 at 100 and 0.0008 at 1000 km², and by nothing at 20 and 500 km²."""
    below, above = keers_wescott(np.array([km2 * (1 - 1e-12), km2 * (1 + 1e-12)]) * KM2, 360)
    assert below - above == pytest.approx(step, abs=tolerance)


@pytest.mark.parametrize(
    ("minutes", "largest"), [(15, 3000), (30, 10_000), (59, 10_000), (60, 30_000), (36_000, 30_000)]
)
def test_the_largest_area_grows_with_the_duration(minutes: float, largest: float) -> None:
    """The area that the fitted table reaches at a duration (from memory) is answered, more is refused."""
    assert 0.25 < METHOD.reduce(largest * KM2, np.array([minutes])).factor[0] < 1
    with pytest.raises(MethodError, match=f"area: found .* expected at most {largest} km²"):
        METHOD.reduce(largest * 1.001 * KM2, np.array([minutes]))


@given(
    areas=st.lists(st.floats(1e3, 3e9), min_size=2, max_size=2),
    minutes=st.lists(st.floats(15, 36_000), min_size=2, max_size=2),
)
def test_it_falls_with_area_and_rises_with_duration(areas: list[float], minutes: list[float]) -> None:
    """A larger area has no greater factor, but for 1e-5 where rows join; a longer duration has no smaller one."""
    durations = np.sort(minutes)
    small, large = (METHOD.reduce(area, durations).factor for area in sorted(areas))
    assert (large <= small + 1e-5).all()
    assert (np.diff(small) >= 0).all()
    assert (large > 0).all()
    assert (small <= 1).all()


@given(km2=st.sampled_from([20.0, 100.0, 500.0, 1000.0]), minutes=st.floats(15, 36_000))
def test_rows_join_without_a_rise(km2: float, minutes: float) -> None:
    """Across the areas where rows join no factor rises by more than 1e-5."""
    below, at, above = keers_wescott(np.array([km2 * (1 - 1e-12), km2, km2 * (1 + 1e-12)]) * KM2, minutes)
    assert at <= below + 1e-5
    assert above <= at + 1e-5


def test_another_fit_to_the_same_table() -> None:
    """From half an hour on within 0.0185 of max(1 - .048 A^(.36-.01 ln A) / d^.35, .25), Koutsoyiannis (memory)."""
    rows = [row for row in ROWS if row["duration_h"] >= 0.5]
    area, hours = (np.array([row[key] for row in rows]) for key in ("area_km2", "duration_h"))
    other = np.maximum(1 - 0.048 * area ** (0.36 - 0.01 * np.log(area)) / hours**0.35, 0.25)
    np.testing.assert_allclose(other, [row["koutsoyiannis_fit_from_memory"] for row in rows], atol=5.01e-5)
    np.testing.assert_allclose(keers_wescott(area * KM2, hours * 60), other, atol=0.0185)
