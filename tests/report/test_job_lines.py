from __future__ import annotations

import tomllib
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from report.screen_pieces import make_findings

from basinrain.report.job_lines import edit_text, needs_edit, screening_text
from basinrain.screening import Finding, settle_findings
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS
from basinrain.screening.edits import SUGGESTED, Edit


def _with_reject(finding: Finding) -> Finding:
    edit = Edit(gauge=finding.gauge, start=finding.start, end=finding.end, action="reject", reason="No.", by=SUGGESTED)
    return replace(finding, edit=edit)


def test_what_is_to_be_pasted_settles_the_findings() -> None:
    """Entries name the findings' keys, whatever letters the gauge's id has."""
    finding = _with_reject(replace(make_findings()[0], gauge='R&D "x" \\ 雨'))
    read = tomllib.loads(screening_text([finding]))
    assert read == {"screening": {"reject": [finding.key]}}
    (settled,) = settle_findings([finding], reject=read["screening"]["reject"])
    assert settled.state == "rejected"


def test_what_has_no_suggested_edit_is_not_rejected_by_pasting() -> None:
    """A high value may be the storm: its key is there, as a comment."""
    outlier = replace(make_findings()[3], state="open")
    text = screening_text([_with_reject(make_findings()[0]), outlier])
    assert tomllib.loads(text)["screening"]["reject"] == ["missing-code A 2004-05-01T00:00"]
    assert f'    # "{outlier.key}",' in text.splitlines()


def test_a_remark_and_the_network_are_accepted_not_rejected() -> None:
    """A short record must not be thrown away by a pasted line; the network has no values to reject."""
    remark = Finding(check="short-record", gauge="A", severity="remark", evidence="12 years.", action="Say so.")
    network = replace(make_findings()[4], severity="doubtful")
    assert tomllib.loads(screening_text([remark, network])) == {
        "screening": {"accept": ["short-record A", "reading-hours"]}
    }


@pytest.mark.parametrize("check", [DOUBLE_MASS_BREAK, INHOMOGENEOUS])
def test_what_cannot_be_rejected_stands_among_what_to_accept(check: str) -> None:
    """Rejecting such a finding is refused, so its key is a comment of ``accept``; uncommented, it settles."""
    finding = Finding(check=check, gauge="A", evidence="The slope changes.", action="Compare.")
    text = screening_text([finding])
    assert tomllib.loads(text) == {"screening": {"accept": []}}
    read = tomllib.loads(text.replace('# "', '"'))
    assert read == {"screening": {"accept": [finding.key]}}
    (settled,) = settle_findings([finding], accept=read["screening"]["accept"])
    assert settled.state == "accepted"


@pytest.mark.parametrize(
    ("change", "entries"),
    [
        ({}, 1),
        ({"gauge": "B"}, 0),
        ({"end": np.datetime64("2004-05-01T12", "s")}, 0),
        ({"action": "scale", "value": 0.1}, 0),
    ],
)
def test_only_a_rejection_of_the_very_stretch_is_an_entry(change: dict[str, Any], entries: int) -> None:
    """Another gauge, a part of the stretch or another action takes an edit, and no entry stands for it."""
    finding = _with_reject(make_findings()[0])
    assert finding.edit is not None
    finding = replace(finding, edit=replace(finding.edit, **change))
    assert needs_edit(finding) is (entries == 0)
    assert screening_text([finding]).count("missing-code") == entries


def test_an_edit_is_pasted_whole_and_leaves_author_and_date_to_write() -> None:
    """Times are TOML's own; nobody's name is put under it."""
    edit = make_findings()[1].edit
    assert edit is not None
    read = tomllib.loads(edit_text(edit, depth_unit="mm"))["edit"][0]
    assert (read["gauge"], read["action"], read["value"]) == ("B", "shift", "1h")
    assert read["from"].isoformat() == "2004-05-01T00:00:00"
    assert (read["by"], read["date"]) == ("", "")


def test_an_edit_of_the_whole_record_leaves_both_sides_open() -> None:
    """A side that is left out is the record's own."""
    edit = Edit(gauge="A", action="scale", value=25.4, reason="inches", by=SUGGESTED)
    read = tomllib.loads(edit_text(edit, depth_unit="in"))["edit"][0]
    assert not {"from", "to"} & set(read)
    assert read["value"] == 25.4


@pytest.mark.parametrize(("side", "key", "other"), [("start", "from", "to"), ("end", "to", "from")])
def test_only_the_open_side_is_left_out(side: str, key: str, other: str) -> None:
    """The part before a break has an end and no beginning, that after it the reverse."""
    given: dict[str, Any] = {side: np.datetime64("2021-01-01T08", "s")}
    edit = Edit(gauge="A", action="scale", value=1.26, reason="moved", by=SUGGESTED, **given)
    read = tomllib.loads(edit_text(edit, depth_unit="mm"))["edit"][0]
    assert read[key].isoformat() == "2021-01-01T08:00:00"
    assert other not in read


def test_a_depth_to_set_is_in_the_jobs_unit() -> None:
    """50.8 mm are 2 in; without a value there is no line for it."""
    edit = Edit(gauge="A", action="set", value=50.8, reason="chart", by=SUGGESTED)
    assert tomllib.loads(edit_text(edit, depth_unit="in"))["edit"][0]["value"] == pytest.approx(2)
    reject = Edit(gauge="A", action="reject", reason="ice", by=SUGGESTED)
    assert "value" not in edit_text(reject, depth_unit="in")
