from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from report.small_run import make_run

from basinrain.ground import Plane, equal_area_plane
from basinrain.report.provenance import formulas, ground_facts, inputs_table, settings_text
from basinrain.results import StormRun


def test_a_local_plane_is_no_map(run: StormRun) -> None:
    """Distances are said to be planar, nothing is said of the ellipsoid."""
    facts = dict(ground_facts(run))
    assert "without a place on the map" in facts["Plane"]
    assert "Distances" not in facts
    assert facts["Grid"] == "A grid of 1 km cells."
    assert facts["Normals"] == "Normals of the year, 1991-2020."
    assert facts["Gauge catch"] == "Not corrected."


def test_a_plane_on_the_map_states_its_distortion() -> None:
    """The largest difference of a distance stands in per cent."""
    run = make_run(plane=Plane(equal_area_plane(10, 50, 12, 51), "Equal-area plane", 0.000123))
    assert "at most 0.0123\u202f%" in dict(ground_facts(run))["Distances"]


def test_catch_factors_are_listed(run: StormRun) -> None:
    """Factors that changed the depths are in the report."""
    job = replace(run, settings={"gauges": {"catch_factor": {"A": 1.05}}})
    assert dict(ground_facts(job))["Gauge catch"] == "Depths were multiplied by these factors: A 1.05."


@pytest.mark.parametrize(("area", "percent"), [(99e6, "1"), (25e6, "300"), (99.98e6, "0.02")])
def test_areas_beside_the_registers(run: StormRun, area: float, percent: str) -> None:
    """A register's 99 km² for a square of 100 km² is 1 % off, its 25 km² 300 %, in plain digits."""
    official = np.array([area, np.nan, np.nan])
    job = replace(run, basins=replace(run.basins, official_areas=official))
    assert dict(ground_facts(job))["Areas"].endswith(f"at most {percent}\u202f%.")


def test_formulas_of_what_was_used(run: StormRun) -> None:
    """The three averages and the one infill method, each with a source; nothing of the others."""
    found = formulas(run)
    assert [f.method for f in found] == ["arithmetic", "thiessen", "idw", "station-average"]
    assert all(f.source for f in found)


def test_settings_name_every_value_once() -> None:
    """Nested tables become dotted names, repeated tables are counted from 1, letters stay as they are."""
    text = settings_text({"job": {"name": "Fluß"}, "idw": {}, "rainfall": [{"a": 1}, {"a": [1, 2]}], "none": None})
    assert text.splitlines() == [
        'job.name = "Fluß"',
        "idw = {}",
        "rainfall[1].a = 1",
        "rainfall[2].a = [1, 2]",
        "none = null",
    ]


def test_inputs_with_their_digests(run: StormRun) -> None:
    """File and SHA-256 stand side by side."""
    assert list(inputs_table(run).rows) == [("rain.csv", "0" * 64)]
