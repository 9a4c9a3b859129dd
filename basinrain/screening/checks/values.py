"""Values that no rain writes: one depth that stands still, and codes of missing values read as depths."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from typing import Final

import numpy as np

from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import Floats, Screened, Sheet, runs_of
from basinrain.screening.wording import exact_text

__all__ = ["CODE_LIMITS", "STUCK_LIMITS", "missing_codes", "stuck_values"]

LEAST_EQUAL: Final = 5
"""Equal depths on end below which a run is never called stuck: coarse gauges repeat small depths."""

CHANCE: Final = 1e-4
"""Expected number of such runs in the whole record, by the gauge's own habit of repeating a depth, above which a run
may be chance: one in ten thousand, since rain that lasts repeats itself more than the habit says."""

HABIT: Final = 5.0
"""Weight, in pairs of steps, of the gauge's habit over all depths when that of one depth is estimated."""

CODES: Final = (99.9, 99.99, 777.0, 777.7, 888.0, 888.8, 999.0, 999.9, 999.99, 7777.0, 8888.0, 9999.0, 9999.9, 99999.0)
"""Codes of missing or suspect values that formats and observers use (common practice)."""

LIMITS: Final = (3276.7, 32767.0, 6553.5, 65535.0)
"""Full scale of registers of two bytes, in whole units or tenths, which loggers write when they fail."""

UNITS: Final = {"mm": 1.0, "in": 25.4, "0.1 mm": 0.1, "0.01 in": 0.254, "cm": 10.0, "0.1 in": 2.54, "0.01 mm": 0.01}
"""Units that files of rain are written in, and how many mm one is."""

TIMES_GREATER: Final = 2.0
"""How far a code must stand above every other depth of the gauge where it stands twice; with three it need only be
above."""

_FIT: Final = 2e-4
_FEW: Final = 3


STUCK_LIMITS: Final = (
    f"{LEAST_EQUAL} or more equal depths on end, of which the gauge's own habit lets expect less than {CHANCE:g} runs "
    "in the record."
)
CODE_LIMITS: Final = (
    f"A known code or full scale, twice or more and {TIMES_GREATER:g} times every other depth, or {_FEW} times and "
    "above every other depth."
)


def stuck_values(view: Screened) -> Iterator[Finding]:
    """Yield runs of one depth above 0 that are too long for the gauge's own habit of repeating it."""
    for sheet in view.sheets:
        for column, g in enumerate(sheet.gauges.tolist()):
            for first, stop, expected in _stuck(sheet.depths[:, column]):
                gauge, depth = view.network.ids[g], exact_text(float(sheet.depths[first, column]), view.depth_unit)
                start, end = sheet.starts[first], sheet.ends[stop - 1]
                beside = view.beside(g, *view.cases_of(start, end)) if view.timed else ""
                yield Finding(
                    check="stuck-values",
                    gauge=gauge,
                    start=start,
                    end=end,
                    evidence=f"{depth} in each of {sheet.words(first, stop)}; by the gauge's own habit "
                    f"{max(expected, 1e-9):.1g} such runs would be expected in the record."
                    + (f" Neighbours over the same day or days: {beside}." if beside else ""),
                    action="Reject the run: a stuck float or register, or one value copied down.",
                    others=view.ids(view.neighbours[g][:4]),
                    edit=Edit(
                        gauge=gauge,
                        start=start,
                        end=end,
                        action="reject",
                        reason=f"{depth} repeated over {stop - first} {sheet.unit}s",
                        by=SUGGESTED,
                    ),
                )


def _stuck(depths: Floats) -> list[tuple[int, int, float]]:
    """Return first, stop and the expected number of runs as long, for the runs that are too long."""
    n = len(depths)
    if n < LEAST_EQUAL:
        return []
    begins = np.flatnonzero(np.concatenate([[True], depths[1:] != depths[:-1]]))
    stops = np.append(begins[1:], n)
    wet = depths[begins] > 0
    begins, stops = begins[wet], stops[wet]
    lengths = stops - begins
    if not len(lengths) or lengths.max() < LEAST_EQUAL:
        return []
    values, which = np.unique(depths[begins], return_inverse=True)
    # How often a depth repeats, apart from its longest run, which is what is judged.
    longest = np.zeros(len(values), dtype=np.int64)
    np.maximum.at(longest, which, lengths)
    pairs = np.bincount(which, lengths - 1) - (longest - 1)
    chances = np.bincount(which, lengths) - longest
    short = lengths[lengths < LEAST_EQUAL]
    general = ((short - 1).sum() + 1) / (short.sum() + 2)
    repeats = (pairs + HABIT * general) / (chances + HABIT)
    expected = len(lengths) * repeats[which] ** (lengths - 1)
    found = (lengths >= LEAST_EQUAL) & (expected < CHANCE)
    return list(zip(begins[found].tolist(), stops[found].tolist(), expected[found].tolist(), strict=True))


def missing_codes(view: Screened) -> Iterator[Finding]:
    """Yield codes of missing values that were read as depths: they repeat exactly, far above all else."""
    codes, names = _known_codes()
    for sheet in view.sheets:
        for column, depths in enumerate(sheet.depths.T):
            values, counts = np.unique(depths[depths > 0], return_counts=True)
            if not len(values):
                continue
            nearest = _nearest(codes, values)
            fits = np.abs(codes[nearest] - values) <= _FIT * values
            for k in np.flatnonzero(fits)[::-1].tolist():
                others = values[:k][~fits[:k]]
                above = others[-1] if len(others) else 0.0
                beyond = values[k + 1 :][~fits[k + 1 :]]
                sure = counts[k] >= 2 and values[k] >= TIMES_GREATER * above
                if len(beyond) or not (sure or (counts[k] >= _FEW and values[k] > above)):
                    continue
                yield from _codes(view, sheet, column, _Code(float(values[k]), names[nearest[k]], float(above)))


@dataclass(frozen=True)
class _Code:
    """A depth in mm that is a code, what the code is, and the gauge's greatest other depth in mm."""

    depth: float
    what: str
    above: float


@cache
def _known_codes() -> tuple[Floats, list[str]]:
    """Return the depths in mm that codes are read as, rising, and what they are; mm goes before other units."""
    units = sorted(UNITS.items(), key=lambda item: item[1] != 1.0)
    kinds = (
        (CODES, "a usual code for a missing value"),
        (LIMITS, "the full scale of a logger's register, which it writes when it fails"),
    )
    named = [
        (code * factor, f"{code:.6g} {unit} is {what}")
        for unit, factor in units
        for codes, what in kinds
        for code in codes
    ]
    codes, first = np.unique(np.round([depth for depth, _ in named], 6), return_index=True)
    return codes, [named[k][1] for k in first.tolist()]


def _nearest(codes: Floats, values: Floats) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
    right = np.clip(np.searchsorted(codes, values), 1, len(codes) - 1)
    return np.where(values - codes[right - 1] < codes[right] - values, right - 1, right)


def _codes(view: Screened, sheet: Sheet, column: int, code: _Code) -> Iterator[Finding]:
    """Yield the stretches of a code; steps that have no depth do not part them."""
    depths = sheet.depths[:, column]
    g = int(sheet.gauges[column])
    gauge = view.network.ids[g]
    known = np.flatnonzero(np.isfinite(depths))
    count = int((depths == code.depth).sum())
    depth = exact_text(code.depth, view.depth_unit)
    for a, b in runs_of(depths[known] == code.depth):
        start, end = sheet.starts[known[a]], sheet.ends[known[b - 1]]
        yield Finding(
            check="missing-code",
            gauge=gauge,
            start=start,
            end=end,
            severity="erroneous",
            evidence=f"{depth} in {sheet.words(known[a], known[b - 1] + 1)}, and in {count} {sheet.unit}s of the "
            f"record in all. The gauge's greatest other depth is {view.depth(code.above)}, and {code.what}.",
            action="Declare the code under missing, as it stands in the file, or reject the values.",
            edit=Edit(
                gauge=gauge,
                start=start,
                end=end,
                action="reject",
                reason=code.what,
                by=SUGGESTED,
            ),
        )
