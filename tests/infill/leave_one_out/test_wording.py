"""The sentences of a comparison."""

from __future__ import annotations

import numpy as np
import pytest
from leave_one_out_data import small_network

from basinrain.infill.leave_one_out import Difference, Score
from basinrain.infill.leave_one_out.cases import Cases
from basinrain.infill.leave_one_out.wording import notes_of, reason_of
from basinrain.notes import Note

NAN = float("nan")


def score(candidate: str, rmse: float = 3.21, top: float = 0.9) -> Score:
    return Score(
        candidate=candidate,
        gauge="",
        scale="day",
        n=9,
        rmse=rmse,
        mae=1.0,
        bias=-0.5,
        correlation=0.9,
        hits=9,
        misses=0,
        false_alarms=0,
        dry_hits=0,
        top20_ratio=top,
    )


def difference(candidate: str, value: float, low: float, high: float) -> Difference:
    return Difference(candidate=candidate, best="b", difference=value, low=low, high=high, distinguishable=low > 0)


SIMPLER = " and is simpler, so it is taken."
HEAD = "b has the least RMSE, 3.21 mm over "


@pytest.mark.parametrize(
    ("differences", "chosen", "n", "expected"),
    [
        (
            [difference("a", 0.03, -0.02, 0.09), difference("b", 0, 0, 0)],
            "a",
            1204,
            "1,204 cases; a is not distinguishable from it (difference 0.03 mm, 95 % interval -0.02 to 0.09 mm)"
            + SIMPLER,
        ),
        (
            [difference("a", 0.5, 0.2, 0.9), difference("b", 0, 0, 0)],
            "b",
            1204,
            "1,204 cases, and every simpler method is distinguishably worse, so it is taken.",
        ),
        (
            [difference("b", 0, 0, 0), difference("c", 0.5, 0.2, 0.9)],
            "b",
            20,
            "20 cases, and none is simpler, so it is taken.",
        ),
        (
            [difference("b", 0, 0, 0)],
            "b",
            1,
            "1 case (few), and is the only method that could be compared, so it is taken.",
        ),
        (
            [difference("a", 0.5, NAN, NAN), difference("b", 0, NAN, NAN)],
            "a",
            8,
            "8 cases (few); a is not distinguishable from it (difference 0.50 mm, too few weeks for an interval)"
            + SIMPLER,
        ),
        (
            [difference("a", 0.0, -0.001, 0.001), difference("b", 0, 0, 0)],
            "a",
            100,
            "100 cases; a is not distinguishable from it (difference 0.00 mm, 95 % interval 0.00 to 0.00 mm)" + SIMPLER,
        ),
    ],
)
def test_why_a_method_is_taken(differences: list[Difference], chosen: str, n: int, expected: str) -> None:
    """One sentence with its numbers."""
    assert reason_of([score("a", 9.0), score("b")], differences, chosen, n) == HEAD + expected


def notes(scale: str = "day", *, n: int = 500, left_out: int = 0, top: float = 0.9, learned: bool = False,
          normals: bool = False, from_record: bool = False, see_all: bool = False) -> dict[str, Note]:  # fmt: skip
    empty = no_cases(scale)
    found = notes_of(
        empty,
        small_network(3),
        chosen=score("regression", top=top),
        n=n,
        left_out=left_out,
        learned=learned,
        normals=normals,
        from_record=from_record,
        normals_see_all=see_all,
    )
    return {note.code: note for note in found}


def no_cases(scale: str) -> Cases:
    none = np.empty(0, dtype=np.int64)
    return Cases(scale, 1.0, np.empty(0, "datetime64[s]"), none, none, none, lambda _: np.empty((0, 3)), 3)


def test_gauge_sites_are_not_the_basin() -> None:
    """It is always said, with how far gauges stand apart, and so are the rules of the cases."""
    found = notes()
    assert set(found) == {"gauge-sites-are-not-the-basin", "cases-compared"}
    assert "km away in the median: they show which method suits this network, not how well the basin mean" in str(
        found["gauge-sites-are-not-the-basin"]
    )
    assert "mean of at least 1 mm over the gauges that know theirs" in str(found["cases-compared"])
    assert "Cases are steps with a mean above 0" in str(notes("step")["cases-compared"])


def test_what_is_said_where_it_applies() -> None:
    """Few cases, a flat winner, values left out, what was learned how."""
    found = notes(n=19, left_out=1234, top=0.66, learned=True, normals=True)
    assert "compared on 19 cases only" in str(found["few-cases"])
    assert "its 20 largest estimates are 66 % of the 20 largest depths observed" in str(found["chosen-flattens-storms"])
    assert "its bias is -0.50 mm" in str(found["chosen-flattens-storms"])
    assert str(found["cases-left-out"]).startswith("1,234 values")
    assert "for each of 5 parts of the record from the others" in str(found["learned-without-the-case"])
    assert "taken as they are given" in str(found["normals-as-given"])
    assert {code for code, note in found.items() if note.level == "warning"} == {"few-cases", "chosen-flattens-storms"}


def test_normals_from_the_record() -> None:
    """It is warned of where they rest on all years, those of the cases included."""
    assert set(notes(normals=True, from_record=True)) == set(notes())
    assert notes(normals=True, from_record=True, see_all=True)["normals-see-the-case"].level == "warning"
