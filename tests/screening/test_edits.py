"""The edit log: what an edit may say, and the rows of its table."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from basinrain.errors import JobError
from basinrain.rainfall import RainRecord
from basinrain.screening.edits import SUGGESTED, Edit, apply_edits


def edit(**changes: Any) -> Edit:  # noqa: ANN401 - any field
    """Return a right edit, scaled by 2, with fields changed."""
    fields: dict[str, Any] = {"gauge": "W03", "action": "scale", "value": 2.0, "reason": "unit", "by": "J. Marrow"}
    fields["date"] = "2031-06-01"
    return Edit(**(fields | changes))


def test_times_become_seconds() -> None:
    """Times of any unit are kept to the second; sides that are not given are open."""
    made = edit(start=np.datetime64("2031-05-04T06"))
    assert (str(made.start), np.isnat(made.end)) == ("2031-05-04T06:00:00", True)


@pytest.mark.parametrize(
    ("value", "seconds"),
    [("1h", 3600), ("+1h", 3600), ("-1d", -86400), ("15min", 900), (" 2 h ", 7200), ("-90min", -5400)],
)
def test_durations(value: str, seconds: int) -> None:
    """A shift is a number with min, h or d, later above 0."""
    assert edit(action="shift", value=value).seconds == seconds
    assert edit().seconds == 0


@pytest.mark.parametrize(
    ("action", "value", "text"),
    [
        ("reject", 3.0, r"value: found 3.0; expected no value, since rejected values are not replaced"),
        ("set", None, r"value: found none; expected a depth of 0 or more"),
        ("set", -0.1, r"value: found -0.1; expected a depth of 0 or more"),
        ("set", float("nan"), r"value: found nan; expected a depth of 0 or more"),
        ("set", "3 mm", r"value: found '3 mm'; expected a depth of 0 or more"),
        ("scale", 0.0, r"value: found 0.0; expected a factor above 0"),
        ("scale", float("inf"), r"value: found inf; expected a factor above 0"),
        ("scale", True, r"value: found True; expected a factor above 0"),
        ("scale", None, r"value: found none; expected a factor above 0"),
        ("shift", 1.0, r"value: found 1.0; expected a duration such as \"1h\" \(later\) or \"-1d\" \(earlier\)"),
        ("shift", "0h", r"value: found '0h'; expected a duration"),
        ("shift", "1mo", r"value: found '1mo'; expected a duration"),
        ("shift", None, r"value: found none; expected a duration"),
        ("rejct", None, r"action: found 'rejct'; expected one of: [a-z, -]+; did you mean 'reject'\?$"),
    ],
)
def test_values_that_do_not_fit(action: str, value: object, text: str) -> None:
    """Each action says what value it takes."""
    with pytest.raises(JobError, match=rf"^\[\[edit\]\] 2 \(gauge W03\): {text}"):
        edit(action=action, value=value, number=2)


def test_zero_may_be_set() -> None:
    """A depth of 0 is a depth."""
    assert edit(action="set", value=0).value == 0


@pytest.mark.parametrize(
    ("changes", "text"),
    [
        ({"gauge": " "}, r"edit \(gauge  ?\): gauge: found an empty id; expected a gauge's id"),
        ({"reason": " "}, r"edit \(gauge W03\): reason: found nothing; expected why the values are changed"),
        ({"by": ""}, r"edit \(gauge W03\): by: found nothing; expected who decided on it"),
        ({"date": "4 May"}, r"date: found '4 May'; expected a date such as 2031-05-04"),
        ({"date": ""}, r"date: found nothing; expected a date such as 2031-05-04"),
        (
            {"start": np.datetime64("2031-05-04"), "end": np.datetime64("2031-05-04")},
            r"from, to: found 2031-05-04T00:00:00 to 2031-05-04T00:00:00; expected a start before the end",
        ),
    ],
)
def test_fields_that_do_not_fit(changes: dict[str, Any], text: str) -> None:
    """Gauge, reason, author and date are required; times and date must make sense."""
    with pytest.raises(JobError, match=text):
        edit(**changes)


def test_all_together() -> None:
    """Everything that is wrong with one edit is said at once."""
    with pytest.raises(JobError) as caught:
        edit(reason="", by="", value=-1.0, date="x")
    assert [problem.item.rsplit(": ", 1)[1] for problem in caught.value.problems] == ["value", "reason", "by", "date"]


def test_rows() -> None:
    """One row an edit, as the job has it, with what it did; what is open or not known is empty."""
    ends = np.datetime64("2031-05-04", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    depths = np.array([[2.0, 1.0], [0.0, np.nan], [4.0, 3.0], [np.nan, 5.0]])
    record = RainRecord.from_depths(("A", "B"), ends - 3600, ends, depths, step="1h")
    edits = [
        Edit(gauge="A", end=ends[2], action="scale", value=0.5, reason="unit", by="J. M.", date="2031-06-01"),
        Edit(
            gauge="B",
            start=ends[0],
            end=ends[1],
            action="set",
            value=2.5,
            reason="chart",
            by="J. M.",
            date="2031-06-02",
        ),
        Edit(gauge="B", start=ends[1], action="reject", reason="stuck", by="A. K.", date="2031-06-02"),
    ]
    rows = apply_edits([record], edits)[1]
    assert rows[0] == {
        "gauge": "A",
        "from": "",
        "to": "2031-05-04T03:00:00",
        "action": "scale",
        "value": 0.5,
        "reason": "unit",
        "by": "J. M.",
        "date": "2031-06-01",
        "steps_changed": 3,
        "depth_before": 6.0,
        "depth_after": 3.0,
    }
    done = [(row["steps_changed"], row["depth_before"], row["depth_after"]) for row in rows[1:]]
    assert done == [(1, None, 2.5), (2, 8.0, None)]
    assert [list(row) for row in rows] == [list(rows[0])] * 3


def test_rows_of_a_shift() -> None:
    """A shift keeps the depths that it moves."""
    ends = np.datetime64("2031-05-04", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    record = RainRecord.from_depths(("A",), ends - 3600, ends, [[2.0], [0.0], [np.nan], [4.0]], step="1h")
    (row,) = apply_edits([record], [edit(gauge="A", action="shift", value="-2h")])[1]
    assert (row["steps_changed"], row["depth_before"], row["depth_after"]) == (3, 6.0, 6.0)


def test_suggested_edits_are_signed_as_such() -> None:
    """An edit that a finding suggests names no person, and no date, since nobody has decided."""
    suggested = edit(by=SUGGESTED, date="")
    assert (suggested.by, suggested.date) == ("suggested by screening", "")
