"""A small record in chunks for tests of how chunks are run; worker processes import it too."""

from __future__ import annotations

import os
import signal
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import shapely

from basinrain.basins import Basins
from basinrain.errors import DataError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.infill.options import InfillOptions
from basinrain.rainfall import RainRecord
from basinrain.series.chunks import Chunk, LoadChunk, RecordSource, chunk_borders
from basinrain.series.engine import SeriesSetup
from basinrain.series_store import SeriesStore

KEY = "a job"
GAUGES, BASINS, STEPS, DAY = 12, 3, 24 * 12, 24


def small_setup() -> SeriesSetup:
    """Return twelve gauges over three strips, two policies and two methods."""
    rng = np.random.default_rng(11)
    network = GaugeNetwork(
        ids=tuple(f"G{n:02d}" for n in range(GAUGES)),
        x=rng.uniform(0, 9000, GAUGES),
        y=rng.uniform(0, 9000, GAUGES),
        crs="local",
    )
    strips = np.array([shapely.box(3000 * n, 0, 3000 * (n + 1), 9000) for n in range(BASINS)])
    return SeriesSetup(
        network=network,
        basins=Basins(ids=("west", "middle", "east"), polygons=strips, crs="local"),
        methods={"thiessen": {}, "arithmetic": {"gauges": "all"}},
        gaps=("reweight", "infill"),
        infill=InfillOptions(method="inverse-distance", scale="step"),
    )


def small_record(n_steps: int = STEPS) -> RainRecord:
    """Return hours of rain in which one value in ten is missing, and all at one step."""
    rng = np.random.default_rng(12)
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, n_steps + 1) * np.timedelta64(1, "h")
    depth = rng.gamma(0.3, 4.0, (n_steps, GAUGES)).round(1)
    depth[rng.random(depth.shape) < 0.1] = np.nan
    depth[n_steps // 3] = np.nan
    gauges = tuple(f"G{n:02d}" for n in range(GAUGES))
    return RainRecord.from_depths(gauges, ends - np.timedelta64(1, "h"), ends, depth, step="1h")


def small_source() -> RecordSource:
    """Return the record in chunks of a day."""
    return RecordSource(small_record(), None, chunk_borders(STEPS, steps_per_day=DAY, chunk_steps=DAY))


def small_store(folder: Path | None = None, *, key: str = KEY) -> SeriesStore:
    """Return the store of the record's series."""
    return SeriesStore.open(
        folder, key=key, n_steps=STEPS, n_basins=BASINS, series=small_setup().series, borders=small_source().borders
    )


def stored_bytes(store: SeriesStore) -> bytes:
    """Return every byte of a complete store."""
    arrays = [
        array(gaps, method)
        for gaps, method in small_setup().series
        for array in (store.depth, store.observed_share, store.flags)
    ]
    return b"".join(np.ascontiguousarray(array).tobytes() for array in arrays)


@dataclass(frozen=True, eq=False)
class SourceWith:
    """The record, with something that happens in the worker before each chunk is there."""

    before: Callable[[int], None]
    source: RecordSource = field(default_factory=small_source)

    @property
    def n_steps(self) -> int:
        """Steps of the record."""
        return self.source.n_steps

    @property
    def borders(self) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
        """Borders of the chunks."""
        return self.source.borders

    def task(self, k: int, /) -> LoadChunk:
        """Return what gives a chunk after that."""
        return _After(self.before, k, self.source.task(k))


@dataclass(frozen=True)
class _After:
    before: Callable[[int], None]
    k: int
    load: LoadChunk

    def __call__(self) -> Chunk:
        self.before(self.k)
        return self.load()


@dataclass(frozen=True)
class Slow:
    """Takes its time."""

    seconds: float

    def __call__(self, _: int) -> None:
        """Sleep."""
        time.sleep(self.seconds)


@dataclass(frozen=True)
class Deadly:
    """Kills its own process at one chunk: the first times that it comes, counted by files in a folder."""

    folder: Path
    chunk: int
    times: int

    def __call__(self, k: int) -> None:
        """Kill, perhaps."""
        if k != self.chunk:
            return
        died = len(list(self.folder.iterdir()))
        if died < self.times:
            (self.folder / f"{died}").write_text(str(os.getpid()))
            os.kill(os.getpid(), signal.SIGKILL)


@dataclass(frozen=True)
class Counting:
    """Leaves a file for every chunk that is computed."""

    folder: Path

    def __call__(self, k: int) -> None:
        """Leave the file."""
        (self.folder / f"{k}.{time.monotonic_ns()}").touch()


@dataclass(frozen=True)
class Faulty:
    """Finds fault with one chunk."""

    chunk: int

    def __call__(self, k: int) -> None:
        """Fail, perhaps."""
        if k == self.chunk:
            raise DataError([Problem(item="gauge A", found="a fault"), Problem(item="gauge B", found="another")])
