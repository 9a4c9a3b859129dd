"""Layouts of rainfall files and their keys."""

from __future__ import annotations

import inspect

from basinrain.layouts import COLUMNS, GHCN, LAYOUTS, TAKEN_BY, misplaced
from basinrain.reading.rainfall import read_rainfall


def test_every_layout_has_columns_and_every_key_is_an_option() -> None:
    """The tables name known layouts and options of the reader only."""
    assert tuple(COLUMNS) == LAYOUTS
    assert set(GHCN) < set(LAYOUTS)
    assert {layout for layouts in TAKEN_BY.values() for layout in layouts} <= set(LAYOUTS)
    assert set(TAKEN_BY) < set(inspect.signature(read_rainfall).parameters)


def test_what_is_said_of_a_misplaced_key() -> None:
    """The layouts that take the key are named; a key of all, or a layout that is not known, is no misplaced key."""
    assert misplaced("rollover", "tips") == "it with layout 'counter' only"
    assert misplaced("stamp", "counter") == "it with layout 'wide', 'long' or 'totals' only"
    assert misplaced("timezone", "tips") == misplaced("rollover", "tall") == misplaced("rollover", "counter") == ""
