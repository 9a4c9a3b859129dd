"""How rare a storm was over a basin: its greatest areal depths against those of the table, duration by duration."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.found_frequency import check_frequencies, found_frequencies
from basinrain.designstorm.measures import duration_text
from basinrain.designstorm.rarity_sentences import (
    few_steps_remark,
    interval_sentence,
    meaning_sentences,
    points_sentence,
    rarest_sentence,
    searched_sentence,
)
from basinrain.designstorm.storm_depths import RarityRow, StormDepths, StormRarity
from basinrain.errors import DataError, Problems

__all__ = ["comparable", "storm_rarity"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]

_ROUNDING: Final = 1e-6


def comparable(minutes: npt.ArrayLike, *, step: float, window: float) -> Bools:
    """Return which durations a storm's record has depths of.

    Parameters
    ----------
    minutes : array of float, shape (n,)
        Durations.
    step
        The record's step in minutes.
    window
        The storm's length in minutes.

    Returns
    -------
    array of bool, shape (n,)
        Whether the duration is a whole number of steps, one at least, and no longer than the storm.

    Examples
    --------
    >>> comparable([5, 15, 50, 60, 1440], step=15, window=720)
    array([False,  True, False,  True, False])
    """
    return np.array([not _why_not(float(m), step, window) for m in np.asarray(minutes, dtype=np.float64)], dtype=bool)


def storm_rarity(
    storm: str,
    minutes: npt.ArrayLike,
    areal: StormDepths,
    *,
    frequencies: Sequence[Frequency],
    step: float,
    window: float,
    gauges: StormDepths | None = None,
    infilled: npt.ArrayLike | None = None,
    table_step: float | None = None,
) -> StormRarity:
    """Return how rare a storm's greatest depths were, by duration and place.

    Parameters
    ----------
    storm
        Its name.
    minutes : array of float, shape (n_durations,)
        Rising durations of the table, those included that :func:`comparable` refuses.
    areal
        The storm over the basins.
    frequencies
        Of the table, rising in rarity, of one series.
    step
        The record's step in minutes.
    window
        The storm's length in minutes.
    gauges
        The storm at the gauges. Of every duration the wettest is compared, the first by name of equal ones.
    infilled : array of float, shape (n_areas,), optional
        Share of every area's storm depth that rests on infilled values, 0 to 1; NaN where it is not known.
    table_step
        Step in minutes of the record that the table was made from, where nothing was done to its sums to make up for
        fixed intervals; None where the table is of true intervals, as published ones are.

    Returns
    -------
    StormRarity

    Raises
    ------
    DataError
        Shapes do not fit; durations do not rise; a step, window or share that cannot be; or as
        :func:`~basinrain.designstorm.found_frequency.found_frequency`.

    Examples
    --------
    >>> ladder = np.array([[[20.0, 30.0, 40.0], [40.0, 60.0, 80.0]]])
    >>> ends = np.full((2, 1), np.datetime64("2031-05-04T06:00", "s"))
    >>> found = storm_rarity(
    ...     "Quill",
    ...     [60, 360],
    ...     StormDepths(names=("Upper",), depth=np.array([[18.0], [70.0]]), ends=ends, ladder=ladder),
    ...     frequencies=[Frequency(years, "annual-maximum") for years in (2, 10, 100)],
    ...     step=60,
    ...     window=720,
    ... )
    >>> for row in found.rows:
    ...     print(row.place, row.minutes, row.found.words)
    Upper 60.0 more frequent than 1 in 2 a year (the table's most frequent)
    Upper 360.0 between 1 in 10 and 1 in 100 a year, about 1 in 31
    >>> print(found.sentences[0])
    The rarest of the depths compared: over Upper in 6 h, between 1 in 10 and 1 in 100 a year, about 1 in 31.
    """
    asked = np.asarray(minutes, dtype=np.float64)
    shares = None if infilled is None else np.asarray(infilled, dtype=np.float64)
    series = check_frequencies(frequencies)
    _check(asked, areal, gauges, len(frequencies), step=step, window=window, shares=shares)
    kept, left_out = _sorted_out(asked, areal, gauges, step, window)

    remarks = [few_steps_remark(one / step, same=table_step == step) for one in asked.tolist()]
    rows = _areal_rows(asked, kept, areal, frequencies, remarks)
    gauge_rows = () if gauges is None else _gauge_rows(asked, kept, gauges, frequencies, remarks)
    known = [row for row in rows if row.found.known]
    rarest, rarest_at_gauge = _rarest(rows), _rarest(gauge_rows)
    n_durations = len({row.minutes for row in known})
    n_areas = len({row.place for row in known})
    n_gauges = 0 if gauges is None else int((_both(gauges)[kept]).any(axis=0).sum())
    sentences = [
        rarest_sentence([_where(row) for row in rarest], [row.found for row in rarest]),
        *([searched_sentence(n_durations, n_areas, len(known))] if known else []),
    ]
    if rarest_at_gauge:
        where, found = [_where(row) for row in rarest_at_gauge], [row.found for row in rarest_at_gauge]
        sentences += [rarest_sentence(where, found, of="the wettest gauges' depths"), points_sentence(n_gauges)]
    table_words = None if table_step is None else duration_text(table_step)
    sentences.append(interval_sentence(duration_text(step), table_words, same=table_step == step))
    sentences += meaning_sentences(
        series,
        beyond=any(row.found.beyond for row in (*rows, *gauge_rows)),
        infilled=[] if shares is None else list(zip(areal.names, shares.tolist(), strict=True)),
        aligned=areal.aligned is not None,
    )
    return StormRarity(
        storm=storm,
        frequencies=tuple(frequencies),
        minutes=asked,
        areal=areal,
        gauges=gauges,
        rows=rows,
        gauge_rows=gauge_rows,
        rarest=rarest,
        rarest_at_gauge=rarest_at_gauge,
        n_durations=n_durations,
        n_areas=n_areas,
        n_gauges=n_gauges,
        left_out=left_out,
        sentences=tuple(sentences),
    )


def _where(row: RarityRow) -> str:
    place = f"over {row.place}" if row.kind == "areal" else f"at gauge {row.place}"
    return f"{place} in {duration_text(row.minutes)}"


def _both(depths: StormDepths) -> Bools:
    """Return where there is a depth and a table to compare it with, by duration and name."""
    return ~np.isnan(depths.depth) & (~np.isnan(depths.ladder)).any(axis=-1).T


def _why_not(minutes: float, step: float, window: float) -> str:
    # Durations are of whole seconds at the least.
    if minutes < step - _ROUNDING:
        return f"shorter than the record's step of {duration_text(step)}"
    if minutes > window + _ROUNDING:
        return f"longer than the storm's window of {duration_text(window)}"
    if abs(minutes / step - round(minutes / step)) > _ROUNDING:
        return f"no whole number of the record's steps of {duration_text(step)}"
    return ""


def _sorted_out(
    minutes: Floats, areal: StormDepths, gauges: StormDepths | None, step: float, window: float
) -> tuple[npt.NDArray[np.int64], tuple[str, ...]]:
    """Return the places of the durations that can be compared, and the others with the reason."""
    kept, left_out = [], []
    given = [areal] if gauges is None else [areal, gauges]
    for d, one in enumerate(minutes.tolist()):
        why = _why_not(one, step, window)
        if not why and not any((~np.isnan(depths.ladder[:, d])).any() for depths in given):
            why = "the table has no depths of it"
        if not why and not any((~np.isnan(depths.depth[d])).any() for depths in given):
            why = "no window of the storm has a depth at every step"
        if why:
            left_out.append(f"{duration_text(one)}: {why}")
        else:
            kept.append(d)
    return np.array(kept, dtype=np.int64), tuple(left_out)


def _areal_rows(
    minutes: Floats,
    kept: npt.NDArray[np.int64],
    areal: StormDepths,
    frequencies: Sequence[Frequency],
    remarks: Sequence[str],
) -> tuple[RarityRow, ...]:
    found = found_frequencies(areal.depth, frequencies, areal.ladder.swapaxes(0, 1))
    return tuple(
        RarityRow(
            kind="areal",
            place=name,
            minutes=float(minutes[d]),
            found=found.one((d, a)),
            end=areal.ends[d, a],
            aligned=np.nan if areal.aligned is None else float(areal.aligned[d, a]),
            remark=remarks[d],
        )
        for a, name in enumerate(areal.names)
        for d in kept.tolist()
    )


def _gauge_rows(
    minutes: Floats,
    kept: npt.NDArray[np.int64],
    gauges: StormDepths,
    frequencies: Sequence[Frequency],
    remarks: Sequence[str],
) -> tuple[RarityRow, ...]:
    found = found_frequencies(gauges.depth, frequencies, gauges.ladder.swapaxes(0, 1))
    both = _both(gauges)
    by_name = np.argsort(np.array(gauges.names), kind="stable")
    rows = []
    for d in kept.tolist():
        if both[d].any():
            g = int(by_name[np.where(both[d], gauges.depth[d], -1.0)[by_name].argmax()])
            rows.append(
                RarityRow(
                    kind="point",
                    place=gauges.names[g],
                    minutes=float(minutes[d]),
                    found=found.one((d, g)),
                    end=gauges.ends[d, g],
                    aligned=np.nan if gauges.aligned is None else float(gauges.aligned[d, g]),
                    remark=remarks[d],
                )
            )
    return tuple(rows)


def _rarest(rows: Sequence[RarityRow]) -> tuple[RarityRow, ...]:
    ranks = [(row.found.rank, row) for row in rows if row.found.known]
    top = max((rank for rank, _ in ranks), default=0.0)
    return tuple(row for rank, row in ranks if rank == top)


def _check(
    minutes: Floats,
    areal: StormDepths,
    gauges: StormDepths | None,
    n_t: int,
    *,
    step: float,
    window: float,
    shares: Floats | None,
) -> None:
    problems = Problems()
    if minutes.ndim != 1 or not len(minutes) or not np.all(np.diff(minutes, prepend=0.0) > 0):
        problems.add(item="durations", found=str(minutes.tolist()), expected="minutes above 0 that rise, one at least")
        problems.raise_as(DataError)
    for item, value in (("the record's step", step), ("the storm's window", window)):
        if not (np.isfinite(value) and value > 0):
            problems.add(item=item, found=f"{value:g} minutes", expected="more than 0")
    for kind, depths in (("area", areal), ("gauge", gauges)):
        if depths is None:
            continue
        n = len(depths.names)
        wanted = {"depth": (len(minutes), n), "ends": (len(minutes), n), "ladder": (n, len(minutes), n_t)}
        arrays = {"depth": depths.depth, "ends": depths.ends, "ladder": depths.ladder}
        if depths.aligned is not None:
            wanted["aligned"], arrays["aligned"] = wanted["depth"], depths.aligned
        for name, array in arrays.items():
            if array.shape != wanted[name]:
                problems.add(
                    item=f"'{name}' of the {kind}s", found=f"shape {array.shape}", expected=f"shape {wanted[name]}"
                )
        if not n:
            problems.add(item=f"{kind}s", found="none", expected="one at least")
        twice = sorted({name for name in depths.names if depths.names.count(name) > 1})
        if twice:
            problems.add(item=f"{kind} {twice[0]}", found="twice", expected="every name once")
    if shares is not None:
        if shares.shape != (len(areal.names),):
            problems.add(item="infilled", found=f"shape {shares.shape}", expected=f"shape {(len(areal.names),)}")
        elif ((shares < -_ROUNDING) | (shares > 1 + _ROUNDING)).any():
            problems.add(item="infilled", found=str(shares.tolist()), expected="shares between 0 and 1")
    problems.raise_as(DataError)
