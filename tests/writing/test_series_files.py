"""Series go to all formats that a job names, whole or not at all, within bounded memory, and the same each time."""

from __future__ import annotations

import hashlib
import importlib.util
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd
import pytest
from small_series import BASINS, SERIES, Kept, drawn, hours, small_content

from basinrain.errors import JobError, WriteError
from basinrain.jobfile.series_tables import FORMATS as JOB_FORMATS
from basinrain.series.regrouping import regroup
from basinrain.writing.folder import whole_folder
from basinrain.writing.series_content import SeriesContent
from basinrain.writing.series_files import FORMATS, check_formats, write_series_files

EVERY = list(FORMATS)
FILES = ["hyetographs", "series.csv", "series.nc", "series.parquet"]


def digests(folder: Path) -> dict[str, str]:
    """Return the digest of every file below a folder."""
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def exact(path: Path) -> pd.DataFrame:
    """Read a CSV file, depths to the last bit whatever way pandas parses numbers."""
    table = pd.read_csv(path, dtype=str)
    depths = [name for name in table.columns if name.startswith("depth") and name != "depth_unit"]
    return table.assign(**{name: table[name].map(float) for name in depths})


def test_formats_are_those_of_the_job() -> None:
    """What a job may say and what can be written are the same words."""
    assert tuple(FORMATS) == tuple(JOB_FORMATS)


def test_all_formats_at_once(tmp_path: Path) -> None:
    """The names of what was made come back, in order, whatever order they were asked for in."""
    assert write_series_files(tmp_path, small_content(), formats=[*EVERY[::-1], "csv"]) == FILES
    assert sorted(path.name for path in tmp_path.iterdir()) == FILES


def test_the_same_series_give_the_same_bytes(tmp_path: Path) -> None:
    """Nothing of the time of writing goes into any file."""
    made = []
    for name in ("one", "two"):
        (tmp_path / name).mkdir()
        write_series_files(tmp_path / name, small_content(), formats=EVERY)
        made.append(digests(tmp_path / name))
        time.sleep(1.1)
    assert made[0] == made[1]
    assert len(made[0]) == len(BASINS) + 4


def test_formats_say_the_same_of_a_regrouped_series(tmp_path: Path) -> None:
    """Six-hour sums in UTC have the same digits in CSV, Parquet and NetCDF, which were read in parts of their own."""
    import xarray as xr

    starts, ends = hours(50)
    grouped = regroup(starts, ends, step="6h", zone="+02:00", timezone="UTC")
    source = grouped.source(drawn(50, len(BASINS)))
    content = small_content(source=source, starts=grouped.starts, ends=grouped.ends, zone=grouped.zone)
    write_series_files(tmp_path, content, formats=EVERY)
    table = exact(tmp_path / "series.csv")
    parquet = pd.read_parquet(tmp_path / "series.parquet")
    np.testing.assert_array_equal(table["depth"], parquet["depth"])
    assert (pd.to_datetime(table["time"], utc=True) == parquet["time"]).all()
    with xr.open_dataset(tmp_path / "series.nc") as data:
        own = table[table["method"] == "thiessen"].pivot_table(
            index="time", columns="basin", values="depth", dropna=False
        )
        np.testing.assert_array_equal(own[list(BASINS)].to_numpy(), data["depth_thiessen_reweight"].to_numpy().T)
    mill = exact(tmp_path / "hyetographs" / "Mill.csv")
    np.testing.assert_array_equal(mill["depth_thiessen_reweight"], own["Mill"])


def test_formats_that_do_not_exist_are_named_together() -> None:
    """With the nearest that does."""
    with pytest.raises(JobError, match=r"(?s)'tsv'.*one of: csv, csv-per-basin.*'netcfd'.*did you mean 'netcdf'"):
        check_formats(["tsv", "csv", "netcfd"])


@pytest.mark.parametrize(("word", "library"), [("parquet", "pyarrow"), ("netcdf", "netCDF4")])
def test_a_library_that_is_not_there(tmp_path: Path, word: str, library: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """The message names the extra that brings it, before any file is begun."""
    there = importlib.util.find_spec
    monkeypatch.setattr(
        "basinrain.writing.series_files.find_spec", lambda name: None if name == library else there(name)
    )
    message = rf"formats: found '{word}', and no {library} to write it with; expected the extra basinrain\[{word}\]"
    with pytest.raises(JobError, match=message):
        write_series_files(tmp_path, small_content(), formats=["csv", word])
    assert list(tmp_path.iterdir()) == []


def test_the_libraries_load_when_a_file_is_written() -> None:
    """Whoever writes CSV does not wait for those of the other formats."""
    code = (
        "import sys, basinrain.writing.series_files as s\ns.check_formats(list(s.FORMATS))\n"
        "print([m for m in ('pyarrow', 'netCDF4') if m in sys.modules])"
    )
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
    # A data frame library may load pyarrow by itself; none loads netCDF4.
    assert "netCDF4" not in out


class Failing(Kept):
    """A source whose folder goes away after some steps."""

    def flags(self, gaps: str, method: str, /) -> npt.NDArray[Any]:
        """Return marks of the first series only."""
        if method == "idw" and self.ready:
            raise OSError(5, "Input/output error")
        return super().flags(gaps, method)

    ready = True


@pytest.mark.parametrize("word", EVERY)
def test_a_failure_half_way_leaves_no_folder(tmp_path: Path, word: str) -> None:
    """What fails in the second series leaves nothing of the first where the results go."""

    def write() -> None:
        with whole_folder(tmp_path / "out") as built:
            write_series_files(built, content, formats=[word])

    content = small_content(source=Failing(drawn(50, len(BASINS)).arrays))
    with pytest.raises(WriteError, match=r"^(series|hyetographs).*: cannot be written: found input/output error; "):
        write()
    assert list(tmp_path.iterdir()) == []


CHILD = """
import resource, signal, sys, time
from pathlib import Path
sys.path.insert(0, {tests!r})
from small_series import drawn, hours, small_content
from basinrain.errors import WriteError
from basinrain.writing.folder import whole_folder
from basinrain.writing.series_files import write_series_files
content = small_content(4000)
"""
FULL = (
    CHILD
    + """
resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, 100_000))
for word in ("csv", "csv-per-basin", "parquet", "netcdf"):
    try:
        with whole_folder(Path({out!r})) as built:
            write_series_files(built, content, formats=[word])
    except WriteError as error:
        print(error)
"""
)
KILLED = (
    CHILD
    + """
with whole_folder(Path({out!r})) as built:
    write_series_files(built, content, formats=["netcdf"])
    print("written", flush=True)
    time.sleep(60)
"""
)


def child(code: str, tmp_path: Path) -> list[str]:
    """Return a command that runs code beside these tests."""
    return [sys.executable, "-c", code.format(tests=str(Path(__file__).parents[1]), out=str(tmp_path / "out"))]


@pytest.mark.skipif(sys.platform == "win32", reason="limits of a process are those of POSIX")
def test_no_room_for_the_file(tmp_path: Path) -> None:
    """A system that takes no more than 100 kB of a file: one clear line for each format, and nothing is left."""
    run = subprocess.run(child(FULL, tmp_path), capture_output=True, text=True, check=True)
    lines = run.stdout.splitlines()
    assert [line.split(":")[0] for line in lines] == ["series.csv", "hyetographs", "series.parquet", "series.nc"]
    for line in lines:
        assert ": cannot be written: found " in line
        assert line.endswith("; expected a folder with room for the file; make room, or name another output folder")
    assert run.stderr == ""
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(sys.platform == "win32", reason="no SIGKILL")
def test_a_killed_run_leaves_the_earlier_files(tmp_path: Path) -> None:
    """What an earlier run wrote is what is there, to the last byte."""
    with whole_folder(tmp_path / "out") as built:
        write_series_files(built, small_content(), formats=["netcdf", "parquet"])
        (built / "record.json").write_text('{"files": ["series.nc", "series.parquet"]}')
    before = digests(tmp_path / "out")
    run = subprocess.Popen(child(KILLED, tmp_path), stdout=subprocess.PIPE, text=True)
    assert run.stdout is not None
    assert run.stdout.readline() == "written\n"
    run.send_signal(signal.SIGKILL)
    run.wait()
    run.stdout.close()
    assert digests(tmp_path / "out") == before


class Made:
    """Rows that exist only when asked for, so that what memory grows by is the writing's own."""

    def __init__(self, shape: tuple[int, int], kind: type[Any]) -> None:
        self.shape, self.kind = shape, kind

    def __getitem__(self, part: tuple[slice, slice], /) -> npt.NDArray[Any]:
        steps, basins = (np.arange(n)[one] for n, one in zip(self.shape, part, strict=True))
        if self.kind is not np.float64:
            return np.ones((len(steps), len(basins)), dtype=self.kind)
        # Digits that do not compress.
        return np.random.default_rng(int(steps[0])).random((len(steps), len(basins)))


class MadeSource:
    """Series of many steps and basins that take no memory."""

    def __init__(self, n_steps: int, n_basins: int) -> None:
        self.n_steps, self._shape, self.series = n_steps, (n_steps, n_basins), SERIES

    def depth(self, *_: str) -> Made:
        """Return depths."""
        return Made(self._shape, np.float64)

    def observed_share(self, *_: str) -> Made:
        """Return shares."""
        return Made(self._shape, np.float32)

    def flags(self, *_: str) -> Made:
        """Return marks."""
        return Made(self._shape, np.uint8)


GROWTH = """
import resource, sys
from pathlib import Path
sys.path[:0] = [{tests!r}, {here!r}]
from test_series_files import BIG, EVERY, made_content, write_series_files
def peak():
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / (2**20 if sys.platform == "darwin" else 2**10)
def write(name, size, formats):
    (Path({out!r}) / name).mkdir()
    write_series_files(Path({out!r}) / name, made_content(*size), formats=formats)
write("small", (10, 10), EVERY)
before = peak()
for word, size in BIG:
    write(f"{{word}}-{{size[0]}}", size, [word])
    print(word, peak() - before)
"""

BIG = (
    ("csv", (500, 1000)),
    ("csv-per-basin", (500, 1000)),
    ("netcdf", (6000, 1000)),
    ("netcdf", (100, 50_000)),
    ("parquet", (6000, 1000)),
    ("parquet", (100, 50_000)),
)


def made_content(n_steps: int, n_basins: int) -> SeriesContent:
    """Return series of so many steps and basins."""
    starts, ends = hours(n_steps)
    basins = tuple(f"B{number}" for number in range(n_basins))
    return SeriesContent(
        source=MadeSource(n_steps, n_basins), starts=starts, ends=ends, basins=basins, areas=np.ones(n_basins)
    )


@pytest.mark.skipif(sys.platform == "win32", reason="the peak of a process is POSIX's")
def test_memory_is_bounded(tmp_path: Path) -> None:
    """Two series of 6 million values (78 MB each) take well under 300 MiB, as does a record of 50,000 basins."""
    here = Path(__file__).parent
    code = GROWTH.format(tests=str(here.parent), here=str(here), out=str(tmp_path))
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    grown = [float(line.split()[1]) for line in run.stdout.splitlines()]
    assert len(grown) == len(BIG)
    assert max(grown) < 200, run.stdout
