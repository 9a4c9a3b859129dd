"""Chunks on Dask: threads or processes of this machine, or the workers of a scheduler."""

from __future__ import annotations

import asyncio
import hashlib
import logging
import os
import pickle
import platform
import queue
import signal
import tempfile
import threading
import time
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import CancelledError, ThreadPoolExecutor
from contextlib import ExitStack, contextmanager, suppress
from importlib.metadata import PackageNotFoundError, version
from typing import TYPE_CHECKING, Any, Final

from basinrain.blas import hold_to_one_blas_thread, one_blas_thread
from basinrain.errors import JobError, Problem
from basinrain.series.chunks import ChunkSource, LoadChunk
from basinrain.series.engine import SeriesEngine, SeriesPart, SeriesSetup

if TYPE_CHECKING:
    from distributed import Client, Future

__all__ = ["REACH_SECONDS", "WORKER_SECONDS", "compute_chunk", "dask_setup", "forget_engines", "run_on_cluster"]

Parts = dict[tuple[str, str], SeriesPart]

REACH_SECONDS: Final = 15.0
"""How long a scheduler may take to answer."""
WORKER_SECONDS: Final = 60.0
"""How long there may be no worker, at the start or when all are lost."""
_TICK: Final = 0.5
"""Seconds between two looks at the workers."""
_GATHER_SECONDS: Final = 120.0
"""After how long a result that does not come is asked for again."""
_SAME: Final = ("basinrain", "numpy", "scipy", "shapely", "pyproj")
"""Packages of which a worker must have the versions that the run has."""

_SETTINGS: Final = {
    # Chunks of a record in memory travel through the scheduler on purpose: one that has lost its worker is sent again.
    "distributed.admin.large-graph-warning-threshold": "1TiB",
    # A worker that computes for minutes without a break is not ill.
    "distributed.admin.tick.limit": "1h",
    "distributed.comm.timeouts.connect": f"{REACH_SECONDS}s",
    # A worker process says nothing from its very start, before it is told how loud to be.
    "distributed.nanny.pre-spawn-environ.DASK_LOGGING__DISTRIBUTED": "critical",
    "distributed.scheduler.http.routes": [],
    "distributed.worker.http.routes": [],
}

_engines: dict[int, tuple[str, SeriesEngine]] = {}
"""The engine of every thread of this process that has computed a chunk, with the digest of its setup."""


def run_on_cluster(
    setup: SeriesSetup,
    source: ChunkSource,
    chunks: Sequence[int],
    take: Callable[[int, Parts], None],
    *,
    on: str,
    workers: int | None = None,
) -> None:
    """Compute chunks on Dask and hand each over as it is finished.

    At most one chunk more than there are workers is under way. A chunk whose worker dies is computed again elsewhere.

    Parameters
    ----------
    setup, source
        What to compute, and of which record.
    chunks
        The chunks to compute.
    take
        Is called in this thread with each chunk and its series.
    on
        ``"threads"``, ``"processes"``, or the address of a scheduler.
    workers
        How many; by default the processors of this machine, or all threads of the scheduler's workers.

    Raises
    ------
    JobError
        Dask is not installed, the scheduler does not answer, has no workers or loses them all, a worker has other
        versions, or one chunk has brought down worker after worker.

    Examples
    --------
    See :func:`basinrain.run_chunks.run_chunks`, which calls it.
    """
    with ExitStack() as stack:
        stack.enter_context(_prepared())
        client = stack.enter_context(_connected(on, workers))
        if on == "threads":
            # In this process the limit ends with the run.
            stack.enter_context(one_blas_thread())
        _Run(client, on, workers, setup, source).run(chunks, take)


def compute_chunk(setup: SeriesSetup, digest: str, load: LoadChunk, versions: dict[str, str]) -> Parts:
    """Compute a chunk in a worker; its engine is prepared once per thread.

    Raises
    ------
    JobError
        This worker has other versions than the run.
    """
    here = _versions()
    if here != versions:
        differ = sorted(name for name in versions if here[name] != versions[name])
        raise _refused(
            f"a worker on {platform.node()} with {', '.join(f'{name} {here[name]}' for name in differ)}",
            expected=", ".join(f"{name} {versions[name]}" for name in differ),
            remedy="give scheduler and workers the versions of this run, for results do not depend on the worker then",
        )
    thread = threading.get_ident()
    hold_to_one_blas_thread()
    known, engine = _engines.get(thread, ("", None))
    if engine is None or known != digest:
        engine = SeriesEngine(setup)
        _engines[thread] = digest, engine
    return engine.compute(*load())


def forget_engines() -> None:
    """Free what this process has prepared."""
    _engines.clear()


def dask_setup(_: Any) -> None:  # noqa: ANN401 - Dask hands over the worker
    """Leave Ctrl-C to the process that started this worker; Dask calls this when a worker process starts."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)


def _versions() -> dict[str, str]:
    return {"python": platform.python_version(), **{name: version(name) for name in _SAME}}


class _Run:
    """The chunks of one run on a client's workers."""

    def __init__(self, client: Client, on: str, workers: int | None, setup: SeriesSetup, source: ChunkSource) -> None:
        self._client, self._on, self._workers, self._source = client, on, workers, source
        packed = pickle.dumps(setup, protocol=pickle.HIGHEST_PROTOCOL)
        self._digest = hashlib.sha256(packed).hexdigest()
        # As a task of its own it reaches every worker once, and comes to life again when its worker dies.
        self._setup = client.submit(pickle.loads, packed, key=f"basinrain-setup-{os.urandom(8).hex()}")
        self._versions = _versions()
        self._name = os.urandom(8).hex()
        self._under_way: dict[int, Future] = {}
        self._ended: queue.SimpleQueue[int] = queue.SimpleQueue()
        self._threads = workers or 1
        self._alone_since: float | None = None

    def run(self, chunks: Sequence[int], take: Callable[[int, Parts], None]) -> None:
        waiting = deque(chunks)
        self._look()
        while waiting or self._under_way:
            while waiting and len(self._under_way) <= self._threads:
                self._start(waiting.popleft())
            try:
                k = self._ended.get(timeout=_TICK)
            except queue.Empty:
                self._look()
                continue
            parts = self._result(k)
            del self._under_way[k]
            take(k, parts)
        with suppress(OSError, TimeoutError):
            self._client.run(forget_engines)

    def _start(self, k: int) -> None:
        future = self._client.submit(
            compute_chunk,
            self._setup,
            self._digest,
            self._source.task(k),
            self._versions,
            key=f"basinrain-chunk-{self._name}-{k}",
        )
        self._under_way[k] = future
        future.add_done_callback(lambda _: self._ended.put(k))

    def _result(self, k: int) -> Parts:
        from distributed import KilledWorker

        while True:
            try:
                parts: Parts = self._under_way[k].result(timeout=_GATHER_SECONDS)
            except KilledWorker:
                # Which of the chunks that the dead workers had brought them down is not known.
                first, last = min(self._under_way), max(self._under_way)
                steps = f"{self._source.borders[first] + 1} to {self._source.borders[last + 1]}"
                raise _refused(
                    f"one worker after the other lost while they computed steps {steps}",
                    expected="workers that live through a chunk",
                    remedy="give them more memory or ask for less with [series] memory",
                ) from None
            except CancelledError:
                self._look()
                raise self._gone() from None
            except TimeoutError:
                self._look()
            else:
                return parts

    def _look(self) -> None:
        """See how many workers there are; fail when the scheduler is gone, or when there has been none for long."""
        if self._client.status not in {"running", "connecting"}:
            raise self._gone()
        try:
            threads = sum(self._client.nthreads().values())
        except (OSError, TimeoutError):
            raise self._gone() from None
        if threads:
            self._alone_since = None
            self._threads = self._workers or threads
            return
        now = time.monotonic()
        self._alone_since = self._alone_since or now
        if now - self._alone_since > WORKER_SECONDS:
            raise _refused(
                f"no worker for {WORKER_SECONDS:g} s",
                expected=f"workers of {self._on}",
                remedy="start workers and run again",
            )

    def _gone(self) -> JobError:
        return _refused(
            f"the scheduler at {self._on} gone",
            expected="a scheduler that lives as long as the run",
            remedy="start it and run again",
        )


@contextmanager
def _prepared() -> Iterator[None]:
    """Load Dask, and keep it from writing to the terminal."""
    try:
        import dask
        import distributed  # noqa: F401 - sets up its loggers, which are silenced below
    except ImportError as error:
        raise _refused(
            f"{error.name or 'dask'} not installed",
            expected="the packages dask and distributed",
            remedy="pip install 'basinrain[cluster]', or on = \"here\"",
        ) from None
    talkers = ("distributed", "tornado")
    levels = {
        name: logging.getLogger(name).level for name in logging.root.manager.loggerDict if name.startswith(talkers)
    }
    for name in levels:
        logging.getLogger(name).setLevel(logging.CRITICAL + 1)
    try:
        with dask.config.set(_SETTINGS):
            yield
    finally:
        for name, level in levels.items():
            logging.getLogger(name).setLevel(level)


@contextmanager
def _connected(on: str, workers: int | None) -> Iterator[Client]:
    from distributed import Client, LocalCluster

    if on not in {"threads", "processes"}:
        try:
            # In a thread, since this one may have an event loop of its own, as in a notebook.
            with ThreadPoolExecutor(1) as pool:
                pool.submit(asyncio.run, _require_scheduler(on)).result()
            client = Client(on, timeout=REACH_SECONDS, set_as_default=False)
        except OSError:
            raise _refused(
                f"no scheduler that answers at {on} within {REACH_SECONDS:g} s",
                expected="the address of a running one",
                remedy='start it with `dask scheduler`, or on = "here"',
            ) from None
        with client:
            _require_package(client)
            yield client
        return
    count = workers or os.cpu_count() or 1
    processes, threads = (count, 1) if on == "processes" else (1, count)
    with (
        tempfile.TemporaryDirectory(prefix="basinrain-") as scratch,
        LocalCluster(
            **({"preload": [__name__]} if on == "processes" else {}),
            n_workers=processes,
            threads_per_worker=threads,
            processes=on == "processes",
            # No port but on the loopback address, and no page on any.
            host="127.0.0.1",
            protocol="tcp://",
            dashboard_address="127.0.0.1:0",
            scheduler_kwargs={"dashboard": False},
            silence_logs=logging.CRITICAL + 1,
            local_directory=scratch,
            # Chunks bound the memory; a limit of its own would stop workers halfway.
            memory_limit=0,
        ) as cluster,
        Client(cluster, set_as_default=False) as client,
    ):
        yield client


async def _require_scheduler(address: str) -> None:
    """Ask who is at an address; a client would wait for ever for one that listens and says nothing."""
    from distributed.core import rpc
    from distributed.security import Security

    arguments = Security().get_connection_args("client")
    try:
        async with asyncio.timeout(REACH_SECONDS), rpc(address, connection_args=arguments) as there:
            kind = (await there.identity())["type"]
    except Exception as error:
        # Another kind of server may answer with anything.
        raise ConnectionError(address) from error
    if kind != "Scheduler":
        raise ConnectionError(address)


def _require_package(client: Client) -> None:
    """Fail where scheduler or workers lack this package, without which they cannot even read what is sent."""
    own = version("basinrain")
    try:
        found = {client.run_on_scheduler(version, "basinrain"), *client.run(version, "basinrain").values()}
    except PackageNotFoundError:
        found = {"of no version"}
    if found != {own}:
        raise _refused(
            f"a scheduler or worker with the package basinrain {', '.join(sorted(found - {own}))}",
            expected=f"version {own}, as here",
            remedy=f"pip install 'basinrain[cluster]=={own}' there",
        )


def _refused(found: str, *, expected: str, remedy: str) -> JobError:
    remedy += "; finished chunks stay"
    return JobError(Problem(item="[series] on", found=found, expected=expected, remedy=remedy))
