"""What a job may say about findings, and the record that is left."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.errors import JobError
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.screening.findings import Finding
from basinrain.screening.rejection import apply_rejections, rejected_findings, settle_findings

HOUR = np.timedelta64(3600, "s")
MIDNIGHT = np.datetime64("2031-05-04", "s")


def found(check: str, gauge: str, first: int | None = None, last: int | None = None, **fields: str) -> Finding:
    """Return a finding from the end of one hour to the end of another; over the whole record without them."""
    start, end = (np.datetime64("NaT", "s") if hour is None else MIDNIGHT + hour * HOUR for hour in (first, last))
    return Finding(check=check, gauge=gauge, start=start, end=end, evidence="Seen.", action="Look.", **fields)  # type: ignore[arg-type]


FINDINGS = (
    found("unit-mixup", "W03"),
    found("unit-mixup", "W04"),
    found("stuck-values", "W03", 6, 9),
    found("stuck-values", "W03", 12, 14),
    found("reading-hours", ""),
)


def states(**options: list[str]) -> str:
    """Return the first letter of every finding's state."""
    return "".join(finding.state[0] for finding in settle_findings(FINDINGS, **options))


@pytest.mark.parametrize(
    ("entry", "expected"),
    [
        ("unit-mixup", "aaooo"),
        ("unit-mixup W03", "aoooo"),
        ("stuck-values W03", "ooaao"),
        ("stuck-values W03 2031-05-04T06:00", "ooaoo"),
        ("  stuck-values   W03 2031-05-04T12:00 ", "oooao"),
        ("stuck-values W03 2031-05-04T06", "ooaoo"),
        ("stuck-values W03 2031-05-04", "ooaao"),
        ("stuck-values W03 2031-05", "ooaao"),
        ("stuck-values W03 2031", "ooaao"),
        ("reading-hours", "ooooa"),
    ],
)
def test_entries(entry: str, expected: str) -> None:
    """An entry names a finding by its key, or several by the leading words, the time by a leading part of it."""
    assert states(accept=[entry]) == expected


@pytest.mark.parametrize(
    ("entry", "expected"),
    [("stuck-values W03", "oorro"), ("stuck-values W03 2031-05-04T12:00", "oooro"), ("unit-mixup W04", "orooo")],
)
def test_rejections(entry: str, expected: str) -> None:
    """The same entries reject."""
    assert states(reject=[entry]) == expected


WITHIN = (
    found("zero-run", "A", 2, 6),
    found("zero-among-wet", "A", 2, 3),
    found("zero-among-wet", "A", 5, 6),
    found("spatial-outlier", "A", 5, 7),
    found("stuck-values", "A", 6, 9),
    found("zero-among-wet", "B", 3, 4),
    found("short-record", "A"),
    found("double-mass-break", "A", 2, 6),
)


def within(**options: list[str]) -> str:
    return "".join(finding.state[0] for finding in settle_findings(WITHIN, **options))


def test_what_lies_in_a_rejected_stretch_is_settled() -> None:
    """Zeros within the rejected run go with it; what reaches beyond it, other gauges and whole records do not."""
    assert within(reject=["zero-run"]) == "rrrooooo"


def test_rejected_stretches_that_adjoin() -> None:
    """What lies across the edge of two that are rejected lies wholly in both together."""
    assert within(reject=["zero-run", "stuck-values A"]) == "rrrrrooo"


def test_a_rejected_whole_record() -> None:
    """With the whole record all of the gauge's stretches are gone, also those that an entry accepts among others."""
    assert within(reject=["short-record A"]) == "rrrrroro"
    assert within(reject=["short-record A"], accept=["zero-among-wet"]) == "rrrrraro"
    assert within(reject=["zero-run"], accept=["zero-among-wet", "spatial-outlier"]) == "rrraoaoo"


@pytest.mark.parametrize(
    ("reject", "accept", "text"),
    [
        (
            "zero-run",
            "zero-among-wet A",
            (
                "accept 'zero-among-wet A': found 2 findings wholly within what other findings reject of the gauge; "
                "expected a finding whose values are kept; remove the entry, or reject less by naming gauge and time"
            ),
        ),
        (
            "short-record A",
            "stuck-values",
            "accept 'stuck-values': found 'stuck-values A 2031-05-04T06:00' wholly within what other findings reject",
        ),
    ],
)
def test_accepting_only_what_is_gone(reject: str, accept: str, text: str) -> None:
    """An entry that accepts nothing but findings whose values another rejects would mislead."""
    with pytest.raises(JobError, match=re.escape(text)) as caught:
        within(reject=[reject], accept=[accept])
    assert len(caught.value.problems) == 1


def test_gathered_stretches_between() -> None:
    """Two rejected days do not settle what lies between them."""
    assert within(reject=["zero-among-wet A"]) == "orrooooo"


def test_both_lists() -> None:
    """What is neither rejected nor accepted stays as it was."""
    assert states(reject=["stuck-values"], accept=["unit-mixup W03", "reading-hours"]) == "aorra"
    assert states() == "ooooo"
    assert settle_findings(()) == ()


@pytest.mark.parametrize(
    ("options", "text"),
    [
        (
            {"reject": ["stuck-value W03"]},
            "[screening] reject 'stuck-value W03': found no such finding; expected the key of a finding or its leading",
        ),
        (
            {"accept": ["unit-mixup W05"]},
            "accept 'unit-mixup W05': found no such finding; expected the key of a finding",
        ),
        ({"accept": ["unit-mixup W05"]}, "the nearest: unit-mixup W0"),
        # Words are whole: the leading part of one is none.
        ({"reject": ["unit"]}, "reject 'unit': found no such finding"),
        ({"reject": ["W03"]}, "there are: unit-mixup W03, unit-mixup W04, stuck-values W03 2031-05-04T06:00"),
        ({"reject": [" "]}, "reject ' ': found no such finding"),
        (
            {"reject": ["unit-mixup"], "accept": ["unit-mixup W04"]},
            "[screening] finding 'unit-mixup W04': found reject 'unit-mixup' and accept 'unit-mixup W04'; expected one",
        ),
        (
            {"reject": ["reading-hours"]},
            "[screening] reject 'reading-hours': found a finding about the network as a whole; expected one about v",
        ),
        # A leading part of the time ends where one of its parts does.
        ({"accept": ["stuck-values W03 2031-05-0"]}, "accept 'stuck-values W03 2031-05-0': found no such finding"),
        ({"accept": ["stuck-values W03 2031-05-05"]}, "the nearest: stuck-values W03 2031-05-04T"),
        ({"accept": ["unit-mixup W03 2031"]}, "accept 'unit-mixup W03 2031': found no such finding"),
    ],
)
def test_entries_that_do_not_fit(options: dict[str, list[str]], text: str) -> None:
    """An entry that names nothing, or what another entry names otherwise, is refused."""
    with pytest.raises(JobError, match=re.escape(text)):
        states(**options)


@pytest.mark.parametrize(
    ("check", "text"),
    [
        (
            "double-mass-break",
            'can be left out; correct the older part by an [[edit]] with action = "scale", or accept the finding',
        ),
        (
            "inhomogeneous",
            "can be left out; accept it, correct a part by an [[edit]], or leave the gauge out by [gauges] exclude",
        ),
    ],
)
def test_decades_are_not_rejected_by_a_word(check: str, text: str) -> None:
    """A finding on years can be accepted, not rejected; looking ahead at what is rejected leaves it out."""
    finding = found(check, "A", 2, 6)
    assert settle_findings([finding], accept=[check])[0].state == "accepted"
    assert rejected_findings([finding], [check]) == ()
    with pytest.raises(JobError, match=rf"reject '{check} A': found a .*{re.escape(text)}"):
        settle_findings([finding], reject=[f"{check} A"])


@pytest.mark.parametrize("option", ["reject", "accept"])
@pytest.mark.parametrize(
    ("entries", "told"),
    [
        (["unit-mixup W04", "unit-mixup"], [("unit-mixup W04", "unit-mixup")]),
        (["unit-mixup", "unit-mixup W04"], [("unit-mixup W04", "unit-mixup")]),
        # The same findings: the longer of the two, and the later of equal ones.
        (["stuck-values W03", "stuck-values"], [("stuck-values W03", "stuck-values")]),
        (["stuck-values", "stuck-values"], [("stuck-values", "stuck-values")]),
        (
            ["stuck-values W03 2031", "unit-mixup W03", "unit-mixup", "stuck-values"],
            [("stuck-values W03 2031", "stuck-values"), ("unit-mixup W03", "unit-mixup")],
        ),
    ],
)
def test_entries_that_overlap(option: str, entries: list[str], told: list[tuple[str, str]]) -> None:
    """An entry all of whose findings another of its list names is refused, and that other is named."""
    with pytest.raises(JobError, match="expected entries that do not overlap; remove one of the two") as caught:
        states(**{option: entries})
    assert [(problem.item, problem.found) for problem in caught.value.problems] == [
        (f"[screening] {option} '{entry}'", f"only findings that '{by}' in the same list names") for entry, by in told
    ]


def test_entries_side_by_side() -> None:
    """Entries that name different findings do not overlap, nor do those that name nothing."""
    assert states(accept=["unit-mixup W03", "unit-mixup W04", "stuck-values W03"]) == "aaaao"
    with pytest.raises(JobError, match="found no such finding") as caught:
        states(reject=["unit-mixup", "unit-mixup W05"])
    assert len(caught.value.problems) == 1


def test_nothing_found() -> None:
    """Where screening found nothing, an entry is told so."""
    with pytest.raises(JobError, match=r"accept 'stuck-values': found no such finding; .*; screening found nothing"):
        settle_findings((), accept=["stuck-values"])


def test_all_together() -> None:
    """All entries that do not fit are said at once."""
    with pytest.raises(JobError) as caught:
        states(reject=["one", "reading-hours", "unit-mixup"], accept=["two", "unit-mixup W03"])
    assert len(caught.value.problems) == 4


def drawn() -> RainRecord:
    """Return A and B over eight hours: A measured but for one hour, B a spread total of hours 3 to 6 among zeros."""
    ends = MIDNIGHT + np.arange(1, 9) * HOUR
    depths = np.array([[1, 2, 0, np.nan, 5, 6, 7, 8], [0, 0, 1, 2, 3, 4, 0, 0]], dtype=float).T
    record = RainRecord.from_depths(("A", "B"), ends - HOUR, ends, depths, step="1h")
    status = record.status.copy()
    status[2:6, 1] = Status.SPREAD
    return replace(record, status=status, totals=(KnownTotal("B", MIDNIGHT + 2 * HOUR, MIDNIGHT + 6 * HOUR, 10.0),))


def left(record: RainRecord, gauge: str) -> str:
    """Return the first two letters of every status."""
    return " ".join(Status(code).label[:2] for code in record.status[:, record.gauges.index(gauge)])


def rejected(*findings: Finding) -> RainRecord:
    record = drawn()
    result = apply_rejections(record, [replace(finding, state="rejected") for finding in findings])
    assert np.array_equal(record.depth, drawn().depth, equal_nan=True)
    return result


def test_a_stretch() -> None:
    """Steps after the start and up to the end lose their values; missing stays missing, the other gauge as it is."""
    result = rejected(found("stuck-values", "A", 2, 6))
    assert left(result, "A") == "ob ob re mi re re ob ob"
    assert np.isnan(result.depth[2:6, 0]).all()
    assert left(result, "B") == left(drawn(), "B")
    assert result.totals == drawn().totals


def test_a_whole_record() -> None:
    """A finding without times takes the gauge's whole record."""
    assert left(rejected(found("unit-mixup", "A")), "A") == "re re re mi re re re re"
    assert rejected(found("unit-mixup", "B")).totals == ()


@pytest.mark.parametrize(("first", "last"), [(5, 8), (0, 3), (3, 4)])
def test_a_total_goes_whole(first: int, last: int) -> None:
    """One rejected step of a spread total takes all of it, since what is left of it is not known."""
    result = rejected(found("spatial-outlier", "B", first, last))
    assert left(result, "B").split()[2:6] == ["re"] * 4
    assert result.totals == ()


def test_beside_a_total() -> None:
    """Steps that only adjoin a total leave it."""
    result = rejected(found("spatial-outlier", "B", 0, 2), found("spatial-outlier", "B", 6, 8))
    assert left(result, "B") == "re re sp sp sp sp re re"
    assert result.totals == drawn().totals


def test_accumulation_that_is_not_spread() -> None:
    """An accumulation without depths at its steps is rejected whole as well."""
    record = drawn()
    status, depth = record.status.copy(), record.depth.copy()
    status[2:6, 1], depth[2:6, 1] = Status.ACCUMULATED, np.nan
    record = replace(record, status=status, depth=depth)
    result = apply_rejections(record, [found("unmarked-accumulation", "B", 4, 5, state="rejected")])
    assert left(result, "B") == "ze ze re re re re ze ze"
    assert result.totals == ()


def test_storm_totals() -> None:
    """A whole record of storm totals without times can be rejected; a stretch of time meets none of them."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    storms = RainRecord.from_depths(("A",), nat, nat, [[10.0], [20.0]], step="storm")
    whole, part = (found("unit-mixup", "A", *hours, state="rejected") for hours in ((), (0, 8)))
    assert left(apply_rejections(storms, [whole]), "A") == "re re"
    assert left(apply_rejections(storms, [part]), "A") == "ob ob"


def test_open_and_accepted_findings_change_nothing() -> None:
    """Only what the job rejects is left out."""
    record = drawn()
    findings = [found("unit-mixup", "A"), found("unit-mixup", "B", state="accepted")]
    assert apply_rejections(record, findings) is record


@given(st.lists(st.tuples(st.sampled_from("AB"), st.integers(0, 8), st.integers(0, 8)), max_size=5))
def test_order_and_repetition(stretches: list[tuple[str, int, int]]) -> None:
    """Findings in another order, or twice, reject the same values, and never make a value."""
    findings = [found("x", gauge, min(a, b), max(a, b)) for gauge, a, b in stretches if a != b]
    once, again = rejected(*findings), rejected(*findings[::-1], *findings)
    assert np.array_equal(once.status, again.status)
    assert once.totals == again.totals
    kept = np.isfinite(once.depth)
    assert np.array_equal(once.depth[kept], drawn().depth[kept])
