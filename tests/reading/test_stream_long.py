"""One pass over long files: their order, the gauges in them, and gaps."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rainfiles import written
from streamfiles import HOUR, hours, network_of, write

from basinrain.errors import ReadError
from basinrain.reading import parquet, stream_text
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step
from basinrain.reading.stream import RecordStream, open_stream


def stream_of(folder: Path, rows: str, *gauges: str, **options: Any) -> RecordStream:  # noqa: ANN401 - any option
    """Return the stream of a long CSV with these rows, each a gauge, an hour and a depth."""
    text = re.sub(r" (\d\d)", r",2031-05-04 \1:00", rows)
    path = written(folder, f"gauge,time,depth{options.pop('more', '')}\n" + "\n".join(text.split("; ")))
    return open_stream([{"files": path, "layout": "long", **HOUR, **options}], network_of(*gauges))


@pytest.mark.parametrize("block", [8, 30, 4_000_000])
def test_gauges_that_come_and_go(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, block: int) -> None:
    """Absent rows are missing values where that is declared, in blocks of any size; marks count."""
    monkeypatch.setattr(stream_text, "_BLOCK", block)
    rows = "A 01,1,; B 01,0,; B 02,2,E; A 04,,; B 04,3,; C 04,4,"
    options: dict[str, Any] = {"gaps": "missing", "flags": {"estimated": ["E"]}}
    stream = stream_of(tmp_path, rows, "C", "B", "A", more=",flag", **options)
    source = {"files": tmp_path / "rain.csv", "layout": "long", **HOUR, **options}
    expected, _ = bring_to_step([read_rainfall(**source)], network_of("C", "B", "A"))
    for first in range(4):
        part = stream.read(first, first + 1)
        np.testing.assert_array_equal(part.depth, expected.depth[first : first + 1])
        np.testing.assert_array_equal(part.status, expected.status[first : first + 1])


@pytest.mark.parametrize("block", [8, 4_000_000])
@pytest.mark.parametrize(
    ("rows", "message"),
    [
        ("A 01,1; A 02,1; B 02,1; B 01,1",
         r":5: column time: found '2031-05-04T01:00:00' after a later time; expected rows in order.*; sort the rows"),
        ("A 01,1; B 01,1; A 01,2", r":4: gauge A: found '2031-05-04T01:00:00', as in line 2; expected each time once"),
        ("A 01,1;  01,2", r":3: column gauge: found a blank cell; expected the gauge"),
        ("A 01,1; A noon,2", r":3: column time: found 'A noon|:3: a row: found 2 cells"),
        ("A 01,1; B 01,1; B 02,1; A 03,1; B 03,1",
         r"gauge A: found no row for 1 of the 1h steps, ending at 2031-05-04T02:00:00; expected every step once betw"),
        ("A 01,1; A 02,1; A 05,1", r"time axis: found no rows for 2 of the 1h steps, ending at 2031-05-04T03:00:00"),
        ("; ".join(f"{gauge} {hour:02d},1" for hour in range(1, 10) for gauge in ("BA" if hour % 2 else "B")),
         r"gauge A: found rows 2h apart; expected 1h, as declared; correct interval, or put the gauge into a source"),
    ],
)  # fmt: skip
def test_rows_that_cannot_be(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, block: int, rows: str, message: str
) -> None:
    """Each thing that is wrong with the times and gauges of rows is told in the pass, in whichever block it stands."""
    monkeypatch.setattr(stream_text, "_BLOCK", block)
    with pytest.raises(ReadError, match=message):
        stream_of(tmp_path, rows, "A", "B")


def test_values_over_several_steps(tmp_path: Path) -> None:
    """A value over several steps is refused with its line, since it may reach over the border of a part; 1 is not."""
    stream = stream_of(tmp_path, "A 01,1,1; A 02,1,", "A", more=",steps")
    assert len(stream) == 2
    message = r":3: column steps: found '2'; expected 1 or nothing .*give more \[series\] memory"
    with pytest.raises(ReadError, match=message):
        stream_of(tmp_path, "A 01,1,1; A 02,1,2", "A", more=",steps")


def test_columns_that_are_not_there(tmp_path: Path) -> None:
    """A long file without one of its columns, or without the one that was named, is refused as when read at once."""
    path = written(tmp_path, "who,time,depth\nA,2031-05-04 01:00,1\n")
    for columns, message in (
        (
            {},
            r"the header: found no column for the gauge among: who, time, depth; expected .*columns\.gauge",
        ),
        (
            {"gauge": "whom"},
            r"columns\.gauge: found no column 'whom'; expected a column of the file; did you mean 'who'\?",
        ),
    ):
        with pytest.raises(ReadError, match=message):
            open_stream([{"files": path, "layout": "long", "columns": columns, **HOUR}], network_of("A"))


def test_parquet_in_small_batches(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Rows of one time may stand in different batches and row groups."""
    monkeypatch.setattr(parquet, "_CELLS", 4)
    depth = np.arange(12.0).reshape(4, 3)
    stream = open_stream([write(tmp_path, "long Parquet", hours(4), "ABC", depth)], network_of("A", "B", "C"))
    np.testing.assert_array_equal(np.concatenate([stream.read(0, 1).depth, stream.read(1, 4).depth]), depth)
