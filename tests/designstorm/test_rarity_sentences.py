from __future__ import annotations

import math

import numpy as np
import pytest

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.found_frequency import found_frequency
from basinrain.designstorm.rarity_sentences import (
    few_steps_remark,
    interval_sentence,
    meaning_sentences,
    points_sentence,
    rarest_sentence,
    searched_sentence,
)

LADDER = [Frequency(years, ANNUAL_MAXIMUM) for years in (2, 10, 100)]


def test_equally_rare_but_not_beyond_the_end() -> None:
    """Each keeps its own range: a flat table may give one of them more."""
    found = [found_frequency(90.0, LADDER, [60.0, 90.0, last]) for last in (130.0, 90.0)]
    assert rarest_sentence(["over Upper in 1 h", "over Lower in 6 h"], found) == (
        "The rarest of the depths compared: over Upper in 1 h, 1 in 10 a year; over Lower in 6 h, from 1 in 10 to 1 in "
        "100 a year, which have the same depth."
    )


def test_one_beyond_the_end() -> None:
    """Alone it is the rarest, and there is nothing that the table cannot tell."""
    assert rarest_sentence(["over Upper in 1 h"], [found_frequency(140.0, LADDER, [60.0, 90.0, 130.0])]) == (
        "The rarest of the depths compared: over Upper in 1 h, rarer than 1 in 100 a year (the table's end)."
    )


@pytest.mark.parametrize(("steps", "factor"), [(1, "8/7 = 1.143"), (2, "16/15 = 1.067"), (3, "24/23 = 1.043")])
def test_factors_of_weiss(steps: int, factor: str) -> None:
    """8n / (8n - 1), Weiss 1964, from memory: 1.142857, 1.066667, 1.043478."""
    remark = few_steps_remark(steps, same=False)
    assert f"the sum of {steps} step{'s' if steps > 1 else ''} of the record" in remark
    assert f"on average by a factor of {factor} (8n/(8n - 1), Weiss 1964)" in remark


def test_remarks_end_where_two_per_cent_do() -> None:
    """48/47 is 2.1 %, 56/55 is 1.8 %."""
    assert [bool(few_steps_remark(n, same=False)) for n in (5, 6, 7, 24)] == [True, True, False, False]
    assert few_steps_remark(0.25, same=False) == ""


def test_looks_are_counted() -> None:
    """One look needs no warning of many."""
    assert "looks" not in searched_sentence(1, 1, 1)
    assert searched_sentence(4, 1, 4).startswith("Searched: 4 durations over 1 basin, 4 depths. The rarest of 4 looks")


def test_a_single_gauge() -> None:
    """It is not the wettest of several."""
    assert "The only gauge is not the basin" in points_sentence(1)


def test_intervals() -> None:
    """True intervals, the same steps, other steps: one sentence each."""
    assert "1.143 for one, 1.005 for 24" in interval_sentence("1 h", None, same=False)
    assert np.allclose([8 / 7, 192 / 191], [1.143, 1.005], atol=5e-4)
    assert "neither reads low" in interval_sentence("1 h", "1 h", same=True)
    assert "sums of steps of 24 h" in interval_sentence("1 h", "24 h", same=False)


def test_meaning_by_series() -> None:
    """The first sentence says what a probability or a return period is."""
    annual = meaning_sentences(ANNUAL_MAXIMUM, beyond=False, infilled=[], aligned=False)
    partial = meaning_sentences(PARTIAL_DURATION, beyond=True, infilled=[("Upper", math.nan)], aligned=True)
    assert annual[0].startswith("Each probability is the chance that in any one year")
    assert partial[0].startswith("The table's return periods are of a partial duration series")
    assert len(partial) == len(annual) + 2


def test_share_infilled() -> None:
    """Only areas above a quarter are named."""
    *_, last = meaning_sentences(
        ANNUAL_MAXIMUM, beyond=False, infilled=[("Upper", 0.26), ("Lower", 0.25)], aligned=False
    )
    assert last == (
        "Over 25 % of the storm's mean rests on infilled values (Upper 26 %): how rare it was there is that much less "
        "sure."
    )
