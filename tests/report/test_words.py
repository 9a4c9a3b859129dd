from __future__ import annotations

from decimal import ROUND_HALF_UP, Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.report.words import (
    area_text,
    depth_text,
    depth_texts,
    inline,
    number_text,
    percent_text,
    round_to_sum,
    volume_text,
    weight_text,
)

depths = st.lists(st.floats(0, 500, allow_subnormal=False), min_size=1, max_size=200)


@given(depths, st.sampled_from([0, 1, 2, 3]))
def test_rounded_values_sum_to_the_rounded_total(values: list[float], decimals: int) -> None:
    """The printed values of a series add up to its printed total, to the last digit."""
    rounded = round_to_sum(values, decimals)
    printed = sum(Decimal(f"{v:.{decimals}f}") for v in rounded)
    # A half is rounded up, as in every printed number.
    total = Decimal(f"{float(np.sum(values)):.{decimals + 6}f}").quantize(Decimal(1).scaleb(-decimals), ROUND_HALF_UP)
    assert printed == total


@given(depths, st.sampled_from([1, 2]))
def test_rounding_moves_no_value_by_a_whole_unit_and_keeps_zeros(values: list[float], decimals: int) -> None:
    """Each value stays within one unit of the last digit, and a dry step stays dry."""
    rounded = round_to_sum(values, decimals)
    assert np.all(np.abs(rounded - values) < 10.0**-decimals * (1 + 1e-4))
    assert np.all(rounded >= 0)
    assert np.all(rounded[np.array(values) == 0] == 0)


@given(st.lists(st.integers(0, 5000), min_size=1, max_size=100))
def test_depths_that_need_no_rounding_stay(tenths: list[int]) -> None:
    """Tenths of a millimetre are printed as they are."""
    values = [t / 10 for t in tenths]
    assert round_to_sum(values, 1).tolist() == values


def test_largest_remainder_gets_the_missing_unit() -> None:
    """1.04, 1.06, 1.00 make 3.10 as they round; 1.04 three times makes 3.12, so the first gets the tenth."""
    assert round_to_sum([1.04, 1.06, 1.0], 1).tolist() == [1.0, 1.1, 1.0]
    assert round_to_sum([1.04, 1.04, 1.04], 1).tolist() == [1.1, 1.0, 1.0]


def test_negative_parts_sum_too() -> None:
    """Contributions may be negative; 3.26 and -1.18 make 2.08, printed 2.1."""
    assert round_to_sum([3.26, -1.18], 1).sum() == pytest.approx(2.1)


def test_a_series_with_a_gap_is_rounded_value_by_value() -> None:
    """Without a total there is nothing to sum to; the gap is printed as a dash, never as zero."""
    assert depth_texts([0.26, float("nan"), 0.0], "mm") == ["0.3", "–", "0.0"]


@pytest.mark.parametrize("write", [weight_text, percent_text, area_text, volume_text, lambda v: depth_text(v, "in")])
def test_no_number_is_a_dash(write: object) -> None:
    """Nothing prints a missing number as zero."""
    assert callable(write)
    assert write(float("nan")) == "–"


def test_small_negative_numbers_print_without_a_sign() -> None:
    """A contribution of -0.01 mm prints 0.0; a real negative has a minus sign, not a hyphen."""
    assert number_text(-0.01, 1) == "0.0"
    assert number_text(-1.26, 1) == "−1.3"


def test_a_name_is_cut_and_loses_control_characters() -> None:
    """Names from files fit on one line of a figure."""
    assert inline("a\x00b\nc\ud800", 0) == "a b c"
    assert inline("x" * 30, 10) == "x" * 9 + "…"
