"""Wherever chunks are computed the bytes are the same, and what goes wrong there is one clear line."""

from __future__ import annotations

import builtins
import json
import logging
import os
import re
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import ExitStack, suppress
from dataclasses import dataclass, replace
from pathlib import Path
from threading import Thread
from typing import Any

import psutil
import pytest
from chunked import (
    DAY,
    STEPS,
    Counting,
    Deadly,
    Faulty,
    Slow,
    SourceWith,
    small_setup,
    small_source,
    small_store,
    stored_bytes,
)
from threadpoolctl import threadpool_info

from basinrain import cluster
from basinrain.errors import DataError, JobError
from basinrain.run_chunks import run_chunks

CHUNKS = STEPS // DAY


@pytest.fixture(scope="module")
def undisturbed() -> bytes:
    """Return the bytes of a run here."""
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store)
        return stored_bytes(store)


@pytest.fixture(autouse=True)
def _quiet(capfd: pytest.CaptureFixture[str]) -> Iterator[None]:
    """No run of this file writes a word to the terminal, from whatever process."""
    yield
    assert capfd.readouterr() == ("", "")


ENVIRONMENT = os.environ | {"PYTHONPATH": str(Path(__file__).parent)}


@dataclass(frozen=True)
class Others:
    """A scheduler and workers that somebody else has started, each a process of its own."""

    address: str
    scheduler: subprocess.Popen[bytes]
    workers: tuple[subprocess.Popen[bytes], ...] = ()


def started(stack: ExitStack, *words: str) -> subprocess.Popen[bytes]:
    """Start a program of Dask; it is killed and waited for at the end."""
    process = subprocess.Popen(
        [sys.executable, "-m", *words, "--no-dashboard", "--dashboard-address", "127.0.0.1:0"],
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        env=ENVIRONMENT,
    )
    stack.callback(process.wait)
    stack.callback(process.kill)
    return process


@pytest.fixture
def lone_scheduler(tmp_path: Path) -> Iterator[Others]:
    """Start a scheduler without workers."""
    noted = tmp_path / "scheduler.json"
    with ExitStack() as stack:
        words = ("--host", "127.0.0.1", "--port", "0", "--scheduler-file", str(noted))
        process = started(stack, "distributed.cli.dask_scheduler", *words)
        until = time.monotonic() + 60
        while not (noted.exists() and '"address"' in noted.read_text()):
            assert time.monotonic() < until
            time.sleep(0.05)
        yield Others(json.loads(noted.read_text())["address"], process)


@pytest.fixture
def strangers(lone_scheduler: Others, tmp_path: Path) -> Iterator[Others]:
    """Start a scheduler with two worker processes; one that dies stays dead."""
    with ExitStack() as stack:
        words = ("--nthreads", "1", "--no-nanny", "--host", "127.0.0.1", "--local-directory", str(tmp_path / "scratch"))
        two = [started(stack, "distributed.cli.dask_worker", lone_scheduler.address, *words) for _ in range(2)]
        yield replace(lone_scheduler, workers=tuple(two))


def workers_of(process: psutil.Process) -> list[psutil.Process]:
    """Return the worker processes that a process has started."""
    return [child for child in process.children(recursive=True) if "spawn_main" in " ".join(child.cmdline())]


def refused(on: str, source: Any = None, progress: Callable[[int, int], None] | None = None) -> str:  # noqa: ANN401
    """Run where it cannot be done and return the line."""
    with pytest.raises(JobError) as error, small_store() as store:
        run_chunks(small_setup(), source or small_source(), store, on=on, progress=progress)
    assert "\n" not in str(error.value)
    return str(error.value)


@pytest.mark.parametrize("on", ["threads", "processes"])
@pytest.mark.parametrize("workers", [1, 3])
def test_threads_and_processes_give_the_same_bytes(undisturbed: bytes, on: str, workers: int) -> None:
    """With one worker or three the store is that of a run here, and progress counts to the end."""
    before = [pool["num_threads"] for pool in threadpool_info()]
    told: list[tuple[int, int]] = []
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store, on=on, workers=workers, progress=lambda *now: told.append(now))
        assert stored_bytes(store) == undisturbed
    assert told == [(DAY * k, STEPS) for k in range(CHUNKS + 1)]
    assert [pool["num_threads"] for pool in threadpool_info()] == before
    assert workers_of(psutil.Process()) == []


def test_a_worker_process_that_is_killed_changes_nothing(tmp_path: Path, undisturbed: bytes) -> None:
    """Of two worker processes one is killed amid a chunk, and one from outside later: the bytes are the same."""
    (tmp_path / "deaths").mkdir()
    killed = []

    def kill_one(done: int, _: int) -> None:
        if done == 6 * DAY:
            killed.append(workers_of(psutil.Process())[0].pid)
            os.kill(killed[0], signal.SIGKILL)

    with small_store(tmp_path / "work") as store:
        source = SourceWith(Deadly(tmp_path / "deaths", chunk=3, times=1))
        run_chunks(small_setup(), source, store, on="processes", workers=2, progress=kill_one)
        assert stored_bytes(store) == undisturbed
    assert [path.name for path in (tmp_path / "deaths").iterdir()] == ["0"]
    assert len(killed) == 1


def test_a_chunk_that_kills_every_worker_ends_the_run(tmp_path: Path) -> None:
    """After four deaths over the same chunk the run ends in a line with the steps under way; finished chunks stay."""
    (tmp_path / "deaths").mkdir()
    with small_store(tmp_path / "work") as store:
        source = SourceWith(Deadly(tmp_path / "deaths", chunk=1, times=99))
        lost = r"lost while they computed steps (\d+) to (\d+); expected workers that live through a chunk"
        with pytest.raises(JobError, match=lost) as caught:
            run_chunks(small_setup(), source, store, on="processes", workers=1)
        # Which others were under way depends on how fast they are; the deadly one, steps 25 to 48, is among them.
        first, last = map(int, re.findall(r"steps (\d+) to (\d+)", str(caught.value))[0])
        assert first <= 25
        assert last >= 48
        finished = set(range(CHUNKS)) - set(store.missing_chunks)
        assert 1 not in finished
    assert len(list((tmp_path / "deaths").iterdir())) == 4
    (tmp_path / "seen").mkdir()
    with small_store(tmp_path / "work") as store:
        run_chunks(small_setup(), SourceWith(Counting(tmp_path / "seen")), store)
    assert {int(path.stem) for path in (tmp_path / "seen").iterdir()} == set(range(CHUNKS)) - finished


WORK = """
import sys
from pathlib import Path
from chunked import Slow, SourceWith, small_setup, small_store
from basinrain.run_chunks import run_chunks

if __name__ == "__main__":
    with small_store(Path(sys.argv[1])) as store:
        try:
            source = SourceWith(Slow(0.3))
            tell = lambda done, _: print(done, flush=True)
            run_chunks(small_setup(), source, store, on="processes", workers=2, progress=tell)
        except KeyboardInterrupt:
            print("stopped")
"""


@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGKILL], ids=["Ctrl-C", "killed"])
def test_stopping_the_run_stops_its_workers_without_a_word(
    tmp_path: Path, undisturbed: bytes, how: signal.Signals
) -> None:
    """Ctrl-C reaches workers too, as in a terminal: they say nothing and end, as they do when the run is killed."""
    (tmp_path / "work.py").write_text(WORK)
    command = [sys.executable, str(tmp_path / "work.py"), str(tmp_path / "work")]
    with subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=ENVIRONMENT, start_new_session=True
    ) as run:
        assert run.stdout is not None
        assert [run.stdout.readline() for _ in range(3)] == ["0\n", f"{DAY}\n", f"{2 * DAY}\n"]
        workers = workers_of(psutil.Process(run.pid))
        assert len(workers) == 2
        if how == signal.SIGINT:
            os.killpg(run.pid, how)
        else:
            run.send_signal(how)
        said, complaint = run.communicate(timeout=60)
    if how == signal.SIGINT:
        assert complaint == ""
    assert said.endswith("stopped\n") == (how == signal.SIGINT)
    assert psutil.wait_procs(workers, timeout=30)[1] == []
    with small_store(tmp_path / "work") as store:
        assert 0 < len(store.missing_chunks) <= CHUNKS - 2
        run_chunks(small_setup(), small_source(), store)
        assert stored_bytes(store) == undisturbed


@pytest.mark.parametrize("on", ["threads", "processes"])
def test_what_a_worker_finds_at_fault_arrives_whole(on: str) -> None:
    """An error of the data is the same error here, with all its lines."""
    with small_store() as store:
        with pytest.raises(DataError, match=r"^gauge A: found a fault\ngauge B: found another$") as error:
            run_chunks(small_setup(), SourceWith(Faulty(2)), store, on=on, workers=1)
        assert [problem.item for problem in error.value.problems] == ["gauge A", "gauge B"]
        assert not store.is_done(2)


def test_no_more_chunks_are_under_way_than_workers_and_one(tmp_path: Path) -> None:
    """While the first result is waited for, two workers have been given three chunks."""
    (tmp_path / "seen").mkdir()
    begun: list[int] = []

    def look(done: int, _: int) -> None:
        begun.append(len(list((tmp_path / "seen").iterdir())) - done // DAY)

    with small_store() as store:
        source = SourceWith(Counting(tmp_path / "seen"))
        run_chunks(small_setup(), source, store, on="threads", workers=2, progress=look)
    assert max(begun) <= 3


def test_local_workers_listen_on_the_loopback_address_only() -> None:
    """No other machine reaches the ports of threads or processes, and none of them answers with pages."""
    heard: set[str] = set()

    def listen(*_: int) -> None:
        for process in (psutil.Process(), *workers_of(psutil.Process())):
            heard.update(at.laddr.ip for at in process.net_connections("inet") if at.status == psutil.CONN_LISTEN)

    for on in ("threads", "processes"):
        with small_store() as store:
            run_chunks(small_setup(), small_source(), store, on=on, workers=1, progress=listen)
        assert heard == {"127.0.0.1"}


def test_a_scheduler_of_others_gives_the_same_bytes(strangers: Others, undisturbed: bytes) -> None:
    """By its address, twice in a row, with engines freed in between."""
    for workers in (None, 1):
        with small_store() as store:
            run_chunks(small_setup(), small_source(), store, on=strangers.address, workers=workers)
            assert stored_bytes(store) == undisturbed


def test_a_scheduler_that_loses_one_of_two_workers_goes_on(
    strangers: Others, tmp_path: Path, undisturbed: bytes
) -> None:
    """A worker that is killed for good leaves its chunks to the other."""
    (tmp_path / "deaths").mkdir()
    with small_store() as store:
        source = SourceWith(Deadly(tmp_path / "deaths", chunk=4, times=1))
        run_chunks(small_setup(), source, store, on=strangers.address)
        assert stored_bytes(store) == undisturbed
    assert len(list((tmp_path / "deaths").iterdir())) == 1


def test_a_scheduler_that_loses_all_workers_is_waited_for_and_then_given_up(
    strangers: Others, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The line says how long there was no worker."""
    monkeypatch.setattr(cluster, "WORKER_SECONDS", 2.0)

    def kill_all(done: int, _: int) -> None:
        if done == 2 * DAY:
            for worker in strangers.workers:
                worker.kill()

    line = refused(strangers.address, SourceWith(Slow(0.05)), kill_all)
    assert line == (
        f"[series] on: found no worker for 2 s; expected workers of {strangers.address}; "
        "start workers and run again; finished chunks stay"
    )


def test_a_scheduler_without_workers_is_given_up(lone_scheduler: Others, monkeypatch: pytest.MonkeyPatch) -> None:
    """When no worker comes within the time for it, the line says so."""
    monkeypatch.setattr(cluster, "WORKER_SECONDS", 1.0)
    line = refused(lone_scheduler.address)
    assert line.startswith(f"[series] on: found no worker for 1 s; expected workers of {lone_scheduler.address}; start")


def test_a_scheduler_that_ends_amid_the_run_is_one_line(
    strangers: Others, tmp_path: Path, undisturbed: bytes, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A scheduler that is killed ends the run; finished chunks stay, and another run completes them."""
    monkeypatch.setattr(cluster, "REACH_SECONDS", 2.0)

    def kill(done: int, _: int) -> None:
        if done == 2 * DAY:
            strangers.scheduler.kill()

    gone = rf"found the scheduler at {strangers.address} gone; expected .*; finished chunks stay"
    with small_store(tmp_path / "work") as store:
        with pytest.raises(JobError, match=gone):
            run_chunks(small_setup(), SourceWith(Slow(0.1)), store, on=strangers.address, progress=kill)
        assert 0 < len(store.missing_chunks) <= CHUNKS - 2
    with small_store(tmp_path / "work") as store:
        run_chunks(small_setup(), small_source(), store)
        assert stored_bytes(store) == undisturbed


@pytest.mark.parametrize("address", ["tcp://127.0.0.1:9", "tcp://nowhere.invalid:8786"])
def test_a_scheduler_that_cannot_be_reached_is_one_line(address: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Nobody listens, or no such machine: the line has the address, the time given, and what to do."""
    monkeypatch.setattr(cluster, "REACH_SECONDS", 0.5)
    assert refused(address) == (
        f"[series] on: found no scheduler that answers at {address} within 0.5 s; expected the address of a running "
        'one; start it with `dask scheduler`, or on = "here"; finished chunks stay'
    )


@pytest.mark.parametrize(
    "answer", [b"", b"HTTP/1.1 400 Bad Request\r\nContent-Length: 0\r\n\r\n" * 3], ids=["none", "http"]
)
def test_a_server_of_another_kind_is_no_scheduler(answer: bytes, monkeypatch: pytest.MonkeyPatch) -> None:
    """Somebody who listens and says nothing, or something else, is as nobody."""
    monkeypatch.setattr(cluster, "REACH_SECONDS", 0.5)
    with socket.create_server(("127.0.0.1", 0)) as server, ExitStack() as stack:

        def serve() -> None:
            with suppress(OSError):
                while True:
                    stack.enter_context(server.accept()[0]).sendall(answer)

        serving = Thread(target=serve, daemon=True)
        serving.start()
        address = f"tcp://127.0.0.1:{server.getsockname()[1]}"
        line = refused(address)
        server.shutdown(socket.SHUT_RDWR)
        serving.join(10)
    assert line.startswith(f"[series] on: found no scheduler that answers at {address} within 0.5 s; expected")


def test_a_worker_of_other_versions_is_refused(strangers: Others, monkeypatch: pytest.MonkeyPatch) -> None:
    """A worker computes only with the versions of the run; the line names what differs."""
    own = cluster._versions()
    monkeypatch.setattr(cluster, "_versions", lambda: own | {"numpy": "1.0"})
    line = refused(strangers.address)
    assert re.search(rf"found a worker on \S+ with numpy {re.escape(own['numpy'])}; expected numpy 1.0; give ", line)


@pytest.mark.parametrize("package", ["dask", "distributed"])
def test_without_the_extra_the_line_says_how_to_get_it(package: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where the packages are not installed nothing is tried."""
    real = builtins.__import__

    def without(name: str, *args: Any, **kwargs: Any) -> Any:  # noqa: ANN401 - stands for the built-in
        if name == package:
            raise ModuleNotFoundError(name, name=name)
        return real(name, *args, **kwargs)

    monkeypatch.setattr(builtins, "__import__", without)
    assert refused("threads") == (
        f"[series] on: found {package} not installed; expected the packages dask and distributed; "
        "pip install 'basinrain[cluster]', or on = \"here\"; finished chunks stay"
    )


def test_engines_are_kept_by_what_they_compute_and_freed() -> None:
    """A thread has one engine: the same for chunks of one setup, another for another, none when it is freed."""
    versions = cluster._versions()
    load = small_source().task(0)
    try:
        first = cluster.compute_chunk(small_setup(), "one", load, versions)
        ((known, engine),) = cluster._engines.values()
        cluster.compute_chunk(small_setup(), "one", load, versions)
        assert next(iter(cluster._engines.values())) == (known, engine) == ("one", engine)
        cluster.compute_chunk(small_setup(), "two", load, versions)
        assert next(iter(cluster._engines.values()))[1] is not engine
        assert first.keys() == set(small_setup().series)
    finally:
        cluster.forget_engines()
    assert cluster._engines == {}


def test_levels_of_log_are_as_before() -> None:
    """Dask's loggers are silent in a run only."""
    logger = logging.getLogger("distributed.scheduler")
    logger.setLevel(logging.ERROR)
    with small_store() as store:
        run_chunks(small_setup(), small_source(), store, on="threads", workers=1)
    assert logger.level == logging.ERROR
    logger.setLevel(logging.NOTSET)
