"""Design hyetographs to files of every format."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from types import MappingProxyType
from typing import Final

from basinrain.writing import design_basin_csv, design_csv, design_netcdf, design_parquet
from basinrain.writing.design_content import DesignContent
from basinrain.writing.series_files import check_formats

__all__ = ["WRITERS", "check_design_formats", "write_design_files"]

WRITERS: Final[Mapping[str, tuple[str, Callable[[Path, DesignContent], None]]]] = MappingProxyType(
    {
        "csv": (design_csv.NAME, design_csv.write_csv),
        "csv-per-basin": (design_basin_csv.FOLDER, design_basin_csv.write_basin_csv),
        "parquet": (design_parquet.NAME, design_parquet.write_parquet),
        "netcdf": (design_netcdf.NAME, design_netcdf.write_netcdf),
    }
)
"""The file or folder that is made, and what makes it, by the word that a job says; the words are those of series."""


def check_design_formats(formats: Sequence[str]) -> None:
    """Refuse formats that cannot be written, before anything is computed.

    Raises
    ------
    JobError
        A format is not known, or the library that it needs is not installed; all of them.

    Examples
    --------
    >>> check_design_formats(["csv", "netcfd"])
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design] formats: found 'netcfd'; expected one of: csv, csv-per-basin, parquet, \
netcdf; did you mean 'netcdf'?
    """
    check_formats(formats, item="[design] formats")


def write_design_files(folder: Path, content: DesignContent, *, formats: Sequence[str]) -> list[str]:
    """Write design hyetographs in one format or several.

    Parameters
    ----------
    folder
        Where the files are made; what is there stays. A run that fails leaves some of them: it is for the caller to
        give a folder that counts only when all is done (:func:`basinrain.writing.folder.whole_folder`).
    content
        What to write.
    formats
        Words of :data:`WRITERS`; one given twice is written once.

    Returns
    -------
    list of str
        Names of the files and folders made, in order of the alphabet.

    Raises
    ------
    JobError
        As for :func:`check_design_formats`.
    WriteError
        A file cannot be written.
    """
    check_design_formats(formats)
    for word in dict.fromkeys(formats):
        WRITERS[word][1](folder, content)
    return sorted(WRITERS[word][0] for word in set(formats))
