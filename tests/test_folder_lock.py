"""A folder is held by one process, until it ends in whatever way."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from basinrain.folder_lock import FolderLock

HOLD = "import sys, time; from pathlib import Path; from basinrain.folder_lock import FolderLock; "
HOLD += "held = FolderLock(Path(sys.argv[1])); print('held', flush=True); time.sleep(60)"


def test_a_killed_process_holds_nothing(tmp_path: Path) -> None:
    """Another process's lock is seen with its number, and is gone when that process is killed."""
    path = tmp_path / "lock"
    with subprocess.Popen([sys.executable, "-c", HOLD, str(path)], stdout=subprocess.PIPE, text=True) as other:
        assert other.stdout is not None
        assert other.stdout.readline() == "held\n"
        with pytest.raises(BlockingIOError, match=rf"in use by another run \(process {other.pid}\)"):
            FolderLock(path)
        other.send_signal(signal.SIGKILL)
        other.wait()
    FolderLock(path).release()
    assert path.read_text() == f"{os.getpid()}\n"


def test_releasing_twice_is_once(tmp_path: Path) -> None:
    """A lock that was let go does not let go of the next one's."""
    first = FolderLock(tmp_path / "lock")
    first.release(remove=True)
    assert not (tmp_path / "lock").exists()
    second = FolderLock(tmp_path / "lock")
    first.release(remove=True)
    with pytest.raises(BlockingIOError, match="in use"):
        FolderLock(tmp_path / "lock")
    second.release()


def test_a_lock_needs_its_folder(tmp_path: Path) -> None:
    """No folder is made for it."""
    with pytest.raises(FileNotFoundError, match="none"):
        FolderLock(tmp_path / "none" / "lock")
