"""Files of storm totals."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from rainfiles import labels, read, written

from basinrain.errors import JobError, ReadError
from basinrain.reading.rainfall import read_rainfall


def test_storms_are_steps_without_times(tmp_path: Path) -> None:
    """Every storm is a step with its name; a gauge without a row is missing there."""
    text = "gauge,storm,depth\nA,May flood,10\nB,May flood,20\nA,June flood,0\n"
    record = read(tmp_path, text, layout="totals", interval=None, unit="in")
    assert (record.step, record.labels, record.recorders) == ("storm", ("May flood", "June flood"), frozenset())
    np.testing.assert_allclose(record.depth, [[254.0, 508.0], [0.0, np.nan]])
    assert labels(record) == [["observed", "observed"], ["zero", "missing"]]
    assert np.isnat(record.starts).all()
    assert np.isnat(record.ends).all()
    assert record.window(1, 2).labels == ("June flood",)


def test_one_storm_without_a_name(tmp_path: Path) -> None:
    """Without a column of storms there is one, named storm; accumulation marks say nothing new of a total."""
    record = read(tmp_path, "gauge,depth,flag\nA,10,A\nB,20,\n", layout="totals", interval=None, accumulated="A")
    assert (record.labels, record.depth.tolist(), labels(record)) == (("storm",), [[10.0, 20.0]], [["observed"] * 2])


def test_several_files(tmp_path: Path) -> None:
    """Files of one source are joined; a storm and gauge in both is refused with file and line."""
    one = written(tmp_path, "gauge,storm,depth\nA,May,10\n", "one.csv")
    two = written(tmp_path, "gauge,storm,depth\nB,May,20\nA,June,5\n", "two.csv")
    record = read_rainfall([one, two], layout="totals", unit="mm")
    np.testing.assert_array_equal(record.depth, [[10.0, 20.0], [5.0, np.nan]])
    three = written(tmp_path, "gauge,storm,depth\nA,May,11\n", "three.csv")
    with pytest.raises(ReadError) as caught:
        read_rainfall([one, two, three], layout="totals", unit="mm")
    assert str(caught.value) == (
        f"{three}:2: gauge A: found a second total of storm 'May'; expected one total for a gauge and storm; remove "
        "one of the rows"
    )


def test_problems_of_all_files(tmp_path: Path) -> None:
    """Blank cells and faulty depths of every file are listed."""
    one = written(tmp_path, "gauge,storm,depth\n,May,10\nA,,x\n", "one.csv")
    two = written(tmp_path, "gauge,mm\nA,1\n", "two.csv")
    with pytest.raises(ReadError) as caught:
        read_rainfall([one, two], layout="totals", unit="mm")
    assert [line.split(";")[0] for line in str(caught.value).splitlines()] == [
        f"{one}:2: column gauge: found a blank cell",
        f"{one}:3: column storm: found a blank cell",
        f"{one}:3: column depth: gauge A: found 'x'",
        f"{two}: the header: found no column for the depth among: gauge, mm",
    ]


def test_interval_has_no_place(tmp_path: Path) -> None:
    """Storm totals have no interval."""
    with pytest.raises(JobError, match=r"rain\.csv: interval: found '1h'; expected none for storm totals; leave it"):
        read(tmp_path, "gauge,depth\nA,1\n", layout="totals", interval="1h")
