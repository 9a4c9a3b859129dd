"""Tips summed to steps, and when silence is no rain."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from rainfiles import labels, read, times, written

from basinrain.errors import JobError, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step

FIVE = ["10:00:00", "10:04:59", "10:05:00", "10:05:01", "10:12:00"]


def log(clock_times: list[str], *, depths: list[str] | None = None, gauge: str = "") -> str:
    """Return rows of 4 May 2031, with a gauge column and a depth column where these are given."""
    header = ["time", *(["gauge"] if gauge else []), *(["depth"] if depths else [])]
    rows = [
        [f"2031-05-04 {at}", *([gauge] if gauge else []), *([depths[k]] if depths else [])]
        for k, at in enumerate(clock_times)
    ]
    return "\n".join(",".join(row) for row in [header, *rows]) + "\n"


def tips(folder: Path, text: str, **options: Any) -> Any:  # noqa: ANN401 - any option of the reader
    settings: dict[str, Any] = {"layout": "tips", "interval": "5min"}
    if "depth" not in text.split("\n", maxsplit=1)[0]:
        settings["tip"] = 0.2
    return read(folder, text, **settings | options)


def test_a_tip_belongs_to_the_step_that_it_ends_or_is_in(tmp_path: Path) -> None:
    """Steps are (start, end]: tips at 10:04:59 and 10:05:00 are of one step, 10:05:01 of the next."""
    record = tips(tmp_path, log(FIVE))
    assert times(record) == [(f"2031-05-04T{a}", f"2031-05-04T{b}") for a, b in (
        ("09:55", "10:00"), ("10:00", "10:05"), ("10:05", "10:10"), ("10:10", "10:15"),
    )]  # fmt: skip
    np.testing.assert_array_equal(record.depth[:, 0], [0.2, 0.4, 0.2, 0.2])
    assert labels(record) == [["observed"]] * 4
    assert (record.gauges, record.step, record.totals) == (("rain",), "5min", ())


def test_fractions_of_a_second(tmp_path: Path) -> None:
    """A fraction after the bound is of the next step, before it of the step; zeros after the point are no fraction."""
    record = tips(tmp_path, log(["10:04:59.999", "10:05:00.000", "10:05:00.001"]))
    np.testing.assert_array_equal(record.depth[:, 0], [0.4, 0.2])
    text = "time\n04.05.2031 10:04:59.5\n04.05.2031 10:05:00.0\n04.05.2031 10:05:00.5\n"
    record = tips(tmp_path, text, time_format="%d.%m.%Y %H:%M:%S.%f")
    np.testing.assert_array_equal(record.depth[:, 0], [0.4, 0.2])


def test_silence_is_zero_from_a_gauges_first_row_to_its_last(tmp_path: Path) -> None:
    """Between tips it is dry; before a gauge's first and after its last row nothing is known of it."""
    text = "gauge,time\nA,2031-05-04 10:01\nB,2031-05-04 10:11\nB,2031-05-04 10:21\nA,2031-05-04 10:16\n"
    record = tips(tmp_path, text)
    assert record.gauges == ("A", "B")
    np.testing.assert_allclose(
        record.depth, [[0.2, np.nan], [0, np.nan], [0, 0.2], [0.2, 0], [np.nan, 0.2]], rtol=1e-15
    )
    assert labels(record) == [
        ["observed", "missing"],
        ["zero", "missing"],
        ["zero", "observed"],
        ["observed", "zero"],
        ["missing", "observed"],
    ]


def test_the_period_that_is_declared(tmp_path: Path) -> None:
    """With start and end, silence is zero over the whole period, for every gauge of the source."""
    text = "gauge,time\nA,2031-05-04 10:01\nB,2031-05-04 10:11\n"
    record = tips(tmp_path, text, start="2031-05-04T09:55", end="2031-05-04 10:20")
    np.testing.assert_array_equal(record.depth, [[0, 0], [0.2, 0], [0, 0], [0, 0.2], [0, 0]])
    assert times(record)[0][0] == "2031-05-04T09:55"
    assert labels(record)[4] == ["zero", "zero"]
    half = tips(tmp_path, text, start="2031-05-04T09:55")
    np.testing.assert_array_equal(half.depth, [[0, 0], [0.2, 0], [np.nan, 0], [np.nan, 0.2]])


@pytest.mark.parametrize(
    ("start", "end", "first", "last"),
    [
        ("2031-05-04", "2031-05-04", "2031-05-04T00:00", "2031-05-05T00:00"),
        ("2031-05", "2031-05", "2031-05-01T00:00", "2031-06-01T00:00"),
        ("2031-05-04T08:00+00:00", "2031-05-04T13:00+03:00", "2031-05-04T10:00", "2031-05-04T12:00"),
    ],
)
def test_bounds_of_the_period(tmp_path: Path, start: str, end: str, first: str, last: str) -> None:
    """A bare date or month is that whole day or month; an offset is brought to the clock of the log."""
    text = "time\n2031-05-04T10:31+02:00\n"
    record = tips(tmp_path, text, start=start, end=end, timezone="+02:00")
    assert (times(record)[0][0], times(record)[-1][1], record.zone) == (first, last, "+02:00")
    assert np.nansum(record.depth) == pytest.approx(0.2)
    assert not np.isnan(record.depth).any()


def test_tests_and_stops(tmp_path: Path) -> None:
    """A depth of 0 shows that the logger ran; a blank or a code stops it until the next row, steps in part included."""
    at = ["10:00:00", "10:08:00", "10:13:00", "10:30:00", "10:45:00", "10:50:00", "11:02:00"]
    record = tips(tmp_path, log(at, depths=["0", "0.2", "", "0", "0.4", "off", "0"]), missing=["off"])
    by_end = dict(zip([end[11:] for _, end in times(record)], labels(record), strict=True))
    missing = ["10:15", "10:20", "10:25", "10:30", "10:55", "11:00", "11:05"]
    assert [end for end, (label,) in by_end.items() if label == "missing"] == missing
    assert {
        end: d for (_, full), d in zip(times(record), record.depth[:, 0], strict=True) if d > 0 and (end := full[11:])
    } == {
        "10:10": 0.2,
        "10:45": 0.4,
    }
    assert by_end["10:35"] == by_end["10:50"] == ["zero"]


def test_a_stop_in_a_step_takes_its_tips(tmp_path: Path) -> None:
    """A step of which a part is not known has no depth, not that of its other part; a last stop holds to the end."""
    record = tips(
        tmp_path, log(["10:01:00", "10:06:00", "10:07:00"], depths=["0.2", "0.2", ""]), end="2031-05-04T10:20"
    )
    np.testing.assert_array_equal(record.depth[:, 0], [0.2, np.nan, np.nan, np.nan])
    assert labels(record) == [["observed"], ["missing"], ["missing"], ["missing"]]


def test_a_test_at_the_very_start(tmp_path: Path) -> None:
    """A test at the start of the period is in order, and alone it makes no step known; a tip then is outside."""
    options = {"start": "2031-05-04T10:00", "end": "2031-05-04T10:10"}
    record = tips(tmp_path, log(["10:00:00", "10:07:00"], depths=["0", "0.2"]), **options)
    np.testing.assert_array_equal(record.depth[:, 0], [0, 0.2])
    alone = tips(tmp_path, log(["10:00:00"], depths=["0"]), start="2031-05-04T10:00")
    assert labels(alone) == [["missing"]]
    with pytest.raises(ReadError, match=r"rain\.csv:2: gauge rain: found 1 row outside the period, the first at "):
        tips(tmp_path, log(["10:00:00", "10:07:00"], depths=["0.2", "0.2"]), **options)


def test_rows_outside_the_period(tmp_path: Path) -> None:
    """A logger cannot have tipped when it did not run."""
    with pytest.raises(
        ReadError,
        match=r"rain\.csv:5: gauge rain: found 2 rows outside the period, the first at 2031-05-04T10:05:01; expected "
        r"rows after its first row, until 2031-05-04T10:05:00, as declared; correct start and end, or the rows",
    ):
        tips(tmp_path, log(FIVE), end="2031-05-04T10:05")


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"start": "2031-05-04T10:02"}, r"start: found '2031-05-04T10:02'; expected a bound of the steps of 5min"),
        (
            {"start": "2031-05-05", "end": "2031-05-04"},
            r"end: found '2031-05-04'; expected a time after start, '2031-05-05'",
        ),
        ({"end": "tomorrow at noon"}, r"end: found 'tomorrow at noon'; expected a time such as 2031-05-04 08:00"),
        ({"start": "soon"}, r"start: found 'soon'; expected a time such as"),
        ({"end": "2031-05-04T12:00Z"}, r"end: found '2031-05-04T12:00Z'; expected no offset, as the other stamps have"),
        (
            {"interval": "7min"},
            r"interval: found '7min'; expected a step that divides the day, as layout is 'tips'; sum",
        ),
        ({"interval": "1mo"}, r"interval: found '1mo'; expected a step that divides the day"),
        ({"tip": 0.0}, r"tip: found 0\.0; expected a number above 0"),
        (
            {"stamp": "start"},
            r"stamp: found 'start'; expected it with layout 'wide', 'long' or 'totals' only; leave it",
        ),
        ({"columns": {"flag": "x"}}, r"columns: found 'flag'; expected for layout 'tips' one of: gauge, time, depth"),
    ],
)
def test_options_that_cannot_be(tmp_path: Path, options: dict[str, Any], message: str) -> None:
    """Each faulty option of a source of tips says what was found, what is expected and what to do."""
    with pytest.raises(JobError, match=rf"rain\.csv: {message}"):
        tips(tmp_path, log(FIVE), **options)


def test_an_axis_that_is_too_long(tmp_path: Path) -> None:
    """A wrong year is told before memory is taken for all its steps."""
    with pytest.raises(ReadError, match=r"time axis: found \d{8} steps of 1min from .* expected at most 20000000"):
        tips(tmp_path, "time\n1931-05-04 10:00:00\n2031-05-04 10:00:00\n", interval="1min")


def test_several_files_of_several_gauges(tmp_path: Path) -> None:
    """Files without a gauge column hold the gauge of their name; files of one gauge may come in any order."""
    files = [
        written(tmp_path, log(["10:21:00"]), "june/R07.csv"),
        written(tmp_path, log(["10:02:00", "10:03:00"]), "may/R07.csv"),
        written(tmp_path, log(["10:06:00"], gauge="R08"), "other.csv"),
    ]
    record = read_rainfall(files, layout="tips", unit="0.1 mm", tip=2, interval="10min")
    assert record.gauges == ("R07", "R08")
    np.testing.assert_allclose(record.depth, [[0.4, 0.2], [np.nan, np.nan], [0.2, np.nan]], rtol=1e-12)


def test_a_gap_between_two_files_is_not_dry(tmp_path: Path) -> None:
    """From the step of a file's last row to that of the next file's first nothing shows that the logger ran."""
    files = [
        written(tmp_path, log(["10:02:00", "10:08:00"]), "may/R07.csv"),
        written(tmp_path, log(["10:21:00", "10:34:00"]), "june/R07.csv"),
        written(tmp_path, log(["10:36:00"]), "july/R07.csv"),
    ]
    options: dict[str, Any] = {"layout": "tips", "unit": "mm", "tip": 0.2, "interval": "5min"}
    record = read_rainfall(files, **options)
    np.testing.assert_array_equal(record.depth[:, 0], [0.2, 0.2, np.nan, np.nan, 0.2, 0, 0.2, 0.2])
    assert [(note.code, note.level, note.gauge) for note in record.notes] == [
        ("run-not-declared", "info", ""),
        ("log-gap", "warning", "R07"),
    ]
    assert record.notes[1].text == (
        "Gauge R07: nothing shows that the logger ran between its files, 2031-05-04T10:08:00 to 2031-05-04T10:21:00; "
        "this is missing, not dry. If it ran, give start and end."
    )
    half = read_rainfall(files, start="2031-05-04T10:00", **options)
    np.testing.assert_array_equal(half.depth, record.depth)
    told = read_rainfall(files, start="2031-05-04T10:00", end="2031-05-04T10:40", **options)
    np.testing.assert_array_equal(told.depth[:, 0], [0.2, 0.2, 0, 0, 0.2, 0, 0.2, 0.2])
    assert told.notes == ()


def test_a_stop_at_the_end_of_a_file_needs_no_note(tmp_path: Path) -> None:
    """Where the file itself says that recording stopped, the gap is missing without another word."""
    files = [
        written(tmp_path, log(["10:02:00", "10:08:00"], depths=["0.2", ""]), "may/R07.csv"),
        written(tmp_path, log(["10:21:00"], depths=["0.2"]), "june/R07.csv"),
    ]
    record = read_rainfall(files, layout="tips", unit="mm", interval="5min")
    np.testing.assert_array_equal(record.depth[:, 0], [0.2, np.nan, np.nan, np.nan, np.nan])
    assert [note.code for note in record.notes] == ["run-not-declared"]


def test_a_silence_of_years_is_not_dry(tmp_path: Path) -> None:
    """A row of a clock that went back to 2000 makes no years of zeros; a year without rain may be one."""
    text = "time\n2000-01-01 00:00:05\n2031-05-03 23:50\n2031-05-04 00:10\n"
    record = tips(tmp_path, text, interval="1h")
    assert np.flatnonzero(~np.isnan(record.depth[:, 0])).tolist() == [0, len(record) - 2, len(record) - 1]
    assert [note.code for note in record.notes] == ["run-not-declared", "long-silence"]
    assert record.notes[1].text == (
        "Gauge rain: rows that stand more than 366 days apart, 2000-01-01T00:00:05 to 2031-05-03T23:50:00; so long a "
        "silence is missing, not dry. Remove a row whose clock was wrong; if the logger ran, give start and end."
    )
    told = tips(tmp_path, text, interval="1h", start="2000-01-01", end="2031-05-04")
    assert (not np.isnan(told.depth).any(), told.notes) == (True, ())
    year = tips(tmp_path, "time\n2030-05-04 10:00\n2031-05-05 10:00\n", interval="1h")
    assert not np.isnan(year.depth).any()


def test_bins_of_another_library(tmp_path: Path) -> None:
    """Steps hold what pandas' resampling, closed and labelled on the right, counts in them."""
    seconds = np.sort(np.random.default_rng(7).integers(0, 86_400 * 3, 4000))
    moments = pd.DatetimeIndex(np.datetime64("2031-05-04T00:00:00") + seconds.astype("timedelta64[s]"))
    record = tips(tmp_path, "time\n" + "\n".join(map(str, moments)) + "\n", tip=0.254)
    counts = pd.Series(1, index=moments).resample("5min", closed="right", label="right").sum()
    np.testing.assert_array_equal(record.ends, counts.index.to_numpy().astype("datetime64[s]"))
    np.testing.assert_array_equal(record.depth[:, 0], 0.254 * counts.to_numpy())


def test_hourly_common_step(tmp_path: Path) -> None:
    """At the common step, an hour with a stop in it is missing, and the others are the sums of their tips."""
    at = ["09:00:00", "09:07:00", "09:59:00", "10:20:00", "10:31:00", "11:40:00", "12:00:00"]
    record = tips(tmp_path, log(at, depths=["0", "0.2", "0.4", "", "0", "0.2", "0"]), start="2031-05-04T08:00")
    network = GaugeNetwork(ids=("rain",), x=np.zeros(1), y=np.zeros(1), crs="local")
    common, notes = bring_to_step([record], network, common="1h")
    assert [end for _, end in times(common)] == [f"2031-05-04T{hour:02d}:00" for hour in range(9, 13)]
    np.testing.assert_allclose(common.depth[:, 0], [0, 0.6, np.nan, 0.2], rtol=1e-12)
    assert labels(common) == [["zero"], ["observed"], ["missing"], ["observed"]]
    assert ([note.code for note in notes], common.recorders) == (["run-not-declared"], frozenset({"rain"}))


@given(
    seconds=st.lists(st.integers(0, 4 * 3600), min_size=1, max_size=60),
    minutes=st.sampled_from([1, 5, 15, 60]),
    tip=st.sampled_from([0.1, 0.2, 0.254, 0.5]),
)
def test_every_tip_counts_once(
    tmp_path_factory: pytest.TempPathFactory, seconds: list[int], minutes: int, tip: float
) -> None:
    """The record's sum is the number of tips times the tip; every step has the tips of its (start, end]."""
    moments = np.datetime64("2031-05-04T00:00:00") + np.sort(seconds).astype("timedelta64[s]")
    text = "gauge,time\n" + "".join(f"{'AB'[k % 2]},{moment}\n" for k, moment in enumerate(moments))
    # Every time twice for a gauge is a doubled file.
    if any(
        len(part) > 2 and (np.unique(part, return_counts=True)[1] > 1).all() for part in (moments[::2], moments[1::2])
    ):
        return
    record = tips(tmp_path_factory.mktemp("tips"), text, interval=f"{minutes}min", tip=tip)
    assert np.nansum(record.depth) == pytest.approx(len(seconds) * tip, rel=1e-12)
    for g, gauge in enumerate(record.gauges):
        mine = moments[::2] if gauge == "A" else moments[1::2]
        counts = [int(((mine > a) & (mine <= b)).sum()) for a, b in zip(record.starts, record.ends, strict=True)]
        np.testing.assert_allclose(np.nan_to_num(record.depth[:, g]), np.array(counts) * tip, rtol=1e-12)
