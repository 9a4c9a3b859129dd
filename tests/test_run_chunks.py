"""Chunks give the series of the record, and a run that was stopped goes on as if it had not been."""

from __future__ import annotations

import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
import shapely
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

from basinrain.basins import Basins
from basinrain.blas import one_blas_thread
from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill.options import InfillOptions
from basinrain.rainfall import RainRecord, Status
from basinrain.run_chunks import run_chunks
from basinrain.series.chunks import RecordSource, chunk_borders
from basinrain.series.engine import SeriesEngine, SeriesSetup
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


def wide_setup() -> SeriesSetup:
    """Return thirty gauges over six strips, all policies and methods."""
    rng = np.random.default_rng(21)
    x, y = rng.uniform(0, 30_000, (2, 30))
    network = GaugeNetwork(ids=tuple(f"W{n:02d}" for n in range(30)), x=x, y=y, crs="local")
    strips = np.array([shapely.box(5000 * n, 0, 5000 * (n + 1), 30_000) for n in range(6)])
    return SeriesSetup(
        network=network,
        basins=Basins(ids=tuple("abcdef"), polygons=strips, crs="local"),
        methods={"thiessen": {}, "arithmetic": {"gauges": "all"}, "idw": {"cell": 1000.0}},
        gaps=("infill", "reweight", "infill-then-reweight"),
        infill=InfillOptions(method="inverse-distance", scale="day"),
    )


def coming_and_going(n_days: int = 20) -> tuple[RainRecord, npt.NDArray[np.bool_]]:
    """Return hours with outages, five gauges that open late and two that close early, and which gaps are long."""
    rng = np.random.default_rng(22)
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 24 * n_days + 1) * np.timedelta64(1, "h")
    depth = rng.gamma(0.3, 4.0, (len(ends), 30))
    status = np.full(depth.shape, Status.OBSERVED, dtype=np.uint8)
    for _ in range(60):
        at, silent, hours = rng.integers(0, len(ends)), rng.integers(0, 30), rng.integers(1, 100)
        status[at : at + hours, silent] = Status.MISSING
    for gauge in range(5):
        status[: 24 * 3 * gauge + 7, gauge] = Status.NOT_INSTALLED
    status[24 * 15 + 5 :, 28:] = Status.NOT_INSTALLED
    depth[np.isin(status, [Status.MISSING, Status.NOT_INSTALLED])] = np.nan
    starts = ends - np.timedelta64(1, "h")
    record = RainRecord(tuple(f"W{n:02d}" for n in range(30)), starts, ends, depth, status, step="1h")
    return record, longer_than(record, gap_mask(record), 2)


def test_what_an_engine_did_before_changes_no_byte() -> None:
    """Each chunk by an engine of its own, and all by one engine from the last to the first: the same bytes."""
    record, long = coming_and_going()
    source = RecordSource(record, long, chunk_borders(len(record), steps_per_day=24, chunk_steps=96))
    assert long.any()
    used = SeriesEngine(wide_setup())
    with one_blas_thread():
        for k in reversed(range(len(source.borders) - 1)):
            fresh, late = SeriesEngine(wide_setup()).compute(*source.task(k)()), used.compute(*source.task(k)())
            for name, part in fresh.items():
                for kind in ("depth", "observed_share", "flags"):
                    assert getattr(part, kind).tobytes() == getattr(late[name], kind).tobytes(), (k, name, kind)


LARGE = """
import sys
from pathlib import Path
import numpy as np, shapely
from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.rainfall import RainRecord
from basinrain.run_chunks import run_chunks
from basinrain.series.chunks import chunk_borders, chunk_steps_within
from basinrain.series.engine import SeriesSetup
from basinrain.series_store import SeriesStore

class Endless:
    def __init__(self, n_steps, borders):
        self.n_steps, self.borders = n_steps, borders
    def task(self, k):
        return lambda: self.chunk(int(self.borders[k]), int(self.borders[k + 1]))
    def chunk(self, first, stop):
        rng = np.random.default_rng(first)
        ends = np.datetime64("2001-01-01T00", "s") + np.arange(first + 1, stop + 1) * np.timedelta64(1, "h")
        depth = rng.random((stop - first, 300))
        depth[rng.random(depth.shape) < 0.001] = np.nan
        return RainRecord.from_depths(network.ids, ends - np.timedelta64(1, "h"), ends, depth, step="1h"), None

x, y = np.random.default_rng(1).uniform(0, 2e5, (2, 300))
network = GaugeNetwork(ids=tuple(f"G{n:03d}" for n in range(300)), x=x, y=y, crs="local")
boxes = np.array([shapely.box(2e4 * c, 1e4 * r, 2e4 * c + 2e4, 1e4 * r + 1e4) for c in range(10) for r in range(20)])
setup = SeriesSetup(
    network=network,
    basins=Basins(ids=tuple(f"B{n:03d}" for n in range(200)), polygons=boxes, crs="local"),
    methods={"thiessen": {}},
    gaps=("reweight", "infill"),
    infill=InfillOptions(method="inverse-distance", scale="step"),
)
most = chunk_steps_within(float(sys.argv[1]), 300, 200, 2)
n_steps = int(2.5 * most)
borders = chunk_borders(n_steps, steps_per_day=24, chunk_steps=most)
with SeriesStore.open(
    Path(sys.argv[2]), key="large", n_steps=n_steps, n_basins=200, series=setup.series, borders=borders
) as store:
    run_chunks(setup, Endless(n_steps, borders), store)
    assert not np.isnan(store.depth("reweight", "thiessen")[::1000]).any()
line = next(line for line in open("/proc/self/status") if line.startswith("VmHWM"))
print(int(line.split()[1]) * 1024)
"""


@pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="reads the process's memory where Linux shows it")
def test_a_run_stays_within_its_memory(tmp_path: Path) -> None:
    """With chunks of the size that is stated for 640 MiB the whole process has at most that, and at least a quarter."""
    bound = 640 << 20
    command = [sys.executable, "-c", LARGE, str(bound), str(tmp_path / "work")]
    run = subprocess.run(command, capture_output=True, text=True, check=True)
    assert 0.25 * bound < int(run.stdout) < bound


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
