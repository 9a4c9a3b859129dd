"""Bytes of input files."""

from pathlib import Path

from basinrain.reading.files import read_bytes


def test_read_bytes_reads_no_more_than_asked(tmp_path: Path) -> None:
    """A size bounds what is read; -1 is all."""
    path = tmp_path / "letters.txt"
    path.write_bytes(b"abcdef")
    assert (read_bytes(path, size=2), read_bytes(path)) == (b"ab", b"abcdef")
