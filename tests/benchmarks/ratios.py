"""Ratios of speed and memory, measured in a child process with BLAS held to one thread."""

from __future__ import annotations

import json
import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

HERE: Final = Path(__file__).parent
ONE_THREAD: Final = dict.fromkeys(("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS"), "1")

Floats = npt.NDArray[np.float64]


def run_child(script: str, *arguments: str) -> dict[str, Any]:
    """Run a script of this folder in a process of its own and return the JSON object that it prints.

    BLAS is held to one thread in it. The script may import the package and this folder's modules.
    """
    paths = os.pathsep.join([str(HERE.parents[1]), str(HERE.parent)])
    child = subprocess.run(
        [sys.executable, str(HERE / script), *arguments],
        env={**os.environ, **ONE_THREAD, "PYTHONPATH": paths},
        capture_output=True,
        text=True,
        check=False,
    )
    assert child.returncode == 0, child.stderr
    found: dict[str, Any] = json.loads(child.stdout)
    return found


def seconds(work: Callable[[], object]) -> float:
    """Return how long a piece of work takes."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


class Ratios(NamedTuple):
    """How often one work took the time of another, by round, and the least time of both, s."""

    values: list[float]
    work: float
    beside: float

    @property
    def median(self) -> float:
        """The middle one of the ratios."""
        return statistics.median(self.values)

    def figures(self) -> dict[str, Any]:
        """Return what a script prints for its parent."""
        return {"median": self.median, "most": max(self.values), "work": self.work, "beside": self.beside}


def ratios(work: Callable[[], object], beside: Callable[[], object], *, rounds: int = 5, best_of: int = 3) -> Ratios:
    """Time ``work`` in times of ``beside``: in every round they take turns and the best of each counts.

    Both run once before, so that buffers and code are warm.
    """
    beside()
    work()
    values, mine, theirs = [], [], []
    for _ in range(rounds):
        pairs = [(seconds(work), seconds(beside)) for _ in range(best_of)]
        one, other = (min(side) for side in zip(*pairs, strict=True))
        values.append(one / other)
        mine.append(one)
        theirs.append(other)
    return Ratios(values, min(mine), min(theirs))


def product_of(depth: Floats, n_columns: int) -> Callable[[], object]:
    """Return one plain product of a record, missing as 0, with a dense table of ``n_columns``, into a warmed buffer."""
    filled = np.nan_to_num(depth)
    table = np.random.default_rng(2).random((depth.shape[1], n_columns))
    out = np.zeros((len(depth), n_columns))
    return lambda: np.matmul(filled, table, out=out)


def _resident(line: str) -> int:
    """Return a figure of this process's memory in bytes: ``VmRSS`` now, ``VmHWM`` the most so far (Linux)."""
    for text in Path("/proc/self/status").read_text(encoding="ascii").splitlines():
        if text.startswith(line + ":"):
            return int(text.split()[1]) * 1024
    raise RuntimeError(line)


def memory_growth(load: Callable[[], Floats], work: Callable[[Floats], object]) -> float:
    """Return (peak - memory before the record is loaded) / size of the record, so at least 1.

    ``load`` must not need more than the record itself (:func:`numpy.load` of a file), and nothing large may have been
    made in this process before: the peak is that of the whole process.
    """
    before = _resident("VmRSS")
    record = load()
    kept = work(record)
    growth = (_resident("VmHWM") - before) / record.nbytes
    del kept
    return growth
