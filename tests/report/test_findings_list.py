from __future__ import annotations

import re
import tomllib
from dataclasses import replace

import numpy as np
import pytest
from report.screen_pieces import make_findings

from basinrain.report import findings_list
from basinrain.report.findings_list import (
    FoundSection,
    check_counts,
    count_table,
    finding_sections,
    settled_table,
)
from basinrain.screening import Finding


def _sections(*findings: Finding) -> list[FoundSection]:
    return finding_sections(findings or make_findings(), depth_unit="mm")


def _plain(cell: str) -> str:
    return re.sub(r"<[^>]+>", "", cell)


def test_counts_by_severity_and_state() -> None:
    """One erroneous open; doubtful one of each state; one remark."""
    rows = [row[1:] for row in count_table(make_findings()).rows]
    assert rows == [("1", "0", "0", "1"), ("1", "1", "1", "3"), ("1", "0", "0", "1")]


def test_counts_by_check_the_heaviest_first() -> None:
    """Severity, check, open, accepted, rejected, gauges; of many gauges a dozen are named."""
    rows = check_counts(make_findings()).rows
    assert rows[0] == ("erroneous", "missing-code", "1", "0", "0", "A")
    assert rows[2] == ("doubtful", "stuck-values", "0", "0", "1", "B")
    assert rows[4] == ("remark", "reading-hours", "1", "0", "0", "the network")
    many = [replace(make_findings()[0], gauge=f"G{k:02d}") for k in range(14)]
    assert check_counts(many).rows[0][-1].endswith("G11 and 2 more")


def test_sections_by_severity_the_heaviest_first() -> None:
    """Only severities with an open finding; of the doubtful two of three are settled."""
    assert [section.title for section in _sections()] == [
        "Erroneous: 1 open finding, cannot be right",
        "Doubtful: 1 open finding, may be wrong",
        "Remarks: 1 open finding, worth knowing",
    ]
    assert _sections(make_findings()[2]) == []


def test_a_table_a_check_says_once_what_all_its_lines_share() -> None:
    """Heading with the count, the check's sentence and the suggestion; then gauge, stretch, evidence and key."""
    base = replace(make_findings()[2], state="open")
    other = replace(base, gauge="A", start=base.start + 86400, end=base.end + 86400)
    (section,) = _sections(base, other, replace(base, gauge="C", state="accepted"))
    (table,) = section.tables
    assert table.caption == "stuck-values: 2 findings, 1 more settled"
    assert table.lead.startswith("One depth above zero that stands at more steps on end")
    assert table.lead.endswith("Suggested: reject the stretch.")
    assert [_plain(cell) for cell in table.rows[0]] == [
        "A",
        "2004-05-06 00:00",
        "2004-05-07 00:00",
        "0.4 mm stands at 14 steps on end.",
        "stuck-values A 2004-05-06T00:00",
    ]
    assert [row[0] for row in table.rows] == ["A", "B"]


def test_suggestions_that_differ_stand_in_the_lines() -> None:
    """Two findings of a check, each with its own suggestion."""
    base = make_findings()[0]
    (table,) = _sections(base, replace(base, gauge="B", action="Declare it."))[0].tables
    assert "Suggested" not in table.lead
    assert [row[4] for row in table.rows] == ["Reject it.", "Declare it."]


def test_others_are_named_only_where_the_evidence_names_none() -> None:
    """A and C stand in the sentence; of whole words only: gauge A1 is not named by A12."""
    finding = make_findings()[1]
    assert _sections(finding)[0].tables[0].rows[0][3] == "An hour behind A and C."
    bare = replace(finding, evidence="An hour behind A12.", others=("A1", "C"))
    assert _sections(bare)[0].tables[0].rows[0][3] == "An hour behind A12. Others concerned: A1, C."


def test_times_in_sentences_are_as_in_the_tables() -> None:
    """No letter T between date and time, and no seconds that are zero; others stay."""
    finding = replace(make_findings()[0], evidence="From 2031-05-04T06:00:00 to 2031-05-04T07:30:20, 2031-05-04T08:00.")
    cell = _sections(finding)[0].tables[0].rows[0][3]
    assert cell == "From 2031-05-04 06:00 to 2031-05-04 07:30:20, 2031-05-04 08:00."


def test_equal_remarks_share_a_line_and_an_entry() -> None:
    """Three gauges with the same years: one line, and the check's name accepts them all."""
    remarks = [
        Finding(check="short-record", gauge=gauge, severity="remark", evidence="It has 12 years.", action="Say so.")
        for gauge in "BAC"
    ]
    (section,) = _sections(*remarks)
    assert section.tables[0].rows[0][:4] == ("A, B, C", "whole record", "", "It has 12 years.")
    assert tomllib.loads(section.entries) == {"screening": {"accept": ["short-record"]}}
    (section,) = _sections(*remarks[:2], replace(remarks[2], state="accepted"))
    assert tomllib.loads(section.entries) == {"screening": {"accept": ["short-record A", "short-record B"]}}


def test_edits_stand_below_the_entries() -> None:
    """A shift is an edit; the erroneous code, whose suggestion has no edit, is to be looked at."""
    erroneous, doubtful, _ = _sections()
    assert tomllib.loads(erroneous.entries) == {"screening": {"reject": []}}
    assert '# "missing-code A 2004-05-01T00:00",' in erroneous.entries
    assert erroneous.edits == ()
    assert doubtful.entries == ""
    assert [tomllib.loads(edit)["edit"][0]["action"] for edit in doubtful.edits] == ["shift"]


def test_long_lists_say_where_the_rest_is(monkeypatch: pytest.MonkeyPatch) -> None:
    """Of five, two are printed, in the table and among the entries."""
    monkeypatch.setattr(findings_list, "MOST_FINDINGS", 2)
    (section,) = _sections(*(replace(make_findings()[0], gauge=f"G{k}") for k in range(5)))
    assert [row[0] for row in section.tables[0].rows] == ["G0", "G1"]
    assert section.tables[0].notes == ("Shown: 2 of 5. All are in findings.csv.",)
    assert section.entries.count("missing-code") == 2
    assert section.rest == "The keys of 3 more are in findings.csv."


def test_what_is_settled_is_told_in_short() -> None:
    """Rejected before accepted; several of a gauge in one line, from the first to the last."""
    stuck, accepted = make_findings()[2:4]
    later = replace(stuck, start=stuck.start + 864000, end=stuck.end + 864000, evidence="Again.")
    table = settled_table([accepted, later, stuck, make_findings()[0]])
    assert table is not None
    assert table.caption == "Settled by the job: 3 findings"
    assert table.rows[0] == (
        "rejected",
        "stuck-values",
        "B",
        "2",
        "2004-05-05 00:00",
        "2004-05-16 00:00",
        "0.4 mm stands at 14 steps on end.",
    )
    assert table.rows[1][:4] == ("accepted", "spatial-outlier", "C", "1")
    assert settled_table(make_findings()[:2]) is None


def test_settled_whole_records_that_say_the_same_share_a_line(monkeypatch: pytest.MonkeyPatch) -> None:
    """Two gauges of 12 years and one of 14; of more lines than are printed the number is told."""
    remarks = [
        Finding(
            check="short-record", gauge=gauge, severity="remark", evidence=years, action="Say so.", state="accepted"
        )
        for gauge, years in (("A", "12 years."), ("B", "14 years."), ("C", "12 years."))
    ]
    table = settled_table(remarks)
    assert table is not None
    assert [row[2:] for row in table.rows] == [
        ("A, C", "2", "whole record", "", "12 years."),
        ("B", "1", "whole record", "", "14 years."),
    ]
    monkeypatch.setattr(findings_list, "MOST_FINDINGS", 1)
    short = settled_table(remarks)
    assert short is not None
    assert "Shown: 1 of 2 lines." in short.notes


def test_a_finding_about_the_network_is_called_so() -> None:
    """It has no gauge."""
    network = make_findings()[4]
    assert np.isnat(network.start)
    assert _sections(network)[0].tables[0].rows[0][0] == "the network"
