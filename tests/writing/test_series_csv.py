"""The tidy CSV file has every number to its last digit, and says what is missing."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from small_series import BASINS, SERIES, Kept, hours, small_content

from basinrain.series.flags import flag_words
from basinrain.writing import series_csv
from basinrain.writing.series_content import SeriesContent
from basinrain.writing.series_csv import write_csv


def test_a_file_that_can_be_read_at_a_glance(tmp_path: Path) -> None:
    """Two hours of two basins, in inches: 25.4 mm are 1 in, and nothing is nothing, not 0."""
    depth = np.array([[25.4, 0.0], [np.nan, 2.54]])
    share = np.array([[1.0, 0.7], [np.nan, 0.5]], dtype=np.float32)
    flags = np.array([[0, 3], [16, 8]], dtype=np.uint8)
    starts, ends = hours(2)
    content = SeriesContent(
        source=Kept({("reweight", "thiessen"): (depth, share, flags)}),
        starts=starts,
        ends=ends,
        basins=("Upper", "a,b"),
        areas=np.ones(2),
        zone="+00:00",
        depth_unit="in",
    )
    write_csv(tmp_path, content)
    assert (tmp_path / "series.csv").read_bytes().decode() == (
        "basin,method,gaps,time,depth,depth_unit,observed_share,flags\n"
        "Upper,thiessen,reweight,2031-05-04T01:00Z,1.0,in,1.0,\n"
        '"a,b",thiessen,reweight,2031-05-04T01:00Z,0.0,in,0.7,infilled reweighted\n'
        "Upper,thiessen,reweight,2031-05-04T02:00Z,,in,,missing\n"
        '"a,b",thiessen,reweight,2031-05-04T02:00Z,0.1,in,0.5,estimated\n'
    )


@pytest.mark.parametrize("held", [1, 30, 1 << 17])
@pytest.mark.parametrize("unit", ["mm", "in"])
def test_every_number_is_read_back(tmp_path: Path, held: int, unit: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """By the csv module of Python, to the last bit, however many rows are made at a time."""
    monkeypatch.setattr(series_csv, "_HELD", held)
    content = small_content(depth_unit=unit)
    write_csv(tmp_path, content)
    with (tmp_path / "series.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 2 * 50 * 4
    for number, (gaps, method) in enumerate(SERIES):
        block = content.block(gaps, method, slice(0, 50))
        own = rows[number * 200 : (number + 1) * 200]
        assert {(row["gaps"], row["method"], row["depth_unit"]) for row in own} == {(gaps, method, unit)}
        assert [row["basin"] for row in own] == list(BASINS) * 50
        assert [row["time"] for row in own[::4]] == content.time_texts(slice(0, 50))
        depth = np.array([float(row["depth"] or "nan") for row in own]).reshape(50, 4)
        np.testing.assert_array_equal(depth, block.depth)
        share = np.array([row["observed_share"] or "nan" for row in own], dtype=np.float32).reshape(50, 4)
        np.testing.assert_array_equal(share, block.observed_share)
        assert [row["flags"] for row in own] == [flag_words(code) for code in block.flags.ravel().tolist()]


def test_pandas_reads_it_and_a_hyetograph_sums_to_its_total(tmp_path: Path) -> None:
    """The depths of a basin's steps add up to the total of its series, to rounding; times are instants."""
    content = small_content()
    write_csv(tmp_path, content)
    table = pd.read_csv(tmp_path / "series.csv")
    assert str(pd.to_datetime(table["time"], utc=True)[0]) == "2031-05-03 23:00:00+00:00"
    for gaps, method in SERIES:
        one = table[(table["gaps"] == gaps) & (table["method"] == method) & (table["basin"] == "Mill")]
        depth = content.source.depth(gaps, method)[slice(None), slice(2, 3)]
        assert math.fsum(one["depth"].dropna()) == pytest.approx(float(np.nansum(depth)), rel=1e-13)
        assert one["depth"].isna().sum() == np.isnan(depth).sum() > 0
