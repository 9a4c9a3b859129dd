"""Parquet files as rainfall: the record of the same data in CSV, and what cannot be read."""

from __future__ import annotations

import sys
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest
from pyarrow import parquet
from rainfiles import labels, times, written
from streamfiles import hours, long_parquet, network_of, wide_csv, wide_parquet

from basinrain.errors import JobError, ReadError
from basinrain.rainfall import RainRecord
from basinrain.reading.parquet import open_parquet
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.stream import open_stream

DATA = Path(__file__).parent.parent / "data"


def read(path: Path, **options: Any) -> RainRecord:  # noqa: ANN401 - any option of the reader
    """Return the record of a Parquet file; wide, in mm and hourly unless the options say otherwise."""
    settings: dict[str, Any] = {"layout": "wide", "unit": "mm", "interval": "1h"} | options
    return read_rainfall(path, **settings)


def table(path: Path, **columns: Any) -> Path:  # noqa: ANN401 - anything that pyarrow takes for a column
    """Write columns as a Parquet file."""
    parquet.write_table(pa.table(columns), path)
    return path


def test_open_data_as_parquet(tmp_path: Path) -> None:
    """An open record that pandas writes as Parquet is the record of its CSV."""
    path = DATA / "nyc_hourly" / "rain.csv"
    frame = pd.read_csv(path, index_col=0, parse_dates=True)
    frame.to_parquet(tmp_path / "rain.parquet")
    found = read(tmp_path / "rain.parquet")
    expected = read_rainfall(path, layout="wide", unit="mm", interval="1h")
    assert (found.gauges, found.zone) == (expected.gauges, expected.zone)
    np.testing.assert_array_equal(found.ends, expected.ends)
    np.testing.assert_array_equal(found.depth, expected.depth)
    np.testing.assert_array_equal(found.status, expected.status)


def test_long_with_marks(tmp_path: Path) -> None:
    """A long file has gauges as text or whole numbers, marks and steps in columns, its rows in any order."""
    path = table(
        tmp_path / "rain.pq",
        station=[7, 7, 8],
        time=pd.to_datetime(["2031-05-04 03:00", "2031-05-04 01:00", "2031-05-04 01:00"]),
        depth=[6.0, 1.0, None],
        flag=pa.array(["E", None, ""]).dictionary_encode(),
        steps=[2, None, 1],
    )
    record = read(path, layout="long", flags={"estimated": ["E"]})
    assert record.gauges == ("7", "8")
    assert [(total.gauge, total.depth) for total in record.totals] == [("7", 6.0)]
    assert labels(record)[0] == ["observed", "missing"]


@pytest.mark.parametrize(
    ("column", "options", "zone", "first"),
    [
        (pa.array(hours(1)), {}, "", "2031-05-04T01:00"),
        (pa.array(hours(1)), {"timezone": "+02:00"}, "+02:00", "2031-05-04T01:00"),
        (pa.array(hours(1), pa.timestamp("ms", "UTC")), {}, "+00:00", "2031-05-04T01:00"),
        (pa.array(hours(1), pa.timestamp("ns", "+02:00")), {}, "+02:00", "2031-05-04T03:00"),
        # Summer in Vienna: the record's clock is its standard time.
        (pa.array(hours(1), pa.timestamp("us", "Europe/Vienna")), {}, "+01:00", "2031-05-04T02:00"),
        (pa.array(hours(1), pa.timestamp("us", "UTC")), {"timezone": "Europe/Vienna"}, "+01:00", "2031-05-04T02:00"),
        (pa.array(["2031-05-04T01:00Z"]), {"timezone": "-03:00"}, "-03:00", "2031-05-03T22:00"),
        (pa.array(["4.5.2031 01:00"]), {"time_format": "%d.%m.%Y %H:%M"}, "", "2031-05-04T01:00"),
        (pa.array(hours(1)).cast(pa.date32()), {"interval": "1d"}, "", "2031-05-05T00:00"),
        (pa.array(hours(1)).cast(pa.date64()), {"interval": "1mo"}, "", "2031-06-01T00:00"),
    ],
)
def test_times(tmp_path: Path, column: Any, options: dict[str, Any], zone: str, first: str) -> None:  # noqa: ANN401
    """Timestamps, dates and text are understood as the same text in CSV; a zone of the column is an offset."""
    record = read(table(tmp_path / "rain.parquet", time=column, A=[1.0]), **options)
    assert (record.zone, times(record)[0][1]) == (zone, first)


@pytest.mark.parametrize(
    ("values", "expected"),
    [
        (pa.array([1.5, None, -9.0]), [38.1, None, None]),
        (pa.array(np.array([1.5, np.nan, -9.0], dtype=np.float32)), [38.1, None, None]),
        (pa.array([1, 0, None]), [25.4, 0.0, None]),
        (pa.array([Decimal("1.5"), None, Decimal("0.0")]), [38.1, None, 0.0]),
        (pa.array(["1.5", "T", "2E"]), [38.1, 0.0, 50.8]),
        (pa.array([None, None, None]), [None, None, None]),
    ],
)
def test_types_of_depths(tmp_path: Path, values: Any, expected: list[float | None]) -> None:  # noqa: ANN401
    """Numbers of any type, and cells of text with marks, are depths in the declared unit, whole and in parts."""
    path = table(tmp_path / "rain.parquet", time=hours(3), A=values)
    options: dict[str, Any] = {"unit": "in", "missing": [-9], "flags": {"estimated": ["E"]}}
    record = read(path, **options)
    np.testing.assert_allclose(record.depth[:, 0], np.array(expected, dtype=float))
    part = open_stream([{"files": path, "interval": "1h", **options}], network_of("A")).read(0, 3)
    np.testing.assert_array_equal(part.depth, record.depth)
    np.testing.assert_array_equal(part.status, record.status)


def test_numbers_that_look_like_codes(tmp_path: Path) -> None:
    """Codes that nobody declared, and infinite depths, are refused as in text, float32 ones too."""
    values = np.array([-9999.0, np.inf, 999.9, 1.0], dtype=np.float32)
    with pytest.raises(ReadError) as caught:
        read(table(tmp_path / "rain.parquet", time=hours(4), A=values))
    assert [line.split("gauge A: ")[1].split("; expected")[0] for line in str(caught.value).splitlines()] == [
        "found '-9999'", "found 'inf'", "found '999.9'",
    ]  # fmt: skip


def test_columns_that_cannot_be_used(tmp_path: Path) -> None:
    """All columns of a wrong type are named together, with their type."""
    path = table(
        tmp_path / "rain.parquet",
        time=[1, 2],
        A=[True, False],
        B=[[1.0], [2.0]],
        C=pa.array([b"1", b"2"]),
    )
    with pytest.raises(ReadError) as caught:
        read(path)
    assert [(problem.item, problem.found, problem.expected) for problem in caught.value.problems] == [
        ("column time", "values of the type int64", "timestamps, dates, or text"),
        ("column A", "values of the type bool", "numbers or text"),
        ("column B", "values of the type list<element: double>", "numbers or text"),
        ("column C", "values of the type binary", "numbers or text"),
    ]


def test_names_of_columns(tmp_path: Path) -> None:
    """Columns named twice or not at all, and files without rows, are refused; an index without a name is found."""
    path = tmp_path / "rain.parquet"
    parquet.write_table(
        pa.table([pa.array(hours(1)), pa.array([1.0]), pa.array([2.0])], names=["time", "A", "A"]), path
    )
    with pytest.raises(ReadError, match=r"column A: the columns: found 2 named 'A'; expected every column once"):
        read(path)
    parquet.write_table(pa.table([pa.array(hours(1)), pa.array([1.0])], names=["time", ""]), path)
    with pytest.raises(ReadError, match="the columns: found one without a name; expected a name for every column"):
        read(path)
    parquet.write_table(pa.table({"time": pa.array([], pa.timestamp("s"))}), path)
    with pytest.raises(ReadError, match="the file: found no rows; expected rows"):
        read(path)
    pd.DataFrame({"A": [1.0]}, index=hours(1)).to_parquet(path)
    assert read(path).gauges == ("A",)
    with pytest.raises(ReadError, match=r"columns\.time: found no column 'when'"):
        read(path, columns={"time": "when"})
    with pytest.raises(ReadError, match=r"no column for the gauge among: A, __index_level_0__; .*columns\.gauge"):
        read(path, layout="long")


def test_fractions_of_a_second(tmp_path: Path) -> None:
    """A stamp that is no whole second is told as it is, and so is a blank one."""
    stamps = pa.array([np.datetime64("2031-05-04T01:00:00.5", "ms"), None])
    with pytest.raises(
        ReadError, match=r":1: column time: found '2031-05-04T01:00:00\.500'.*\n.*:2: column time: found ''"
    ):
        read(table(tmp_path / "rain.parquet", time=stamps, A=[1.0, 2.0]))


def test_zone_that_is_none(tmp_path: Path) -> None:
    """A zone that nobody knows is refused by its name."""
    stamps = pa.array(hours(1), pa.timestamp("s", "Mars/Base"))
    with pytest.raises(ReadError, match=r"column time: found times of zone 'Mars/Base'; expected 'UTC', an offset"):
        read(table(tmp_path / "rain.parquet", time=stamps, A=[1.0]))


@pytest.mark.parametrize(
    ("keep", "message"),
    [
        (
            slice(0, -9),
            r"the file: found no end of a Parquet file; expected a whole file; copy it again; it is cut short",
        ),
        (slice(4, None), r"the file: found no Parquet file; expected a Parquet file, as its suffix says; rename it"),
        (slice(0, 0), r"the file: found nothing in it"),
    ],
)
def test_files_that_are_cut(tmp_path: Path, keep: slice, message: str) -> None:
    """A file without its end or its beginning is refused in one line, whole and in parts."""
    path = wide_parquet(tmp_path / "rain.parquet", hours(9), ["A"], np.ones((9, 1)))
    path.write_bytes(path.read_bytes()[keep])
    with pytest.raises(ReadError, match=message):
        read(path)
    with pytest.raises(ReadError, match=message):
        open_stream([{"files": path, "unit": "mm", "interval": "1h"}], network_of("A"))


def test_damage_within(tmp_path: Path) -> None:
    """A file whose middle is not Parquet is refused in one line, whole and in parts."""
    path = wide_parquet(tmp_path / "rain.parquet", hours(9), ["A"], np.ones((9, 1)))
    content = path.read_bytes()
    path.write_bytes(b"PAR1" + b"\xff" * (len(content) - 8) + content[-4:])
    for reads in (read, lambda path: open_stream([{"files": path, "unit": "mm", "interval": "1h"}], network_of("A"))):
        with pytest.raises(
            ReadError, match=r"the file: found that it is damaged \(.*\); expected a whole Parquet file"
        ):
            reads(path)


def test_without_pyarrow(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where pyarrow is not installed, one line says what to install."""
    path = wide_parquet(tmp_path / "rain.parquet", hours(2), ["A"], np.ones((2, 1)))
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    with pytest.raises(ReadError, match=r"pyarrow is not installed, which reads it; install basinrain\[parquet\]"):
        read(path)


@pytest.mark.parametrize("layout", ["tips", "counter", "totals"])
def test_layouts_that_are_text(tmp_path: Path, layout: str) -> None:
    """Other layouts are given as text."""
    options: dict[str, Any] = {"layout": layout, "interval": None if layout == "totals" else "1h"}
    with pytest.raises(
        JobError, match=rf"layout: found '{layout}' with a Parquet file; expected 'wide' or 'long'; give"
    ):
        read(tmp_path / "rain.parquet", **options)


def test_parquet_beside_text(tmp_path: Path) -> None:
    """Files of one source may be text and Parquet; they follow on each other."""
    depth = np.arange(8.0).reshape(4, 2)
    early = wide_csv(tmp_path / "early.csv", hours(4)[:2], ["A", "B"], depth[:2])
    late = wide_parquet(tmp_path / "late.parquet", hours(4)[2:], ["A", "B"], depth[2:])
    record = read_rainfall([early, late], layout="wide", unit="mm", interval="1h")
    np.testing.assert_array_equal(record.depth, depth)
    with pytest.raises(ReadError, match=r"late\.parquet: the file: found it twice"):
        read_rainfall([late, late], layout="wide", unit="mm", interval="1h")


def test_rows_in_pieces(tmp_path: Path) -> None:
    """Rows come from the row groups that hold them, whatever these are."""
    path = long_parquet(tmp_path / "rain.pq", hours(6), ["A", "B"], np.arange(12.0).reshape(6, 2), group=5)
    rows = open_parquet(path, layout="long", columns={})
    assert rows.group_starts.tolist() == [0, 5, 10, 12]
    pieces = list(rows.tables(3, 11))
    assert [(row, len(table.lines)) for row, table in pieces] == [(3, 2), (5, 5), (10, 1)]
    assert np.concatenate([table.frame["depth"] for _, table in pieces]).tolist() == list(range(3, 11))
    assert not rows.all_numbers(["gauge"])
    assert rows.all_numbers(["depth"])


def test_text_is_no_parquet(tmp_path: Path) -> None:
    """A text file with the suffix of Parquet is refused by what it is."""
    with pytest.raises(
        ReadError, match="found no Parquet file; expected a Parquet file, as its suffix says; rename it"
    ):
        read(written(tmp_path, "time,A\n2031-05-04 01:00,1\n", "rain.parquet"))
