"""What files of design hyetographs hold."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.errors import DataError, Problems
from basinrain.units import area_factor, depth_factor

__all__ = ["DesignContent", "column_word", "frequency_word"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class DesignContent:
    """Design hyetographs with everything that is written beside the numbers.

    Parameters
    ----------
    hyetographs : tuple of DesignHyetograph
        All of one step; no two of the same point, frequency, duration and pattern. Those of one point and duration have
        the same basins.
    basins : tuple of str
        Ids of all basins.
    areas : array of float, shape (n_basins,)
        m², in the working plane.
    names : tuple of str
        Names of the basins; none where there are none.
    positions : array of float, shape (n_basins, 2), optional
        Longitude and latitude (WGS 84) of a point inside each basin, where that is known.
    start : datetime64, optional
        The storm's nominal start, where the job gives one; else only elapsed time is written.
    depth_unit, area_unit
        The units to write.
    source
        Where the point depths come from.
    job, caution, version
        The job's name, the caution of every report, and the version of this package.

    Raises
    ------
    DataError
        There is no hyetograph, two are alike, a basin is not known, or steps, names, areas or positions disagree; all
        that do.
    JobError
        A unit is not known.
    """

    hyetographs: tuple[DesignHyetograph, ...]
    basins: tuple[str, ...]
    areas: Floats
    names: tuple[str, ...] = ()
    positions: Floats | None = None
    start: np.datetime64 | None = None
    depth_unit: str = "mm"
    area_unit: str = "m2"
    source: str = ""
    job: str = ""
    caution: str = ""
    version: str = ""

    def __post_init__(self) -> None:
        depth_factor(self.depth_unit)
        area_factor(self.area_unit)
        problems = Problems()
        n = len(self.basins)
        for item, found in (
            ("names", len(self.names) or n),
            ("areas", len(self.areas)),
            ("positions", n if self.positions is None else len(self.positions)),
        ):
            if found != n:
                problems.add(item=item, found=f"{found}", expected=f"{n}")
        if self.start is not None and np.isnat(self.start):
            problems.add(item="start", found="no time", expected="a time, or None")
        if not self.hyetographs:
            problems.add(item="hyetographs", found="none", expected="at least one")
        self._check_hyetographs(problems)
        problems.raise_as(DataError)

    def _check_hyetographs(self, problems: Problems) -> None:
        seen: set[tuple[str, int, str]] = set()
        first: dict[tuple[str, int], DesignHyetograph] = {}
        for one in self.hyetographs:
            item = f"hyetograph {one.name}"
            group = one.point, one.minutes
            if unknown := sorted(set(one.basins) - set(self.basins)):
                problems.add(item=item, found=f"basins {', '.join(unknown)}", expected="basins of the content")
            if one.step != self.step:
                problems.add(item=item, found=f"a step of {one.step} min", expected=f"{self.step} min as the first")
            if (key := (*group, column_word(one))) in seen:
                problems.add(item=item, found="two", expected="one of each point, frequency, duration and pattern")
            seen.add(key)
            if one.basins != first.setdefault(group, one).basins:
                problems.add(
                    item=item,
                    found=f"basins {', '.join(one.basins)}",
                    expected=f"{', '.join(first[group].basins)} as in {first[group].name}",
                )

    @property
    def step(self) -> int:
        """The step of every hyetograph, minutes."""
        return self.hyetographs[0].step

    @property
    def written_areas(self) -> Floats:
        """Areas in the unit that is written, shape (n_basins,)."""
        return np.asarray(self.areas, dtype=float) / area_factor(self.area_unit)

    def depth(self, one: DesignHyetograph) -> Floats:
        """Return a hyetograph's depths in the unit that is written, shape (n_basins, n_steps), basin after basin."""
        return np.ascontiguousarray(one.depth.T / depth_factor(self.depth_unit))

    def groups(self, rows: int) -> Iterator[tuple[DesignHyetograph, ...]]:
        """Give out hyetographs in order, so many together that they hold no more than some values, and at least one."""
        group: list[DesignHyetograph] = []
        held = 0
        for one in self.hyetographs:
            if group and held + one.depth.size > rows:
                yield tuple(group)
                group, held = [], 0
            group.append(one)
            held += one.depth.size
        yield tuple(group)

    def by_storm(self) -> dict[tuple[str, int], list[DesignHyetograph]]:
        """Return the hyetographs of every point and duration, in order."""
        storms: dict[tuple[str, int], list[DesignHyetograph]] = {}
        for one in self.hyetographs:
            storms.setdefault((one.point, one.minutes), []).append(one)
        return storms

    def ends(self, elapsed: npt.NDArray[np.int64]) -> npt.NDArray[np.datetime64]:
        """Return the times that lie some minutes after the nominal start, datetime64[s]; NaT without one."""
        start = np.datetime64("NaT", "s") if self.start is None else self.start.astype("datetime64[s]")
        return np.asarray(start + (60 * elapsed).astype("timedelta64[s]"))

    def time_texts(self, elapsed: npt.NDArray[np.int64]) -> list[str]:
        """Return the same times in ISO 8601, to the minute, or to the second where the start needs it."""
        ends = self.ends(elapsed)
        whole = not (ends.astype(np.int64) % 60).any()
        return list(np.datetime_as_string(ends.astype("datetime64[m]" if whole else "datetime64[s]")).tolist())


def column_word(one: DesignHyetograph) -> str:
    """Return what a column of a hyetograph is called after: its frequency and its pattern."""
    return f"{frequency_word(one.frequency)}_{one.pattern}"


def frequency_word(frequency: Frequency) -> str:
    """Return what columns of a frequency are called after.

    Examples
    --------
    >>> frequency_word(Frequency.of_aep(0.01)), frequency_word(Frequency(2.0, "partial-duration"))
    ('aep_0.01', 'return_period_2')
    """
    if frequency.series == ANNUAL_MAXIMUM:
        return f"aep_{frequency.aep:.6g}"
    return f"return_period_{frequency.return_period:.6g}"
