"""What files of basin-mean series hold, given out some steps at a time."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem, Problems, WriteError
from basinrain.series.flags import flag_words
from basinrain.series.series_source import copied
from basinrain.units import area_factor, depth_factor

if TYPE_CHECKING:
    from basinrain.series.series_source import SeriesSource

__all__ = ["SeriesBlock", "SeriesContent", "series_name", "words_by_code", "writing"]

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True, eq=False, kw_only=True)
class SeriesContent:
    """Basin-mean series with everything that is written beside the numbers.

    Parameters
    ----------
    source : SeriesSource
        The series, depths in mm.
    starts, ends : array of datetime64[s], shape (n_steps,)
        The intervals ``(start, end]`` in the clock ``zone``.
    zone : str
        A fixed offset from UTC such as ``"+02:00"``; empty where the record's clock is not known.
    basins : tuple of str
        Ids, the columns of the series.
    names : tuple of str
        Names of the basins; none where there are none.
    areas : array of float, shape (n_basins,)
        m², in the working plane.
    points : array of float, shape (n_basins, 2), optional
        Longitude and latitude (WGS 84) of a point inside each basin, where that is known.
    depth_unit, area_unit
        The units to write.
    job, caution, plane, references, institution, version
        Words for those formats that have a place for them: the job's name, the caution of every report, the working
        plane's name, where the methods are published, who made the files, and the version of this package.

    Raises
    ------
    DataError
        Numbers of steps, basins, names, areas or points disagree; all that do.
    JobError
        A unit is not known.
    """

    source: SeriesSource
    starts: Times
    ends: Times
    basins: tuple[str, ...]
    areas: Floats
    zone: str = ""
    names: tuple[str, ...] = ()
    points: Floats | None = None
    depth_unit: str = "mm"
    area_unit: str = "m2"
    job: str = ""
    caution: str = ""
    plane: str = ""
    references: str = ""
    institution: str = ""
    version: str = ""

    def __post_init__(self) -> None:
        depth_factor(self.depth_unit)
        area_factor(self.area_unit)
        problems = Problems()
        n = len(self.basins)
        for item, found, expected in (
            ("starts", len(self.starts), self.source.n_steps),
            ("ends", len(self.ends), self.source.n_steps),
            ("names", len(self.names) or n, n),
            ("areas", len(self.areas), n),
            ("points", n if self.points is None else len(self.points), n),
            *(
                (f"series {gaps} {method}", self.source.depth(gaps, method).shape[1], n)
                for gaps, method in self.source.series
            ),
        ):
            if found != expected:
                problems.add(item=item, found=f"{found}", expected=f"{expected}")
        problems.raise_as(DataError)

    @property
    def n_steps(self) -> int:
        """Steps of every series."""
        return len(self.ends)

    @property
    def written_areas(self) -> Floats:
        """Areas in the unit that is written, shape (n_basins,)."""
        return np.asarray(self.areas, dtype=float) / area_factor(self.area_unit)

    def blocks(self, values: int, *, width: int | None = None) -> Iterator[slice]:
        """Give out stretches of steps that hold no more than some values, and at least one step.

        Parameters
        ----------
        values
            How many values may be held of one quantity.
        width
            Values of a step; the basins by default.
        """
        steps = max(1, values // max(1, len(self.basins) if width is None else width))
        for first in range(0, self.n_steps, steps):
            yield slice(first, min(first + steps, self.n_steps))

    def block(self, gaps: str, method: str, steps: slice, basins: slice = slice(None)) -> SeriesBlock:
        """Return a series' values of some steps and basins, depths in the unit that is written."""
        kinds = (self.source.depth, self.source.observed_share, self.source.flags)
        depth, share, flags = (copied(kind(gaps, method), steps, basins) for kind in kinds)
        return SeriesBlock(
            np.asarray(depth, dtype=np.float64) / depth_factor(self.depth_unit),
            np.asarray(share, dtype=np.float32),
            np.asarray(flags, dtype=np.uint8),
        )

    def time_texts(self, steps: slice) -> list[str]:
        """Return the ends of some steps in ISO 8601, with the offset where it is known, all to the same digit."""
        zone = "Z" if self.zone == "+00:00" else self.zone
        whole = not (self.ends.astype(np.int64) % 60).any()
        ends = self.ends[steps].astype("datetime64[m]" if whole else "datetime64[s]")
        return [f"{text}{zone}" for text in np.datetime_as_string(ends).tolist()]


@dataclass(frozen=True, eq=False)
class SeriesBlock:
    """Some steps of a series: depths in the unit that is written, observed shares and flags, (n_steps, n_basins)."""

    depth: Floats
    observed_share: npt.NDArray[np.float32]
    flags: npt.NDArray[np.uint8]


def series_name(gaps: str, method: str) -> str:
    """Return what columns and variables of a series are called after.

    Examples
    --------
    >>> series_name("infill-then-reweight", "thiessen")
    'thiessen_infill_then_reweight'
    """
    return f"{method}_{gaps}".replace("-", "_")


def words_by_code() -> list[str]:
    """Return the words of every code of flags that a byte can hold.

    Examples
    --------
    >>> words_by_code()[5], len(words_by_code())
    ('infilled spread', 256)
    """
    return [flag_words(code) for code in range(256)]


@contextmanager
def writing(file: str, *, faults: tuple[type[Exception], ...] = (OSError,)) -> Iterator[None]:
    """Turn what stops a file from being written into one clear line.

    Parameters
    ----------
    file
        Its name.
    faults
        What the library that writes it raises.

    Raises
    ------
    WriteError
        The disk is full, the folder is gone, or the like.

    Examples
    --------
    >>> with writing("series.csv"):
    ...     raise OSError(28, "No space left on device")
    Traceback (most recent call last):
        ...
    basinrain.errors.WriteError: series.csv: cannot be written: found no space left on device; expected a folder with \
room for the file; make room, or name another output folder
    """
    try:
        yield
    except faults as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise WriteError(
            Problem(
                item="cannot be written",
                found=reason[:1].lower() + reason[1:],
                expected="a folder with room for the file",
                remedy="make room, or name another output folder",
                file=file,
            )
        ) from error
