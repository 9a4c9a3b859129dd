"""The tables of a comparison and of a completed record, by hand."""

from __future__ import annotations

import math
from dataclasses import replace
from types import MappingProxyType

import numpy as np
import pytest

from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Comparison, Difference, Score
from basinrain.rainfall import RainRecord, Status
from basinrain.tables_comparison import (
    completed_depths,
    completed_status,
    infill_cases,
    infill_differences,
    infill_scores,
)

NAN = float("nan")


def score(candidate: str, gauge: str, n: int, rmse: float) -> Score:
    return Score(
        candidate=candidate,
        gauge=gauge,
        scale="day",
        n=n,
        rmse=rmse,
        mae=rmse / 2,
        bias=-rmse / 4,
        correlation=0.5,
        hits=n,
        misses=0,
        false_alarms=0,
        dry_hits=0,
        top20_ratio=0.75,
    )


def comparison() -> Comparison:
    """Two methods on two days of two gauges, one value missing; errors that are round in inches."""
    return Comparison(
        candidates=("nearest-gauge", "regression"),
        skipped=MappingProxyType({"normal-ratio": "no normals"}),
        scale="day",
        gauges=("A", "B"),
        ends=np.array(["2031-05-05T06", "2031-05-06T06"], dtype="datetime64[s]"),
        observed=np.array([[25.4, 50.8], [NAN, 12.7]]),
        estimated=np.array([[50.8, 25.4], [NAN, 0.0]]),
        scores=(
            score("nearest-gauge", "", 3, 50.8),
            score("regression", "", 3, 25.4),
            score("regression", "A", 0, NAN),
        ),
        differences=(
            Difference(
                candidate="nearest-gauge",
                best="regression",
                difference=25.4,
                low=-2.54,
                high=76.2,
                distinguishable=False,
            ),
            Difference(candidate="regression", best="regression", difference=0, low=0, high=0, distinguishable=False),
        ),
        drawn="case",
        best="regression",
        chosen="nearest-gauge",
        chosen_options=InfillOptions(method="nearest-gauge"),
        reason="",
        notes=(),
    )


@pytest.mark.parametrize(("unit", "factor"), [("mm", 25.4), ("in", 1.0)])
def test_scores(unit: str, factor: float) -> None:
    """Errors in the unit, all else as it is; a score without cases is NaN."""
    table = infill_scores(comparison(), unit)
    assert ",".join(table.columns) == (
        "scale,gauge,infill_method,cases,rmse,mae,bias,depth_unit,correlation,hits,misses,false_alarms,dry_hits,"
        "top20_ratio,chosen"
    )
    assert table.iloc[0].tolist() == [
        "day", "", "nearest-gauge", 3, 2 * factor, factor, -factor / 2, unit, 0.5, 3, 0, 0, 0, 0.75, True,
    ]  # fmt: skip
    assert table["chosen"].tolist() == [True, False, False]
    assert table.iloc[2, :4].tolist() == ["day", "A", "regression", 0]
    assert all(math.isnan(value) for value in table.iloc[2][["rmse", "mae", "bias"]])


def test_scores_without_a_comparison() -> None:
    """The same columns and no row."""
    table = infill_scores(None, "mm")
    assert len(table) == 0
    assert list(table.columns) == list(infill_scores(comparison(), "mm").columns)


@pytest.mark.parametrize(("unit", "factor"), [("mm", 25.4), ("in", 1.0)])
def test_differences(unit: str, factor: float) -> None:
    """A row a method in the order of the comparison, those that were skipped last with their reason."""
    table = infill_differences(comparison(), unit)
    assert table.iloc[0].tolist() == [
        "nearest-gauge", "regression", factor, pytest.approx(-0.1 * factor), pytest.approx(3 * factor), unit, False,
        True, "",
    ]  # fmt: skip
    assert table.iloc[1].tolist() == ["regression", "regression", 0, 0, 0, unit, False, False, ""]
    assert table.iloc[2][["infill_method", "best", "skipped_because"]].tolist() == [
        "normal-ratio",
        "regression",
        "no normals",
    ]
    assert table.iloc[2][["difference", "low", "high", "distinguishable"]].isna().all()
    assert not table["chosen"].iloc[2]


def test_cases() -> None:
    """Gauge by gauge, only what was compared, with the clock of the record."""
    table = infill_cases(comparison(), "+01:00", "in")
    assert table.to_numpy().tolist() == [
        ["A", "2031-05-05T06:00+01:00", 1.0, 2.0, "in", "nearest-gauge"],
        ["B", "2031-05-05T06:00+01:00", 2.0, 1.0, "in", "nearest-gauge"],
        ["B", "2031-05-06T06:00+01:00", 0.5, 0.0, "in", "nearest-gauge"],
    ]
    assert infill_cases(comparison(), "+01:00", "mm")["observed"].tolist() == [25.4, 50.8, 12.7]


def test_cases_without_times() -> None:
    """Storm totals have their storm's name in place of a time."""
    undated = replace(comparison(), ends=np.full(2, "NaT", dtype="datetime64[s]"), storms=("Quill", "Reed"))
    assert infill_cases(undated, "", "mm")[["gauge", "storm"]].values.tolist() == [
        ["A", "Quill"],
        ["B", "Quill"],
        ["B", "Reed"],
    ]


def test_the_completed_record() -> None:
    """Depths in the unit beside where they come from, in the same shape; NaN where nothing is known."""
    ends = np.array(["2031-05-05", "2031-05-06"], dtype="datetime64[s]")
    record = RainRecord(
        ("A", "B"),
        np.array(["2031-05-04", "2031-05-05"], dtype="datetime64[s]"),
        ends,
        np.array([[25.4, 0.0], [12.7, NAN]]),
        np.array([[Status.OBSERVED, Status.ZERO], [Status.INFILLED, Status.MISSING]], dtype=np.uint8),
        step="1d",
    )
    depths, status = completed_depths(record, "in"), completed_status(record)
    assert list(depths.columns) == list(status.columns) == ["time", "A", "B"]
    assert depths["time"].tolist() == status["time"].tolist() == ["2031-05-05T00:00", "2031-05-06T00:00"]
    np.testing.assert_array_equal(depths[["A", "B"]], [[1.0, 0.0], [0.5, NAN]])
    np.testing.assert_array_equal(completed_depths(record, "mm")[["A", "B"]], record.depth)
    assert status[["A", "B"]].to_numpy().tolist() == [["observed", "zero"], ["infilled", "missing"]]
