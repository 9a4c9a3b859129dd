"""Basin-mean series as one CSV file per basin, the series side by side."""

from __future__ import annotations

from contextlib import ExitStack
from pathlib import Path
from typing import Final

from basinrain.writing.series_content import SeriesContent, series_name, words_by_code, writing
from basinrain.writing.series_csv import csv_row, depth_texts, share_texts
from basinrain.writing.series_file_names import file_stems

__all__ = ["FOLDER", "INDEX", "write_basin_csv"]

FOLDER: Final = "hyetographs"
"""The folder of the files."""

INDEX: Final = "index"
"""The file that says which file is which basin's, without its suffix."""

_OPEN: Final = 128
"""Files that are written at the same time; some systems allow 256."""
_HELD: Final = 1 << 17
"""Values of all series that are turned into text together; about 40 MiB."""


def write_basin_csv(folder: Path, content: SeriesContent) -> None:
    """Write a file per basin with one row per step and three columns per series, and an index of the files.

    Parameters
    ----------
    folder
        Where the folder ``hyetographs`` is made.
    content
        What to write. No more than about 130 thousand values are held at a time, and no more than 128 files open.

    Raises
    ------
    WriteError
        A file cannot be written.
    """
    place = folder / FOLDER
    files = [f"{stem}.csv" for stem in file_stems(content.basins, taken=[INDEX])]
    with writing(FOLDER):
        place.mkdir()
    _write_index(place, content, files)
    for first in range(0, len(files), _OPEN):
        _write_some(place, content, files, slice(first, min(first + _OPEN, len(files))))


def _write_index(place: Path, content: SeriesContent, files: list[str]) -> None:
    names = content.names or ("",) * len(files)
    areas = map(repr, content.written_areas.tolist())
    with writing(f"{FOLDER}/{INDEX}.csv"), (place / f"{INDEX}.csv").open("w", encoding="utf-8", newline="") as index:
        index.write("basin,name,area,area_unit,file\n")
        for basin, name, area, file in zip(content.basins, names, areas, files, strict=True):
            index.write(csv_row([basin, name, area, content.area_unit, file]) + "\n")


def _write_some(place: Path, content: SeriesContent, files: list[str], basins: slice) -> None:
    series = content.source.series
    quantities = ("depth", "observed_share", "flags")
    columns = [f"{quantity}_{series_name(*one)}" for one in series for quantity in quantities]
    words = words_by_code()
    n_basins = basins.stop - basins.start
    with writing(FOLDER), ExitStack() as stack:
        opened = [stack.enter_context((place / file).open("w", encoding="utf-8", newline="")) for file in files[basins]]
        for file in opened:
            file.write(",".join(["time", "depth_unit", *columns]) + "\n")
        for steps in content.blocks(_HELD, width=n_basins * len(series)):
            heads = [f"{time},{content.depth_unit}" for time in content.time_texts(steps)]
            texts: list[list[str]] = []
            for gaps, method in series:
                block = content.block(gaps, method, steps, basins)
                # Basin after basin, so that each file gets its own rows in one piece.
                texts += [
                    depth_texts(block.depth.T),
                    share_texts(block.observed_share.T),
                    [words[code] for code in block.flags.T.ravel().tolist()],
                ]
            n_steps = len(heads)
            for at, file in enumerate(opened):
                own = [column[at * n_steps : (at + 1) * n_steps] for column in texts]
                file.write("".join([",".join(row) + "\n" for row in zip(heads, *own, strict=True)]))
