"""How much memory it takes to read a rainfall file whole."""

from __future__ import annotations

from pathlib import Path
from typing import Final

__all__ = ["bytes_to_read"]

_PER_TEXT_BYTE: Final = 10
"""Bytes at the height of the work for every byte of delimited text: its cells are text before they are numbers."""
_PER_VALUE: Final = 40
"""Bytes for every value of a file of numbers, and of its record."""


def bytes_to_read(path: Path) -> int:
    r"""Return about how many bytes it takes to read a rainfall file whole.

    Parameters
    ----------
    path
        Delimited text, Parquet or NetCDF. What is wrong with it is told where it is read: 0 for what cannot be opened.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = path.write_text("date,A\n2031-05-04,1.5\n")
    >>> bytes_to_read(path), bytes_to_read(path.with_name("gone.csv"))
    (220, 0)
    """
    try:
        if path.suffix.lower() in {".parquet", ".pq"}:
            from pyarrow.parquet import read_metadata

            about = read_metadata(path)
            return int(about.num_rows * about.num_columns * _PER_VALUE)
        if path.suffix.lower() in {".nc", ".nc4"}:
            from netCDF4 import Dataset

            with Dataset(path) as file:
                return int(max((variable.size for variable in file.variables.values()), default=0) * _PER_VALUE)
        return path.stat().st_size * _PER_TEXT_BYTE
    except (OSError, ImportError, ValueError):
        return 0
