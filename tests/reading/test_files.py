"""Bytes of input files."""

from pathlib import Path

import pytest

from basinrain.errors import Problems, ReadError
from basinrain.reading.files import read_bytes, report_repeated


def test_read_bytes_reads_no_more_than_asked(tmp_path: Path) -> None:
    """A size bounds what is read; -1 is all."""
    path = tmp_path / "letters.txt"
    path.write_bytes(b"abcdef")
    assert (read_bytes(path, size=2), read_bytes(path)) == (b"ab", b"abcdef")


def test_repeated_files(tmp_path: Path) -> None:
    """A file named twice, and a copy of it under another name, are one line each; others of its size are not."""
    paths = [tmp_path / name for name in ("one.csv", "two.csv", "copy.csv", "gone.csv")]
    for path, content in zip(paths, ("abc", "abd", "abc"), strict=False):
        path.write_text(content)
    problems = Problems()
    report_repeated([*paths, paths[0]], problems)
    with pytest.raises(ReadError, match="each file once") as caught:
        problems.raise_as(ReadError)
    assert str(caught.value).splitlines() == [
        f"{paths[2]}: the file: found the same content as in {paths[0]}; expected each file once; name it once",
        f"{paths[0]}: the file: found it twice; expected each file once; name it once",
    ]
    nothing = Problems()
    report_repeated(paths[:2], nothing)
    assert len(nothing) == 0
