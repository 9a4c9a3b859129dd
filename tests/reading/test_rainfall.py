"""Rainfall files as a whole: options, open data, months."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from ghcnfiles import ONE, TWO, month
from rainfiles import labels, read, times, written

from basinrain.errors import JobError, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step

DATA = Path(__file__).parent.parent / "data"


@pytest.mark.parametrize(
    ("folder", "interval", "steps", "missing", "zone", "first"),
    [
        ("nyc_hourly", "1h", 8730, 0.29, "+00:00", ("2013-01-01T05:00", "2013-01-01T06:00")),
        ("oahu", "1d", 2792, 27.96, "", ("2010-01-01T00:00", "2010-01-02T00:00")),
    ],
)
def test_open_data(  # noqa: PLR0917 - one row of the table
    folder: str, interval: str, steps: int, missing: float, zone: str, first: tuple[str, str]
) -> None:
    """Steps and missing shares of the open records are those of their READMEs (%), depths those that pandas reads."""
    path = DATA / folder / "rain.csv"
    record = read_rainfall([path], layout="wide", unit="mm", interval=interval)
    reference = json.loads((DATA / folder / "reference.json").read_text())
    assert (len(record), len(record.gauges)) == (steps, reference["n_gauges"])
    assert np.isnan(record.depth).mean() == pytest.approx(reference["missing_share"], abs=1e-12)
    assert round(100 * np.isnan(record.depth).mean(), 2) == missing
    assert (record.zone, times(record)[0]) == (zone, first)
    np.testing.assert_array_equal(record.depth, pd.read_csv(path, index_col=0).to_numpy())


def test_months(tmp_path: Path) -> None:
    """Months are calendar months, leap years included, in any of their writings."""
    for february in ("2032-02", "2032-02-01", "2032-02-29"):
        months = [february[:5] + "01" + february[7:].replace("29", "31"), february]
        record = read(tmp_path, f"month,A\n{months[0]},31\n{months[1]},29\n", interval="1mo", unit="in")
        assert times(record) == [
            ("2032-01-01T00:00", "2032-02-01T00:00"),
            ("2032-02-01T00:00", "2032-03-01T00:00"),
        ]
        np.testing.assert_allclose(record.depth[:, 0], [787.4, 736.6])
        assert (record.step, record.day_phase) == ("1mo", 0)


@pytest.mark.parametrize(
    ("options", "start", "phase"),
    [
        ({}, "2031-06-05T00:00", 0),
        ({"date_means": "calendar-day"}, "2031-06-05T00:00", 0),
        ({"read_hour": "08:00", "date_means": "ends"}, "2031-06-04T08:00", 28800),
        ({"read_hour": 8, "date_means": "starts"}, "2031-06-05T08:00", 28800),
        ({"read_hour": "06:30", "date_means": "ends"}, "2031-06-04T06:30", 23400),
    ],
)
def test_daily_dates(tmp_path: Path, options: dict[str, Any], start: str, phase: int) -> None:
    """A bare date is the calendar day, or the 24 hours that end or start at the reading hour."""
    record = read(tmp_path, "date,A\n2031-06-05,48\n", interval="1d", **options)
    assert (times(record)[0][0], record.day_phase) == (start, phase)
    assert record.ends[0] - record.starts[0] == np.timedelta64(86400, "s")


def test_first_file_sets_the_clock(tmp_path: Path) -> None:
    """Later files with other offsets are brought to the first file's clock."""
    one = written(tmp_path, "time,A\n2031-05-04T08:00+02:00,1\n", "one.csv")
    two = written(tmp_path, "time,A\n2031-05-04T07:00Z,2\n", "two.csv")
    record = read_rainfall([one, two], layout="wide", unit="mm", interval="1h")
    assert (record.zone, [end for _, end in times(record)]) == ("+02:00", ["2031-05-04T08:00", "2031-05-04T09:00"])


def test_local_times_refused_in_a_file(tmp_path: Path) -> None:
    """All lines with a local time that does not exist once are listed, pointing to standard time."""
    text = "time,A\n2031-10-26 01:00,1\n2031-10-26 02:00,1\n2031-10-26 02:30,1\n"
    with pytest.raises(ReadError) as caught:
        read(tmp_path, text, interval="30min", timezone="Europe/Vienna")
    assert [line.split("rain.csv:")[1] for line in str(caught.value).splitlines()] == [
        f"{line}: column time: found '2031-10-26 {hour}', which the clocks of Europe/Vienna show twice; "
        "expected a time that exists once; give the stamps in standard time, with timezone = '+01:00'"
        for line, hour in ((3, "02:00"), (4, "02:30"))
    ]


def test_options_that_cannot_be() -> None:
    """All faulty options are refused together, before any file is opened."""
    options: dict[str, Any] = {
        "layout": "widr", "unit": "inch", "stamp": "middle", "timezone": "Nowhere/At_all", "gaps": "fill",
        "date_means": "end",
    }  # fmt: skip
    with pytest.raises(JobError) as caught:
        read_rainfall([], **options)
    assert [line.split(";")[0] for line in str(caught.value).splitlines()] == [
        "layout: found 'widr'",
        "stamp: found 'middle'",
        "date_means: found 'end'",
        "gaps: found 'fill'",
        "files: found none",
        "interval: found none",
        "timezone: found 'Nowhere/At_all'",
        "depth unit: found 'inch'",
    ]


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"unit": ""}, r"depth unit: found ''; expected one of: mm, "),
        (
            {"interval": None},
            r"interval: found none; expected a number with min, h or d, or 1mo.*; declare the files' step$",
        ),
        ({"interval": "hour"}, r"interval: found 'hour'; expected a number"),
        (
            {"read_hour": "08:00"},
            r"date_means: found none beside read_hour; expected 'ends' .* or 'starts'; declare",
        ),
        (
            {"read_hour": 8, "date_means": "calendar-day"},
            r"date_means: found 'calendar-day' beside read_hour; ",
        ),
        ({"date_means": "ends"}, r"read_hour: found none beside date_means = 'ends'; expected the hour"),
        (
            {"read_hour": "8 am", "date_means": "ends", "interval": "1d"},
            r"read_hour: found '8 am'; expected a time of day",
        ),
        (
            {"read_hour": 24, "date_means": "ends", "interval": "1d"},
            r"read_hour: found '24'; expected a time of day",
        ),
        (
            {"read_hour": 8, "date_means": "ends"},
            r"read_hour: found it beside the interval 1h; expected it with daily",
        ),
        ({"columns": {"depth": "x"}}, r"columns: found 'depth'; expected for layout 'wide' one of: time; "),
        (
            {"layout": "long", "columns": {"gage": "x"}},
            r"columns: found 'gage'; .*; did you mean 'gauge'\?$",
        ),
    ],
)
def test_an_option_that_cannot_be(tmp_path: Path, options: dict[str, Any], message: str) -> None:
    """Each faulty option says what was found, what is expected and what to do."""
    with pytest.raises(JobError, match=rf"rain\.csv: {message}"):
        read(tmp_path, "time,A\n2031-05-04 01:00,1\n", **options)


def test_options_name_the_first_file_of_their_source(tmp_path: Path) -> None:
    """Of several sources, the faulty one is told by its first file; so is a format found out while reading."""
    files = [written(tmp_path, f"time,A\n2031-05-04 0{hour}:00,1\n", f"{hour}.csv") for hour in (1, 2)]
    options: dict[str, Any] = {"layout": "wide", "unit": "mm"}
    with pytest.raises(JobError) as caught:
        read_rainfall(files, interval="hour", timezone="Nowhere/At_all", read_hour=8, **options)
    assert {problem.file for problem in caught.value.problems} == {str(files[0])}
    assert [problem.item for problem in caught.value.problems] == ["interval", "date_means", "timezone"]
    with pytest.raises(JobError, match=r"1\.csv: time_format: found '%Q'; expected a strptime format"):
        read_rainfall(files, interval="1h", time_format="%Q", **options)


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    """Files that are missing, folders or empty are listed together."""
    empty = written(tmp_path, "", "empty.csv")
    gone = tmp_path / "gone.csv"
    with pytest.raises(ReadError) as caught:
        read_rainfall([gone, tmp_path, empty], layout="wide", unit="mm", interval="1h")
    assert [line.split(";")[0] for line in str(caught.value).splitlines()] == [
        f"{gone}: the file: found nothing of that name",
        f"{tmp_path}: the file: found a folder",
        f"{empty}: the file: found nothing in it",
    ]


def test_faults_of_several_files(tmp_path: Path) -> None:
    """Faulty cells of all files of a source are in one error."""
    files = [written(tmp_path, f"time,A\n2031-05-0{k} 01:00,x\n", f"{k}.csv") for k in (1, 2)]
    with pytest.raises(ReadError, match=r"(?s)1\.csv:2: .*\n.*2\.csv:2: column A: gauge A: found 'x'"):
        read_rainfall(files, layout="wide", unit="mm", interval="1h")


def test_inputs_are_left_alone(tmp_path: Path) -> None:
    """Reading changes no file."""
    path = written(tmp_path, "time,A\r\n2031-05-04 01:00,T\r\n")
    before = (path.read_bytes(), path.stat().st_mtime_ns)
    assert labels(read_rainfall([path], layout="wide", unit="mm", interval="1h")) == [["trace"]]
    assert (path.read_bytes(), path.stat().st_mtime_ns) == before


@pytest.mark.parametrize("layout", ["ghcn-dly", "ghcn-csv"])
@pytest.mark.parametrize("timezone", [None, "+09:00", "Europe/Vienna"])
def test_published_daily_formats(tmp_path: Path, layout: str, timezone: str | None) -> None:
    """Station files of GHCN-Daily reach the common step with the statuses of their flags, in the declared clock."""
    two, one = month("PRCP", {4: "0T", 5: "12"}, station=TWO), month("PRCP", {2: "15", 3: "0P", 5: "30 X"})
    if layout == "ghcn-csv":
        two = f"{TWO},20310504,PRCP,0,T,,S,\n{TWO},20310505,PRCP,12,,,S,"
        one = f"{ONE},20310502,PRCP,15,,,S,\n{ONE},20310503,PRCP,0,P,,S,\n{ONE},20310505,PRCP,30,,X,S,"
    files = [written(tmp_path, text + "\n", name) for name, text in (("one", one), ("two", two))]
    options: dict[str, Any] = {"read_hour": 7, "date_means": "ends", "timezone": timezone}
    record = read_rainfall(files, layout=layout, **options)  # type: ignore[arg-type]
    assert (record.gauges, record.step) == ((ONE, TWO), "1d")
    assert record.zone == {None: "", "+09:00": "+09:00", "Europe/Vienna": "+01:00"}[timezone]
    network = GaugeNetwork(ids=(TWO, ONE), x=np.array([0.0, 1000.0]), y=np.zeros(2), crs="local")
    common, _ = bring_to_step([record], network)
    assert times(common)[0] == ("2031-05-01T07:00", "2031-05-02T07:00")
    np.testing.assert_array_equal(common.depth, [[np.nan, 1.5], [np.nan, 0], [0, np.nan], [1.2, np.nan]])
    assert labels(common) == [
        ["missing", "observed"],
        ["missing", "presumed zero"],
        ["trace", "missing"],
        ["observed", "rejected"],
    ]


def test_faults_of_published_files(tmp_path: Path) -> None:
    """Faults of station files are told like those of others, all files together."""
    files = [written(tmp_path, f"{ONE},2031050{k},PRCP,1.5,,,S,\n", f"{k}.csv") for k in (1, 2)]
    with pytest.raises(ReadError, match=r"(?s)1\.csv:1: .*found '1\.5'.*\n.*2\.csv:1: .*found '1\.5'"):
        read_rainfall(files, layout="ghcn-csv")
