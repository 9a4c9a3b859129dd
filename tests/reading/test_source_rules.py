"""The options of a source as rules."""

from __future__ import annotations

import inspect
from pathlib import Path
from typing import Any

import pytest

from basinrain.errors import JobError
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.source_rules import source_rules


def test_options_are_those_of_the_reader() -> None:
    """Every option of the reader is one of the rules, with the same default; the layout alone has one of its own."""
    reader, rules = (inspect.signature(function).parameters for function in (read_rainfall, source_rules))
    assert list(reader) == list(rules)
    assert [name for name in reader if reader[name].default != rules[name].default] == ["layout"]


def test_rules_of_layouts() -> None:
    """Each layout has the rules that go with it; depths of tips and counters are in mm."""
    totals = source_rules("a.csv", layout="totals", unit="in")
    assert (totals.stamps, totals.tips, totals.counter) == (None, None, None)
    with pytest.raises(ValueError, match="storm totals have no step"):
        _ = totals.interval
    tips = source_rules(["a.csv", Path("b.csv")], layout="tips", unit="in", interval="1h", tip=0.01)
    assert tips.tips is not None
    assert tips.paths == (Path("a.csv"), Path("b.csv"))
    assert tips.tips.tip == pytest.approx(0.254)
    counter = source_rules("a.csv", layout="counter", unit="in", interval="1h", jitter=0.1, rollover=10.0)
    assert counter.counter is not None
    assert counter.counter.jitter == pytest.approx(2.54)
    assert counter.counter.rollover == pytest.approx(254.0)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        (
            {"files": "a.parquet", "layout": "counter"},
            r"a\.parquet: layout: found 'counter' with a Parquet file; expected",
        ),
        (
            {"files": ["a.csv", "b.nc"], "layout": "long"},
            r"layout: found 'long' with a NetCDF file; expected 'wide'; leave",
        ),
        (
            {"files": "a.nc", "read_hour": "08:00", "date_means": "ends", "interval": "1d"},
            r"read_hour: found '08:00'; exp",
        ),
    ],
)
def test_options_of_formats(options: dict[str, Any], message: str) -> None:
    """What a format does not take is refused before a file is opened."""
    with pytest.raises(JobError, match=message):
        source_rules(**{"unit": "mm", "interval": "1h", **options})
