"""The registry of infill methods."""

from __future__ import annotations

import inspect

import pytest

import basinrain.infill
from basinrain.errors import JobError
from basinrain.infill import METHODS, infill_method

NAMES = [
    "nearest-gauge",
    "station-average",
    "inverse-distance",
    "four-quadrant",
    "normal-ratio",
    "ten-percent-rule",
    "inverse-distance-ratios",
    "correlation-weighting",
    "regression",
    "ratio-regression",
]


def those(flag: str) -> list[str]:
    return [name for name, method in METHODS.items() if getattr(method, flag)]


def test_names() -> None:
    """Every method is registered under its own name, from simple to complex."""
    assert list(METHODS) == NAMES
    assert all(name == method.name for name, method in METHODS.items())
    assert [method.order for method in METHODS.values()] == list(range(1, 11))


def test_laws_promised() -> None:
    """Which weights sum to 1, and which return the normal."""
    assert those("sums_to_one") == [*NAMES[:4], "correlation-weighting"]
    assert those("keeps_normals") == ["normal-ratio", "inverse-distance-ratios"]


def test_what_methods_rest_on() -> None:
    """Normals, and relations in the record; the last one on both."""
    assert those("needs_normals") == [*NAMES[4:7], "ratio-regression"]
    assert those("needs_relations") == NAMES[7:]


def test_functions_and_registry_agree() -> None:
    """A function takes the options that the registry says, with the defaults that it says, and what it rests on."""
    for method in METHODS.values():
        named = inspect.signature(method.weights).parameters
        common = {"network", "target", "reporting", "radius", "elevation_limit", "distances"}
        more = {"month", "ratios"} if method.needs_normals else set()
        more |= {"relations"} if method.needs_relations else set()
        assert set(named) == common | more | set(method.takes)
        for option in ("nearest", "min_donors"):
            if option in method.takes:
                assert named[option].default == getattr(method, option)


def test_an_unknown_method() -> None:
    """The choices and the nearest of them are named."""
    with pytest.raises(
        JobError, match=r"found 'idw'; expected one of: nearest-gauge, station-average, inverse-distance, four-quadrant"
    ):
        infill_method("idw")


def test_public_names() -> None:
    """What the room offers is sorted and exists."""
    assert basinrain.infill.__all__ == sorted(basinrain.infill.__all__, key=lambda n: (not n.isupper(), n))
    assert all(hasattr(basinrain.infill, name) for name in basinrain.infill.__all__)
