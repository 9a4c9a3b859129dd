"""The tables of what infilling did: columns, units, and rows."""

from __future__ import annotations

import numpy as np
import pytest
from strips import BASINS, NAN, NETWORK, hourly

from basinrain.averaging import averaging_method
from basinrain.basin_depths import average_storm
from basinrain.infill import InfillOptions, complete
from basinrain.infill_effect import InfillEffect, infill_effect
from basinrain.series_check import SeriesCheck, series_check
from basinrain.tables_infill import effect_frame, effect_spread_frame, series_frame


def both() -> tuple[InfillEffect, SeriesCheck]:
    """Return the results of an hour with B silent between 25.4 and 76.2 mm, and a full one of 25.4 mm."""
    record = hourly([[25.4, NAN, 76.2], [25.4, 25.4, 25.4]])
    own = InfillOptions(method="station-average", scale="step")
    completed = complete(record, NETWORK, own)
    weighers = {"thiessen": averaging_method("thiessen")(NETWORK, BASINS)}
    depths = {name: average_storm(completed, weigher) for name, weigher in weighers.items()}
    return infill_effect(record, NETWORK, completed, weighers, options=own), series_check(completed.record, depths)


def test_effect_in_inches() -> None:
    """B has 50.8 mm by the mean and 25.4 by the nearest gauge: 2 + 1 in, or 5/3 + 1, a third of an inch less."""
    effect, _ = both()
    frame = effect_frame("Quill", BASINS.ids, effect, "in")
    assert " ".join(frame.columns) == (
        "storm basin method infill_method depth depth_unit difference share_infilled gaps_left"
    )
    assert len(frame) == len(effect.methods)
    rows = frame.set_index("infill_method")
    assert rows.loc["station-average", "depth"] == pytest.approx(3)
    assert rows.loc["nearest-gauge", "depth"] == pytest.approx(5 / 3 + 1)
    assert rows.loc["nearest-gauge", "difference"] == pytest.approx(-1 / 3)
    assert rows.loc["station-average", "share_infilled"] == pytest.approx(2 / 9)
    assert set(frame["depth_unit"]) == {"in"}
    (spread,) = effect_spread_frame("Quill", BASINS.ids, effect, "in").to_dict("records")
    assert spread["least"] == pytest.approx(8 / 3)
    assert spread["least_by"] == "nearest-gauge"
    assert spread["greatest"] == pytest.approx(3)


def test_series_in_inches() -> None:
    """The basin has 2 and 1 in: variance 0.5 in²; the wet limit of 0.1 mm is told in inches."""
    _, check = both()
    frame = series_frame("Quill", check, "in")
    assert " ".join(frame.columns) == (
        "storm basin method series steps wet_share wet_from top20_mean top_n depth_unit variance variance_unit"
    )
    row = frame.iloc[0]
    assert (row["series"], row["steps"], row["top_n"]) == ("completed", 2, 2)
    assert row["top20_mean"] == pytest.approx(1.5)
    assert row["variance"] == pytest.approx(0.5)
    assert row["variance_unit"] == "in2"
    assert row["wet_from"] == pytest.approx(0.1 / 25.4)
    assert list(frame["series"]) == ["completed", "reporting gauges", "gauges, weighted"]
    assert np.isfinite(frame[["wet_share", "top20_mean", "variance"]].to_numpy()).all()
