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
NOT_APART = "a is not distinguishable from it"
ALL_WORSE = "every simpler method is distinguishably worse"
HEAD = "b has the least RMSE, 3.21 mm over "


@pytest.mark.parametrize(
    ("differences", "chosen", "n", "drawn", "expected"),
    [
        (
            [difference("a", 0.03, -0.02, 0.09), difference("b", 0, 0, 0)],
            "a",
            1204,
            "week",
            f"1,204 cases; {NOT_APART} (difference 0.03 mm, 95 % interval -0.02 to 0.09 mm, weeks drawn anew){SIMPLER}",
        ),
        (
            [difference("a", 0.5, 0.2, 0.9), difference("b", 0, 0, 0)],
            "b",
            99,
            "week",
            f"99 cases, and {ALL_WORSE} (95 % intervals, weeks drawn anew), so it is taken.",
        ),
        (
            [difference("b", 0, 0, 0), difference("c", 0.5, 0.2, 0.9)],
            "b",
            20,
            "time",
            "20 cases, and none is simpler, so it is taken.",
        ),
        (
            [difference("a", 0.5, NAN, NAN), difference("b", 0, NAN, NAN)],
            "b",
            4,
            "",
            "4 cases (few); with fewer than 5 cases nothing can be told apart, so it is taken for that alone.",
        ),
        (
            [difference("a", 0.0, -0.001, 0.001), difference("b", 0, 0, 0)],
            "a",
            100,
            "time",
            "100 cases; a is not distinguishable from it (difference 0.00 mm, 95 % interval 0.00 to 0.00 mm, days "
            "drawn anew and so too narrow)" + SIMPLER,
        ),
    ],
)
def test_why_a_method_is_taken(differences: list[Difference], chosen: str, n: int, drawn: str, expected: str) -> None:
    """One sentence with its numbers."""
    assert reason_of([score("a", 9.0), score("b")], differences, chosen, cases(), n, drawn) == HEAD + expected


def test_one_method_alone_is_no_comparison() -> None:
    """It is said first, and plainly."""
    assert reason_of([score("b")], [difference("b", 0, 0, 0)], "b", cases(), 1, "") == (
        "Nothing could be compared: b alone can estimate enough of the values, with an RMSE of 3.21 mm over 1 case "
        "(few), and is taken for want of another."
    )


def test_why_in_inches() -> None:
    """25.4 mm are an inch; errors have three decimals."""
    found = reason_of(
        [score("a", 9.0), score("b", 25.4)],
        [difference("a", 0.254, -0.508, 0.762), difference("b", 0, 0, 0)],
        "a",
        cases(),
        50,
        "week",
        depth_unit="in",
    )
    assert found == (
        "b has the least RMSE, 1.000 in over 50 cases; a is not distinguishable from it (difference 0.010 in, 95 % "
        "interval -0.020 to 0.030 in, weeks drawn anew)" + SIMPLER
    )


def notes(scale: str = "day", *, times: int = 40, n: int = 500, drawn: str = "week", left_out: int = 0,
          top: float = 0.9, learned: bool = False, normals: bool = False, from_record: bool = False,
          see_all: bool = False, unit: str = "mm") -> dict[str, Note]:  # fmt: skip
    found = notes_of(
        cases(times, scale),
        small_network(3),
        chosen=score("regression", top=top),
        n=n,
        drawn=drawn,
        left_out=left_out,
        learned=learned,
        normals=normals,
        from_record=from_record,
        normals_see_all=see_all,
        depth_unit=unit,
    )
    return {note.code: note for note in found}


def cases(n_times: int = 40, scale: str = "day") -> Cases:
    ends = np.datetime64("2031-05-01", "s") + np.arange(n_times) * np.timedelta64(86400, "s")
    one = np.ones(n_times, dtype=np.int64)
    week = np.arange(n_times) // 7 if scale == "day" else None
    if scale == "storm":
        ends = np.full(n_times, "NaT", dtype="datetime64[s]")
    return Cases("day" if scale == "day" else "step", 1.0, ends, one, one, week, lambda _: np.empty((0, 3)), 3)


def test_gauge_sites_are_not_the_basin() -> None:
    """It is always said, with how far gauges stand apart, and so are the rules of the cases."""
    found = notes()
    assert set(found) == {"gauge-sites-are-not-the-basin", "cases-compared", "intervals"}
    assert "km away in the median: they show which method suits this network, not how well the basin mean" in str(
        found["gauge-sites-are-not-the-basin"]
    )
    assert "mean of at least 1 mm over the gauges that know theirs" in str(found["cases-compared"])
    assert "Cases are steps with a mean above 0" in str(notes("step", drawn="time")["cases-compared"])
    assert "Cases are storm totals with a mean above 0" in str(notes("storm", drawn="time")["cases-compared"])


@pytest.mark.parametrize(
    ("case", "code", "expected"),
    [
        (("day", 40, 99, "week"), "intervals", "drawing whole weeks of cases anew 1,000 times"),
        (("step", 10, 99, "time"), "intervals", "drawing whole steps, all gauges of each together, anew 1,000 times"),
        (("storm", 9, 99, "time"), "intervals-too-narrow", "Cases lie on 9 storm totals only, which were drawn anew"),
        (("day", 40, 99, "time"), "intervals-too-narrow", "40 days of fewer than 10 weeks, so days were drawn anew"),
        (
            ("day", 1, 9, "case"),
            "intervals-too-narrow",
            "Cases lie on 1 day only, fewer than 5, so single cases, a gauge",
        ),
        (("day", 2, 4, ""), "no-intervals", "4 cases on 2 days: fewer than 5, so there is no interval"),
    ],
)
def test_what_the_intervals_come_from(case: tuple[str, int, int, str], code: str, expected: str) -> None:
    """It is always said what was drawn, and warned of where what goes together was drawn apart."""
    scale, times, n, drawn = case
    found = notes(scale, times=times, n=n, drawn=drawn)
    assert [name for name in found if "interval" in name] == [code]
    assert expected in str(found[code])
    assert (found[code].level == "info") == (code == "intervals")
    assert ("Errors of one storm go together" in str(found[code])) == (drawn in {"time", "case"} and scale == "day")


def test_notes_in_inches() -> None:
    """Bounds that are round in mm have these beside them."""
    found = notes(unit="in", top=0.5)
    assert "at least 0.039 in (1 mm) over" in str(found["cases-compared"])
    assert "0.0079 in (0.2 mm) a step" in str(found["cases-compared"])
    assert "its bias is -0.020 in a case" in str(found["chosen-flattens-storms"])


def test_what_is_said_where_it_applies() -> None:
    """Few cases, a flat winner, values left out, what was learned how."""
    found = notes(n=19, left_out=1234, top=0.66, learned=True, normals=True)
    assert "compared on 19 cases only" in str(found["few-cases"])
    assert "its 20 largest estimates are 66 % of the 20 largest depths observed" in str(found["chosen-flattens-storms"])
    assert "its bias is -0.50 mm" in str(found["chosen-flattens-storms"])
    assert str(found["cases-left-out"]).startswith("1,234 values that some method can estimate were left out")
    one = notes(n=19, left_out=1)["cases-left-out"]
    assert str(one) == "1 value that some method can estimate was left out, since not all methods can."
    assert "for each of 5 parts of the record from the others" in str(found["learned-without-the-case"])
    assert "taken as they are given" in str(found["normals-as-given"])
    assert {code for code, note in found.items() if note.level == "warning"} == {"few-cases", "chosen-flattens-storms"}


def test_normals_from_the_record() -> None:
    """It is warned of where they rest on all years, those of the cases included."""
    assert set(notes(normals=True, from_record=True)) == set(notes())
    assert notes(normals=True, from_record=True, see_all=True)["normals-see-the-case"].level == "warning"
