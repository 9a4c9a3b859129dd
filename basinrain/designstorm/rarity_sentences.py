"""What a storm's rarity means, and what it does not, in whole sentences."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from basinrain.designstorm.exceedance import PARTIAL_DURATION
from basinrain.designstorm.found_frequency import FoundFrequency
from basinrain.designstorm.interval_factors import weiss

__all__ = [
    "few_steps_remark",
    "interval_sentence",
    "meaning_sentences",
    "points_sentence",
    "rarest_sentence",
    "searched_sentence",
]

_FEW: Final = 6
"""Up to so many steps, depths at fixed intervals read low by 2 % or more on average."""

_MUCH: Final = 0.25
"""Share of a mean on infilled values above which it is said."""

_ANNUAL: Final = (
    "Each probability is the chance that in any one year a depth at least as great falls over this area in this "
    "duration. It is a range between the table's neighbouring frequencies; the figure within it is interpolated."
)
_PARTIAL: Final = (
    "The table's return periods are of a partial duration series: the mean time between depths at least as great over "
    "this area in this duration, of which one year may have several. For the chance in any one year (AEP) take "
    "1 - exp(-1/T) (Langbein 1949): 1 year is 63 %, 2 years 39 %, 10 years 9.5 %. The range is between the table's "
    "neighbouring return periods; the figure within it is interpolated."
)
_BEYOND: Final = (
    "A depth above the table's end is said to be rarer than that end, and no more: nothing is extrapolated."
)
_NO_FLOOD: Final = (
    "It is not the probability of the flood: that depends also on how wet the ground was, on where and when within the "
    "storm the rain fell, on snow, storage and the channels."
)
_NO_FORECAST: Final = (
    "It is not a forecast: a depth of 1 in 100 a year has the same chance next year, whether or not it has just fallen."
)
_TABLE_ERROR: Final = (
    "The depth-duration-frequency compared with is an estimate from limited records, most uncertain where it is "
    "rarest; its own error, and that of a mean of few gauges, is not in the range."
)
_NOT_RANDOM: Final = "A storm is looked into because it was great: it is not a storm picked at random."
_ALIGNED: Final = (
    "Greatest depths in windows tied to the clock are kept beside, to be compared with clock-hour records; they are "
    "never the greater, and no probability is found for them."
)


def rarest_sentence(where: Sequence[str], found: Sequence[FoundFrequency], *, of: str = "the depths compared") -> str:
    """Return which depth was the rarest; several where a table cannot tell them apart.

    Parameters
    ----------
    where
        Places and durations, in words.
    found
        How rare each was; all of one rank.
    of
        What the depths are called.

    Examples
    --------
    >>> rarest_sentence([], [])
    'None of the depths could be compared.'
    """
    if not where:
        return "None of the depths could be compared."
    words = found[0].words
    if found[0].estimate is None and not found[0].beyond:
        return f"None of {of} is within the table: each is {words}."
    head = f"The rarest of {of}: "
    if len(where) > 1 and found[0].beyond:
        return f"{head}{'; '.join(where)}; each is {words}, and which of them is the rarest the table cannot tell."
    return head + "; ".join(f"{place}, {one.words}" for place, one in zip(where, found, strict=True)) + "."


def searched_sentence(n_durations: int, n_areas: int, n_looks: int) -> str:
    """Return how much was searched, and what that does to the rarest.

    Examples
    --------
    >>> searched_sentence(1, 1, 1)
    'Searched: 1 duration over 1 basin, 1 depth. The probability is that of this duration over this basin, not that of \
the storm: a storm as a whole has none.'
    """
    searched = f"Searched: {_counted(n_durations, 'duration')} over {_counted(n_areas, 'basin')}, "
    more = (
        f" The rarest of {n_looks} looks is rarer than one look: the more durations and basins are searched, the "
        "likelier something rare turns up somewhere."
    )
    return (
        f"{searched}{_counted(n_looks, 'depth')}.{more if n_looks > 1 else ''} The probability is that of this "
        "duration over this basin, not that of the storm: a storm as a whole has none."
    )


def few_steps_remark(steps: float, *, same: bool) -> str:
    """Return what is to be known of a depth that is the sum of few steps; empty for many.

    Parameters
    ----------
    steps
        How many steps of the record the duration is.
    same
        Whether the table is of sums of the same steps.

    Notes
    -----
    8n / (8n - 1) for n steps: Weiss, L. L. (1964): Ratio of true to fixed-interval maximum rainfall, Journal of the
    Hydraulics Division, ASCE, 90; derived in :func:`~basinrain.designstorm.interval_factors.weiss`. It is a mean over
    many storms: one storm may need more or nothing.

    Examples
    --------
    >>> few_steps_remark(1, same=False)
    'the sum of 1 step of the record: reads low against a table of true intervals, on average by a factor of 8/7 = \
1.143 (8n/(8n - 1), Weiss 1964), and is not adjusted; the storm may have been rarer'
    >>> few_steps_remark(7, same=False), few_steps_remark(1, same=True)
    ('', '')
    """
    n = round(steps)
    if same or not 1 <= n <= _FEW:
        return ""
    factor = float(weiss(np.array([float(n)]))[0])
    return (
        f"the sum of {_counted(n, 'step')} of the record: reads low against a table of true intervals, on average by "
        f"a factor of {8 * n}/{8 * n - 1} = {factor:.3f} (8n/(8n - 1), Weiss 1964), and is not adjusted; "
        "the storm may have been rarer"
    )


def points_sentence(n_gauges: int) -> str:
    """Return how depths at gauges go together with those over basins.

    Examples
    --------
    >>> points_sentence(7).split(": ")[-1]
    'what was rare at a point may have been common over the area, and the other way round.'
    """
    wettest = f"The wettest of {n_gauges} gauges" if n_gauges > 1 else "The only gauge"
    return (
        "A gauge's depth is compared with point depths and a basin's mean with areal ones, and they are never mixed. "
        f"{wettest} is not the basin: what was rare at a point may have been common over the area, and the other way "
        "round."
    )


def interval_sentence(step: str, table_step: str | None, *, same: bool) -> str:
    """Return how the windows of the storm and those of the table go together.

    Parameters
    ----------
    step, table_step
        The record's step in words, and that of the record that the table was made from; None for true intervals.
    same
        Whether they are the same.

    Examples
    --------
    >>> interval_sentence("1 h", "1 h", same=True)
    "Both the storm's depths and the table's are greatest sums of steps of 1 h: neither reads low against the other."
    """
    if same:
        return (
            f"Both the storm's depths and the table's are greatest sums of steps of {step}: neither reads low against "
            "the other."
        )
    storm = f"The storm's depths are greatest sums of whole steps of {step}, in windows that begin at any step; "
    if table_step is not None:
        return (
            f"{storm}the table's are sums of steps of {table_step}. Nothing is multiplied to make up for the "
            "difference: of the two, the sums of the coarser steps read low."
        )
    return (
        f"{storm}the table's are of true intervals, which begin at any moment. For durations of few steps the storm's "
        "therefore read low (by 8n/(8n - 1) on average for n steps, Weiss 1964: 1.143 for one, 1.005 for 24). Nothing "
        "is multiplied to make up for it, so that observed and adjusted depths are not mixed."
    )


def meaning_sentences(series: str, *, beyond: bool, infilled: Sequence[tuple[str, float]], aligned: bool) -> list[str]:
    """Return what a probability found for an observed depth means, and what it does not.

    Parameters
    ----------
    series
        That the table's return periods are counted in.
    beyond
        Whether a depth lies above the table's end.
    infilled
        Areas and the share of their storm depth that rests on infilled values; NaN where it is not known.
    aligned
        Whether depths of windows tied to the clock are kept beside.

    Examples
    --------
    >>> len(meaning_sentences("annual-maximum", beyond=False, infilled=[("Upper", 0.1)], aligned=False))
    5
    """
    sentences = [_PARTIAL if series == PARTIAL_DURATION else _ANNUAL]
    if beyond:
        sentences.append(_BEYOND)
    sentences += [_NO_FLOOD, _NO_FORECAST, _TABLE_ERROR, _NOT_RANDOM]
    much = [f"{name} {100 * share:.0f} %" for name, share in infilled if not math.isnan(share) and share > _MUCH]
    if much:
        sentences.append(
            f"Over {100 * _MUCH:.0f} % of the storm's mean rests on infilled values ({', '.join(much)}): how rare it "
            "was there is that much less sure."
        )
    if aligned:
        sentences.append(_ALIGNED)
    return sentences


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}{'' if count == 1 else 's'}"
