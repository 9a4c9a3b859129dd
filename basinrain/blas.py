"""Matrix products that round alike in every process."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from importlib import import_module

from threadpoolctl import threadpool_limits

__all__ = ["hold_to_one_blas_thread", "one_blas_thread"]


@contextmanager
def one_blas_thread() -> Iterator[None]:
    """Hold the linear algebra of this process to one thread within the block.

    A matrix product that is shared among two threads is cut elsewhere and rounds differently: with OpenBLAS a third of
    the numbers of a (720, 2000) by (2000, 1000) product differ in the last digit. With one thread it does not matter
    where a chunk is computed, on how many cores and beside how many others.

    Examples
    --------
    >>> from threadpoolctl import threadpool_info
    >>> with one_blas_thread():
    ...     {pool["num_threads"] for pool in threadpool_info() if pool["user_api"] == "blas"}
    {1}
    """
    _load()
    with threadpool_limits(limits=1):
        yield


def hold_to_one_blas_thread() -> None:
    """Hold the linear algebra of this thread to one thread, for good: for threads that compute nothing else.

    Libraries that have one limit for the whole process keep it as well. Blocks of :func:`one_blas_thread` in several
    threads would take it from each other.

    Examples
    --------
    See :func:`basinrain.cluster.compute_chunk`, which runs in workers.
    """
    _load()
    threadpool_limits(limits=1)


def _load() -> None:
    # scipy has a linear algebra of its own, which must be there to be held.
    import_module("scipy.linalg")
