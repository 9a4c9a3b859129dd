"""Products round alike, however many threads there are."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from threadpoolctl import threadpool_info, threadpool_limits

from basinrain.blas import one_blas_thread


def threads_in_use() -> set[int]:
    """Return how many threads the libraries of linear algebra may use."""
    return {pool["num_threads"] for pool in threadpool_info() if pool["user_api"] == "blas"}


def test_a_product_has_the_same_bytes_whatever_the_limit_was() -> None:
    """Under one thread and under four a large product within the block is the same to the last digit."""
    rng = np.random.default_rng(5)
    depth, weights = rng.random((720, 2000)), rng.random((2000, 300))
    products = []
    for limit in (1, 4):
        with threadpool_limits(limits=limit, user_api="blas"), one_blas_thread():
            products.append((depth @ weights).tobytes())
    assert products[0] == products[1]


def test_the_earlier_number_of_threads_is_back_after_the_block() -> None:
    """The limit is the block's and leaves no trace."""
    with threadpool_limits(limits=3, user_api="blas"):
        with one_blas_thread():
            assert threads_in_use() == {1}
        assert threads_in_use() == {3}


def test_a_thread_is_held_for_good() -> None:
    """In a process of its own, a thread that holds itself to one thread stays so, and so does the process."""
    program = (
        "from threading import Thread; from test_blas import threads_in_use; "
        "from basinrain.blas import hold_to_one_blas_thread; "
        "thread = Thread(target=hold_to_one_blas_thread); thread.start(); thread.join(); print(threads_in_use())"
    )
    environment = os.environ | {"OPENBLAS_NUM_THREADS": "2", "PYTHONPATH": str(Path(__file__).parent)}
    run = subprocess.run([sys.executable, "-c", program], env=environment, capture_output=True, text=True, check=True)
    assert run.stdout == "{1}\n"


def test_a_block_that_fails_ends_too() -> None:
    """An error within the block does not leave the limit behind."""
    before = threads_in_use()
    with pytest.raises(ZeroDivisionError, match="division"), one_blas_thread():
        _ = 1 / len(before - before)
    assert threads_in_use() == before
