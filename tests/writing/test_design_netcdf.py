"""The NetCDF file follows the CF conventions, as a checker that is not ours finds, and gives every number back."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
import xarray as xr
from cf_checker import complaints
from small_hyetographs import AREAS, BASINS, NAMES, POSITIONS, drawn_content, two_steps

from basinrain.writing.design_netcdf import write_netcdf

FILE = "design_hyetographs.nc"


@pytest.mark.parametrize(
    "changed",
    [
        {},
        {"depth_unit": "in", "names": (), "start": None},
        {"positions": None, "job": "", "source": "", "caution": "", "start": np.datetime64("2031-05-04T06:00:30")},
    ],
    ids=["mm", "inches without names or start", "local and seconds"],
)
def test_the_checker_has_nothing_to_say(tmp_path: Path, changed: dict[str, Any]) -> None:
    """No error and no warning, whatever the unit, the start and the place on the map."""
    write_netcdf(tmp_path, drawn_content(**changed))
    assert complaints(tmp_path / FILE, tmp_path / "report.json") == []


def test_the_checker_would_say_so(tmp_path: Path) -> None:
    """A unit that is no length, one that is no unit and a sum over no dimension are found: the check above can fail."""
    write_netcdf(tmp_path, drawn_content())
    with netCDF4.Dataset(tmp_path / FILE, "a") as file:
        file["depth"].units = "kg"
        file["depth"].cell_methods = "hour: total"
        file["return_period"].units = "floods"
    found = " ".join(complaints(tmp_path / FILE, tmp_path / "report.json"))
    assert "units" in found
    assert "cell_methods" in found
    assert "floods" in found


def test_a_file_that_can_be_read_at_a_glance(tmp_path: Path) -> None:
    """One case of two hours over two basins, in inches: 25.4 and 12.7 mm are 1 and 0.5 in."""
    write_netcdf(tmp_path, two_steps())
    with netCDF4.Dataset(tmp_path / FILE) as file:
        assert {name: len(size) for name, size in file.dimensions.items()} == {
            "case": 1,
            "step": 2,
            "basin": 2,
            "nv": 2,
        }
        assert file["depth"][:].tolist() == [[[1.0, 2.54 / 25.4], [0.5, 0.0]]]
        assert file["elapsed"][:].tolist() == [60, 120]
        assert file["elapsed_bounds"][:].tolist() == [[0, 60], [60, 120]]
        case = {name: file[name][0] for name in ("point", "pattern", "aep", "return_period", "duration")}
        assert list(case.values()) == ["bridge", "nrcs-type-ii", 0.01, 100.0, 120]
        assert file["return_period_in"][0] == "annual-maximum"
        assert (file["depth"].units, file["elapsed"].units, file["duration"].units) == ("in", "minutes", "minutes")
        assert not {"time", "lat", "lon", "crs", "basin_name"} & set(file.variables)


@pytest.mark.parametrize("unit", ["mm", "in"])
def test_xarray_reads_every_number(tmp_path: Path, unit: str) -> None:
    """To the last bit; what is beyond a case's duration or not above its point is missing."""
    content = drawn_content(depth_unit=unit)
    write_netcdf(tmp_path, content)
    with xr.open_dataset(tmp_path / FILE, engine="netcdf4", decode_timedelta=False) as data:
        assert data["depth"].dims == ("case", "step", "basin")
        named = {"point", "pattern", "aep", "return_period", "return_period_in", "duration", "elapsed", "time"}
        assert set(data["depth"].coords) == named | {"basin_id", "basin_name", "lat", "lon"}
        assert data["basin_id"].to_numpy().tolist() == list(BASINS)
        assert data["basin_name"].to_numpy().tolist() == list(NAMES)
        np.testing.assert_array_equal(np.column_stack([data["lon"], data["lat"]]), POSITIONS)
        np.testing.assert_array_equal(data["basin_area"], AREAS)
        count = 0
        for case, one in enumerate(content.hyetographs):
            own = data.isel(case=case)
            assert (own["point"].item(), own["pattern"].item()) == (one.point, one.pattern)
            assert own["return_period_in"].item() == one.frequency.series
            assert (own["return_period"].item(), own["duration"].item()) == (one.frequency.written_years, one.minutes)
            np.testing.assert_array_equal(own["aep"], one.frequency.written_aep)
            columns = [BASINS.index(basin) for basin in one.basins]
            written = own["depth"].to_numpy()[: one.n_steps, columns]
            np.testing.assert_array_equal(written, content.depth(one).T)
            assert np.isfinite(own["depth"]).sum() == written.size
            count += written.size
        assert np.isfinite(data["depth"]).sum() == count
        np.testing.assert_array_equal(data["elapsed"], 10 * np.arange(1, 37))
        ends = np.datetime64("2031-05-04T06:00") + np.timedelta64(10, "m") * np.arange(1, 37)
        np.testing.assert_array_equal(data["time"], ends)
        np.testing.assert_array_equal(data["time_bounds"][:, 0], ends - np.timedelta64(10, "m"))


def test_what_the_file_says_of_itself(tmp_path: Path) -> None:
    """Sums over the step, means over the area, where the depths are from, the caution, no time of writing."""
    write_netcdf(tmp_path, drawn_content())
    with netCDF4.Dataset(tmp_path / FILE) as file:
        depth = file["depth"]
        assert (depth.standard_name, depth.units) == ("lwe_thickness_of_precipitation_amount", "mm")
        assert (depth.cell_methods, depth.cell_measures) == ("step: sum area: mean", "area: basin_area")
        assert np.isnan(depth.get_fill_value())
        assert depth.filters()["zlib"]
        assert file["time"].units == "minutes since 2031-05-04 06:00:00"
        assert (file.Conventions, file.title) == ("CF-1.11", "Design hyetographs of the job Alder Fork")
        assert file.source == "design storms made by basinrain 0.1.0 from point depths: an invented table, 2031"
        assert file.history == "written by basinrain 0.1.0"
        assert file.comment == (
            "For use by a qualified hydrologist. A case is one point of interest, frequency, duration and pattern. "
            "Steps after the end of a case's duration, and basins that are not above its point of interest, hold the "
            "missing value: it is not rain of 0."
        )
