"""Basin-mean series to files of every format."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from importlib.util import find_spec
from pathlib import Path
from types import MappingProxyType
from typing import Final, NamedTuple

from basinrain.errors import JobError, Problems, unknown
from basinrain.writing import series_basin_csv, series_csv, series_netcdf, series_parquet
from basinrain.writing.series_content import SeriesContent

__all__ = ["FORMATS", "SeriesFormat", "check_formats", "write_series_files"]


class SeriesFormat(NamedTuple):
    """A format of series.

    Parameters
    ----------
    name
        The file or folder that is written.
    write
        Writes it into a folder.
    library, extra
        The library that it needs beyond those of the package, and the package's extra that brings it.
    """

    name: str
    write: Callable[[Path, SeriesContent], None]
    library: str = ""
    extra: str = ""


FORMATS: Final[Mapping[str, SeriesFormat]] = MappingProxyType(
    {
        "csv": SeriesFormat(series_csv.NAME, series_csv.write_csv),
        "csv-per-basin": SeriesFormat(series_basin_csv.FOLDER, series_basin_csv.write_basin_csv),
        "parquet": SeriesFormat(series_parquet.NAME, series_parquet.write_parquet, "pyarrow", "parquet"),
        "netcdf": SeriesFormat(series_netcdf.NAME, series_netcdf.write_netcdf, "netCDF4", "netcdf"),
    }
)
"""The formats by the word that a job says."""


def check_formats(formats: Sequence[str], *, item: str = "[series] formats") -> None:
    """Refuse formats that cannot be written, before anything is computed.

    Parameters
    ----------
    formats
        Words of :data:`FORMATS`.
    item
        Where the job asks for them, for the message.

    Raises
    ------
    JobError
        A format is not known, or the library that it needs is not installed; all of them.

    Examples
    --------
    >>> check_formats(["csv", "parquett"])
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [series] formats: found 'parquett'; expected one of: csv, csv-per-basin, parquet, \
netcdf; did you mean 'parquet'?
    """
    problems = Problems()
    for word in formats:
        if word not in FORMATS:
            problems.include(unknown(item, word, FORMATS))
        elif (library := FORMATS[word].library) and find_spec(library) is None:
            problems.add(
                item=item,
                found=f"'{word}', and no {library} to write it with",
                expected=f"the extra basinrain[{FORMATS[word].extra}]",
                remedy=f"pip install 'basinrain[{FORMATS[word].extra}]', or choose csv",
            )
    problems.raise_as(JobError)


def write_series_files(folder: Path, content: SeriesContent, *, formats: Sequence[str]) -> list[str]:
    """Write series in one format or several.

    Parameters
    ----------
    folder
        Where the files are made; what is there stays. A run that fails leaves some of them: it is for the caller to
        give a folder that counts only when all is done (:func:`basinrain.writing.folder.whole_folder`).
    content
        What to write. It is read some steps at a time, never as a whole.
    formats
        Words of :data:`FORMATS`; one given twice is written once.

    Returns
    -------
    list of str
        Names of the files and folders made, in order of the alphabet.

    Raises
    ------
    JobError
        As for :func:`check_formats`.
    WriteError
        A file cannot be written.
    """
    check_formats(formats)
    for word in dict.fromkeys(formats):
        FORMATS[word].write(folder, content)
    return sorted(FORMATS[word].name for word in set(formats))
