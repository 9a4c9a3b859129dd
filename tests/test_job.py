"""The run of a job: storms and their times, gauges left out, co-located gauges, remarks said once."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tiny import GAUGES, JOB, RAIN, write_tiny

from basinrain.errors import DataError, JobError
from basinrain.job import run_storm
from basinrain.jobfile import read_job
from basinrain.results import StormRun

TOTALS = "storm,gauge,depth\nQuill,A,10\nQuill,B,\nQuill,C,100\nReed,A,0\nReed,B,0\nReed,C,0\n"
TOTALS_JOB = JOB.replace('interval = "1h"', 'layout = "totals"')
DAILY = "date,A,B,C\n2031-03-08,1,1,1\n2031-03-09,2,4,8\n2031-03-10,3,3,3\n"


def depths(run: StormRun, method: str = "thiessen") -> dict[tuple[str, str], float]:
    frame = run.basin_means[run.basin_means["method"] == method]
    return {(row["storm"], row["basin"]): row["depth"] for row in frame.to_dict("records")}


def test_excluded_gauges_take_no_part(tmp_path: Path) -> None:
    """A gauge left out by the job may stand in the rain file; the others share its area: 10 west, 30 east."""
    job = write_tiny(
        tmp_path, job=JOB.replace('length_unit = "km"\n\n[[rain', 'length_unit = "km"\nexclude = ["C"]\n\n[[rain')
    )
    run = run_storm(job)
    assert run.network.ids == ("A", "B")
    assert depths(run) == {
        ("whole record", "west"): pytest.approx(10),
        ("whole record", "east"): pytest.approx(30),
        ("whole record", "union"): pytest.approx(20),
    }


def test_storm_totals_take_the_times_that_the_job_gives(tmp_path: Path) -> None:
    """A storm of totals has the job's window, and January's normals fill its gap; undated the year's do."""
    gauges = "id,x,y," + ",".join(f"normal_{m:02d}" for m in range(1, 13)) + "\n"
    # January's normals 60, 120 and 60 mm, all others 60: B has A's and C's rain twice over in January.
    for gauge, x, january in (("A", 2.5, 60), ("B", 7.5, 120), ("C", 11, 60)):
        gauges += f"{gauge},{x},5,{january}," + ",".join(["60"] * 11) + "\n"
    infill = '\n[infill]\nmethod = "normal-ratio"\n'
    dated = '\n[[storm]]\nname = "Quill"\nstart = 2031-01-04T00:00:00\nend = 2031-01-06T00:00:00\n'
    undated = '\n[[storm]]\nname = "Quill"\n'
    run = run_storm(write_tiny(tmp_path / "dated", job=TOTALS_JOB + infill + dated, gauges=gauges, rain=TOTALS))
    assert run.infilled["depth"].tolist() == pytest.approx([(2 * 10 + 2 * 100) / 2])
    assert set(run.storm_table["start"]) == {"2031-01-04T00:00"}
    assert set(run.hyetographs["time"]) == {"2031-01-06T00:00"}
    run = run_storm(write_tiny(tmp_path / "undated", job=TOTALS_JOB + infill + undated, gauges=gauges, rain=TOTALS))
    # Of the year: 780 mm at B, 720 at A and C.
    assert run.infilled["depth"].tolist() == pytest.approx([(10 + 100) / 2 * 780 / 720])
    assert set(run.storm_table["start"]) == {""}


def test_storm_totals_that_end_before_they_start_are_refused(tmp_path: Path) -> None:
    """The window of a storm of totals is checked like any other."""
    storm = '\n[[storm]]\nname = "Quill"\nstart = 2031-01-06\nend = 2031-01-04\n'
    with pytest.raises(
        JobError, match="storm Quill: found 2031-01-06T00:00 to 2031-01-05T00:00; expected an end after"
    ):
        run_storm(write_tiny(tmp_path, job=TOTALS_JOB + storm, rain=TOTALS))


def test_a_dry_storm_is_zero_and_keeps_its_own_times(tmp_path: Path) -> None:
    """A storm without rain gives 0, not a failed run, also where a gauge should time it; shares are blank."""
    storm = '\n[[storm]]\nname = "Reed"\npattern = "A"\n'
    run = run_storm(write_tiny(tmp_path, job=TOTALS_JOB + storm, rain=TOTALS))
    assert set(depths(run).values()) == {0.0}
    assert run.weights["share"].isna().all()
    assert set(run.basin_means["share_infilled"]) == {0.0}


@pytest.mark.parametrize(
    ("means", "expected"),
    [("ends", "2031-03-08T07:00 2031-03-09T07:00"), ("starts", "2031-03-09T07:00 2031-03-10T07:00")],
)
def test_a_bare_date_names_the_files_own_day(tmp_path: Path, means: str, expected: str) -> None:
    """With daily readings at one hour, the storm of 9 March is the reading dated 9 March: 2, 4 and 8 mm."""
    job = JOB.replace('interval = "1h"', f'interval = "1d"\nread_hour = "07:00"\ndate_means = "{means}"')
    storm = '\n[[storm]]\nname = "Sunday"\nstart = 2031-03-09\nend = 2031-03-09\n'
    run = run_storm(write_tiny(tmp_path, job=job + storm, rain=DAILY))
    assert run.gauge_totals["depth"].tolist() == [2, 4, 8]
    assert set(run.storm_table["start"] + " " + run.storm_table["end"]) == {expected}
    assert "window-widened" not in {note.code for note in run.notes}


def test_the_last_day_that_can_be_written(tmp_path: Path) -> None:
    """A storm up to the end of time is outside the record, not a failure of the calendar."""
    storm = '\n[[storm]]\nname = "Q"\nstart = 2031-05-04\nend = 9999-12-31\n'
    with pytest.raises(JobError, match="expected a window inside the record"):
        run_storm(write_tiny(tmp_path, job=JOB + storm))


def test_times_with_an_offset_are_brought_to_the_clock_of_the_files(tmp_path: Path) -> None:
    """01:00 at +02:00 is 23:00 UTC the day before: outside a record that begins at midnight UTC; 03:00 is 01:00 UTC."""
    utc = JOB.replace('interval = "1h"', 'interval = "1h"\ntimezone = "UTC"')
    storm = '\n[[storm]]\nname = "Q"\nstart = 2031-05-04T03:00:00+02:00\nend = 2031-05-04T04:00:00+02:00\n'
    run = run_storm(write_tiny(tmp_path / "utc", job=utc + storm))
    assert run.gauge_totals["depth"].tolist() == [4, 9, 50]
    assert set(run.storm_table["end"]) == {"2031-05-04T02:00Z"}
    with pytest.raises(JobError, match=r"storm Q: found the time '2031-05-04T03:00:00\+02:00' with an offset"):
        run_storm(write_tiny(tmp_path / "bare", job=JOB + storm))


def test_a_catch_factor_of_a_gauge_that_is_merged(tmp_path: Path) -> None:
    """Each gauge's catch is corrected before gauges at one place are merged: (30·1.5 + 100)/2 = 72.5."""
    job = JOB.replace(
        'length_unit = "km"\n\n[[rain', 'length_unit = "km"\ncolocated = "mean"\ncatch_factor = { B = 1.5 }\n\n[[rain'
    )
    run = run_storm(write_tiny(tmp_path, job=job, gauges=GAUGES.replace("11,5", "7.5,5")))
    assert run.gauge_totals.set_index("gauge")["depth"].to_dict() == {"A": 10, "B+C": pytest.approx(72.5)}


def test_remarks_of_every_storm_are_said_once(tmp_path: Path) -> None:
    """What holds in every storm of the job names none; what holds in one names it."""
    storms = (
        '\n[[storm]]\nname = "one"\nend = 2031-05-04T02:00:00\n\n[[storm]]\nname = "two"\nstart = 2031-05-04T02:00:00\n'
    )
    run = run_storm(write_tiny(tmp_path, job=JOB + storms, rain=RAIN.replace("4,9,50", "4,,50")))
    dominant = [note for note in run.warnings if note.code == "one-gauge-dominates"]
    assert [(note.storm, note.basin) for note in dominant] == [("", "west"), ("", "east")]
    assert {note.storm for note in run.warnings if note.code == "gap-over-peak"} == {"one"}


def test_a_step_without_any_gauge_is_said(tmp_path: Path) -> None:
    """A basin whose total is missing has its reason among the warnings; the total is blank."""
    run = run_storm(write_tiny(tmp_path, rain=RAIN.replace("4,9,50", ",,")))
    assert np.isnan(list(depths(run).values())).all()
    texts = {note.text for note in run.warnings if note.code == "no-basin-total"}
    assert (
        "Basin west has no total: at some steps no gauge has a value (1 by arithmetic, 1 by thiessen, 1 by idw)."
        in texts
    )


def test_gauges_that_were_never_there_do_not_count_as_inside(tmp_path: Path) -> None:
    """A gauge closed before the storm is not a gauge inside."""
    gauges = (
        GAUGES.replace("normal\n", "normal,to\n").replace("120,900", "120,900,2031-05-01").replace("000\n", "000,\n")
    )
    gauges = gauges.replace("1200\n", "1200,\n")
    run = run_storm(write_tiny(tmp_path, gauges=gauges))
    assert [note.basin for note in run.warnings if note.code == "no-gauge-inside"] == ["west"]
    assert run.gauge_totals["status"].tolist() == ["not installed", "observed", "observed"]


def test_every_part_of_a_shapefile_is_fingerprinted(tmp_path: Path) -> None:
    """The record has the SHA-256 of the table and the projection of a shapefile, not only of its shapes."""
    import geopandas as gpd
    import shapely

    frame = gpd.GeoDataFrame({"name": ["west"]}, geometry=[shapely.box(0, 0, 5000, 10000)], crs=32633)
    job = write_tiny(
        tmp_path, job=JOB.replace("basins.geojson", "basins.shp").replace('length_unit = "km"\n\n[aver', "\n[aver")
    )
    frame.to_file(tmp_path / "basins.shp")
    run = run_storm(job)
    assert {"basins.shp", "basins.dbf", "basins.shx", "basins.prj"} <= set(run.inputs)
    assert len(set(run.inputs.values())) == len(run.inputs)


def test_settings_beside_a_resolved_job_are_refused(tmp_path: Path) -> None:
    """Settings belong to a file; a job that is already resolved takes none."""
    job = read_job(write_tiny(tmp_path))
    with pytest.raises(JobError, match="settings beside a job that is already resolved"):
        run_storm(job, ["infill.power=3"])


def test_no_gauge_reporting_is_a_data_error(tmp_path: Path) -> None:
    """A storm in which nobody reports is refused by name."""
    rain = RAIN.replace("1,6,20", ",,").replace("4,9,50", ",,").replace("5,10,30", ",,").replace("0,5,0", ",,")
    with pytest.raises(
        DataError, match="storm whole record: found no gauge reporting in it; expected one gauge at least"
    ):
        run_storm(write_tiny(tmp_path, rain=rain))
