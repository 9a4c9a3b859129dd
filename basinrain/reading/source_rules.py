"""The options of a rainfall source, checked together, as the rules by which its files are read."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from basinrain.clocks import parse_zone
from basinrain.errors import JobError, Problems
from basinrain.intervals import Interval
from basinrain.layouts import GHCN, GHCN_UNIT, file_format
from basinrain.reading.choices import check_choices, check_numbers, reading_hour, source_interval, time_of_day
from basinrain.reading.counter_rules import CounterRules
from basinrain.reading.depths import DepthRules, depth_rules
from basinrain.reading.options import of_file, option_problems
from basinrain.reading.stamps import StampRules
from basinrain.reading.tips import TipRules

__all__ = ["SourceRules", "source_rules"]


@dataclass(frozen=True, kw_only=True)
class SourceRules:
    """How the files of a source are to be understood.

    Parameters
    ----------
    paths
        The files.
    layout
        Their layout.
    depths
        The rules of depth cells.
    stamps
        The rules of time stamps; None for storm totals.
    columns
        Which column holds what.
    gaps
        Whether times that are absent are refused or become missing.
    tips, counter
        What only these layouts have.
    """

    paths: tuple[Path, ...]
    layout: str
    depths: DepthRules
    stamps: StampRules | None
    columns: Mapping[str, str]
    gaps: Literal["refuse", "missing"]
    tips: TipRules | None = None
    counter: CounterRules | None = None

    @property
    def interval(self) -> Interval:
        """The files' step, where they have one."""
        if self.stamps is None:
            raise ValueError("storm totals have no step")
        return self.stamps.interval


def source_rules(
    files: str | Path | Sequence[str | Path],
    *,
    layout: Literal["wide", "long", "totals", "tips", "counter", "ghcn-dly", "ghcn-csv"] = "wide",
    unit: str | None = None,
    interval: str | None = None,
    stamp: Literal["end", "start"] = "end",
    timezone: str | None = None,
    read_hour: str | int | None = None,
    date_means: Literal["calendar-day", "ends", "starts"] | None = None,
    missing: Sequence[str | float] = (),
    trace: Sequence[str] = ("T",),
    flags: Mapping[str, Sequence[str]] | None = None,
    accumulated: str | None = None,
    gaps: Literal["refuse", "missing"] = "refuse",
    time_format: str | None = None,
    tip: float | None = None,
    start: str | None = None,
    end: str | None = None,
    rollover: float | None = None,
    jitter: float = 0.0,
    reset: str | int | None = None,
    columns: Mapping[str, str] | None = None,
) -> SourceRules:
    """Return the rules of a source, from the options of :func:`basinrain.reading.read_rainfall`.

    Raises
    ------
    JobError
        The options cannot be; all such problems together. No file is opened.

    Examples
    --------
    >>> rules = source_rules("rain.csv", layout="wide", unit="in", interval="60min")
    >>> rules.interval.label, rules.depths.factor
    ('1h', 25.4)
    """
    paths = (Path(files),) if isinstance(files, str | Path) else tuple(Path(file) for file in files)
    # A job may have many sources; their first file tells them apart.
    first = str(paths[0]) if paths else ""
    problems = Problems(file=first)
    given: dict[str, object] = {
        "stamp": None if stamp == "end" else stamp,
        "date_means": date_means,
        "gaps": None if gaps == "refuse" else gaps,
        "unit": unit,
        "read_hour": read_hour,
        "missing": missing or None,
        "trace": None if tuple(trace) == ("T",) else trace,
        "flags": flags or None,
        "accumulated": accumulated,
        "time_format": time_format,
        "tip": tip,
        "start": start,
        "end": end,
        "rollover": rollover,
        "jitter": jitter or None,
        "reset": reset,
        "columns": columns or None,
    }
    check_choices(layout, given, problems, formats={file_format(path.name) for path in paths})
    if not paths:
        problems.add(item="files", found="none", expected="at least one file")
    check_numbers(problems, above={"tip": tip, "rollover": rollover}, least={"jitter": jitter})
    step, hour, anew = None, None, None
    with option_problems(problems, file=first):
        step = source_interval(interval, layout)
    with option_problems(problems, file=first):
        hour = reading_hour(read_hour, date_means, step)
    with option_problems(problems, file=first):
        anew = None if reset is None else time_of_day(reset, item="reset")
    with option_problems(problems, file=first):
        _ = None if timezone is None else parse_zone(timezone)

    def rules_of_depths() -> DepthRules:
        return depth_rules(
            unit=GHCN_UNIT if layout in GHCN else unit or "",
            interval=None if layout == "counter" else step,  # a reading may be of any size
            missing=missing,
            trace=() if layout in {"tips", "counter"} else trace,
            flags=flags or {},
            accumulated=accumulated,
            least=-jitter if layout == "counter" else 0.0,
        )

    with option_problems(problems, file=first):
        rules_of_depths()
    problems.raise_as(JobError)
    depths = rules_of_depths()
    if step is None:
        return SourceRules(paths=paths, layout=layout, depths=depths, stamps=None, columns=columns or {}, gaps=gaps)
    stamps = StampRules(
        interval=step,
        stamp=stamp,
        timezone=timezone,
        read_hour=hour,
        date_means=date_means or "calendar-day",
        time_format=time_format,
    )
    with of_file(first):
        tips = TipRules(interval=step, tip=_in_mm(tip, depths), start=start, end=end) if layout == "tips" else None
        counter = CounterRules(rollover=_in_mm(rollover, depths), jitter=jitter * depths.factor, reset=anew)
    return SourceRules(
        paths=paths,
        layout=layout,
        depths=depths,
        stamps=stamps,
        columns=columns or {},
        gaps=gaps,
        tips=tips,
        counter=counter if layout == "counter" else None,
    )


def _in_mm(depth: float | None, rules: DepthRules) -> float | None:
    return None if depth is None else depth * rules.factor
