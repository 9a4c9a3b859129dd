"""A lock on a folder that a run works in; it ends with the process, however that ends."""

from __future__ import annotations

import os
import sys
from contextlib import suppress
from pathlib import Path

if sys.platform == "win32":
    import msvcrt
else:
    import fcntl

__all__ = ["FolderLock"]


class FolderLock:
    """Holds a folder for one run, by the system's lock on a file in it.

    Parameters
    ----------
    path : Path
        The file of the lock; made where it is not there.

    Raises
    ------
    BlockingIOError
        Another run holds it; its ``strerror`` says which process.
    OSError
        The file cannot be made or locked.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "lock"
    >>> held = FolderLock(path)
    >>> try:
    ...     FolderLock(path)
    ... except BlockingIOError as error:
    ...     error.strerror == f"in use by another run (process {os.getpid()})"
    True
    >>> held.release()
    >>> FolderLock(path).release(remove=True)
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        self._file: int | None = None
        while self._file is None:
            file = os.open(path, os.O_RDWR | os.O_CREAT, 0o644)
            try:
                if not _lock(file):
                    holder = os.read(file, 20).decode("ascii", "replace").strip() or "unknown"
                    raise BlockingIOError(0, f"in use by another run (process {holder})")
                # A run that has just ended may have taken the file away in between.
                if _same(file, path):
                    os.truncate(file, 0)
                    os.write(file, f"{os.getpid()}\n".encode("ascii"))
                    self._file = file
            finally:
                if self._file is None:
                    os.close(file)

    def release(self, *, remove: bool = False) -> None:
        """Let go of the folder, and take the file away with ``remove``; again does nothing."""
        if self._file is None:
            return
        file, self._file = self._file, None
        if remove and sys.platform != "win32":
            with suppress(OSError):
                self._path.unlink()
        os.close(file)
        if remove and sys.platform == "win32":
            with suppress(OSError):
                self._path.unlink()


def _same(file: int, path: Path) -> bool:
    with suppress(FileNotFoundError):
        return os.path.samestat(os.fstat(file), path.stat())
    return False


def _lock(file: int) -> bool:
    """Lock an open file if nobody else has; the system lets go when it is closed."""
    try:
        if sys.platform == "win32":
            # A byte behind the process's number, which others may read.
            os.lseek(file, 1 << 10, os.SEEK_SET)
            msvcrt.locking(file, msvcrt.LK_NBLCK, 1)
            os.lseek(file, 0, os.SEEK_SET)
        else:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except (BlockingIOError, PermissionError):
        return False
    return True
