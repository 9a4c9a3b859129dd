"""Edits carried out, by hand on two gauges that can be drawn, the laws that they keep, and every way they can be wrong.

The hours of 4 May 2031 from 00:00, in mm; - is missing, "acc" an accumulation of 9 mm over the last two hours of B:

    ending  01   02   03   04   05   06   07   08
    A        1    2    0    4    -    -    7    8
    B        0    5    6    -    -    3  acc  acc
"""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.errors import JobError, Problem, Problems
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.screening.editing import _report_overlaps
from basinrain.screening.edits import Edit, apply_edits

HOUR = np.timedelta64(3600, "s")
MIDNIGHT = np.datetime64("2031-05-04", "s")
NAN = np.nan


def at(hour: int) -> np.datetime64:
    return MIDNIGHT + hour * HOUR


def drawn(**fields: Any) -> RainRecord:  # noqa: ANN401 - any field
    """Return the record of the module's head."""
    ends = MIDNIGHT + np.arange(1, 9) * HOUR
    depths = np.array([[1, 2, 0, 4, NAN, NAN, 7, 8], [0, 5, 6, NAN, NAN, 3, NAN, NAN]]).T
    record = RainRecord.from_depths(("A", "B"), ends - HOUR, ends, depths, step="1h")
    status = record.status.copy()
    status[6:, 1] = Status.ACCUMULATED
    return replace(record, status=status, totals=(KnownTotal("B", at(6), at(8), 9.0),), **fields)


def edit(gauge: str, first: int | None, last: int | None, action: str, value: float | str | None = None) -> Edit:
    """Return the edit of a gauge from the end of one hour to the end of another; None leaves a side open."""
    start, end = (np.datetime64("NaT", "s") if hour is None else at(hour) for hour in (first, last))
    log = {"reason": "seen", "by": "J. Marrow", "date": "2031-06-01"}
    return Edit(gauge=gauge, start=start, end=end, action=action, value=value, **log)  # type: ignore[arg-type]


def edited(*edits: Edit) -> RainRecord:
    """Return the drawn record after the edits; the drawn one stays as it is."""
    record = drawn()
    before = record.depth.copy(), record.status.copy()
    result = apply_edits([record], edits)[0][0]
    np.testing.assert_array_equal(record.depth, before[0])
    np.testing.assert_array_equal(record.status, before[1])
    return result


def column(record: RainRecord, gauge: str) -> list[float]:
    return [float(v) for v in record.depth[:, record.gauges.index(gauge)]]


def words(record: RainRecord, gauge: str) -> str:
    """Return the first two letters of every status."""
    return " ".join(Status(code).label[:2] for code in record.status[:, record.gauges.index(gauge)])


def same(found: list[float], expected: list[float]) -> bool:
    return bool(np.array_equal(found, expected, equal_nan=True))


def test_nothing_to_do() -> None:
    """Without edits the record is as it was."""
    assert same(column(edited(), "A"), column(drawn(), "A"))
    assert apply_edits([], []) == ([], [])


def test_reject() -> None:
    """Values lose their depth and are rejected; what is missing stays missing; the step at the start is not in it."""
    result = edited(edit("A", 1, 5, "reject"))
    assert same(column(result, "A"), [1, NAN, NAN, NAN, NAN, NAN, 7, 8])
    assert words(result, "A") == "ob re re re mi mi ob ob"
    assert same(column(result, "B"), column(drawn(), "B"))


def test_reject_an_accumulation() -> None:
    """A total inside goes, and its steps are rejected."""
    result = edited(edit("B", 5, 8, "reject"))
    assert words(result, "B") == "ze ob ob mi mi re re re"
    assert result.totals == ()


@pytest.mark.parametrize(("hour", "before"), [(2, "ob"), (3, "ze"), (5, "mi")])
def test_set(hour: int, before: str) -> None:
    """One step gets the depth and is adjusted, whatever stood there."""
    assert words(drawn(), "A").split()[hour - 1] == before
    result = edited(edit("A", hour - 1, hour, "set", 3.3))
    assert column(result, "A")[hour - 1] == 3.3
    assert words(result, "A").split()[hour - 1] == "ad"


def test_set_to_zero() -> None:
    """A zero that a person sets is adjusted, not observed."""
    result = edited(edit("A", 0, 1, "set", 0))
    assert (column(result, "A")[0], words(result, "A")[:2]) == (0.0, "ad")


def test_set_an_accumulation_of_one_step() -> None:
    """An accumulation that is one step long is replaced with its step."""
    record = drawn()
    record.status[4, 0] = Status.ACCUMULATED
    record = replace(record, totals=(*record.totals, KnownTotal("A", at(4), at(5), 6.0)))
    result = apply_edits([record], [edit("A", 4, 5, "set", 2.0)])[0][0]
    assert column(result, "A")[4] == 2.0
    assert [total.gauge for total in result.totals] == ["B"]


def test_scale() -> None:
    """Depths are multiplied and adjusted; zeros stay zeros, missing stays missing, the accumulation is scaled too."""
    result = edited(edit("B", None, None, "scale", 0.1))
    assert column(result, "B")[:3] == pytest.approx([0, 0.5, 0.6])
    assert words(result, "B") == "ze ad ad mi mi ad ac ac"
    assert result.totals[0].depth == pytest.approx(0.9)


def test_shift() -> None:
    """Hours 2 to 4 move two hours on: 2, 0, 4 stand at 4 to 6, and hours 2 and 3 are missing."""
    result = edited(edit("A", 1, 4, "shift", "2h"))
    assert same(column(result, "A"), [1, NAN, NAN, 2, 0, 4, 7, 8])
    assert words(result, "A") == "ob mi mi ad ze ad ob ob"


def test_shift_an_accumulation() -> None:
    """B's accumulation, its 3 mm and the two empty hours before them move an hour back."""
    result = edited(edit("B", 3, 8, "shift", "-1h"))
    assert same(column(result, "B"), [0, 5, 6, NAN, 3, NAN, NAN, NAN])
    assert words(result, "B") == "ze ob ob mi ad ac ac mi"
    assert result.totals == (KnownTotal("B", at(5), at(7), 9.0),)


@pytest.mark.parametrize(("value", "first", "last"), [("-3h", -2, 8), ("2h", 1, 10)])
def test_shift_beyond_the_record(value: str, first: int, last: int) -> None:
    """A whole record moves; the steps that it needs are added, where the other gauge is missing."""
    result = edited(edit("A", None, None, "shift", value))
    assert (result.ends[0], result.ends[-1]) == (at(first), at(last))
    assert len(result) == last - first + 1
    valued = np.isfinite(result.depth[:, 0])
    assert result.depth[valued, 0].tolist() == [1, 2, 0, 4, 7, 8]
    assert result.ends[valued][0] == at(1 + int(value[:-1]))
    inside = (result.ends >= at(1)) & (result.ends <= at(8))
    assert same(list(result.depth[inside, 1]), column(drawn(), "B"))
    assert (result.status[~inside, 1] == Status.MISSING).all()


def test_rejected_first() -> None:
    """7 at hour 7 is rejected, wherever the edit stands, so that 4 may move there; so are two that pass each other."""
    for order in (1, -1):
        edits = [edit("A", 3, 4, "shift", "3h"), edit("A", 6, 7, "reject")][::order]
        assert same(column(edited(*edits), "A"), [1, 2, 0, NAN, NAN, NAN, 4, 8])
        edits = [edit("A", 1, 2, "shift", "2h"), edit("A", 3, 4, "shift", "-2h")][::order]
        assert same(column(edited(*edits), "A")[:4], [1, 4, 0, 2])


def test_edits_that_adjoin() -> None:
    """The end of one may be the start of the next; edits of different gauges may overlap."""
    result = edited(edit("A", 0, 2, "scale", 2.0), edit("A", 2, 4, "scale", 3.0), edit("B", 1, 3, "scale", 10.0))
    assert column(result, "A")[:4] == [2, 4, 0, 12]
    assert column(result, "B")[:3] == [0, 50, 60]


def test_two_sources() -> None:
    """An edit meets a gauge in every source that has it; the other sources stay as they are."""
    daily = RainRecord.from_depths(("A",), [at(8), at(32)], [at(32), at(56)], [[20.0], [30.0]], step="1d")  # type: ignore[arg-type]
    other = RainRecord.from_depths(("C",), [at(0)], [at(24)], [[5.0]], step="1d")  # type: ignore[arg-type]
    (first, second, third), _ = apply_edits([drawn(), daily, other], [edit("A", 6, 32, "scale", 10.0)])
    assert same(column(first, "A"), [1, 2, 0, 4, NAN, NAN, 70, 80])
    assert column(second, "A") == [200, 30]
    assert column(third, "C") == [5]


def test_clock_of_the_first_source() -> None:
    """Times are in the first source's clock: 03:00 there is 02:00 an hour west of it."""
    east, west = drawn(zone="+02:00"), drawn(zone="+01:00")
    east, west = replace(east, gauges=("C", "D"), totals=(), recorders=None), replace(west)  # type: ignore[arg-type]
    result = apply_edits([east, west], [edit("A", 2, 3, "set", 9.0)])[0][1]
    assert same(column(result, "A"), [1, 9, 0, 4, NAN, NAN, 7, 8])


def test_storm_totals_without_times() -> None:
    """An edit without times meets them; one with times does not."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    storms = RainRecord.from_depths(("A",), nat, nat, [[10.0], [20.0]], step="storm")
    assert column(apply_edits([storms], [edit("A", None, None, "scale", 2.0)])[0][0], "A") == [20, 40]
    of_all = r"scale and reject act on all storms of the gauge; correct a single total in the file"
    for wrong, text in (
        (
            edit("A", 0, 8, "scale", 2.0),
            rf"found times, {at(0)} to {at(8)}, for a gauge of storm totals, which have none",
        ),
        (edit("A", None, 8, "reject"), r"found times, the beginning to .*; expected no from and to; " + of_all),
        (
            edit("A", None, None, "set", 5.0),
            rf"found 2 storm totals of .* in the whole record; expected one .*; {of_all}",
        ),
        (
            edit("A", None, None, "shift", "1h"),
            r"a shift by 1h of a record with steps of storm; expected a whole number .*; remove the edit: storm totals",
        ),
    ):
        with pytest.raises(JobError, match=text):
            apply_edits([storms], [wrong])
    # Where another source has the gauge by hours, times are meant for that.
    (hours, left), _ = apply_edits([drawn(), storms], [edit("A", 0, 1, "scale", 2.0)])
    assert (column(hours, "A")[0], column(left, "A")) == (2, [10, 20])
    one = storms.window(0, 1)
    assert column(apply_edits([one], [edit("A", None, None, "set", 5.0)])[0][0], "A") == [5]


hourly = st.lists(st.one_of(st.none(), st.integers(0, 300)), min_size=12, max_size=12).filter(
    lambda values: any(value is not None for value in values[3:9])
)


def of(values: list[int | None]) -> RainRecord:
    depths = np.array([NAN if v is None else v / 10 for v in values])[:, None]
    ends = MIDNIGHT + np.arange(1, len(values) + 1) * HOUR
    return RainRecord.from_depths(("A",), ends - HOUR, ends, depths, step="1h")


@given(values=hourly, by=st.integers(-30, 30).filter(bool))
def test_a_shift_and_its_reverse(values: list[int | None], by: int) -> None:
    """Depths of a whole record come back with the reverse shift, on their own steps; their sum is kept throughout."""
    record = of(values)
    there = apply_edits([record], [edit("A", None, None, "shift", f"{by}h")])[0][0]
    assert np.nansum(there.depth) == pytest.approx(np.nansum(record.depth), rel=1e-12)
    back = apply_edits([there], [edit("A", None, None, "shift", f"{-by}h")])[0][0]
    on = np.isin(back.ends, record.ends)
    assert np.array_equal(back.depth[on], record.depth, equal_nan=True)
    assert np.isnan(back.depth[~on]).all()


@given(values=hourly, factor=st.floats(0.01, 100))
def test_a_scale_and_its_reverse(values: list[int | None], factor: float) -> None:
    """By a factor and by its inverse is nothing, and which steps have values never changes."""
    record = of(values)
    once = apply_edits([record], [edit("A", 3, 9, "scale", factor)])[0][0]
    twice = apply_edits([once], [edit("A", 3, 9, "scale", 1 / factor)])[0][0]
    assert twice.depth == pytest.approx(record.depth, rel=1e-12, nan_ok=True)
    assert np.array_equal(once.measured, record.measured)
    outside = np.r_[0:3, 9:12]
    assert np.array_equal(once.depth[outside], record.depth[outside], equal_nan=True)


@given(values=hourly, order=st.permutations(range(4)))
def test_order_does_not_matter(values: list[int | None], order: list[int]) -> None:
    """The same edits in any order make the same record."""
    edits = [
        edit("A", 0, 1, "set", 5.0),
        edit("A", 3, 9, "scale", 2.0),
        edit("A", 9, 12, "reject"),
        edit("A", 1, 3, "shift", "20h"),
    ]
    record = of([7, 8, 9, *values[3:11], 6])
    expected = apply_edits([record], edits)[0][0]
    found = apply_edits([record], [edits[k] for k in order])[0][0]
    assert np.array_equal(found.depth, expected.depth, equal_nan=True)
    assert np.array_equal(found.status, expected.status)


WRONG: list[tuple[list[Edit], str]] = [
    (
        [edit("Q", 0, 4, "reject")],
        "1 (gauge Q): found a gauge that no source of rainfall has; expected a gauge of the rainfall files; one of: A",
    ),
    (
        [edit("A", 20, 22, "reject")],
        (
            "1 (gauge A): found no step of the gauge that lies wholly in <20> to <22>; "
            "expected steps of 1h from <00> to <08>; correct from and to"
        ),
    ),
    (
        [replace(edit("A", 0, 8, "reject"), start=at(1) + 60, end=at(4))],
        (
            "1 (gauge A): found the step <01> to <02>, which has a value and lies across the edge of "
            "2031-05-04T01:01:00 to <04>; expected steps wholly inside or outside; move that edge to <01> or <02>"
        ),
    ),
    (
        [replace(edit("A", 0, 8, "reject"), start=at(1), end=at(2) + 60)],
        "found the step <02> to <03>, which has a value and lies across the edge of <01> to 2031-05-04T02:01:00",
    ),
    (
        [replace(edit("A", 0, 8, "set", 2.0), start=at(1) + 60, end=at(2) - 60)],
        "found the step <01> to <02>, which has a value and lies across the edge of 2031-05-04T01:01:00 to",
    ),
    (
        [replace(edit("A", 0, 8, "reject"), start=at(4) + 60, end=at(5) + 60)],
        "found no step of the gauge that lies wholly in 2031-05-04T04:01:00 to 2031-05-04T05:01:00",
    ),
    (
        [edit("A", 4, 6, "scale", 2.0)],
        "found no value of the gauge in <04> to <06>; expected values to scale; correct from and to, or remove",
    ),
    (
        [edit("A", 0, 4, "reject"), edit("A", 3, 8, "scale", 2.0)],
        (
            "2 (gauge A): found <03> to <08>, which overlaps [[edit]] 1 (gauge A), <00> to <04>; "
            "expected one edit for a gauge and time; change their times, or join them"
        ),
    ),
    (
        [edit("A", None, None, "scale", 2.0), edit("A", None, 2, "reject")],
        "found the beginning to <02>, which overlaps [[edit]] 1 (gauge A), the whole record",
    ),
    (
        [edit("A", 0, 3, "set", 5.0)],
        (
            "1 (gauge A): found 3 steps of the gauge in <00> to <03>; expected one step to set; "
            "narrow it to one, such as <00> to <01>, and give every step its own edit"
        ),
    ),
    (
        [edit("A", 0, 4, "shift", "30min")],
        (
            "1 (gauge A): found a shift by 30min of a record with steps of 1h; expected a whole number of its steps, "
            "all of one length; shift by a multiple of 1h, or correct the times in the file"
        ),
    ),
    (
        [edit("A", 0, 4, "shift", "3h")],
        (
            "1 (gauge A): found values that would move to 1 step with values of their own, the first ending at <07>; "
            "expected none there; reject those first with an edit, or widen from and to so that they move too"
        ),
    ),
    (
        [edit("B", 1, 3, "shift", "5h")],
        "found values that would move to 2 steps with values of their own, the first ending at <07>",
    ),
    (
        [edit("A", 0, 1, "shift", "4h"), edit("A", 1, 2, "shift", "3h")],
        "2 (gauge A): found values that would move to 1 step with values of their own, the first ending at <05>",
    ),
    (
        [edit("B", 0, 7, "scale", 2.0)],
        (
            "1 (gauge B): found a total of 9 mm over <06> to <08> that lies across the edge of <00> to <07>; "
            "expected a total wholly inside or outside; widen the times to hold it, or narrow them"
        ),
    ),
    (
        [edit("B", 7, 8, "set", 2.0)],
        "found a total of 9 mm over <06> to <08> that lies across the edge of <07> to <08>",
    ),
]
"""Edits, and what is said of them; <06> is 06:00 of the day."""


@pytest.mark.parametrize(("edits", "text"), WRONG)
def test_wrong(edits: list[Edit], text: str) -> None:
    """Each of these is refused in words that say where, what and what to do."""
    with pytest.raises(JobError, match=re.escape(re.sub("<(..)>", r"2031-05-04T\1:00:00", text))):
        edited(*edits)


def test_all_together() -> None:
    """What is wrong with several edits is said at once, each by its number, and nothing is changed."""
    wrong = [edits[0] for edits, _ in WRONG if len(edits) == 1 and edits[0].gauge == "B"]
    with pytest.raises(JobError) as caught:
        edited(edit("Q", 0, 1, "reject"), wrong[0], edit("A", 4, 6, "reject"), edit("A", 0, 3, "set", 1.0))
    assert sorted(problem.item[:10] for problem in caught.value.problems) == [f"[[edit]] {k}" for k in (1, 2, 3, 4)]


def test_months_have_no_length() -> None:
    """A record of months, whose lengths differ, cannot be shifted by a duration."""
    bounds: npt.NDArray[np.datetime64] = np.arange("2031-01", "2031-04", dtype="datetime64[M]").astype("datetime64[s]")
    record = RainRecord.from_depths(("A",), bounds[:-1], bounds[1:], [[30.0], [40.0]], step="1mo")
    text = r"a shift by 31d of a record with steps of 1mo; expected a whole .*; correct the times in the file, whose "
    with pytest.raises(JobError, match=text):
        apply_edits([record], [edit("A", None, None, "shift", "31d")])


def test_a_cut_step_without_a_value_does_not_matter() -> None:
    """Hours 5 and 6 of A are missing: an edge may lie in either."""
    early = replace(edit("A", 0, 8, "scale", 2.0), end=at(4) + 1800)
    late = replace(edit("A", 0, 8, "reject"), start=at(5) + 1800)
    assert same(column(edited(early, late), "A"), [2, 4, 0, 8, NAN, NAN, NAN, NAN])


def test_edges_beyond_the_record() -> None:
    """Edges before the first step and after the last cut none."""
    assert same(column(edited(edit("A", -2, 30, "reject")), "A"), [NAN] * 8)


@given(
    stretches=st.lists(
        st.tuples(st.sampled_from("AB"), st.integers(0, 9), st.integers(1, 5), st.booleans(), st.booleans()), max_size=7
    )
)
def test_overlaps_against_all_pairs(stretches: list[tuple[str, int, int, bool, bool]]) -> None:
    """Of the edits that overlap any other of their gauge all are named, and only those."""
    edits = [
        edit(gauge, None if open_start else first, None if open_end else first + length, "reject")
        for gauge, first, length, open_start, open_end in stretches
    ]
    numbered = [replace(one, number=k) for k, one in enumerate(edits, 1)]
    pairs = [
        (one.number, two.number)
        for two in numbered
        for one in numbered[: two.number - 1]
        if one.gauge == two.gauge and not (one.start >= two.end or two.start >= one.end)
    ]
    problems = Problems()
    _report_overlaps(numbered, problems)
    told = [
        tuple(sorted(int(number) for number in re.findall(r"\[\[edit\]\] (\d+)", str(problem))))
        for problem in problems_of(problems)
    ]
    assert set(told) <= set(pairs)
    assert {number for pair in told for number in pair} == {number for pair in pairs for number in pair}


def problems_of(problems: Problems) -> tuple[Problem, ...]:
    """Return what was collected."""
    try:
        problems.raise_as(JobError)
    except JobError as error:
        return error.problems
    return ()
