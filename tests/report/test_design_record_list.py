from __future__ import annotations

from dataclasses import replace
from math import comb

import numpy as np
import pytest
from report.design_run import bare, from_record

from basinrain.report.design_record_list import (
    depths_tables,
    durations_drawn,
    fit_tables,
    maxima_table,
    record_facts,
)
from basinrain.report.words import DASH


def test_a_job_without_record_has_nothing_here() -> None:
    """No fact, no table."""
    run = bare()
    assert [*record_facts(run), *fit_tables(run), *depths_tables(run), *durations_drawn(run, 3)] == []
    assert maxima_table(run) is None


def test_what_the_depths_rest_on() -> None:
    """Fifteen whole years of the two gauges that were there throughout; Gumbel, being fewer than fifty."""
    facts = dict(record_facts(from_record()))
    assert facts["Gauges"].startswith("Alder, Birch; ")
    assert facts["Average"] == "thiessen; gaps infilled by inverse-distance at the scale of the step"
    assert facts["Record's step"] == "24 h"
    assert facts["Years"] == "15, 2002 to 2016; 15 count"
    assert facts["Do not count"] == "none"
    assert facts["Distribution"] == "Gumbel, since a series is shorter than 50 years, fitted by L-moments"
    assert facts["Reach"] == "the rarest depth asked for is AEP 0.04 (1 in 25), from 15 years"


def test_years_that_do_not_count_are_named() -> None:
    """In all areas, or in some; of a wet season its months."""
    run = from_record()
    record = run.from_record
    assert record is not None
    share = record.season_share.copy()
    share[0] = 0.5
    share[3, 0] = 0.89
    depths = run.asked.design.depths.model_copy(update={"wet_season": (10, 11), "distribution": "gumbel"})
    design = run.asked.design.model_copy(update={"depths": depths})
    facts = dict(
        record_facts(
            replace(run, from_record=replace(record, season_share=share), asked=replace(run.asked, design=design))
        )
    )
    assert facts["Do not count"] == "2002; in some areas 2005"
    assert facts["Years"] == "15, 2002 to 2016; 13 to 14, by area count"
    assert facts["A year counts"] == "where at least 90 % of the steps of the months October, November have a depth"
    assert facts["Distribution"].startswith("Gumbel, as the job says")


def test_the_gumbel_line_by_hand() -> None:
    """Scale l2 / ln 2 and location l1 - 0.5772 scale, with l2 from the ranked maxima (Hosking and Wallis 1997)."""
    run = from_record()
    record = run.from_record
    assert record is not None
    ranked = np.sort(record.maxima[:, 0, 0])
    n = len(ranked)
    b1 = sum(comb(k, 1) / comb(n - 1, 1) * value for k, value in enumerate(ranked)) / n
    scale = (2 * b1 - ranked.mean()) / np.log(2)
    location = ranked.mean() - 0.5772157 * scale
    table = fit_tables(run)[0]
    assert table.caption == "ford: distributions fitted to the annual maxima"
    gumbel = table.rows[0]
    assert gumbel[:3] == ("24 h", "Gumbel, taken", "15")
    assert float(gumbel[3]) == pytest.approx(location, abs=0.006)
    assert float(gumbel[4]) == pytest.approx(scale, abs=0.006)
    assert gumbel[5] == "0"
    y = -np.log(-np.log(1 - 0.1))
    depths = depths_tables(run)[0]
    assert depths.over == (("", 1), ("AEP 0.5 (1 in 2)", 2), ("AEP 0.1 (1 in 10)", 2), ("AEP 0.04 (1 in 25)", 2))
    assert float(depths.rows[0][3]) == pytest.approx(location + scale * y, abs=0.06)
    low, high = (float(end) for end in depths.rows[0][4].split(" to "))
    assert low < location + scale * y < high


def test_both_distributions_of_every_duration() -> None:
    """The one that is taken first; shape and its test of the other."""
    rows = fit_tables(from_record())[1].rows
    assert [(row[0], row[1]) for row in rows] == [
        ("24 h", "Gumbel, taken"),
        ("24 h", "GEV"),
        ("48 h", "Gumbel, taken"),
        ("48 h", "GEV"),
    ]
    assert [row[8] == "" for row in rows] == [True, False, True, False]


def test_annual_maxima_of_the_first_point() -> None:
    """As they are in the file, by the year in which a water year ends; one that does not count is a dash."""
    run = from_record()
    record = run.from_record
    assert record is not None
    table = maxima_table(run)
    assert table is not None
    assert table.heads == ("year", "season's share", "24 h", "48 h")
    frame = run.annual_maxima
    first = frame[(frame.area_of == "ford") & (frame.year == 2002)].depth.round(1).tolist()
    assert [float(cell) for cell in table.rows[0][2:]] == pytest.approx(first, abs=0.06)
    assert table.notes[0].endswith("A year is called by the one that it ends in, since it begins with October.")
    maxima = record.maxima.copy()
    maxima[0] = np.nan
    without = maxima_table(replace(run, from_record=replace(record, maxima=maxima)))
    assert without is not None
    assert without.rows[0][2:] == (DASH, DASH)


def test_durations_of_a_figure_are_those_asked_for() -> None:
    """Places among those of the record, the last among them."""
    run = from_record()
    record = run.from_record
    assert record is not None
    assert [record.minutes[d] for d in durations_drawn(run, 3)] == [1440, 2880]
    assert [record.minutes[d] for d in durations_drawn(run, 1)] == [2880]
