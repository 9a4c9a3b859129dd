"""Matrix products that round alike in every process."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from importlib import import_module
from threading import Lock

from threadpoolctl import threadpool_limits

__all__ = ["one_blas_thread"]

_lock = Lock()
_limits: list[threadpool_limits] = []
_users = 0


@contextmanager
def one_blas_thread() -> Iterator[None]:
    """Hold the linear algebra of this process to one thread within the block.

    A matrix product that is shared among two threads is cut elsewhere and rounds differently: with OpenBLAS a third of
    the numbers of a (720, 2000) by (2000, 1000) product differ in the last digit. With one thread it does not matter
    where a chunk is computed, on how many cores and beside how many others.

    The limit is the process's. Blocks of several threads may overlap; the earlier number of threads is back when the
    last of them ends.

    Examples
    --------
    >>> from threadpoolctl import threadpool_info
    >>> with one_blas_thread():
    ...     {pool["num_threads"] for pool in threadpool_info() if pool["user_api"] == "blas"}
    {1}
    """
    global _users  # noqa: PLW0603 - what it counts is the process's too
    with _lock:
        if not _users:
            # scipy has a linear algebra of its own, which must be there to be held.
            import_module("scipy.linalg")
            _limits.append(threadpool_limits(limits=1))
        _users += 1
    try:
        yield
    finally:
        with _lock:
            _users -= 1
            if not _users:
                _limits.pop().restore_original_limits()
