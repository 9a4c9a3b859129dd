"""Where the chunks of a series run begin."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace
from typing import cast

import numpy as np
import pytest
from tiny import JOB, write_tiny

from basinrain.inputs import read_inputs
from basinrain.jobfile import read_job
from basinrain.series.engine import SeriesSetup
from basinrain.series_inputs import SeriesInputs, borders_of, held_inputs

SETUP = cast("SeriesSetup", SimpleNamespace(network=[None] * 3, basins=[None] * 3, series=(("reweight", "thiessen"),)))


def inputs(tmp_path: Path, rain: str, **replaced: str) -> SeriesInputs:
    text = JOB
    for key, value in replaced.items():
        text = text.replace('interval = "1h"', f'interval = "1h"\n{key} = {value}')
    return held_inputs(read_inputs(read_job(write_tiny(tmp_path, rain=rain, job=text)), lambda _: None), 31)


def hours(first: str, n: int) -> str:
    start = np.datetime64(first)
    return "time,A,B,C\n" + "".join(f"{start + np.timedelta64(k, 'h')},1,1,1\n" for k in range(1, n + 1))


def test_chunks_are_whole_days(tmp_path: Path) -> None:
    """With no memory to spare a chunk is one day; a record that begins at 18:00 begins with six hours."""
    found = inputs(tmp_path, hours("2031-05-04T18:00", 60))
    assert borders_of(found, SETUP, 1e-9).tolist() == [0, 6, 30, 54, 60]


def test_chunks_of_steps_that_do_not_divide_a_day(tmp_path: Path) -> None:
    """Steps of 5 h meet the days again after five of them, 24 steps; a step is of the day that holds its middle."""
    ends = np.datetime64("2031-05-04T15:00") + np.arange(1, 60) * np.timedelta64(5, "h")
    text = JOB.replace('interval = "1h"', 'interval = "5h"')
    rain = "time,A,B,C\n" + "".join(f"{end},1,1,1\n" for end in ends)
    job = read_job(write_tiny(tmp_path, rain=rain, job=text))
    found = held_inputs(read_inputs(job, lambda _: None), 31)
    borders = borders_of(found, SETUP, 1e-9)
    assert borders.tolist() == [0, 2, 26, 50, 59]
    middle = found.starts[borders[1:-1]] + np.timedelta64(9000, "s")
    before = middle - np.timedelta64(5, "h")
    assert (middle.astype("datetime64[D]") > before.astype("datetime64[D]")).all()


def test_with_memory_it_is_one_chunk(tmp_path: Path) -> None:
    """Two GiB hold sixty hours of three gauges."""
    found = inputs(tmp_path, hours("2031-05-04T18:00", 60))
    assert borders_of(found, SETUP, 2.0).tolist() == [0, 60]


def test_masks_of_a_held_record(tmp_path: Path) -> None:
    """What is absent and what is silent for long are looked up by steps."""
    rain = hours("2031-05-04T00:00", 30).replace("04T05:00,1,1,1", "04T05:00,1,,1")
    found = inputs(tmp_path, rain)
    assert not found.absent(0, 30).any()
    assert not found.silent(0, 30).any()
    assert found.held is not None
    record = found.held
    again = held_inputs(found.given, 0.01)
    assert np.argwhere(again.silent(0, 30)).tolist() == [[4, 1]]
    assert again.silent(4, 6).shape == (2, len(record.gauges))


@pytest.mark.parametrize("k", [0, 1])
def test_chunks_of_a_held_record(tmp_path: Path, k: int) -> None:
    """A chunk is a window of the record with its long gaps."""
    found = inputs(tmp_path, hours("2031-05-04T00:00", 48))
    record, long = found.chunks(np.array([0, 24, 48])).task(k)()
    assert len(record) == 24
    assert record.starts[0] == np.datetime64("2031-05-04") + k
    assert long is not None
    assert long.shape == (24, 3)
