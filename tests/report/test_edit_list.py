from __future__ import annotations

import re

from report.screen_pieces import EDIT_ROWS

from basinrain.report.edit_list import edit_table


def test_every_edit_is_printed_whole() -> None:
    """Who, when, why, what it did; no depth is a dash."""
    table = edit_table(EDIT_ROWS, depth_unit="mm")
    assert table is not None
    lines = [[re.sub(r"<[^>]+>", "", cell) for cell in row] for row in table.rows]
    assert lines[0] == [
        "1", "B", "2004-01-01 00:00", "2004-03-01 00:00", "scale by 0.1", "logger set to 0.1 mm", "J. Marrow",
        "2031-06-01", "2", "254.0", "25.4",
    ]  # fmt: skip
    assert lines[1][2:5] == ["–", "–", "reject"]
    assert lines[1][7:] == ["–", "1", "12.0", "–"]


def test_depths_are_in_the_jobs_unit() -> None:
    """50.8 mm set are 2.00 in."""
    table = edit_table(EDIT_ROWS, depth_unit="in")
    assert table is not None
    assert table.rows[2][4] == "set to 2.00 in"
    assert table.rows[2][9:] == ("–", "2.00")


def test_shifts_keep_their_words() -> None:
    """A duration is no number."""
    table = edit_table([{**EDIT_ROWS[0], "action": "shift", "value": "-1d"}], depth_unit="mm")
    assert table is not None
    assert table.rows[0][4] == "shift by -1d"


def test_a_long_log_is_never_shortened() -> None:
    """A reviewer must see every change: 500 edits are 500 lines."""
    table = edit_table(EDIT_ROWS[:1] * 500, depth_unit="mm")
    assert table is not None
    assert len(table.rows) == 500


def test_no_edits_no_table() -> None:
    """The page says in words that nothing was edited."""
    assert edit_table((), depth_unit="mm") is None
