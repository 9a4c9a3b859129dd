"""What screening says of real records."""

from __future__ import annotations

import os
from collections import Counter
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening import Finding, Screening, screen

DATA = Path(__file__).parent.parent / "data"
VARIABLE = "BASINRAIN_CO_PLATTE"


def screened(folder: Path, unit: str) -> Screening:
    """Return the screening of a folder of open data whose steps are hours (h), days (D) or months (M)."""
    gauges = pd.read_csv(folder / "gauges.csv", dtype={"id": str})
    table = pd.read_csv(folder / "rain.csv")
    network = GaugeNetwork(
        ids=tuple(gauges["id"]), x=gauges["lon"].to_numpy(), y=gauges["lat"].to_numpy(), crs="EPSG:4326"
    )
    stamps = table.iloc[:, 0].astype(str).str.rstrip("Z").to_numpy(dtype=str).astype(f"datetime64[{unit}]")
    starts = np.arange(stamps[0], stamps[-1] + 1)
    depths = np.full((len(starts), len(network)), np.nan)
    depths[np.searchsorted(starts, stamps)] = table[list(network.ids)].to_numpy(dtype=float)
    begin, end = starts.astype("datetime64[s]"), (starts + 1).astype("datetime64[s]")
    record = RainRecord.from_depths(network.ids, begin, end, depths, step={"h": "1h", "D": "1d", "M": "1mo"}[unit])
    return screen(record, network)


def of(screening: Screening, check: str) -> list[Finding]:
    """Return the findings of one check."""
    return [finding for finding in screening.findings if finding.check == check]


def test_airports_of_new_york_have_no_findings() -> None:
    """A year of three quality-controlled hourly gauges: nothing but that one year makes no normals."""
    screening = screened(DATA / "nyc_hourly", "h")
    assert {finding.check for finding in screening.findings} == {"short-record"}


def test_oahu_has_few_findings_that_stand_to_reason() -> None:
    """Nine gauges over seven years on an island with showers and steep rain; each finding was looked at."""
    screening = screened(DATA / "oahu", "D")
    counts = Counter(finding.check for finding in screening.findings)
    assert set(counts) == {
        "spatial-outlier", "zero-among-wet", "zero-run", "unflagged-accumulation", "short-record"
    }  # fmt: skip
    assert sum(counts.values()) - counts["short-record"] <= 30
    # Five months of zeros at a gauge whose neighbours' rain it shares in other years.
    assert [finding.key for finding in of(screening, "zero-run")] == ["zero-run USC00518838 2015-05-21T00:00"]
    # The two gauges have each other's rain a day apart: 39 and 0 mm, then 0 and 34 mm.
    days = {finding.gauge: str(finding.start)[:10] for finding in of(screening, "zero-among-wet")}
    assert days["USC00519281"] == "2015-09-03"
    # Of the other gauge the zero of the day after begins what may be an accumulation, which explains it.
    keys = [finding.key for finding in of(screening, "unflagged-accumulation")]
    assert "unflagged-accumulation USC00513117 2015-09-04T00:00" in keys
    # The tropical storm of July 2016 is rain at all gauges, more at the wet ones.
    assert [f for f in screening.findings if str(f.start)[:10] == "2016-07-25"] == []


@pytest.mark.open_data
@pytest.mark.skipif(VARIABLE not in os.environ, reason=f"{VARIABLE} does not name the folder of the Colorado data")
def test_two_gauges_of_the_platte_are_one_record() -> None:
    """487235 and 487240 share a name and are equal in all 361 months that both have, as screening says."""
    folder = Path(os.environ[VARIABLE])
    rain = pd.read_csv(folder / "rain.csv")[["487235", "487240"]].dropna()
    assert len(rain) == 361
    assert (rain["487235"] == rain["487240"]).all()
    screening = screened(folder, "M")
    (twin,) = of(screening, "one-record-two-gauges")
    assert (twin.gauge, twin.others, twin.whole_record) == ("487240", ("487235",), True)
    assert len(of(screening, "unit-mixup")) <= 12
