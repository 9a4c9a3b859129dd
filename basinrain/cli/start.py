"""``basinrain start``: a commented job with sample data."""

from __future__ import annotations

import shutil
from importlib.resources import as_file, files
from importlib.resources.abc import Traversable
from pathlib import Path

import click

from basinrain.errors import Problem, WriteError
from basinrain.writing.folder import whole_folder

__all__ = ["start_command"]

_SAMPLE = ("README.md", "basins.geojson", "gauges.csv", "job.toml", "rain_daily.csv", "rain_hourly.csv")
_FOLDERS = ("design", "handbook", "record")


def start_command(folder: Path) -> None:
    """Copy the sample into a folder that is new or empty.

    Raises
    ------
    WriteError
        The folder holds something, or cannot be made.
    """
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise WriteError(
            Problem(
                item="folder",
                found="something there already",
                expected="a new or empty folder",
                remedy="name another one",
                file=str(folder),
            )
        )
    with as_file(_sample()) as sample, whole_folder(folder) as built:
        for name in _SAMPLE:
            shutil.copyfile(sample / name, built / name)
        for name in _FOLDERS:
            (built / name).mkdir()
            for path in sorted((sample / name).iterdir()):
                # What an earlier run left beside a job of the source tree is no sample.
                if path.is_file():
                    shutil.copyfile(path, built / name / path.name)
    click.echo(f"Made {folder}. Next: basinrain storm {folder / 'job.toml'}")


def _sample() -> Traversable:
    package = files("basinrain")
    sample = package / "sample"
    # In a source tree the sample is the demo folder itself; the wheel carries a copy.
    return sample if sample.is_dir() else package / ".." / "demo_basins"
