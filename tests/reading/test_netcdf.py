"""NetCDF files as rainfall: times, bounds, packing, ids, and what cannot be read."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
from rainfiles import times, written
from streamfiles import hours, netcdf, network_of, wide_csv

from basinrain.errors import JobError, ReadError
from basinrain.rainfall import RainRecord
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.stream import open_stream

Edit = Callable[[Any], None]
DEPTH = np.array([[1.0, 0.0], [np.nan, 2.5], [0.2, 0.0]])


def read(path: Path, **options: Any) -> RainRecord:  # noqa: ANN401 - any option of the reader
    """Return the record of a NetCDF file, in mm and hourly unless the options say otherwise."""
    settings: dict[str, Any] = {"layout": "wide", "unit": "mm", "interval": "1h"} | options
    return read_rainfall(path, **settings)


def file_of(folder: Path, edit: Edit | None = None, **options: Any) -> Path:  # noqa: ANN401 - of the writer
    """Write three hours of gauges A and B."""
    return netcdf(folder / "rain.nc", hours(3), ["A", "B"], DEPTH, edit=edit, **options)


def test_as_csv(tmp_path: Path) -> None:
    """A NetCDF file gives the record of the same data in CSV; the clock of its times is UTC, after CF."""
    found = read(file_of(tmp_path))
    text = wide_csv(tmp_path / "rain.csv", hours(3), ["A", "B"], DEPTH)
    expected = read_rainfall(text, layout="wide", unit="mm", interval="1h", timezone="UTC")
    assert (found.gauges, found.zone, times(found)) == (expected.gauges, "+00:00", times(expected))
    np.testing.assert_array_equal(found.depth, expected.depth)
    np.testing.assert_array_equal(found.status, expected.status)


@pytest.mark.parametrize(
    ("units", "value", "options", "zone", "end"),
    [
        ("days since 2031-05-04", 1 / 24, {}, "+00:00", "2031-05-04T01:00"),
        ("minutes since 2031-05-04 00:30:00", 30, {}, "+00:00", "2031-05-04T01:00"),
        ("hours since 1900-01-01 00:00:00Z", 1151281, {}, "+00:00", "2031-05-04T01:00"),
        ("hours since 2031-05-04 00:00 UTC", 1, {"timezone": "+02:00"}, "+02:00", "2031-05-04T03:00"),
        ("hours since 2031-05-04 00:00:00 +02:00", 1, {}, "+02:00", "2031-05-04T01:00"),
        ("hours since 2031-05-04 00:00:00 -3:30", 1, {"timezone": "UTC"}, "+00:00", "2031-05-04T04:30"),
        ("hours since 2031-05-04 00:00:00", 1, {"timezone": "-03:00"}, "-03:00", "2031-05-04T01:00"),
        ("hours since 2031-05-04T00:00:00", 1, {"stamp": "start"}, "+00:00", "2031-05-04T02:00"),
        ("days since 2031-05-04", 1, {"interval": "1d"}, "+00:00", "2031-05-05T00:00"),
        ("days since 2031-05-01", 31, {"interval": "1mo"}, "+00:00", "2031-06-01T00:00"),
    ],
)
def test_units_of_time(  # noqa: PLR0917 - one row of the table
    tmp_path: Path, units: str, value: float, options: dict[str, Any], zone: str, end: str
) -> None:
    """Times count from their reference, whose offset from UTC is their clock; without one the declared zone is."""

    def one_time(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
        file["time"].units = units
        file["time"][:] = value

    path = netcdf(tmp_path / "rain.nc", hours(1), ["A"], np.ones((1, 1)), edit=one_time)
    record = read(path, **options)
    assert (record.zone, times(record)[0][1]) == (zone, end)


def _bounds(steps: np.ndarray[Any, Any]) -> Edit:
    def edit(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
        file.createDimension("nv", 2)
        file["time"].bounds = "time_bnds"
        file.createVariable("time_bnds", "f8", ("time", "nv"))[:] = steps

    return edit


def test_bounds_of_time(tmp_path: Path) -> None:
    """Bounds say where an interval starts and ends, whichever of the two its time is, and must be the interval."""
    seconds = hours(3).astype(np.int64).astype(float)
    after = np.column_stack([seconds, seconds + 3600])
    record = read(file_of(tmp_path, _bounds(after)))
    assert times(record)[0] == ("2031-05-04T01:00", "2031-05-04T02:00")
    assert times(read(tmp_path / "rain.nc", stamp="start"))[0] == ("2031-05-04T01:00", "2031-05-04T02:00")
    message = (
        r"rain\.nc:1: variable time_bnds: found an interval from 2031-05-04T01:00:00 to 2031-05-04T02:00:00, and 2 "
        r"more bounds that do not fit; expected intervals of 2h, as declared; correct interval, or the bounds"
    )
    with pytest.raises(ReadError, match=message):
        read(tmp_path / "rain.nc", interval="2h")
    with pytest.raises(ReadError, match=r"variable time: found bounds 'time', which has another shape; expected"):
        read(file_of(tmp_path, lambda file: setattr(file["time"], "bounds", "time")))


def test_bounds_of_months(tmp_path: Path) -> None:
    """A month is from its first moment to the next one's; bounds of 30 days are none."""
    ends = np.array(["2031-05-01", "2031-06-01"], dtype="datetime64[s]")
    first = np.array(["2031-04-01", "2031-05-01"], dtype="datetime64[s]")
    both = np.column_stack([first, ends]).astype(np.int64).astype(float)
    record = read(netcdf(tmp_path / "a.nc", ends, ["A"], np.ones((2, 1)), edit=_bounds(both)), interval="1mo")
    assert times(record)[1] == ("2031-05-01T00:00", "2031-06-01T00:00")
    both[1, 0] = both[1, 1] - 30 * 86400
    with pytest.raises(ReadError, match=r":2: variable time_bnds: found an interval from 2031-05-02T00:00:00"):
        read(netcdf(tmp_path / "b.nc", ends, ["A"], np.ones((2, 1)), edit=_bounds(both)), interval="1mo")


@pytest.mark.parametrize("stored", ["f4", "f8"])
def test_packed_and_filled(tmp_path: Path, stored: str) -> None:
    """Packed whole numbers are unpacked; fill values, values outside the valid range and NaN are missing."""

    def edit(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
        packed = file.createVariable("packed", "i2", ("time", "gauge"), fill_value=-32768)
        packed.scale_factor, packed.add_offset = np.dtype(stored).type(0.1), np.dtype(stored).type(0.0)
        packed.valid_max = np.int16(5000)
        packed.set_auto_maskandscale(False)
        packed[:] = [[15, 0], [-32768, 25], [6000, 0]]

    path = file_of(tmp_path, edit)
    record = read(path, columns={"depth": "packed"})
    np.testing.assert_allclose(record.depth, [[1.5, 0.0], [np.nan, 2.5], [np.nan, 0.0]], rtol=1e-6)
    stream = open_stream(
        [{"files": path, "unit": "mm", "interval": "1h", "columns": {"depth": "packed"}}], network_of("A", "B")
    )
    np.testing.assert_array_equal(stream.read(1, 3).depth, record.depth[1:])
    with netCDF4.Dataset(path, "a") as file:
        file.renameVariable("rain", "fall")
    with pytest.raises(
        ReadError, match=r"the variables: found several that may be the depth: fall, packed; expected .*"
    ):
        read(path)


def test_declared_code(tmp_path: Path) -> None:
    """A missing code that the job declares counts; one that nobody declares is refused with gauge and time."""

    def coded(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
        file["rain"][1, 1] = -999.0

    path = file_of(tmp_path, coded)
    assert np.isnan(read(path, missing=[-999]).depth[1, 1])
    with pytest.raises(
        ReadError, match=r":2: column rain: gauge B: found '-999'; expected a depth of 0 or more; it looks"
    ):
        read(path)


def _characters(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
    file.createDimension("letters", 4)
    names = file.createVariable("station", "S1", ("gauge", "letters"))
    names.cf_role = "timeseries_id"
    names[:] = netCDF4.stringtochar(np.array(["W01", "W2"], dtype="S4"))


def _numbers(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
    file.createVariable("number", "i4", ("gauge",))[:] = [31, 7]


@pytest.mark.parametrize(
    ("edit", "columns", "gauges"),
    [
        (_characters, {}, ("W01", "W2")),
        (_characters, {"gauge": "gauge"}, ("A", "B")),
        (_numbers, {"gauge": "number"}, ("31", "7")),
        (_numbers, {}, ("A", "B")),
    ],
)
def test_ids(tmp_path: Path, edit: Edit, columns: dict[str, str], gauges: tuple[str, ...]) -> None:
    """Ids are those of the cf_role, else of the coordinate; text, characters or whole numbers; the job may choose."""
    assert read(file_of(tmp_path, edit), columns=columns).gauges == gauges


def test_gauges_first(tmp_path: Path) -> None:
    """The depth variable may have its gauges before its times, whole and in parts."""

    def turned(file: Any) -> None:  # noqa: ANN401 - a NetCDF file
        file.renameVariable("rain", "old")
        file.createVariable("rain", "f8", ("gauge", "time"))[:] = DEPTH.T

    path = file_of(tmp_path, turned)
    np.testing.assert_array_equal(read(path, columns={"depth": "rain"}).depth, DEPTH)
    source = {"files": path, "unit": "mm", "interval": "1h", "columns": {"depth": "rain"}}
    np.testing.assert_array_equal(open_stream([source], network_of("B", "A")).read(1, 3).depth, DEPTH[1:, ::-1])


@pytest.mark.parametrize(
    ("edit", "options", "message"),
    [
        (lambda f: setattr(f["rain"], "units", "inches"), {},
         r"variable rain: found units 'inches'; expected a depth in 'mm', as unit declares; correct unit"),
        (lambda f: setattr(f["rain"], "units", "mm h-1"), {},
         r"found units 'mm h-1'; expected a depth in 'mm', as unit declares; give depths; a rate must be multiplied"),
        (lambda f: setattr(f["time"], "calendar", "noleap"), {},
         r"variable time: found calendar 'noleap'; expected one of: standard, gregorian, proleptic_gregorian; convert"),
        (lambda f: setattr(f["time"], "units", "fortnights since 2031-05-04"), {},
         r"variable time: found units 'fortnights since 2031-05-04' \(.*\); expected units such as 'hours since"),
        (lambda f: setattr(f["time"], "units", "hours"), {},
         r"the variables: found none for the time; expected a variable of times, with units such as"),
        (lambda f: f["time"].__setitem__(1, np.nan), {}, r":2: variable time: found ''; expected a time such as"),
        (lambda f: f["gauge"].__setitem__(1, "A"), {},
         r"nc: variable gauge: found 2 gauges named 'A'; expected every gauge once"),
        (lambda f: f["gauge"].__setitem__(1, " "), {},
         r"nc: variable gauge: found a gauge without an id; expected an id for every gauge"),
        (lambda f: f.renameVariable("gauge", "who"), {},
         r"variable rain: found no ids for its dimension 'gauge'; expected .*; name it in columns\.gauge"),
        (None, {"columns": {"gauge": "time"}}, r"variable rain: found ids 'time' over another dimension; expected"),
        (None, {"columns": {"gauge": "rain"}}, r"variable rain: found ids 'rain' over another dimension; expected"),
        (None, {"columns": {"depth": "gauge"}}, r"variable gauge: found text over \(gauge\); expected numbers"),
        (None, {"columns": {"time": "rain"}}, r"variable rain: found float64 over \(time, gauge\); expected one"),
        (None, {"columns": {"time": "tim", "depth": "rian"}},
         r"time: found no variable 'tim'; expected a variable of the file;.*\n.*no variable 'rian'"),
        (lambda f: f.renameDimension("gauge", "id"), {"columns": {"depth": "gauge"}}, r"variable gauge: found text"),
        (lambda f: f.createVariable("ids", "f8", ("gauge",)), {"columns": {"gauge": "ids"}},
         r"nc: variable ids: found float64 over \(gauge\); expected text or whole numbers"),
    ],
)  # fmt: skip
def test_variables_that_cannot_be(tmp_path: Path, edit: Edit | None, options: dict[str, Any], message: str) -> None:
    """Each thing that is wrong with a file's variables is one clear line, whole and in parts."""
    path = file_of(tmp_path, edit)
    with pytest.raises(ReadError, match=message):
        read(path, **options)
    with pytest.raises(ReadError, match=message):
        open_stream([{"files": path, "unit": "mm", "interval": "1h", **options}], network_of("A", "B"))


def test_units_that_agree(tmp_path: Path) -> None:
    """Kilograms a square metre are mm, and a file in inches is read as such."""
    path = file_of(tmp_path, lambda file: setattr(file["rain"], "units", "kg m-2"))
    assert read(path).depth[0, 0] == 1.0
    path = file_of(tmp_path, lambda file: setattr(file["rain"], "units", "Inches"))
    assert read(path, unit="in").depth[0, 0] == 25.4


def test_options_of_text() -> None:
    """Keys that speak of the text of cells are refused together, before the file is opened."""
    options: dict[str, Any] = {
        "flags": {"estimated": ["E"]}, "accumulated": "A", "trace": ["tr"], "time_format": "%Y", "layout": "long",
    }  # fmt: skip
    with pytest.raises(JobError) as caught:
        read(Path("none.nc"), **options)
    assert [line.split(": ")[1] for line in str(caught.value).splitlines()] == [
        "layout", "flags", "accumulated", "trace", "time_format",
    ]  # fmt: skip
    with pytest.raises(JobError, match=r"columns: found 'flag'; expected for layout 'wide' one of: time, gauge, depth"):
        read(Path("none.nc"), columns={"flag": "x"})


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"time,A\n", r"the file: found no NetCDF file; expected a NetCDF file, as its suffix says; rename it"),
        (
            b"\x89HDF\r\n\x1a\n" + bytes(64),
            r"the file: found that it is damaged \(.*\); expected a whole NetCDF file; copy",
        ),
        (b"CDF\x01", r"the file: found that it is damaged \(.*\); expected a whole NetCDF file; copy it again"),
    ],
)
def test_files_that_are_none(tmp_path: Path, content: bytes, message: str) -> None:
    """Text, and files that are damaged or cut short, are refused in one line, whole and in parts."""
    path = written(tmp_path, content, "rain.nc4")
    for reads in (read, lambda path: open_stream([{"files": path, "unit": "mm", "interval": "1h"}], network_of("A"))):
        with pytest.raises(ReadError, match=message):
            reads(path)


def test_cut_short(tmp_path: Path) -> None:
    """A file without its last bytes is refused in one line."""
    path = netcdf(tmp_path / "rain.nc", hours(5000), ["A"], np.ones((5000, 1)))
    path.write_bytes(path.read_bytes()[:-2000])
    with pytest.raises(ReadError, match=r"the file: found that it is damaged \(.*\); expected a whole NetCDF file"):
        read(path)


def test_without_netcdf4(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where netCDF4 is not installed, one line says what to install."""
    path = file_of(tmp_path)
    monkeypatch.setitem(sys.modules, "netCDF4", None)
    with pytest.raises(ReadError, match=r"netCDF4 is not installed, which reads it; install basinrain\[netcdf\]"):
        read(path)
