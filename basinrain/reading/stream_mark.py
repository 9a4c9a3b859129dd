"""Whether a file is still as it was when its times were read."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from basinrain.errors import Problem, ReadError
from basinrain.reading.files import read_bytes

__all__ = ["FileMark"]


@dataclass(frozen=True)
class FileMark:
    """A file's size, and when it was last written, in ns since 1970.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = path.write_text("time,A")
    >>> mark = FileMark.of(path)
    >>> mark.check()
    >>> _ = path.write_text("time,A,B")
    >>> mark.check()  # doctest: +ELLIPSIS
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: ...rain.csv: the file: found that it has changed since its times were read; \
expected the same content until the run ends; run again
    """

    path: Path
    size: int
    written: int

    @classmethod
    def of(cls, path: Path) -> FileMark:
        """Return the mark of a file; what keeps it from being read is a ReadError."""
        read_bytes(path, size=1)
        stat = path.stat()
        return cls(path, stat.st_size, stat.st_mtime_ns)

    def check(self) -> None:
        """Raise a ReadError where the file is gone or has changed."""
        try:
            stat = self.path.stat()
        except OSError:
            raise self.fault("that it is gone", "put it back, and run again") from None
        if (stat.st_size, stat.st_mtime_ns) != (self.size, self.written):
            raise self.changed()

    def changed(self) -> ReadError:
        """Return the error that the file has changed."""
        return self.fault("that it has changed since its times were read", "run again")

    def fault(self, found: str, remedy: str) -> ReadError:
        """Return an error of the file."""
        return ReadError(
            Problem(
                item="the file",
                found=found,
                expected="the same content until the run ends",
                remedy=remedy,
                file=str(self.path),
            )
        )
