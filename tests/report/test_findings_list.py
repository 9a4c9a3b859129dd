from __future__ import annotations

import re
import tomllib
from dataclasses import replace

import numpy as np
import pytest
from report.screen_pieces import make_findings, make_monthly

from basinrain.report import findings_list
from basinrain.report.findings_list import count_table, edit_text, finding_tables, paste_text, short_table
from basinrain.screening import Finding
from basinrain.screening.edits import Edit

RECORD = make_monthly()


def test_counts_by_severity_and_state() -> None:
    """One erroneous open; doubtful one of each state; one remark."""
    rows = [row[1:] for row in count_table(make_findings()).rows]
    assert rows == [("1", "0", "0", "1"), ("1", "1", "1", "3"), ("1", "0", "0", "1")]


def test_tables_by_severity_the_heaviest_first() -> None:
    """Erroneous, doubtful, remarks; a severity without findings has no table."""
    captions = [table.caption for table in finding_tables(make_findings(), RECORD, depth_unit="mm")]
    assert captions == [
        "Erroneous: 1 finding, cannot be right",
        "Doubtful: 3 findings, may be wrong",
        "Remarks: 1 finding, worth knowing",
    ]
    only = finding_tables(make_findings()[:1], RECORD, depth_unit="mm")
    assert len(only) == 1


def test_a_line_says_what_where_evidence_action_and_state() -> None:
    """Gauge, stretch, check with evidence and the gauges not named in it, suggestion, state."""
    row = finding_tables(make_findings(), RECORD, depth_unit="mm")[1].rows[0]
    assert row[0] == "B"
    assert re.sub(r"<[^>]+>", "", row[1]) == "2004-05-01 00:00 to 2004-05-04 00:00"
    assert row[2] == "shifted-record: An hour behind A and C. Others concerned: D."
    assert row[3:5] == ("Shift it.", "open")


def test_what_the_job_has_settled_needs_no_entry() -> None:
    """The rejected and the accepted finding are said to be in the job."""
    rows = finding_tables(make_findings(), RECORD, depth_unit="mm")[1].rows
    assert [row[5] for row in rows[1:]] == ["in the job", "in the job"]


def test_a_finding_about_the_network_is_called_so_and_can_be_accepted_only() -> None:
    """There are no values of the network to reject."""
    finding = make_findings()[4]
    assert tomllib.loads(paste_text(finding, RECORD, depth_unit="mm")) == {"screening": {"accept": ["reading-hours"]}}
    assert finding_tables([finding], RECORD, depth_unit="mm")[0].rows[0][0] == "the network"


def test_what_is_to_be_pasted_is_valid() -> None:
    """An entry of reject names the finding's key, whatever letters the gauge's id has."""
    finding = replace(make_findings()[0], gauge='R&D "x" \\ 雨')
    read = tomllib.loads(paste_text(finding, RECORD, depth_unit="mm"))
    assert read == {"screening": {"reject": [finding.key]}}


def test_a_remark_is_accepted_not_rejected() -> None:
    """A short record must not be thrown away by a pasted line."""
    remark = Finding(check="short-record", gauge="A", severity="remark", evidence="12 years.", action="Say so.")
    assert "accept" in paste_text(remark, RECORD, depth_unit="mm")


def test_an_edit_is_pasted_whole_and_leaves_author_and_date_to_write() -> None:
    """Times are TOML's own; nobody's name is put under it."""
    read = tomllib.loads(paste_text(make_findings()[1], RECORD, depth_unit="mm"))["edit"][0]
    assert (read["gauge"], read["action"], read["value"]) == ("B", "shift", "1h")
    assert read["from"].isoformat() == "2004-05-01T00:00:00"
    assert (read["by"], read["date"]) == ("", "")


def test_an_edit_of_the_whole_record_has_the_records_ends() -> None:
    """A job's edit needs both sides."""
    edit = Edit(gauge="A", action="scale", value=25.4, reason="inches", by="screening")
    read = tomllib.loads(edit_text(edit, RECORD, depth_unit="in"))["edit"][0]
    assert (read["from"].isoformat(), read["to"].isoformat()) == ("2001-01-01T00:00:00", "2031-01-01T00:00:00")
    assert read["value"] == 25.4


def test_a_depth_to_set_is_in_the_jobs_unit() -> None:
    """50.8 mm are 2 in; without a value there is no line for it."""
    edit = Edit(gauge="A", action="set", value=50.8, reason="chart", by="screening")
    assert tomllib.loads(edit_text(edit, RECORD, depth_unit="in"))["edit"][0]["value"] == pytest.approx(2)
    assert "value" not in edit_text(Edit(gauge="A", action="reject", reason="ice", by="J."), RECORD, depth_unit="in")


def test_long_lists_keep_the_open_ones_and_say_where_the_rest_is(monkeypatch: pytest.MonkeyPatch) -> None:
    """Of five, three rejected, two are kept: the open ones."""
    monkeypatch.setattr(findings_list, "MOST_FINDINGS", 2)
    base = make_findings()[0]
    many = [replace(base, gauge=f"G{k}", state="open" if k > 2 else "rejected") for k in range(5)]
    table = finding_tables(many, RECORD, depth_unit="mm")[0]
    assert [row[0] for row in table.rows] == ["G3", "G4"]
    assert table.notes[-1] == "Shown: 2 of 5, open ones first. All are in findings.csv."


def test_the_short_table_has_the_heaviest_first() -> None:
    """For the storm report: gauge, severity, when, evidence."""
    table = short_table("Open", make_findings()[:2][::-1], RECORD, most=1)
    assert [row[:2] for row in table.rows] == [("A", "erroneous")]
    assert table.notes[-1] == "Shown: 1 of 2. All are in findings.csv."
    whole = Finding(check="c", gauge="A", evidence="e", action="a")
    assert short_table("Open", [whole], RECORD, most=5).rows[0][2] == "whole record"
    assert np.isnat(whole.start)
