"""Bytes of input files; what keeps one from being read is said in words."""

from __future__ import annotations

from pathlib import Path

from basinrain.errors import Problem, ReadError

__all__ = ["read_bytes"]


def read_bytes(path: Path, *, size: int = -1, expected: str = "a header and rows") -> bytes:
    """Return a file's content.

    Parameters
    ----------
    path
    size
        Return no more than so many bytes from its start; -1 for all.
    expected
        What a file with nothing in it should hold.

    Raises
    ------
    ReadError
        The file is missing, a folder, unreadable or empty.

    Examples
    --------
    >>> read_bytes(Path("no_such_file.csv"))
    Traceback (most recent call last):
        ...
    basinrain.errors.ReadError: no_such_file.csv: the file: found nothing of that name; expected a file; correct the \
path
    """
    file = str(path)
    try:
        with path.open("rb") as stream:
            content = stream.read(size)
    except FileNotFoundError:
        problem = Problem(
            item="the file", found="nothing of that name", expected="a file", remedy="correct the path", file=file
        )
    except OSError as error:
        if path.is_dir():
            problem = Problem(item="the file", found="a folder", expected="a file", remedy="name a file", file=file)
        else:
            problem = Problem(
                item="the file",
                found=f"that it cannot be read ({error.strerror})",
                remedy="allow reading it, or copy it to where it can be read",
                file=file,
            )
    else:
        if content:
            return content
        problem = Problem(item="the file", found="nothing in it", expected=expected, file=file)
    raise ReadError(problem)
