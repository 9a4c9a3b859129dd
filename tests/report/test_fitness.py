from __future__ import annotations

from report.screen_pieces import make_screen_run

from basinrain.report.fitness import fitness
from basinrain.screening import Screening


def test_counts_open_rejected_accepted_and_the_whole_log() -> None:
    """Open ones without the remarks, then what the job decided, then its edits."""
    found = fitness(make_screen_run())
    assert [table.caption for table in found.tables] == [
        "Findings by severity and by what the job says of them",
        "Open: 2 findings",
        "Rejected by the job: 1 finding",
        "Accepted by the job: 1 finding",
        "Edits of the job, all of them; depths in mm",
    ]
    assert len(found.tables[-1].rows) == 3


def test_nothing_found_and_nothing_edited_is_said() -> None:
    """Sentences, no empty tables."""
    found = fitness(make_screen_run(screening=Screening(checks_run=("missing-code",)), edit_rows=()))
    assert found.tables == ()
    assert found.sentences[0].startswith("1 check was made, 0 could not be")
    assert found.sentences[1:] == ("No check found anything.", "The job edits nothing.")
