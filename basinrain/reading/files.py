"""Bytes of input files; what keeps one from being read is said in words."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import Path

from basinrain.errors import Problem, Problems, ReadError

__all__ = ["read_bytes", "report_repeated"]


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


def report_repeated(paths: Sequence[Path], problems: Problems) -> None:
    """Report files that come twice, under one name or two: each in one line, in place of one for all its values.

    Parameters
    ----------
    paths
        The files of one source. Those that cannot be read are passed over.
    problems
        Takes what is found.

    Examples
    --------
    >>> import tempfile
    >>> from basinrain.errors import Problems
    >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
    >>> _ = path.write_text("time,A")
    >>> problems = Problems()
    >>> report_repeated([path, path], problems)
    >>> len(problems)
    1
    """
    sizes: dict[int, list[Path]] = {}
    for path in paths:
        if path.is_file():
            sizes.setdefault(path.stat().st_size, []).append(path)
    for alike in sizes.values():
        kept: list[tuple[Path, bytes]] = []
        for path in alike if len(alike) > 1 else ():
            with path.open("rb") as stream:
                content = hashlib.file_digest(stream, "sha256").digest()
            first = next((other for other, its in kept if its == content), None)
            if first is not None:
                problems.add(
                    item="the file",
                    found="it twice" if first == path else f"the same content as in {first}",
                    expected="each file once",
                    remedy="name it once",
                    file=str(path),
                )
            kept.append((path, content))
