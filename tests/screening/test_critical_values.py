"""Critical values against the printed tables, with the ones that are known to be wrong, and how.

Values and sources: tests/data/published/homogeneity_critical_values.csv. Printed figures are seen for n from 20, those
of Buishand's Q and for n = 10 from memory; the simulated ones beside them are derived.
"""

from __future__ import annotations

import csv
from functools import cache
from pathlib import Path

import pytest
from screening import long_critical_values

from basinrain.screening.critical_values import critical_values

FILE = Path(__file__).parents[1] / "data" / "published" / "homogeneity_critical_values.csv"
NAMES = {
    "buishand_Q_sqrtn": "buishand-q",
    "buishand_R_sqrtn": "buishand-range",
    "SNHT_T0 (sd ddof=1)": "snht",
    "Pettitt_K (published 5%,1% in cols crit_95,crit_99)": "pettitt",
    "von_Neumann_ratio (lower tail)": "von-neumann",
}
ROWS = [
    (NAMES[row["test"]], int(row["n"]), row) for row in csv.DictReader(FILE.read_text(encoding="utf-8").splitlines())
]


def rows_of(*tests: str) -> list[tuple[str, int, dict[str, str]]]:
    return [row for row in ROWS if row[0] in tests]


def test_all_rows_are_here() -> None:
    """31 rows: six lengths each, seven for Buishand's range."""
    assert len(ROWS) == 31
    assert {name for name, *_ in ROWS} == set(NAMES.values())


@pytest.mark.parametrize(("test", "n", "row"), rows_of("buishand-q", "buishand-range", "von-neumann"))
def test_printed_tables_that_are_right(test: str, n: int, row: dict[str, str]) -> None:
    """These are the printed values, which simulation bears out within 0.016."""
    ours = critical_values(test, n)
    for level, column in ((0.05, "95"), (0.01, "99")):
        assert ours[level] == pytest.approx(float(row[f"crit_{column}"]), abs=1e-9)
        assert ours[level] == pytest.approx(float(row[f"sim_{column}"]), abs=0.016)


@pytest.mark.parametrize(("test", "n", "row"), rows_of("snht"))
def test_snht(test: str, n: int, row: dict[str, str]) -> None:
    """Simulated, with the standard deviation of n - 1; the printed table is within 2 % at 5 % and 6 % at 1 %."""
    ours = critical_values(test, n)
    assert ours[0.05] == float(row["sim_95"]) == pytest.approx(float(row["crit_95"]), rel=0.02)
    assert ours[0.01] == float(row["sim_99"]) == pytest.approx(float(row["crit_99"]), rel=0.06)
    assert ours[0.01] < float(row["crit_99"])


@pytest.mark.parametrize(("test", "n", "row"), rows_of("pettitt"))
def test_pettitt(test: str, n: int, row: dict[str, str]) -> None:
    """Simulated, two-sided; the printed 5 % is the two-sided 10 % point, so ours is about a tenth above it."""
    ours = critical_values(test, n)
    assert ours[0.05] == pytest.approx(float(row["sim_95"]), rel=1e-12)
    assert ours[0.01] == pytest.approx(float(row["sim_99"]), rel=1e-12)
    assert float(row["crit_95"]) == float(row["sim_90"])
    assert ours[0.05] > 1.09 * float(row["crit_95"])
    assert ours[0.01] > 1.05 * float(row["crit_99"])


@pytest.mark.parametrize("test", sorted(NAMES.values()))
def test_between_and_beyond(test: str) -> None:
    """Values change steadily with the length, and the 1 % point is the more extreme one everywhere."""
    for level in (0.05, 0.01):
        values = [critical_values(test, n)[level] for n in range(20, 331)]
        assert values == sorted(values)
    for n in range(20, 331):
        ours = critical_values(test, n)
        assert (ours[0.01] < ours[0.05]) == (test == "von-neumann")


@pytest.mark.parametrize(("test", "shortest"), [("snht", 20), ("pettitt", 20), ("von-neumann", 20), ("buishand-q", 10)])
def test_below_the_table(test: str, shortest: int) -> None:
    """Shorter series than the table's have no critical values."""
    assert critical_values(test, shortest)
    assert not critical_values(test, shortest - 1)


@pytest.mark.parametrize("test", [*long_critical_values.TESTS])
def test_long_series(test: str) -> None:
    """Beyond the printed tables the values are those of the program that simulates them, here on a tenth as many."""
    for n in long_critical_values.LENGTHS:
        five, one = simulated(n)[test]
        ours = critical_values(test, n)
        # Three standard errors of a quantile of 40 000 series.
        assert ours[0.05] == pytest.approx(five, rel=0.012)
        assert ours[0.01] == pytest.approx(one, rel=0.025)


@cache
def simulated(n: int) -> dict[str, tuple[float, float]]:
    """Return the values of a tenth of the series."""
    return long_critical_values.simulated(n, series=long_critical_values.SERIES // 10)


def test_beyond_the_table() -> None:
    """Held at the value for 300, as K/n^1.5 for Pettitt; at that for 100 as (2 - N) √n for von Neumann."""
    assert critical_values("snht", 500) == critical_values("snht", 300) == {0.05: 10.018, 0.01: 13.348}
    assert critical_values("pettitt", 1200)[0.05] == pytest.approx(3981 * 8)
    assert critical_values("von-neumann", 400)[0.01] == pytest.approx(2 - 0.46 / 2)
