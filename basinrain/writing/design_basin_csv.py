"""Design hyetographs as one CSV file per point of interest, basin and duration, the others side by side."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.writing.design_content import DesignContent, column_word
from basinrain.writing.series_content import writing
from basinrain.writing.series_csv import csv_row, depth_texts
from basinrain.writing.series_file_names import file_stems

__all__ = ["FOLDER", "INDEX", "write_basin_csv"]

FOLDER: Final = "hyetographs"
"""The folder of the files."""

INDEX: Final = "index"
"""The file that says which file holds what, without its suffix."""


def write_basin_csv(folder: Path, content: DesignContent) -> None:
    """Write a file per point, basin and duration: a row per step, a column of depths per frequency and pattern.

    Parameters
    ----------
    folder
        Where the folder ``hyetographs`` is made, with an index of the files.
    content
        What to write. The text of one point and duration is held at a time.

    Raises
    ------
    WriteError
        A file cannot be written.
    """
    place = folder / FOLDER
    storms = content.by_storm()
    entries = [
        (point, basin, hyetographs[0].duration)
        for (point, _), hyetographs in storms.items()
        for basin in hyetographs[0].basins
    ]
    files = [f"{stem}.csv" for stem in file_stems(["_".join(entry) for entry in entries], taken=[INDEX])]
    with writing(FOLDER):
        place.mkdir()
        _write_index(place, content, entries, files)
        own = iter(files)
        for hyetographs in storms.values():
            _write_storm(place, content, hyetographs, [next(own) for _ in hyetographs[0].basins])


def _write_index(place: Path, content: DesignContent, entries: list[tuple[str, str, str]], files: list[str]) -> None:
    names = content.names or ("",) * len(content.basins)
    areas = content.written_areas.tolist()
    known = dict(zip(content.basins, zip(names, map(repr, areas), strict=True), strict=True))
    with (place / f"{INDEX}.csv").open("w", encoding="utf-8", newline="") as index:
        index.write("point,basin,duration,name,area,area_unit,file\n")
        for (point, basin, duration), file in zip(entries, files, strict=True):
            index.write(csv_row([point, basin, duration, *known[basin], content.area_unit, file]) + "\n")


def _write_storm(place: Path, content: DesignContent, hyetographs: list[DesignHyetograph], files: list[str]) -> None:
    first = hyetographs[0]
    heads = [f"{minutes}" for minutes in first.elapsed.tolist()]
    times = [] if content.start is None else content.time_texts(first.elapsed)
    if times:
        heads = [f"{head},{time}" for head, time in zip(heads, times, strict=True)]
    columns = [
        "elapsed_min",
        *(["time"] if times else []),
        "depth_unit",
        *(f"depth_{column_word(one)}" for one in hyetographs),
    ]
    head = csv_row(columns) + "\n"
    heads = [f"{start},{content.depth_unit}" for start in heads]
    # Basin after basin, so that each file gets its own rows in one piece.
    texts = [depth_texts(content.depth(one)) for one in hyetographs]
    n_steps = first.n_steps
    for at, name in enumerate(files):
        own = [column[at * n_steps : (at + 1) * n_steps] for column in texts]
        rows = [",".join(row) + "\n" for row in zip(heads, *own, strict=True)]
        with (place / name).open("w", encoding="utf-8", newline="") as file:
            file.write(head + "".join(rows))
