"""Rain that stands in the record twice: copied within a gauge, or one record under two gauges' names."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.screening.checks.belonging import TELLING, better_fit
from basinrain.screening.edits import SUGGESTED, Edit
from basinrain.screening.findings import Finding
from basinrain.screening.screened import Floats, Ints, Screened, Sheet

__all__ = ["COPY_LIMITS", "TWIN_LIMITS", "duplicated_stretches", "shared_records"]

WORD: Final = 5
"""Wet values, with the dry steps between them, that are compared at a time: the shortest stretch that is found."""

SURPRISE: Final = 12.0
"""Natural logarithm of the odds against chance, after allowing for all pairs of places in the record: wet spells repeat
more than independent values do, so that e¹² to 1, not 100 to 1, is asked."""

SHARED_SURPRISE: Final = 30.0
"""The same for two gauges at one time: neighbours have wet spells in common, and coarse gauges equal depths."""

LEAST_SHARED: Final = 8
"""Equal wet values on end that two gauges must have."""

WHOLE: Final = 0.9
"""Share of a gauge's wet values that are the other's, from which the whole record is."""

_MIX: Final = (np.uint64(0x9E3779B97F4A7C15), np.uint64(0xBF58476D1CE4E5B9), np.uint64(0x94D049BB133111EB))


COPY_LIMITS: Final = f"{WORD} or more wet values on end with the dry steps between, at odds of e^{SURPRISE:g} to 1."
TWIN_LIMITS: Final = f"{LEAST_SHARED} or more equal wet values on end, at odds of e^{SHARED_SURPRISE:g} to 1."


@dataclass(frozen=True, eq=False)
class _Wet:
    """The wet values of a gauge.

    Parameters
    ----------
    at : array of int, shape (n_wet,)
        Their intervals.
    value, gap : array of uint64, shape (n_wet,)
        The bits of the depths, and the intervals since the wet value before.
    bits : array of float, shape (n_wet,)
        How surprising each depth is: less the logarithm of its share among the gauge's wet values.
    bits_gap : array of float, shape (n_wet,)
        The same for gaps.
    """

    at: Ints
    value: npt.NDArray[np.uint64]
    gap: npt.NDArray[np.uint64]
    bits: Floats
    bits_gap: Floats


def _wet(depths: Floats) -> _Wet | None:
    at = np.flatnonzero(depths > 0)
    if len(at) < 2 * WORD:
        return None
    gap = np.diff(at, prepend=at[0] - 1)
    # A stretch over missing values is no stretch that stands twice: its gap is like no other.
    missing = np.cumsum(np.isnan(depths))
    across = np.diff(missing[at], prepend=missing[at[0]]) > 0
    gap = np.where(across, -at - 1, gap)
    value = depths[at] + 0.0
    return _Wet(at, value.view(np.uint64), gap.astype(np.uint64), _surprise(value), _surprise(gap))


def _surprise(values: npt.NDArray[np.generic]) -> Floats:
    _, which, counts = np.unique(values, return_inverse=True, return_counts=True)
    surprise: Floats = -np.log(counts / len(values))[which]
    return surprise


def _words(letters: npt.NDArray[np.uint64], before: npt.NDArray[np.uint64]) -> npt.NDArray[np.uint64]:
    """Return one number for every ``WORD`` letters on end; equal words have equal numbers.

    What lies ``before`` a letter counts too, except before the first of the word.
    """
    n = len(letters) - WORD + 1
    with np.errstate(over="ignore"):
        joined = _mixed(_mixed(letters) * _MIX[0] + before)
        words = _mixed(letters[:n])
        for k in range(1, WORD):
            words = _mixed(words * _MIX[0] + joined[k : k + n])
    return words


def _mixed(numbers: npt.NDArray[np.uint64]) -> npt.NDArray[np.uint64]:
    """Return numbers in which every bit depends on every bit (a finalizer of the kind that hash functions use)."""
    mixed = (numbers ^ (numbers >> np.uint64(30))) * _MIX[1]
    mixed = (mixed ^ (mixed >> np.uint64(27))) * _MIX[2]
    return mixed ^ (mixed >> np.uint64(31))


def duplicated_stretches(view: Screened) -> Iterator[Finding]:
    """Yield stretches of a gauge's record that stand in it a second time, value by value."""
    for sheet in view.sheets:
        for column, g in enumerate(sheet.gauges.tolist()):
            wet = _wet(sheet.depths[:, column])
            if wet is None:
                continue
            for copy in _repeats(wet):
                yield _repeat(view, sheet, g, wet, copy)


def _repeats(wet: _Wet) -> list[tuple[int, int, int]]:
    """Return places among the wet values of stretches that stand twice, with their lengths."""
    words = _words(wet.value, wet.gap)
    order = np.argsort(words, kind="stable")
    same = words[order[1:]] == words[order[:-1]]
    earlier, later = order[:-1][same], order[1:][same]
    places = len(wet.at)
    limit = SURPRISE + 2 * np.log(places)
    found: list[tuple[int, int, int]] = []
    through = np.concatenate([[0.0], np.cumsum(wet.bits)])
    through_gap = np.concatenate([[0.0], np.cumsum(wet.bits_gap)])
    for offset in np.unique(later - earlier).tolist():
        begins = np.sort(earlier[later - earlier == offset])
        for group in np.split(begins, np.flatnonzero(np.diff(begins) > 1) + 1):
            first, n = int(group[0]), len(group) + WORD - 1
            if offset < n or first + n > places:
                continue
            surprise = through[first + n] - through[first] + through_gap[first + n] - through_gap[first + 1]
            if surprise >= limit and len(np.unique(wet.value[first : first + n])) > 2:
                found.append((first, first + offset, n))
    return _apart(found)


def _apart(found: list[tuple[int, int, int]]) -> list[tuple[int, int, int]]:
    """Return the longest of the stretches that do not overlap with a longer one."""
    kept: list[tuple[int, int, int]] = []
    for item in sorted(found, key=lambda f: (-f[2], f[0], f[1])):
        if all(item[1] >= k[1] + k[2] or item[1] + item[2] <= k[1] for k in kept):
            kept.append(item)
    return kept


def _repeat(view: Screened, sheet: Sheet, g: int, wet: _Wet, copy: tuple[int, int, int]) -> Finding:
    gauge = view.network.ids[g]
    first, second, n = copy
    last = wet.at[second + n - 1]
    start, end = sheet.starts[wet.at[second]], sheet.ends[last]
    original = sheet.words(wet.at[first], wet.at[first + n - 1] + 1)
    return Finding(
        check="duplicated-stretch",
        gauge=gauge,
        start=start,
        end=end,
        severity="erroneous",
        evidence=f"{n} wet {sheet.unit}s with the dry ones between them, in {sheet.words(wet.at[second], last + 1)}, "
        f"are, value by value, those of {original}.",
        action="Find out which of the two stretches is the original, and reject the other.",
        others=view.ids(view.neighbours[g][:4]),
        edit=Edit(
            gauge=gauge,
            start=start,
            end=end,
            action="reject",
            reason=f"a copy of {original}",
            by=SUGGESTED,
        ),
    )


def shared_records(view: Screened) -> Iterator[Finding]:
    """Yield pairs of gauges that have the same wet values at the same times over a stretch."""
    for sheet in view.sheets:
        # In the order of ids, so that of three gauges with one record the same pairs are named in any order of columns.
        by_id = sorted(range(len(sheet.gauges)), key=lambda column: view.network.ids[sheet.gauges[column]])
        wets = {rank: wet for rank, column in enumerate(by_id) if (wet := _wet(sheet.depths[:, column])) is not None}
        if len(wets) < 2:
            continue
        words = {rank: _words(_dated(wet), wet.gap) for rank, wet in wets.items()}
        word = np.concatenate(list(words.values()))
        rank = np.repeat(list(words), [len(w) for w in words.values()])
        place = np.concatenate([np.arange(len(w)) for w in words.values()])
        order = np.lexsort((rank, word))
        same = word[order[1:]] == word[order[:-1]]
        pairs: dict[tuple[int, int], list[int]] = {}
        for k in np.flatnonzero(same).tolist():
            one, other = order[k], order[k + 1]
            pairs.setdefault((int(rank[one]), int(rank[other])), []).append(int(place[one]))
        for (one, other), begins in pairs.items():
            pair = int(sheet.gauges[by_id[one]]), int(sheet.gauges[by_id[other]])
            yield from _shared(view, sheet, wets[one], pair, np.sort(begins))


def _dated(wet: _Wet) -> npt.NDArray[np.uint64]:
    """Return the wet values with their time in them."""
    with np.errstate(over="ignore"):
        return _mixed(wet.value) + wet.at.astype(np.uint64) * _MIX[0]


def _shared(view: Screened, sheet: Sheet, wet: _Wet, pair: tuple[int, int], begins: Ints) -> Iterator[Finding]:
    through = np.concatenate([[0.0], np.cumsum(wet.bits)])
    stretches = []
    for group in np.split(begins, np.flatnonzero(np.diff(begins) > 1) + 1):
        first, n = int(group[0]), len(group) + WORD - 1
        if n >= LEAST_SHARED and through[first + n] - through[first] >= SHARED_SURPRISE:
            stretches.append((first, n))
    if not stretches:
        return
    equal = sum(n for _, n in stretches)
    if equal >= WHOLE * len(wet.at):
        yield _shared_whole(view, sheet, pair, equal)
        return
    for first, n in stretches:
        yield _shared_stretch(view, sheet, pair, (int(wet.at[first]), int(wet.at[first + n - 1]) + 1), n)


def _shared_whole(view: Screened, sheet: Sheet, pair: tuple[int, int], equal: int) -> Finding:
    a, b = pair
    return Finding(
        check="one-record-two-gauges",
        gauge=view.network.ids[b],
        severity="erroneous",
        evidence=f"{equal} wet {sheet.unit}s are, value by value, those of {view.network.ids[a]}, "
        f"{view.distances[a, b] / 1000:.1f} km away. Whose they are cannot be told.",
        action="Find out whose record it is, and exclude the other gauge: one rain must not count twice.",
        others=(view.network.ids[a],),
    )


def _shared_stretch(view: Screened, sheet: Sheet, pair: tuple[int, int], steps: tuple[int, int], n: int) -> Finding:
    """Return the finding at the gauge whose they are not, by the other gauges; where these differ, at the later id."""
    start, end = sheet.starts[steps[0]], sheet.ends[steps[1] - 1]
    sure = better_fit(view, pair, start, end)
    right, wrong = pair if sure > -TELLING else pair[::-1]
    told = abs(sure) >= TELLING
    owner, gauge = view.network.ids[right], view.network.ids[wrong]
    odds = f"{np.exp(abs(sure)):.0f}" if abs(sure) < np.log(1000) else "over 1000"
    whose = (
        f"By the other gauges they are {owner}'s at odds of {odds} to 1, and not {gauge}'s."
        if told
        else f"Whether they are {owner}'s or {gauge}'s the other gauges do not tell."
    )
    return Finding(
        check="one-record-two-gauges",
        gauge=gauge,
        start=start,
        end=end,
        severity="erroneous",
        evidence=f"{n} wet {sheet.unit}s on end, in {sheet.words(*steps)}, are, value by value, those of {owner}, "
        f"{view.distances[pair] / 1000:.1f} km away. {whose}",
        action=f"Reject them at {gauge}, unless its book says otherwise: one rain must not count twice."
        if told
        else f"Find out whose they are, and reject them at the other by an edit, {gauge} or {owner}: one rain must not "
        "count twice.",
        others=(owner,),
        edit=Edit(gauge=gauge, start=start, end=end, action="reject", reason=f"the record of {owner}", by=SUGGESTED)
        if told
        else None,
    )
