"""The tidy CSV file has every number to its last digit."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from small_hyetographs import COMMON, drawn_content, hyetograph, two_steps

from basinrain.writing.design_content import DesignContent
from basinrain.writing.design_csv import write_csv


def test_a_file_that_can_be_read_at_a_glance(tmp_path: Path) -> None:
    """Two hours over two basins, in inches, without a start: 25.4 and 12.7 mm are 1 and 0.5 in, together 1.5."""
    write_csv(tmp_path, two_steps())
    assert (tmp_path / "design_hyetographs.csv").read_bytes().decode() == (
        "point,aep,return_period,return_period_in,duration,pattern,basin,elapsed_min,depth,cumulative,depth_unit\n"
        "bridge,0.01,100,annual-maximum,2h,nrcs-type-ii,west,60,1.0,1.0,in\n"
        "bridge,0.01,100,annual-maximum,2h,nrcs-type-ii,west,120,0.5,1.5,in\n"
        'bridge,0.01,100,annual-maximum,2h,nrcs-type-ii,"a,b",60,0.1,0.1,in\n'
        'bridge,0.01,100,annual-maximum,2h,nrcs-type-ii,"a,b",120,0.0,0.1,in\n'
    )


def test_a_start_gives_times_and_a_partial_duration_no_probability(tmp_path: Path) -> None:
    """The time of a row is the end of its step; the probability is blank."""
    one = hyetograph([[2.0], [1.0]], basins=("west",), frequency=COMMON, pattern="late, peak", step=15)
    write_csv(tmp_path, two_steps(hyetographs=(one,), depth_unit="mm", start=np.datetime64("2031-05-04T23:45")))
    assert (tmp_path / "design_hyetographs.csv").read_text() == (
        "point,aep,return_period,return_period_in,duration,pattern,basin,elapsed_min,time,depth,cumulative,depth_unit\n"
        'bridge,,2,partial-duration,30min,"late, peak",west,15,2031-05-05T00:00,2.0,2.0,mm\n'
        'bridge,,2,partial-duration,30min,"late, peak",west,30,2031-05-05T00:15,1.0,3.0,mm\n'
    )


def check_rows(rows: list[dict[str, str]], content: DesignContent) -> None:
    """Compare the rows of a file with the hyetographs, every digit."""
    at = 0
    for one in content.hyetographs:
        for basin, depth in zip(one.basins, content.depth(one), strict=True):
            own = rows[at : at + one.n_steps]
            at += one.n_steps
            facts = {(r["point"], r["return_period_in"], r["duration"], r["pattern"], r["basin"]) for r in own}
            assert facts == {(one.point, one.frequency.series, one.duration, one.pattern, basin)}
            assert {float(r["return_period"]) for r in own} == {one.frequency.written_years}
            np.testing.assert_array_equal([float(r["aep"] or "nan") for r in own], one.frequency.written_aep)
            assert [int(r["elapsed_min"]) for r in own] == one.elapsed.tolist()
            assert [r["time"] for r in own] == content.time_texts(one.elapsed)
            np.testing.assert_array_equal([float(r["depth"]) for r in own], depth)
            np.testing.assert_array_equal([float(r["cumulative"]) for r in own], np.cumsum(depth))
            assert {r["depth_unit"] for r in own} == {content.depth_unit}
    assert at == len(rows)


@pytest.mark.parametrize("unit", ["mm", "in"])
def test_every_number_is_read_back(tmp_path: Path, unit: str) -> None:
    """By the csv module of Python, to the last bit."""
    content = drawn_content(depth_unit=unit)
    write_csv(tmp_path, content)
    with (tmp_path / "design_hyetographs.csv").open(encoding="utf-8", newline="") as file:
        check_rows(list(csv.DictReader(file)), content)


def test_pandas_reads_it_and_a_hyetograph_sums_to_its_total(tmp_path: Path) -> None:
    """The depths of every basin add up to the depth of its storm, which is also where the cumulative depth ends."""
    content = drawn_content()
    write_csv(tmp_path, content)
    table = pd.read_csv(tmp_path / "design_hyetographs.csv")
    keys = ["point", "return_period", "duration", "pattern", "basin"]
    groups = table.groupby(keys, sort=False)
    assert len(groups) == 32
    totals = [total for one in content.hyetographs for total in one.totals.tolist()]
    for (_, own), total in zip(groups, totals, strict=True):
        assert math.fsum(own["depth"]) == pytest.approx(total, rel=1e-14)
        assert own["cumulative"].iloc[-1] == pytest.approx(total, rel=1e-14)
