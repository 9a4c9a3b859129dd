"""Small rainfall files for tests."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from basinrain.rainfall import RainRecord, Status
from basinrain.reading.rainfall import read_rainfall


def written(folder: Path, text: str | bytes, name: str = "rain.csv") -> Path:
    """Return a file with this content."""
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def read(folder: Path, text: str | bytes, **options: Any) -> RainRecord:  # noqa: ANN401 - any option of the reader
    """Return the record of a file with this content; wide, in mm and hourly unless the options say otherwise."""
    settings: dict[str, Any] = {"layout": "wide", "unit": "mm", "interval": "1h"} | options
    return read_rainfall([written(folder, text)], **settings)


def labels(record: RainRecord) -> list[list[str]]:
    """Return the statuses in words, a list for every step."""
    return [[Status(code).label for code in row] for row in record.status.tolist()]


def times(record: RainRecord) -> list[tuple[str, str]]:
    """Return start and end of every step, to the minute."""
    return [(str(a)[:16], str(b)[:16]) for a, b in zip(record.starts, record.ends, strict=True)]
