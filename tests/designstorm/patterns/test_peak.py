"""Where the peak of a storm stands."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.designstorm.patterns.peak import PEAKS, peak_fraction, peak_step
from basinrain.errors import JobError

EXPECTED = r"expected early, centre, late, or a fraction of the duration between 0 and 1"


def test_words_are_quarters() -> None:
    """The words stand for a quarter, a half and three quarters of the duration, the half where none is given."""
    assert [peak_fraction(word) for word in PEAKS] == [0.25, 0.5, 0.75]
    assert peak_fraction() == 0.5


@given(st.floats(0, 1, exclude_min=True, exclude_max=True))
def test_a_fraction_is_itself(fraction: float) -> None:
    """A number between 0 and 1 is taken as it is."""
    assert peak_fraction(fraction) == fraction


@pytest.mark.parametrize(
    ("peak", "said"),
    [
        ("center", f"found 'center'; {EXPECTED}; did you mean 'centre'\\?"),
        ("0.4", f"found '0.4'; {EXPECTED}; one of: early, centre, late"),
        (0, f"found 0; {EXPECTED}; correct it"),
        (1.0, f"found 1; {EXPECTED}; correct it"),
        (-0.25, f"found -0.25; {EXPECTED}; correct it"),
        (math.nan, f"found nan; {EXPECTED}; correct it"),
        (math.inf, f"found inf; {EXPECTED}; correct it"),
        (True, f"found true; {EXPECTED}; correct it"),
        (37.5, f"found 37.5; {EXPECTED}; write 0.375 for 37.5 %"),
    ],
)
def test_what_is_no_place_for_a_peak(peak: str | float, said: str) -> None:
    """Other words and numbers are refused with what was meant."""
    with pytest.raises(JobError, match=r"^\[\[design\.pattern\]\] peak: " + said + "$"):
        peak_fraction(peak)


def test_steps_by_hand() -> None:
    """Of twelve steps a quarter of the way ends the third, a half the sixth; of five the middle one holds it."""
    assert [peak_step(fraction, 12) for fraction in (0.25, 0.5, 0.75)] == [2, 5, 8]
    assert [peak_step(fraction, 5) for fraction in (0.25, 0.5, 0.75)] == [1, 2, 3]
    assert [peak_step(0.5, n) for n in (1, 2, 3, 4)] == [0, 0, 1, 1]


def test_decimal_fractions_end_where_they_should() -> None:
    """0.55 of 100 steps ends the 55th, though 0.55 x 100 is above 55 in binary numbers; so do 0.07 and the 7th."""
    assert 0.55 * 100 > 55
    assert 0.07 * 100 > 7
    assert [peak_step(0.55, 100), peak_step(0.07, 100)] == [54, 6]


@given(st.integers(1, 20), st.integers(1, 19), st.integers(1, 300))
def test_nearest_middle(part: int, parts: int, n_steps: int) -> None:
    """The step is the one whose middle is nearest to the peak, in exact fractions, the earlier of two equally near."""
    fraction = Fraction(part, part + parts)
    middles = [Fraction(2 * k + 1, 2 * n_steps) for k in range(n_steps)]
    nearest = min(range(n_steps), key=lambda k: (abs(middles[k] - fraction), k))
    assert peak_step(float(fraction), n_steps) == nearest
