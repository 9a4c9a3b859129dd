from __future__ import annotations

from report.screen_pieces import make_findings, make_screen_run

from basinrain.report.fitness import fitness
from basinrain.screening import Screening


def test_counts_what_the_job_settled_and_the_whole_log() -> None:
    """Counts by check, where to read of the open ones, what the job decided but for remarks, then its edits."""
    found = fitness(make_screen_run())
    assert [table.caption for table in found.tables] == [
        "Findings by check and by what the job says of them",
        "Settled by the job: 2 findings",
        "Edits of the job, all of them; depths in mm",
    ]
    assert "Open findings that touch what was computed stand under Warnings, with their evidence." in found.sentences
    assert len(found.tables[-1].rows) == 3


def test_a_record_with_nothing_open_names_no_warnings() -> None:
    """All that weighs is settled, or nothing is."""
    run = make_screen_run(screening=Screening(findings=make_findings()[2:4]))
    assert not any("Warnings" in sentence for sentence in fitness(run).sentences)
    remark = make_screen_run(screening=Screening(findings=make_findings()[4:]), edit_rows=())
    assert [table.caption[:17] for table in fitness(remark).tables] == ["Findings by check"]


def test_nothing_found_and_nothing_edited_is_said() -> None:
    """Sentences, no empty tables."""
    found = fitness(make_screen_run(screening=Screening(checks_run=("missing-code",)), edit_rows=()))
    assert found.tables == ()
    assert found.sentences[0].startswith("1 check was made, 0 could not be")
    assert found.sentences[1:] == ("No check found anything.", "The job edits nothing.")
