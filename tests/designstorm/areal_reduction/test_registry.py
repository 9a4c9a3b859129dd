"""The registry of methods of areal reduction."""

from __future__ import annotations

import pytest

from basinrain.designstorm.areal_reduction import REDUCTIONS, areal_reduction
from basinrain.errors import JobError


def test_names_are_those_of_the_methods() -> None:
    """Every method stands under its own name, in the order of the reports."""
    assert list(REDUCTIONS) == ["leclerc-schaake", "keers-wescott", "arr-2019", "exponential", "table"]
    assert all(areal_reduction(name) is method and method.name == name for name, method in REDUCTIONS.items())


def test_an_unknown_name_is_refused_with_the_nearest() -> None:
    """A misspelt method is an error that names the one meant, and all there are."""
    with pytest.raises(
        JobError,
        match=r"^\[design.areal_reduction\] method: found 'keers-wescot'; expected one of: leclerc-schaake, "
        "keers-wescott, arr-2019, exponential, table; did you mean 'keers-wescott'",
    ):
        areal_reduction("keers-wescot")
