"""Normals as the ratio methods need them."""

from __future__ import annotations

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill.normals import normals_of, require_normals, suspect_normal_units


def network(normals: object) -> GaugeNetwork:
    table = None if normals is None else np.array(normals, dtype=float)
    return GaugeNetwork(ids=("A", "B", "C"), x=np.arange(3.0), y=np.zeros(3), crs="local", normals=table)


EVERYONE = np.ones(3, dtype=bool)
MONTHLY = np.tile(np.arange(1.0, 13.0), (3, 1)) * np.array([[10.0], [20.0], [30.0]])


def test_the_months_normal_is_taken() -> None:
    """March is the third of twelve."""
    assert normals_of(network(MONTHLY), 3).tolist() == [30, 60, 90]


def test_the_years_normal_is_the_sum_of_the_months() -> None:
    """1 + 2 + ... + 12 = 78."""
    assert normals_of(network(MONTHLY), None).tolist() == [780, 1560, 2340]


def test_one_column_is_the_year_in_every_month() -> None:
    """Annual normals have no months to choose from."""
    assert normals_of(network([[900], [1000], [1200]]), 7).tolist() == [900, 1000, 1200]


def test_no_normals_at_all() -> None:
    """One line says that the network has none."""
    assert np.isnan(normals_of(network(None), 1)).all()
    with pytest.raises(
        DataError, match=r"^gauges: found no normals; expected a normal above 0 .* another infill method$"
    ):
        require_normals(network(None), EVERYONE, [1], method="normal-ratio")


def test_every_gauge_at_fault_is_named() -> None:
    """A missing, a zero and a negative normal are three problems of one error."""
    with pytest.raises(DataError) as caught:
        require_normals(network([[np.nan], [0], [-5]]), EVERYONE, [1], method="normal-ratio")
    assert [problem.gauge for problem in caught.value.problems] == ["A", "B", "C"]
    assert [problem.found for problem in caught.value.problems] == [
        "no normal for the year",
        "a normal of 0 mm for the year",
        "a normal of -5 mm for the year",
    ]


def test_only_the_months_concerned_matter() -> None:
    """A dry July is no problem for a storm in March, and is one for a storm in July."""
    dry = MONTHLY.copy()
    dry[1, 6] = 0
    require_normals(network(dry), EVERYONE, [3], method="normal-ratio")
    with pytest.raises(DataError, match="gauge B: found a normal of 0 mm for July; expected a normal above 0"):
        require_normals(network(dry), EVERYONE, [3, 7], method="normal-ratio")


def test_only_the_gauges_concerned_matter() -> None:
    """Gauge A without a normal takes no part here."""
    require_normals(network([[np.nan], [5], [6]]), np.array([False, True, True]), [None], method="normal-ratio")
    with pytest.raises(DataError, match="gauge A: found no normal for the year"):
        require_normals(network([[np.nan], [5], [6]]), EVERYONE, [None], method="normal-ratio")


@pytest.mark.parametrize("method", ["ten-percent-rule", "ratio-regression"])
def test_the_method_in_use_is_named(method: str) -> None:
    """Whoever runs the 10 % rule is not told of the normal ratio."""
    with pytest.raises(DataError, match=f"gauge B: found a normal of 0 mm .* for the {method} method; give it"):
        require_normals(network([[5], [0], [6]]), EVERYONE, [None], method=method)


def row(*normals: float) -> GaugeNetwork:
    """Gauges 1 km apart in line."""
    n = len(normals)
    return GaugeNetwork(
        ids=tuple("ABCDEFGHIJ"[:n]),
        x=np.arange(n, dtype=float) * 1e3,
        y=np.zeros(n),
        crs="local",
        normals=np.array(normals, dtype=float)[:, None],
    )


@pytest.mark.parametrize(
    ("factor", "words"),
    [
        (25.4, "mm where the others are inches"),
        (10, "mm where the others are cm"),
        (2.54, "cm where the others are inches"),
        (1 / 2.54, "inches where the others are cm"),
        (0.1, "cm where the others are mm"),
        (1 / 25.4, "inches where the others are mm"),
    ],
)
@pytest.mark.parametrize("off", [0.9, 1.0, 1.11])
def test_a_normal_in_another_unit_is_doubted(factor: float, words: str, off: float) -> None:
    """Only D, off by the factor and up to 11 % more or less, however it is among its own neighbours' neighbours."""
    notes = suspect_normal_units(row(800, 850, 900, 870 * factor * off, 870, 880, 900))
    assert [(note.gauge, note.code, note.level) for note in notes] == [("D", "normal-unit", "warning")]
    assert notes[0].text.endswith(f"as if it were in {words}.")


def test_relief_alone_is_not_doubted() -> None:
    """Twice, three and five times the neighbours' normal are none of the units' ratios, nor are 14 times."""
    for factor in (0.5, 1.5, 2, 3, 5, 14):
        assert suspect_normal_units(row(800, 850, 900, 870 * factor, 870, 880, 900)) == ()


def test_of_two_gauges_either_may_be_the_wrong_one() -> None:
    """With one neighbour each both are named; gauges without a normal count for nothing; one gauge has no neighbour."""
    assert [note.gauge for note in suspect_normal_units(row(800, 31.5, np.nan, 0))] == ["A", "B"]
    # A normal that its neighbours make doubtful is not doubted twice.
    assert [note.code for note in suspect_normal_units(row(800 * 25.4, 800))] == ["normal-unit"] * 2
    assert suspect_normal_units(row(800, np.nan)) == ()
    assert suspect_normal_units(network(None)) == ()


def test_of_three_gauges_the_wrong_one_is_named() -> None:
    """C has 1,200 mm in cm: beside it A is 2.6 times the middle of B and C, yet C stands out more, and A fits B."""
    (note,) = suspect_normal_units(row(900, 1000, 120))
    assert note.text == (
        "Gauge C: its normal of 120 mm is 0.13 times the median of its 2 nearest gauges' (948.7 mm), "
        "as if it were in cm where the others are mm."
    )


def test_gauges_are_judged_without_those_in_doubt() -> None:
    """C and E are in inches; E, nearer its neighbours by little, is then judged by the others alone."""
    first, second = suspect_normal_units(row(800, 850, 33.1, 900, 35, 870, 850, 860))
    assert (first.gauge, second.gauge) == ("C", "E")
    assert "its 5 nearest gauges' (850 mm), as if it were in inches" in first.text
    assert "its 5 nearest gauges' that are not in doubt (860 mm), as if it were in inches" in second.text


def test_a_neighbour_on_a_mountain_is_left_out_unnamed() -> None:
    """E has five times as much, no ratio of units; D in cm among inches is named though E stands out more."""
    (note,) = suspect_normal_units(row(800, 850, 900, 2200, 4350, 870, 880))
    assert (note.gauge, note.code) == ("D", "normal-unit")


def test_normals_that_no_place_has_are_doubted() -> None:
    """All read as inches, 20 to 25 m a year: 11.9 m at Mawsynram, the wettest place known (from memory), are not."""
    (note,) = suspect_normal_units(row(*(25.4 * np.array([800.0, 850, 900, 950, 1000]))))
    assert (note.code, note.gauge, note.level) == ("normal-out-of-range", "", "warning")
    assert note.text == (
        "Normals for the year below 10 or above 13,000 mm (the wettest place known has about 11,900 mm): A 20,320 mm, "
        "B 21,590 mm, C 22,860 mm and 2 more; check normal_unit, and that normals are those of the year or of its "
        "twelve months."
    )
    assert suspect_normal_units(row(11900, 12000, 10)) == ()
    (lone,) = suspect_normal_units(row(9.9))
    assert lone.text.startswith("A normal for the year below 10 or above 13,000 mm")
    assert "A 9.9 mm; check" in lone.text


def test_monthly_normals_are_doubted_by_their_sum() -> None:
    """Twelve months of 3.3 among months of 80 mm."""
    months = np.array([[80.0], [82.0], [3.3]]) * np.ones(12)
    (note,) = suspect_normal_units(network(months))
    assert note.text == (
        "Gauge C: its normal of 39.6 mm is 0.041 times the median of its 2 nearest gauges' (971.9 mm), "
        "as if it were in inches where the others are mm."
    )
