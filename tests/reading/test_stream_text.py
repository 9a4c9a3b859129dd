"""Text in parts: blocks of every size give the same rows, and a large file needs little memory."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rainfiles import written

from basinrain.errors import ReadError
from basinrain.reading import stream_text
from basinrain.reading.delimited import read_delimited
from basinrain.reading.stream_text import scan_text

TEXT = '\ufeff\n  \ntime;A ;"B"\r\n1;1,5;\r;;\r\n2; x ;"p;q"\r\n\n3;ö;T;;\n" ";;\n4;2;0'


def _pass(*_: Any) -> None:  # noqa: ANN401 - what a visitor takes
    """See the rows and do nothing."""


@pytest.mark.parametrize("block", [1, 2, 3, 7, 16, 1000])
def test_blocks_of_any_size(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, block: int) -> None:
    """Rows, lines, names and the decimal sign are those of the file read at once, wherever blocks end."""
    monkeypatch.setattr(stream_text, "_BLOCK", block)
    path = written(tmp_path, TEXT)
    whole = read_delimited(path)
    rows = scan_text(path, _pass)
    assert (rows.columns, rows.n_rows, rows.decimal) == (whole.columns, len(whole.lines), whole.decimal)
    for first in range(rows.n_rows):
        for stop in range(first + 1, rows.n_rows + 1):
            tables = list(rows.tables(first, stop))
            cells = [row for _, table in tables for row in table.frame.to_numpy().tolist()]
            assert cells == whole.frame.to_numpy().tolist()[first:stop]
            assert [line for _, table in tables for line in table.lines.tolist()] == whole.lines[first:stop].tolist()
            assert tables[0][0] == first


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (b"", "the file: found nothing in it; expected a header and rows"),
        (b"\n \n", "the file: found nothing in it; expected a header and rows"),
        (b"time,A\n,\n", "the file: found a header and nothing below it; expected rows"),
        (b"time,A,A\n1,2,3\n", "2 columns named 'A'; expected every column once"),
        (b"time,A\n1,\xff\n", r"rain\.csv:2: the file: found byte 0xff, which is not UTF-8"),
        (b"time,A\n1,\0\n", "the file: found binary content"),
        (
            b'time,A\n1,2\n3,"4\n5"\n',
            r"rain\.csv:3: a quoted cell: found a line end in it, or a quotation mark out of pl",
        ),
    ],
)
def test_text_that_cannot_be(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, text: bytes, message: str) -> None:
    """What keeps a file from being read is told with its line, in whichever block it stands."""
    monkeypatch.setattr(stream_text, "_BLOCK", 3)
    with pytest.raises(ReadError, match=message):
        scan_text(written(tmp_path, text), _pass)


_BOUNDED = """
import resource, sys
import numpy as np
from basinrain.gauges import GaugeNetwork
from basinrain.reading.stream import open_stream
network = GaugeNetwork(ids=tuple(f"G{k}" for k in range(200)), x=np.arange(200.0), y=np.zeros(200), crs="local")
def peak():
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
def open_all(path):
    stream = open_stream([{"files": path, "unit": "mm", "interval": "1h"}], network)
    return [float(np.nansum(stream.read(k, k + 1000).depth)) for k in range(0, len(stream), 1000)], len(stream)
open_all(sys.argv[1])
before = peak()
sums, n = open_all(sys.argv[2])
print(n, sum(sums), peak() - before)
"""


def test_a_large_file_in_little_memory(tmp_path: Path) -> None:
    """A file of 60 MB, whose record takes 140 MB, grows a process that has read a small one by less than 45 MB."""
    n, row = 78_000, ",".join(["0.1", "0.25", "", "12.5", "0.0"] * 40)
    names = ",".join(f"G{k}" for k in range(200))
    stamps = np.datetime_as_string(np.datetime64("1990-01-01T01:00") + np.arange(n) * np.timedelta64(60, "m"))
    large = written(tmp_path, f"time,{names}\n" + "".join(f"{stamp},{row}\n" for stamp in stamps), "large.csv")
    small = written(tmp_path, f"time,{names}\n{stamps[0]},{row}\n", "small.csv")
    assert large.stat().st_size > 60e6
    done = subprocess.run(
        [sys.executable, "-c", _BOUNDED, str(small), str(large)], capture_output=True, text=True, check=True
    )
    rows, total, grown = (float(word) for word in done.stdout.split())
    assert rows == n
    # 40 times 0.1 + 0.25 + 12.5 mm a row
    assert total == pytest.approx(n * 40 * 12.85)
    assert grown < 45
