from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from report.series_run import four_days, four_years

from basinrain.report.network_list import CHANGES, changes_sentence, changes_table
from basinrain.report.words import DASH
from basinrain.results_series import SeriesRun
from basinrain.series.network_changes import CLOSES, OPENS, RETURNS, SILENT, NetworkChange


def _texts(row: tuple[Any, ...]) -> tuple[str, ...]:
    return tuple(str(cell).replace('<span class="unbroken">', "").replace("</span>", "") for cell in row)


def _changed(*changes: tuple[int, str, str]) -> SeriesRun:
    found = tuple(
        NetworkChange(time=np.datetime64("2027-01-01", "s") + day * 86400, gauge=gauge, change=change, gauges=3)
        for day, gauge, change in changes
    )
    return replace(four_days(), changes=found)


def test_a_silence_stands_in_one_line() -> None:
    """B is silent from February to May 2028 and C comes into service between."""
    table = changes_table(four_years())
    assert table is not None
    assert [_texts(row) for row in table.rows] == [
        ("2028-02-05 00:00", "2028-05-15 00:00", "B", "silent for long", "1"),
        ("2028-05-01 00:00", DASH, "C", "comes into service", "2"),
    ]
    assert table.notes[1] == "Gauges from then on: in service, and not silent for more than 31 days."


def test_how_often_gauges_came_and_went() -> None:
    """Once, never, and one silent gauge."""
    assert changes_sentence(four_years()) == (
        "Gauges came into service once and went out of it never within the record; 1 gauge was silent for more than "
        "31 days. Means before and after a change are not of the same gauges."
    )


def test_nothing_changed() -> None:
    """A sentence and no table."""
    assert changes_table(four_days()) is None
    assert changes_sentence(four_days()) == (
        "No gauge came into service or went out of it, or was silent for more than 31 days, during the record."
    )


def test_silences_that_begin_or_end_otherwise() -> None:
    """One that lasts to the end, one from before the record, one that closing ends."""
    run = _changed((1, "A", SILENT), (2, "B", RETURNS), (3, "C", SILENT), (4, "C", CLOSES), (5, "D", OPENS))
    table = changes_table(run)
    assert table is not None
    assert [_texts(row)[:4] for row in table.rows] == [
        ("2027-01-02 00:00", DASH, "A", "silent for long"),
        (DASH, "2027-01-03 00:00", "B", "silent for long"),
        ("2027-01-04 00:00", "2027-01-05 00:00", "C", "silent for long"),
        ("2027-01-05 00:00", DASH, "C", "goes out of service"),
        ("2027-01-06 00:00", DASH, "D", "comes into service"),
    ]


def test_of_many_those_that_last_are_shown_first() -> None:
    """A hundred silences and then one closing: the closing is among the lines shown, in its place in time."""
    run = _changed(*((day, f"G{day}", SILENT) for day in range(100)), (100, "Z", CLOSES))
    table = changes_table(run)
    assert table is not None
    assert len(table.rows) == CHANGES
    assert table.rows[-1][2] == "Z"
    assert table.notes[-1] == (
        f"Shown: {CHANGES} of 101 lines, gauges that come into service or go out of it first. All are in "
        "network_changes.csv."
    )


def test_gaps_of_any_length_are_no_change() -> None:
    """Where every gap may be infilled there is no silence to tell of."""
    run = four_days()
    setup = replace(run.setup, infill=replace(run.setup.infill, longest_gap=float("inf")))
    assert changes_sentence(replace(run, setup=setup)) == (
        "No gauge came into service or went out of it during the record."
    )


def test_gauges_that_change_together_share_a_line() -> None:
    """Eight open on one day, six of them are named; a ninth opens on the next."""
    run = _changed(*((1, f"G{k}", OPENS) for k in range(8)), (2, "G8", OPENS))
    table = changes_table(run)
    assert table is not None
    assert [row[2] for row in table.rows] == ["G0, G1, G2, G3, G4, G5 and 2 more", "G8"]
