"""NetCDF rainfall files after the CF conventions: one depth variable over time and gauge.

CF Conventions 1.11, chapters 4.4 (time), 7.1 (bounds), 8.1 (packed data) and 9 (discrete sampling geometries).
"""

from __future__ import annotations

import threading
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.errors import Problem, Problems, ReadError
from basinrain.reading.blocks import Block
from basinrain.reading.depths import DepthRules, number_depths
from basinrain.reading.files import read_bytes
from basinrain.reading.netcdf_times import interval_ends
from basinrain.reading.netcdf_variables import choose_variables
from basinrain.reading.order import check_order
from basinrain.reading.stamps import StampRules
from basinrain.reading.stream_mark import FileMark

__all__ = ["NetcdfRows", "open_netcdf", "read_netcdf"]

_MAGIC: Final = (b"CDF", b"\x89HDF")
_LOCK: Final = threading.Lock()
"""The NetCDF library must not be entered by two threads at once."""


def read_netcdf(
    path: Path,
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[Block | None, str | None]:
    """Read a NetCDF file with one depth variable over time and gauge.

    Parameters
    ----------
    path
        The file.
    depths
        How to understand the numbers. ``_FillValue``, ``missing_value``, values outside ``valid_range``, and NaN are
        missing; packed numbers are unpacked.
    stamps
        How to understand the times. Where the file has bounds of time, they say where every interval starts and ends.
    columns
        Variables ``time``, ``gauge``, ``depth``; else the time is the variable with units "... since ...", the gauges'
        ids are those of the variable with the ``cf_role`` ``timeseries_id``, or of the coordinate of their dimension,
        and the depth is the one variable over both.
    zone
        The clock settled by earlier files; None when this is the first. Times whose units have no offset from UTC are
        in the declared zone; where none is declared in UTC, after CF.
    problems
        Takes what is wrong with the file.

    Returns
    -------
    block, zone
        None where the file cannot be used at all.

    Raises
    ------
    ReadError
        netCDF4 is not installed; the file is missing, no NetCDF file or damaged.

    Examples
    --------
    >>> import netCDF4, tempfile
    >>> from basinrain.reading.depths import depth_rules
    >>> from basinrain.intervals import parse_interval
    >>> path = Path(tempfile.mkdtemp()) / "rain.nc"
    >>> with netCDF4.Dataset(path, "w") as file:
    ...     _ = file.createDimension("time", 2), file.createDimension("gauge", 1)
    ...     time = file.createVariable("time", "i4", ("time",))
    ...     time.units, time[:] = "hours since 2031-05-04 00:00:00", [1, 2]
    ...     file.createVariable("gauge", str, ("gauge",))[0] = "W01"
    ...     file.createVariable("rain", "f8", ("time", "gauge"), fill_value=-1.0)[:] = [[1.5], [-1.0]]
    >>> hour = parse_interval("1h")
    >>> rules = depth_rules(unit="mm", interval=hour, missing=[], trace=[], flags={}, accumulated=None)
    >>> block, zone = read_netcdf(path, rules, StampRules(interval=hour), columns={}, zone=None, problems=Problems())
    >>> block.gauges, block.depth[:, 0], block.ends[0], zone
    (('W01',), array([1.5, nan]), np.datetime64('2031-05-04T01:00:00'), '+00:00')
    """
    rows, zone = open_netcdf(path, depths, stamps, columns=columns, zone=zone, problems=problems)
    if rows is None:
        return None, zone
    depth, status = rows.read(0, len(rows.ends), depths, problems)
    lines = np.arange(1, len(rows.ends) + 1)
    return Block(str(path), rows.gauges, rows.ends, lines, depth, status, None, {}), zone


@dataclass(frozen=True, eq=False)
class NetcdfRows:
    """The times and gauges of a NetCDF file, whose depths are read in slices; it holds no open file.

    Parameters
    ----------
    mark
        The file as it was.
    gauges
        Their ids.
    ends : array of datetime64[s], shape (n_times,)
        Interval ends in the source's clock, increasing.
    variable
        The depth variable.
    time_first
        Whether its first dimension is time.
    """

    mark: FileMark
    gauges: tuple[str, ...]
    ends: npt.NDArray[np.datetime64]
    variable: str
    time_first: bool

    def read(
        self, first: int, stop: int, rules: DepthRules, problems: Problems
    ) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.uint8]]:
        """Return depth and status of the times ``first`` to ``stop`` (exclusive), shape (stop - first, n_gauges)."""
        self.mark.check()
        with _opened(self.mark.path) as file:
            variable = file[self.variable]
            part = variable[first:stop] if self.time_first else variable[:, first:stop].T
        values = np.ma.filled(part.astype(np.result_type(part.dtype, np.float32), copy=False), np.nan)
        depth, status, faults = number_depths(values, rules)
        for flat, cell in faults:
            row, g = divmod(flat, len(self.gauges))
            gauge = self.gauges[g]
            problems.add(
                item=f"gauge {gauge}",
                found=cell.found,
                expected=cell.expected,
                remedy=cell.remedy,
                line=first + row + 1,
                column=self.variable,
                gauge=gauge,
                time=str(self.ends[first + row]),
            )
        return depth, status


def open_netcdf(
    path: Path,
    depths: DepthRules,
    stamps: StampRules,
    *,
    columns: Mapping[str, str],
    zone: str | None,
    problems: Problems,
) -> tuple[NetcdfRows | None, str | None]:
    """Return the times and gauges of a NetCDF file, its depths unread; as :func:`read_netcdf`."""
    before = len(problems)
    with _opened(path) as file:
        chosen = choose_variables(file, columns, depths, problems)
        times = (
            None if chosen is None or chosen.time is None else interval_ends(file, chosen.time, stamps, zone, problems)
        )
    if times is not None:
        zone = times.zone
        check_order(
            times.ends, times.shown.__getitem__, np.arange(1, len(times.ends) + 1), item=times.item, problems=problems
        )
    if chosen is None or times is None or len(problems) > before:
        return None, zone
    return NetcdfRows(FileMark.of(path), chosen.gauges, times.ends, chosen.depth, chosen.time_first), zone


@contextmanager
def _opened(path: Path) -> Iterator[Any]:
    """Open a NetCDF file; what is wrong with it is one line."""
    try:
        import netCDF4
    except ImportError:
        raise ReadError(
            _unreadable(
                path, "a NetCDF file, and netCDF4 is not installed, which reads it", "", "install basinrain[netcdf]"
            )
        ) from None
    if not read_bytes(path, size=4).startswith(_MAGIC):
        raise ReadError(_unreadable(path, "no NetCDF file", "a NetCDF file, as its suffix says", "rename it"))
    with _LOCK:
        try:
            with netCDF4.Dataset(path) as file:
                yield file
        except (OSError, RuntimeError) as error:
            said = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
            raise ReadError(
                _unreadable(path, f"that it is damaged ({said})", "a whole NetCDF file", "copy it again")
            ) from None


def _unreadable(path: Path, found: str, expected: str, remedy: str) -> Problem:
    return Problem(item="the file", found=found, expected=expected, remedy=remedy, file=str(path))
