"""The registry of temporal patterns, and the laws that every pattern in it keeps."""

from __future__ import annotations

import inspect
from typing import Any, NamedTuple

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pattern_cases import ordinates, pattern_case

from basinrain.designstorm.patterns import PATTERNS, Pattern, PatternCase, Shaped, ordinates_of, pattern
from basinrain.errors import JobError

NAMES = [
    *(f"nrcs-type-{kind}" for kind in ("i", "ia", "ii", "iii")),
    *(f"huff-{quartile}" for quartile in (1, 2, 3, 4)),
    "alternating-block",
    "chicago",
    "triangular",
    "uniform",
    "nested",
    "table",
    "observed",
]

CURVED = ("alternating-block", "chicago", "nested")
"""Patterns that follow from depths of shorter durations, and not from the total alone."""

ANY: dict[str, st.SearchStrategy[Any]] = {
    "basis": st.sampled_from(["point", "area"]),
    "ordinates": ordinates(),
    "peak": st.sampled_from(["early", "centre", "late"]) | st.floats(0.05, 0.95),
    "smooth": st.booleans(),
}
"""Values of every option that a pattern may have."""

laws = settings(max_examples=60, deadline=None)


class Drawn(NamedTuple):
    """A duration and step that divides it, total, areas and exponents of the curves, and options."""

    minutes: int
    step: int
    total: float
    exponent: float
    own: float
    options: dict[str, Any]

    def case(self, *, step: int | None = None, total: float | None = None) -> PatternCase:
        """Return the case, on another step or with another total where one is given."""
        return pattern_case(
            self.minutes,
            step or self.step,
            total=self.total if total is None else total,
            exponent=self.exponent,
            own=self.own,
        )


@st.composite
def drawn(draw: st.DrawFn, registered: Pattern) -> Drawn:
    """Draw what a pattern is given; NRCS distributions are of 24 hours only."""
    if registered.name.startswith("nrcs"):
        minutes = 1440
        step = draw(st.sampled_from([step for step in range(1, 1441) if 1440 % step == 0]))
    else:
        step = draw(st.integers(1, 90))
        minutes = step * draw(st.integers(1, 120))
    return Drawn(
        minutes,
        step,
        draw(st.floats(0.1, 900)),
        draw(st.floats(0.05, 0.7)),
        draw(st.floats(0, 0.3)),
        {option: draw(ANY[option]) for option in registered.options},
    )


def shaped(registered: Pattern, given_: Drawn, case: PatternCase) -> Shaped:
    return registered.shape(case, **given_.options)


def test_every_pattern_is_registered_under_its_own_name() -> None:
    """The names are those that a job may give, and each has a title and a source."""
    assert list(PATTERNS) == NAMES
    assert [each.name for each in PATTERNS.values()] == NAMES
    assert [each.name for each in PATTERNS.values() if not (each.title and each.source)] == []
    assert len({each.title for each in PATTERNS.values()}) == len(NAMES)
    assert pattern("huff-2") is PATTERNS["huff-2"]


def test_an_unknown_name_is_refused_with_the_nearest() -> None:
    """A slip of the pen is answered with what was meant, and with all that there are."""
    with pytest.raises(
        JobError, match=r"shape: found 'chicgo'; expected one of: nrcs-type-i, .*, observed; did you mean"
    ):
        pattern("chicgo")


@pytest.mark.parametrize("name", NAMES)
def test_options_are_those_of_the_function(name: str) -> None:
    """A pattern's ``options`` are the keyword arguments of its function that are not settled by its name."""
    registered = PATTERNS[name]
    bound = getattr(registered.shape, "keywords", {})
    taken = [
        word
        for word, parameter in inspect.signature(registered.shape).parameters.items()
        if parameter.kind is inspect.Parameter.KEYWORD_ONLY and word not in bound
    ]
    assert sorted(taken) == sorted(registered.options)


@pytest.mark.parametrize("name", NAMES)
@laws
@given(data=st.data())
def test_the_total_is_kept_in_steps_that_are_not_negative(name: str, data: st.DataObject) -> None:
    """As many steps as there are, none negative, that sum to the total to 1e-12."""
    registered = PATTERNS[name]
    given_ = data.draw(drawn(registered))
    depth = shaped(registered, given_, given_.case()).depth
    assert depth.shape == (given_.minutes // given_.step,)
    assert (depth >= 0).all()
    assert float(depth.sum()) == pytest.approx(given_.total, rel=1e-12)


@pytest.mark.parametrize("name", [name for name in NAMES if name not in CURVED])
@laws
@given(data=st.data(), times=st.floats(0.01, 100))
def test_steps_scale_with_the_total(name: str, data: st.DataObject, times: float) -> None:
    """A pattern of the total alone gives every step of a total k times as great k times its depth."""
    registered = PATTERNS[name]
    given_ = data.draw(drawn(registered))
    depth = shaped(registered, given_, given_.case()).depth
    scaled = shaped(registered, given_, given_.case(total=given_.total * times)).depth
    np.testing.assert_allclose(scaled, depth * times, rtol=1e-12, atol=1e-15 * given_.total * times)


@pytest.mark.parametrize("name", [name for name in NAMES if name not in CURVED])
@laws
@given(data=st.data(), parts=st.integers(2, 5))
def test_finer_steps_sum_to_coarser_ones(name: str, data: st.DataObject, parts: int) -> None:
    """A pattern of the total alone falls the same way on any step: halves sum to wholes, and so do thirds to fifths."""
    registered = PATTERNS[name]
    given_ = data.draw(drawn(registered))
    if given_.step % parts:
        given_ = given_._replace(step=given_.step * parts, minutes=given_.minutes * parts)
        if name.startswith("nrcs"):
            given_ = given_._replace(minutes=1440, step=60)
    coarse = shaped(registered, given_, given_.case()).depth
    fine = shaped(registered, given_, given_.case(step=given_.step // parts)).depth
    summed = fine.reshape(-1, parts).sum(axis=1)
    np.testing.assert_allclose(summed, coarse, rtol=0, atol=1e-12 * given_.total)


@pytest.mark.parametrize("name", [name for name in NAMES if name not in CURVED])
def test_nothing_falls_of_nothing(name: str) -> None:
    """A pattern of the total alone gives zeros of a total of 0, not NaN."""
    options = {"ordinates": ordinates_of(np.array([1.0, 2.0]))} if "ordinates" in PATTERNS[name].options else {}
    depth = PATTERNS[name].shape(pattern_case(1440, 60, total=0.0), **options).depth
    assert depth.tolist() == [0] * 24
