"""Parquet rainfall files, wide or long: their columns as a table of text and numbers."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt
import pandas as pd

from basinrain.clocks import clock_name, parse_zone, standard_offset
from basinrain.errors import JobError, Problem, Problems, ReadError
from basinrain.reading.blocks import DEPTH_NAMES, FLAG_NAMES, GAUGE_NAMES, STEPS_NAMES, TIME_NAMES
from basinrain.reading.columns import find_column
from basinrain.reading.delimited import DelimitedTable
from basinrain.reading.files import read_bytes
from basinrain.reading.stream_mark import FileMark

__all__ = ["ParquetRows", "open_parquet", "read_parquet"]

_MAGIC: Final = b"PAR1"
_CELLS: Final = 1 << 21
"""So many cells are decoded at a time where rows are read in pieces (16 MiB of numbers)."""

_BUFFER: Final = 1 << 16
"""Bytes of every column that are read ahead."""

_Role = Literal["time", "depth", "label"]

_FLOATS: Final = {"float": "float32", "double": "float64"}

_LONG: Final[Mapping[str, tuple[tuple[str, ...], _Role]]] = {
    "gauge": (GAUGE_NAMES, "label"),
    "time": (TIME_NAMES, "time"),
    "depth": (DEPTH_NAMES, "depth"),
    "flag": (FLAG_NAMES, "label"),
    "steps": (STEPS_NAMES, "label"),
}
_EXPECTED: Final[Mapping[_Role, str]] = {
    "time": "timestamps, dates, or text",
    "depth": "numbers or text",
    "label": "text or whole numbers",
}


def read_parquet(path: Path, *, layout: str, columns: Mapping[str, str]) -> DelimitedTable:
    """Return the columns of a Parquet file as the table that the same data would make in delimited text.

    Parameters
    ----------
    path
        The file.
    layout
        ``"wide"`` or ``"long"``.
    columns
        Which column holds what, as for text.

    Returns
    -------
    DelimitedTable
        Depths stay numbers where they are; all else is text, ``""`` where there is no value. A timestamp is a time of
        day, with its offset from UTC where it has a zone; a date is a bare date. Lines are rows from 1.

    Raises
    ------
    ReadError
        pyarrow is not installed; the file is missing, no Parquet file, cut short or damaged; it has no rows, columns
        named twice or not at all, or of a type that cannot be used; all problems of the columns together.

    Examples
    --------
    >>> import tempfile
    >>> path = Path(tempfile.mkdtemp()) / "rain.parquet"
    >>> times = pd.to_datetime(["2031-05-04 01:00", "2031-05-04 02:00"], utc=True)
    >>> pd.DataFrame({"time": times, "W01": [1.5, None]}).to_parquet(path)
    >>> read_parquet(path, layout="wide", columns={}).frame.to_numpy().tolist()
    [['2031-05-04T01:00:00+00:00', 1.5], ['2031-05-04T02:00:00+00:00', nan]]
    """
    rows = open_parquet(path, layout=layout, columns=columns)
    with _opened(path) as file:
        content = file.read(columns=list(rows.roles))
    return rows.as_table(content, 0)


@dataclass(frozen=True, eq=False)
class ParquetRows:
    """The rows of a Parquet file, to be read in pieces; it holds no open file.

    Parameters
    ----------
    mark
        The file as it was.
    columns
        All columns, that of times first in a wide file.
    roles
        What the columns in use hold.
    group_starts : array of int, shape (n_groups + 1,)
        The first row of every row group, and the number of rows.
    numbers_of
        The columns of floating numbers, ``"float32"`` or ``"float64"``.
    decimal
        Of numbers in text.
    """

    mark: FileMark
    columns: tuple[str, ...]
    roles: Mapping[str, _Role]
    group_starts: npt.NDArray[np.int64]
    numbers_of: Mapping[str, str]
    decimal: str = "."

    @property
    def n_rows(self) -> int:
        """How many rows the file has."""
        return int(self.group_starts[-1])

    def tables(
        self, first: int, stop: int, *, only: Sequence[str] | None = None
    ) -> Iterator[tuple[int, DelimitedTable]]:
        """Yield the rows ``first`` to ``stop`` (exclusive) in pieces of a bounded size, each with its first row.

        Rows of a row group before ``first`` are decoded and let go.

        Parameters
        ----------
        first, stop
            Rows from 0.
        only
            The columns to read; the others are blank. All by default.

        Raises
        ------
        ReadError
            The file is gone, has changed, or is damaged.
        """
        names = list(self.roles) if only is None else [name for name in self.roles if name in only]
        for row, batch in self._batches(first, stop, names):
            yield row, self.as_table(batch, row)

    def all_numbers(self, names: Sequence[str]) -> bool:
        """Return whether columns hold numbers of the same size, so that :meth:`numbers` can read them."""
        return len({self.numbers_of.get(name, "") for name in names}) == 1 and names[0] in self.numbers_of

    def numbers(self, first: int, stop: int, names: Sequence[str]) -> Iterator[tuple[int, npt.NDArray[Any]]]:
        """Yield the numbers of columns, NaN where there is none, as :meth:`tables` yields tables."""
        for row, batch in self._batches(first, stop, list(names)):
            values = np.empty((batch.num_rows, len(names)), dtype=self.numbers_of[names[0]])
            for k, name in enumerate(names):
                values[:, k] = batch.column(name).to_numpy(zero_copy_only=False)
            yield row, values

    def _batches(self, first: int, stop: int, names: list[str]) -> Iterator[tuple[int, Any]]:
        begin = int(np.searchsorted(self.group_starts, first, "right")) - 1
        end = int(np.searchsorted(self.group_starts, stop, "left"))
        row = int(self.group_starts[begin])
        size = max(1, _CELLS // max(len(names), 1))
        self.mark.check()
        with _opened(self.mark.path) as file:
            for batch in file.iter_batches(size, row_groups=list(range(begin, end)), columns=names):
                low, high = max(first - row, 0), min(stop - row, batch.num_rows)
                if low < high:
                    yield row + low, batch.slice(low, high - low)
                row += batch.num_rows

    def as_table(self, content: Any, first: int) -> DelimitedTable:  # noqa: ANN401 - pyarrow has no types
        """Return a table or batch of pyarrow as text and numbers; ``first`` is its first row."""
        n = content.num_rows
        blank = pd.Series(np.full(n, "", dtype=object), dtype=str)
        series, problems = {}, Problems(file=str(self.mark.path))
        for name in self.columns:
            series[name] = blank
            if name in self.roles and name in content.schema.names:
                try:
                    series[name] = _series(content.column(name), self.roles[name])
                except JobError as error:  # a zone that is none
                    found = error.problems[0]
                    problems.add(item=f"column {name}", found=f"times of zone {found.found}", expected=found.expected)
        problems.raise_as(ReadError)
        return DelimitedTable(
            str(self.mark.path), self.columns, pd.DataFrame(series), np.arange(first + 1, first + 1 + n), self.decimal
        )


def open_parquet(path: Path, *, layout: str, columns: Mapping[str, str]) -> ParquetRows:
    """Return the rows of a Parquet file, its columns checked; errors as of :func:`read_parquet`."""
    file = str(path)
    if read_bytes(path, size=4) != _MAGIC:
        raise ReadError(_unreadable(file, "no Parquet file", "a Parquet file, as its suffix says", "rename it"))
    with path.open("rb") as stream:
        stream.seek(-4, 2)
        if stream.read() != _MAGIC:
            raise ReadError(
                _unreadable(file, "no end of a Parquet file", "a whole file", "copy it again; it is cut short")
            )
    with _opened(path) as opened:
        schema = opened.schema_arrow
        sizes = [opened.metadata.row_group(k).num_rows for k in range(opened.metadata.num_row_groups)]
    problems = Problems(file=file)
    names = list(schema.names)
    for name, count in Counter(names).items():
        if count > 1:
            problems.add(
                item="the columns",
                found=f"{count} named '{name}'",
                expected="every column once",
                remedy="rename or remove them",
                column=name,
            )
        if not name.strip():
            problems.add(item="the columns", found="one without a name", expected="a name for every column")
    if not sum(sizes) or not names:
        problems.add(item="the file", found="no rows", expected="rows")
    problems.raise_as(ReadError)
    names, roles = _roles(names, schema, layout, columns)
    for name, role in roles.items():
        if not _fits(schema.field(name).type, role):
            problems.add(
                item=f"column {name}",
                found=f"values of the type {schema.field(name).type}",
                expected=_EXPECTED[role],
                remedy="convert the column, or remove it" if layout == "wide" else "convert the column",
            )
    problems.raise_as(ReadError)
    floats = {name: _FLOATS[kind] for name in roles if (kind := str(schema.field(name).type)) in _FLOATS}
    return ParquetRows(FileMark.of(path), tuple(names), roles, np.cumsum([0, *sizes], dtype=np.int64), floats)


def _roles(
    names: list[str],
    schema: Any,  # noqa: ANN401 - pyarrow has no types
    layout: str,
    columns: Mapping[str, str],
) -> tuple[list[str], dict[str, _Role]]:
    """Return the columns, that of times first in a wide file, and what those in use hold; what lacks is told later."""
    later = Problems()
    if layout == "long":
        found = {
            key: find_column(names, known, mapped=columns.get(key), key=key, problems=later)
            for key, (known, _) in _LONG.items()
        }
        return names, {name: _LONG[key][1] for key, name in found.items() if name is not None}
    time = find_column(names, TIME_NAMES, mapped=columns.get("time"), key="time", problems=later)
    if time is None:
        # The index of a data frame is written last, under a name that says nothing.
        import pyarrow as pa

        timed = [n for n in names if pa.types.is_temporal(schema.field(n).type)]
        time = timed[0] if len(timed) == 1 else names[0]
    roles: dict[str, _Role] = {time: "time"}
    roles.update({name: "depth" for name in names if name != time})
    return list(roles), roles


def _fits(kind: Any, role: _Role) -> bool:  # noqa: ANN401 - pyarrow has no types
    from pyarrow import types

    if types.is_dictionary(kind):
        kind = kind.value_type
    if types.is_string(kind) or types.is_large_string(kind) or types.is_string_view(kind) or types.is_null(kind):
        return True
    if role == "time":
        return bool(types.is_timestamp(kind) or types.is_date(kind))
    if role == "label":
        return bool(types.is_integer(kind))
    return bool(types.is_integer(kind) or types.is_floating(kind) or types.is_decimal(kind))


def _series(values: Any, role: _Role) -> pd.Series[Any]:  # noqa: ANN401 - pyarrow has no types
    import pyarrow as pa

    if pa.types.is_dictionary(values.type):
        values = values.cast(values.type.value_type)
    kind = values.type
    if pa.types.is_timestamp(kind) or pa.types.is_date(kind):
        return _text(_times(values))
    if role == "depth" and not pa.types.is_null(kind) and not _is_text(kind):
        if pa.types.is_decimal(kind):
            values = values.cast(pa.float64())
        array = values.to_numpy() if isinstance(values, pa.ChunkedArray) else values.to_numpy(zero_copy_only=False)
        return pd.Series(array.astype(np.float32) if array.dtype == np.float16 else array)
    if pa.types.is_null(kind):
        return _text(np.full(len(values), "", dtype=object))
    texts = values.cast(pa.string()).fill_null("")
    return _text(np.asarray(texts.to_pylist(), dtype=object)).str.strip()


def _is_text(kind: Any) -> bool:  # noqa: ANN401 - pyarrow has no types
    from pyarrow import types

    return bool(types.is_string(kind) or types.is_large_string(kind) or types.is_string_view(kind))


def _text(values: npt.NDArray[Any]) -> pd.Series[str]:
    return pd.Series(values.astype(object), dtype=str)


def _times(values: Any) -> npt.NDArray[Any]:  # noqa: ANN401 - pyarrow has no types
    """Return timestamps and dates as ISO 8601, "" where there is none."""
    import pyarrow as pa

    if pa.types.is_date(values.type):
        days = np.asarray(values.cast(pa.date32()).cast(pa.int32()).fill_null(0), dtype="int64").astype("datetime64[D]")
        texts = np.datetime_as_string(days)
        return np.where(np.asarray(values.is_null()), "", texts)
    zone = values.type.tz
    unit = values.type.unit
    ticks = np.asarray(values.cast(pa.int64()).fill_null(0), dtype=np.int64)
    exact = ticks.astype(f"datetime64[{unit}]")
    seconds = exact.astype("datetime64[s]")
    suffix = ""
    if zone is not None:
        # Times with a zone are kept in UTC; the zone is how they are meant to be shown.
        named = parse_zone(zone)
        ahead = named if isinstance(named, int) else standard_offset(named, seconds)
        exact, seconds, suffix = exact + np.timedelta64(ahead, "s"), seconds + ahead, clock_name(ahead)
    texts = np.char.add(np.datetime_as_string(seconds), suffix)
    odd = exact != seconds
    if odd.any():
        texts = np.where(odd, np.char.add(np.datetime_as_string(exact), suffix), texts)
    return np.where(np.asarray(values.is_null()), "", texts)


@contextmanager
def _opened(path: Path) -> Iterator[Any]:
    """Open a Parquet file so that no more than the rows in hand are in memory; what is wrong with it is one line."""
    try:
        import pyarrow as pa
        from pyarrow import parquet
    except ImportError:
        raise ReadError(
            Problem(
                item="the file",
                found="a Parquet file, and pyarrow is not installed, which reads it",
                remedy="install basinrain[parquet]",
                file=str(path),
            )
        ) from None
    read_bytes(path, size=4)
    try:
        with parquet.ParquetFile(path, pre_buffer=False, buffer_size=_BUFFER) as file:
            yield file
    except (pa.ArrowException, OSError) as error:
        said = str(error).splitlines()[0]
        raise ReadError(
            _unreadable(str(path), f"that it is damaged ({said})", "a whole Parquet file", "copy it again")
        ) from None


def _unreadable(file: str, found: str, expected: str, remedy: str) -> Problem:
    return Problem(item="the file", found=found, expected=expected, remedy=remedy, file=file)
