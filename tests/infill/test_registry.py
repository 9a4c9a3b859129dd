"""The registry of infill methods."""

from __future__ import annotations

import pytest

import basinrain.infill
from basinrain.errors import JobError
from basinrain.infill import METHODS, infill_method


def test_names() -> None:
    """Every method is registered under its own name, in order."""
    assert list(METHODS) == sorted(METHODS) == ["inverse-distance", "normal-ratio", "station-average"]
    assert all(name == method.name for name, method in METHODS.items())


def test_laws_promised() -> None:
    """A method works on ratios to normals, or its weights sum to 1."""
    assert {name for name, method in METHODS.items() if method.sums_to_one} == {"inverse-distance", "station-average"}
    assert {name for name, method in METHODS.items() if method.needs_normals} == {"normal-ratio"}


def test_an_unknown_method() -> None:
    """The choices and the nearest of them are named."""
    with pytest.raises(
        JobError, match=r"found 'idw'; expected one of: inverse-distance, normal-ratio, station-average"
    ):
        infill_method("idw")


def test_public_names() -> None:
    """What the room offers is sorted and exists."""
    assert basinrain.infill.__all__ == sorted(basinrain.infill.__all__, key=lambda n: (not n.isupper(), n))
    assert all(hasattr(basinrain.infill, name) for name in basinrain.infill.__all__)
