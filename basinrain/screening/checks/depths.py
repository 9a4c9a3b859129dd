"""Depths that are too great for their duration."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.envelope import envelope_depth, world_depth
from basinrain.screening.findings import Finding, Severity
from basinrain.screening.screened import DAY, Bools, Floats, Ints, Screened, Sheet, runs_of
from basinrain.screening.wording import time_text

__all__ = ["DEPTH_LIMITS", "NAME", "greatest_depths_found"]

NAME: Final = "greatest-depths"

HOURS: Final = (1.0, 3.0, 6.0, 12.0, 24.0, 72.0, 720.0)
"""Durations of windows: the usual ones of depth-duration tables, a month at the end for slow faults."""

DOUBTFUL_SHARE: Final = 1 / 3
"""Share of the world's envelope above which a depth is doubtful where the user gives no limit: 134 mm in an hour, 608
mm in a day. Most regions never see it; where storms do, the user gives the region's own limit."""


DEPTH_LIMITS: Final = (
    f"The world's greatest known depths over the step and {', '.join(f'{hours:g}' for hours in HOURS)} h; doubtful "
    f"above the region's limit, or {DOUBTFUL_SHARE:.0%} of the world's where none is given."
)


@dataclass(frozen=True)
class _Window:
    """A window over its limit."""

    first: int
    stop: int
    depth: float
    hours: float
    limit: float
    severity: Severity

    @property
    def rank(self) -> tuple[bool, float]:
        return self.severity == "erroneous", self.depth / self.limit


def greatest_depths_found(view: Screened) -> Iterator[Finding]:
    """Yield depths over the world's greatest for their duration, the user's limit, or a third of the world's."""
    for sheet in view.sheets:
        windows: dict[int, list[_Window]] = {}
        depths = np.nan_to_num(sheet.depths)
        for k, hours in _durations(sheet):
            world = world_depth(hours)
            region = envelope_depth(view.options.envelope or (), hours)
            doubtful = min(region if np.isfinite(region) else DOUBTFUL_SHARE * world, world)
            for column in _may_exceed(depths, k, doubtful):
                for window in _over(depths[:, column], k, hours, doubtful, world):
                    windows.setdefault(int(column), []).append(window)
        for column, found in windows.items():
            yield from _findings(view, sheet, column, found)


def _durations(sheet: Sheet) -> list[tuple[int, float]]:
    """Return the windows, in intervals and hours, that the sheet's interval allows."""
    if not sheet.seconds:
        return []
    own = sheet.seconds / 3600
    lengths = {1: own}
    regular = bool((np.diff(sheet.ends.astype(np.int64)) == sheet.seconds).all())
    if regular:
        lengths |= {
            round(hours / own): hours for hours in HOURS if hours > own and abs(hours / own - round(hours / own)) < 1e-9
        }
    return [(k, hours) for k, hours in sorted(lengths.items()) if k <= len(sheet.ends)]


def _may_exceed(depths: Floats, k: int, limit: float) -> Ints:
    """Return the columns in which a window of ``k`` steps may exceed the limit: it fits into two blocks of ``k``."""
    if k == 1:
        return np.flatnonzero(depths.max(axis=0) > limit)
    blocks = np.add.reduceat(depths, np.arange(0, len(depths), k), axis=0)
    pairs = blocks + np.concatenate([blocks[1:], np.zeros_like(blocks[:1])])
    return np.flatnonzero(pairs.max(axis=0) > limit)


def _over(depths: Floats, k: int, hours: float, doubtful: float, world: float) -> Iterator[_Window]:
    through = np.concatenate([[0.0], np.cumsum(depths)])
    sums = through[k:] - through[:-k]
    for first in np.flatnonzero(sums > doubtful * (1 + 1e-9)).tolist():
        depth = float(sums[first])
        over_world = depth > world
        # Trimmed to its rain, so that no dry or good step is blamed.
        wet = np.flatnonzero(depths[first : first + k])
        yield _Window(
            first + int(wet[0]),
            first + int(wet[-1]) + 1,
            depth,
            hours,
            world if over_world else doubtful,
            "erroneous" if over_world else "doubtful",
        )


def _findings(view: Screened, sheet: Sheet, column: int, windows: list[_Window]) -> Iterator[Finding]:
    """Yield the worst windows that do not overlap, what adjoins joined."""
    g = int(sheet.gauges[column])
    taken: Bools = np.zeros(len(sheet.ends), dtype=bool)
    kept: list[_Window] = []
    for window in sorted(windows, key=lambda w: (*(-part for part in w.rank), w.first)):
        if not taken[window.first : window.stop].any():
            taken[window.first : window.stop] = True
            kept.append(window)
    for first, stop in runs_of(taken):
        top = max((w for w in kept if first <= w.first < stop), key=lambda w: w.rank)
        yield _finding(view, sheet, g, top, (first, stop))


def _finding(view: Screened, sheet: Sheet, g: int, top: _Window, steps: tuple[int, int]) -> Finding:
    start, end = sheet.starts[steps[0]], sheet.ends[steps[1] - 1]
    world = top.severity == "erroneous"
    limit = view.depth(top.limit)
    over = (
        f"more than was ever measured in that time: the greatest known depths reach {limit}"
        if world
        else f"more than the region's limit of {limit}"
        if np.isfinite(envelope_depth(view.options.envelope or (), top.hours))
        else f"more than {limit}, a third of the greatest depths known"
    )
    beside = view.beside(g, *view.cases_of(sheet.starts[top.first], sheet.ends[top.stop - 1]))
    neighbours = f" Neighbours, over the same day or days: {beside}." if beside else " No neighbour has a depth there."
    action = (
        "Reject it, or correct it from the original: a code, a slipped decimal point, another unit."
        if world
        else "Look at the original and at the neighbours: it may be the storm; keep it unless they speak against it."
    )
    return Finding(
        check=NAME,
        gauge=view.network.ids[g],
        start=start,
        end=end,
        severity=top.severity,
        evidence=f"{view.depth(top.depth)} in {_duration(top.hours)} to {time_text(sheet.ends[top.stop - 1])}, {over}."
        f"{neighbours}",
        action=action,
        others=view.ids(view.neighbours[g][:4]),
        edit=Edit(
            gauge=view.network.ids[g],
            start=start,
            end=end,
            action="reject",
            reason=f"{view.depth(top.depth)} in {_duration(top.hours)} cannot be",
            by=SUGGESTED,
        )
        if world
        else None,
    )


def _duration(hours: float) -> str:
    if hours < 1:
        return f"{hours * 60:.0f} min"
    return f"{hours:g} h" if hours * 3600 < DAY * 2 else f"{hours / 24:.3g} days"
