"""The tables of a record: what it holds, what was found, what was changed; by hand, in both units."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tiny import JOB, write_tiny

from basinrain.job import run_screen
from basinrain.results import ScreenRun

EDITS = """
[[edit]]
gauge = "A"
from = 2031-05-04T01:00:00
to = 2031-05-04T02:00:00
action = "set"
value = 2
reason = "weighed by hand"
by = "duty hydrologist"
date = 2031-06-01

[[edit]]
gauge = "B"
to = 2031-05-04T01:00:00
action = "reject"
reason = "serviced"
by = "duty hydrologist"
date = 2031-06-01
"""
RAIN = """time,A,B,C
2031-05-04T01:00,1,6,
2031-05-04T02:00,4,9,T
2031-05-04T03:00,5,,0
2031-05-04T04:00,0,5,0
"""


def screened(folder: Path, unit: str = "mm") -> ScreenRun:
    job = JOB.replace('name = "Two halves"', f'name = "Two halves"\ndepth_unit = "{unit}"') + EDITS
    gauges = "id,x,y,from,to\nA,2.5,5,,\nB,7.5,5,,\nC,11,5,2031-05-04T01:00:00,\n"
    return run_screen(write_tiny(folder, job=job, gauges=gauges, rain=RAIN))


def test_completeness_counts_every_step_once(tmp_path: Path) -> None:
    """A has its four hours, one of them set; B misses one and one was rejected; C came an hour late."""
    table = screened(tmp_path).completeness.set_index("gauge")
    assert table["first"].tolist() == ["2031-05-04T01:00", "2031-05-04T02:00", "2031-05-04T02:00"]
    assert table["last"].tolist() == ["2031-05-04T04:00"] * 3
    assert table[["steps", "in_service", "with_value"]].values.tolist() == [[4, 4, 4], [4, 4, 2], [4, 3, 3]]
    assert table["share"].tolist() == [1.0, 0.5, 1.0]
    kinds = ["observed", "zero", "trace", "missing", "adjusted", "rejected", "not_installed"]
    assert table[kinds].values.tolist() == [[2, 1, 0, 0, 1, 0, 0], [2, 0, 0, 1, 0, 1, 0], [0, 2, 1, 0, 0, 0, 1]]
    everything = table.loc[:, "observed":]
    assert (everything.sum(axis=1) == table["steps"]).all()


@pytest.mark.parametrize(("unit", "factor"), [("mm", 1.0), ("in", 25.4)])
def test_the_edit_log_is_in_the_unit_of_the_job(tmp_path: Path, unit: str, factor: float) -> None:
    """A depth to set is in the job's unit, and so are the sums; an open side is blank, a rejected sum unknown."""
    run = screened(tmp_path, unit)
    table = run.edit_table
    assert table["gauge"].tolist() == ["A", "B"]
    assert table["value"].tolist() == ["2", ""]
    assert table["from"].tolist() == ["2031-05-04T01:00", ""]
    assert table["depth_before"].tolist() == pytest.approx([4 / factor, 6 / factor])
    assert table["depth_after"].tolist()[0] == pytest.approx(2)
    assert np.isnan(table["depth_after"].tolist()[1])
    assert run.record.depth[1, 0] == pytest.approx(2 * factor)
    assert set(table["depth_unit"]) == {unit}


def test_empty_tables_keep_their_columns(tmp_path: Path) -> None:
    """Four hours give no year: the tables of years have a header and no row."""
    run = screened(tmp_path)
    assert run.double_mass.empty
    assert run.double_mass.columns.tolist()[:3] == ["gauge", "reference", "year"]
    assert run.homogeneity.empty
    assert run.homogeneity.columns.tolist()[:3] == ["gauge", "reference", "test"]


def test_curves_and_tests_stand_in_the_unit_of_the_job() -> None:
    """The sample's long record: the curve of a gauge adds up its years, in inches as in mm."""
    job = Path(__file__).parents[1] / "demo_basins" / "record" / "job.toml"
    metric, inches = run_screen(job), run_screen(job, ["job.depth_unit=in"])
    for run in (metric, inches):
        curve = run.double_mass[run.double_mass["gauge"] == "R01"]
        assert curve["total"].cumsum().tolist() == pytest.approx(curve["cumulative"].tolist())
    # The depth that the job sets at R08 is in the job's unit, so there the two differ.
    ours, theirs = (run.double_mass[run.double_mass["gauge"] != "R08"] for run in (metric, inches))
    assert ours["total"].tolist() == pytest.approx((theirs["total"] * 25.4).tolist())
    tests = metric.homogeneity
    assert set(tests["test"]) == {"snht", "buishand-range", "buishand-q", "pettitt", "von-neumann"}
    assert not tests.loc[tests["test"] == "buishand-q", "counted"].any()
    assert set(tests.loc[tests["gauge"] == "R03", "grade"]) == {"suspect"}
