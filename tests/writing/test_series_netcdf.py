"""The NetCDF file follows the CF conventions, as a checker that is not ours finds, and gives every number back."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
import xarray as xr
from cf_checker import complaints
from small_series import AREAS, BASINS, NAMES, POINTS, SERIES, small_content

from basinrain.series.flags import Flag
from basinrain.writing import series_netcdf
from basinrain.writing.series_content import SeriesContent, series_name
from basinrain.writing.series_netcdf import write_netcdf


@pytest.mark.parametrize(
    "changed",
    [
        {},
        {"depth_unit": "in", "names": ()},
        {"points": None, "zone": ""},
        {"ends": small_content().ends - np.timedelta64(30, "s"), "institution": "Alder Fork flood board"},
    ],
    ids=["mm", "inches without names", "local and clock not known", "seconds"],
)
def test_the_checker_has_nothing_to_say(tmp_path: Path, changed: dict[str, Any]) -> None:
    """No error and no warning, whatever the unit, the clock and the place on the map."""
    write_netcdf(tmp_path, small_content(**changed))
    assert complaints(tmp_path / "series.nc", tmp_path / "report.json") == []


def test_the_checker_would_say_so(tmp_path: Path) -> None:
    """A unit that is no length, a method on no dimension and a mask too few are found: the check above can fail."""
    write_netcdf(tmp_path, small_content())
    name = series_name(*SERIES[0])
    with netCDF4.Dataset(tmp_path / "series.nc", "a") as file:
        file[f"depth_{name}"].units = "kg"
        file[f"depth_{name}"].cell_methods = "hour: total"
        file[f"flags_{name}"].flag_masks = np.array([1, 2], dtype=np.uint8)
    found = " ".join(complaints(tmp_path / "series.nc", tmp_path / "report.json"))
    assert "units" in found
    assert "cell_methods" in found
    assert "flag_masks" in found


def check_numbers(path: Path, content: SeriesContent) -> None:
    """Compare every number with the arrays, read by netCDF4 without its own masks and scales."""
    with netCDF4.Dataset(path) as file:
        file.set_auto_maskandscale(False)
        for one in SERIES:
            name, block = series_name(*one), content.block(*one, slice(0, content.n_steps))
            np.testing.assert_array_equal(file[f"depth_{name}"][:], block.depth.T)
            np.testing.assert_array_equal(file[f"observed_share_{name}"][:], block.observed_share.T)
            np.testing.assert_array_equal(file[f"flags_{name}"][:], block.flags.T)
        assert file["basin_id"][:].tolist() == list(content.basins)
        np.testing.assert_array_equal(file["basin_area"][:], AREAS)


@pytest.mark.parametrize(("held", "piece"), [(1 << 20, 1 << 17), (30, 14), (1, 1)])
@pytest.mark.parametrize("unit", ["mm", "in"])
def test_every_number_is_read_back(
    *, tmp_path: Path, held: int, piece: int, unit: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """To the last bit, however many steps are written and compressed together."""
    monkeypatch.setattr(series_netcdf, "_HELD", held)
    monkeypatch.setattr(series_netcdf, "_PIECE", piece)
    content = small_content(depth_unit=unit)
    write_netcdf(tmp_path, content)
    check_numbers(tmp_path / "series.nc", content)


def test_xarray_reads_times_ids_and_numbers(tmp_path: Path) -> None:
    """Times are instants: the first hour at +02:00 ends at 23:00 UTC and began an hour before; NaN stays NaN."""
    content = small_content()
    write_netcdf(tmp_path, content)
    with xr.open_dataset(tmp_path / "series.nc", engine="netcdf4") as data:
        utc = content.ends - np.timedelta64(2, "h")
        np.testing.assert_array_equal(data["time"].to_numpy(), utc)
        bounds = data["time_bounds"].to_numpy()
        np.testing.assert_array_equal(bounds[:, 1], utc)
        np.testing.assert_array_equal(bounds[:, 0], utc - np.timedelta64(1, "h"))
        depth = data["depth_thiessen_reweight"]
        assert depth.dims == ("basin", "time")
        np.testing.assert_array_equal(depth.to_numpy().T, content.source.depth(*SERIES[0]))
        assert {"basin_id", "basin_name", "lat", "lon"} <= set(depth.coords)
        assert depth["basin_id"].to_numpy().tolist() == list(BASINS)
        assert depth["basin_name"].to_numpy().tolist() == list(NAMES)
        np.testing.assert_array_equal(np.column_stack([data["lon"], data["lat"]]), POINTS)


def test_what_the_file_says_of_itself(tmp_path: Path) -> None:
    """Sums in time, means in area, marks and shares tied to their depth, the caution, no time of writing."""
    write_netcdf(tmp_path, small_content())
    with netCDF4.Dataset(tmp_path / "series.nc") as file:
        depth, flags = file["depth_idw_infill_then_reweight"], file["flags_idw_infill_then_reweight"]
        assert (depth.standard_name, depth.units) == ("lwe_thickness_of_precipitation_amount", "mm")
        assert (depth.cell_methods, depth.cell_measures) == ("time: sum area: mean", "area: basin_area")
        assert depth.ancillary_variables == "observed_share_idw_infill_then_reweight flags_idw_infill_then_reweight"
        assert np.isnan(depth.get_fill_value())
        assert flags.flag_masks.tolist() == [int(flag) for flag in Flag]
        assert flags.flag_meanings == "infilled reweighted spread estimated missing"
        assert (file["time"].units, file["time"].bounds) == ("minutes since 2031-05-04 00:00:00 +02:00", "time_bounds")
        assert file["basin_id"].cf_role == "timeseries_id"
        assert (file.Conventions, file.featureType) == ("CF-1.11", "timeSeries")
        assert file.comment.startswith("For use by a qualified hydrologist. Areas are those of the working plane:")
        assert (file.source, file.history) == (
            "depths of rain gauges, averaged over basins by basinrain 0.1.0",
            "written by basinrain 0.1.0",
        )
        assert depth.filters()["zlib"]


def test_what_is_not_known_is_not_said(tmp_path: Path) -> None:
    """Local coordinates have no place on the map, and a clock that is not known no offset."""
    write_netcdf(tmp_path, small_content(points=None, zone="", names=()))
    with netCDF4.Dataset(tmp_path / "series.nc") as file:
        assert not {"lat", "lon", "crs", "basin_name"} & set(file.variables)
        assert "featureType" not in file.ncattrs()
        assert file["time"].units == "minutes since 2031-05-04 00:00:00"
        assert "The offset of the times from UTC is not known." in file.comment
