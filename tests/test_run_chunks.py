"""Chunks give the series of the record, and a run that was stopped goes on as if it had not been."""

from __future__ import annotations

import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
from chunked import (
    DAY,
    STEPS,
    Counting,
    Faulty,
    SourceWith,
    small_record,
    small_setup,
    small_source,
    small_store,
    stored_bytes,
)
from threadpoolctl import threadpool_limits

from basinrain.errors import DataError, JobError
from basinrain.run_chunks import run_chunks
from basinrain.series.engine import SeriesEngine
from basinrain.series_store import SeriesStore

CHUNKS = STEPS // DAY


@pytest.fixture(scope="module")
def undisturbed() -> bytes:
    """Return the bytes of a run here, in memory, without a break."""
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store)
        return stored_bytes(store)


def test_chunks_are_the_record_computed_at_once(undisturbed: bytes) -> None:
    """Chunk by chunk the depths are those of the whole record to 1e-12 mm, shares and flags the very same."""
    whole = SeriesEngine(small_setup()).compute(small_record())
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store)
        for name in small_setup().series:
            np.testing.assert_allclose(store.depth(*name), whole[name].depth, rtol=0, atol=1e-12)
            np.testing.assert_allclose(store.observed_share(*name), whole[name].observed_share, rtol=0, atol=1e-6)
            assert (store.flags(*name) == whole[name].flags).all()
        # The step at which no gauge reports is missing under every policy, and never zero.
        assert all(np.isnan(store.depth(*name)[STEPS // 3]).all() for name in small_setup().series)


def test_how_many_threads_the_processor_has_does_not_matter(undisturbed: bytes) -> None:
    """The same bytes where the libraries of linear algebra may use four threads, and the limit is back afterwards."""
    with threadpool_limits(limits=4, user_api="blas"), small_store() as store:
        run_chunks(small_setup(), small_source(), store)
        assert stored_bytes(store) == undisturbed


def test_progress_counts_steps() -> None:
    """It is told of 0, then of every chunk's end; on going on it begins with what is finished."""
    told: list[tuple[int, int]] = []
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store, progress=lambda *now: told.append(now))
        assert told == [(DAY * k, STEPS) for k in range(CHUNKS + 1)]
        told.clear()
        run_chunks(small_setup(), small_source(), store, progress=lambda *now: told.append(now))
        assert told == [(STEPS, STEPS)]


def test_only_missing_chunks_are_computed(tmp_path: Path, undisturbed: bytes) -> None:
    """A run that failed at the sixth chunk goes on with it; the first five are not computed again."""
    with small_store(tmp_path / "work") as store:
        with pytest.raises(DataError, match="gauge A: found a fault\ngauge B: found another"):
            run_chunks(small_setup(), SourceWith(Faulty(5)), store)
        assert store.missing_chunks == tuple(range(5, CHUNKS))
    (tmp_path / "seen").mkdir()
    with small_store(tmp_path / "work") as store:
        run_chunks(small_setup(), SourceWith(Counting(tmp_path / "seen")), store)
        assert sorted(int(path.stem) for path in (tmp_path / "seen").iterdir()) == list(range(5, CHUNKS))
        assert stored_bytes(store) == undisturbed


WORK = """
import sys
from pathlib import Path
from chunked import Slow, SourceWith, small_setup, small_store
from basinrain.run_chunks import run_chunks
with small_store(Path(sys.argv[1])) as store:
    run_chunks(small_setup(), SourceWith(Slow(0.2)), store, progress=lambda done, _: print(done, flush=True))
"""


@pytest.mark.parametrize("how", [signal.SIGKILL, signal.SIGINT], ids=["killed", "Ctrl-C"])
def test_a_stopped_run_goes_on_with_the_same_bytes(tmp_path: Path, undisturbed: bytes, how: signal.Signals) -> None:
    """A process that is stopped after its third chunk leaves three; another completes them to the same bytes."""
    program = f"import sys; sys.path.insert(0, {str(Path(__file__).parent)!r})\n{WORK}"
    command = [sys.executable, "-c", program, str(tmp_path / "work")]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True) as run:
        assert run.stdout is not None
        assert [run.stdout.readline() for _ in range(4)] == [f"{DAY * k}\n" for k in range(4)]
        # Within the fourth chunk.
        time.sleep(0.05)
        run.send_signal(how)
        assert run.wait() != 0
    with small_store(tmp_path / "work") as store:
        assert store.missing_chunks == tuple(range(3, CHUNKS))
        run_chunks(small_setup(), small_source(), store)
        assert stored_bytes(store) == undisturbed


@pytest.mark.parametrize(
    ("on", "advice"),
    [
        ("proceses", "did you mean 'processes'?"),
        ("", "one of: here, threads, processes"),
        ("tcp://", "one of: here, threads, processes"),
        ("tcp://10.0.0.5", "one of: here, threads, processes"),
        ("10.0.0.5:8786", "one of: here, threads, processes"),
    ],
)
def test_a_place_that_is_none_is_refused(on: str, advice: str) -> None:
    """The line says what was given, what would do, and what may have been meant."""
    with pytest.raises(JobError) as refused, small_store() as store:
        run_chunks(small_setup(), small_source(), store, on=on)
    address = "here, threads, processes or an address such as tcp://10.0.0.5:8786"
    assert str(refused.value) == f"[series] on: found '{on}'; expected {address}; {advice}"


def test_a_store_of_other_borders_is_refused() -> None:
    """Chunks are not put where others belong."""
    layout = {"key": "a job", "n_steps": STEPS, "n_basins": 3, "series": small_setup().series}
    one = SeriesStore.open(None, borders=[0, STEPS], **layout)  # type: ignore[arg-type]
    with one as store, pytest.raises(ValueError, match=r"the source has the borders .* the store \(0, 288\)"):
        run_chunks(small_setup(), small_source(), store)
    with small_store() as store, pytest.raises(ValueError, match="found 0 workers; expected 1 or more"):
        run_chunks(small_setup(), small_source(), store, workers=0)
