"""GHCN-Daily files as a whole."""

from __future__ import annotations

import csv
import gzip
from pathlib import Path
from typing import Literal

import numpy as np
import pytest
from ghcnfiles import DAILY, ONE, TWO, block_of, days, faults_of, month, record_of

from basinrain.errors import Problems, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.intervals import DAY, Interval
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.ghcn import read_ghcn
from basinrain.reading.stamps import StampRules
from basinrain.reading.step import bring_to_step

FLAGS = Path(__file__).parent.parent / "data" / "published" / "ghcn_daily_flags.csv"

Layout = Literal["ghcn-dly", "ghcn-csv"]


def table(field: str) -> dict[str, str]:
    """Return the published codes of a flag with their meanings; a blank is a blank."""
    with FLAGS.open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["field"] == field]
    return {row["code"].replace("(blank)", " "): row["meaning"] for row in rows}


def one_value(layout: Layout, value: str, mflag: str, qflag: str) -> str:
    """Return a file's line or row with one PRCP value, of 2031-05-04."""
    if layout == "ghcn-dly":
        return month("PRCP", {4: f"{value}{mflag}{qflag}X"})
    return f"{ONE},20310504,PRCP,{value},{mflag.strip()},{qflag.strip()},X,0700"


LAYOUTS = pytest.mark.parametrize("layout", ["ghcn-dly", "ghcn-csv"])


@LAYOUTS
@pytest.mark.parametrize(("code", "meaning"), table("MFLAG").items())
def test_measurement_flags(tmp_path: Path, layout: Layout, code: str, meaning: str) -> None:
    """Every published measurement flag counts as its meaning says; those of other elements are refused on rain."""
    of_other_elements = ("temperature", "knots", "oktas", "wind")
    if any(word in meaning for word in of_other_elements):
        [fault] = faults_of(tmp_path, one_value(layout, "0", code, " "), layout=layout)
        assert fault == (
            f"1: gauge {ONE}: PRCP of 2031-05-04: found measurement flag '{code}'; expected a blank or one of: B, D, "
            "P, T; correct the flag"
        )
        return
    block = block_of(tmp_path, one_value(layout, "0", code, " "), layout=layout)
    expected = {"trace": "trace", "missing presumed zero": "presumed zero"}
    label = next((label for words, label in expected.items() if meaning.startswith(words)), "zero")
    assert days(block) == {4: (0.0, label)}
    if label == "zero":
        wet = block_of(tmp_path, one_value(layout, "123", code, " "), layout=layout)
        assert days(wet) == {4: (12.3, "observed")}
    else:
        [fault] = faults_of(tmp_path, one_value(layout, "123", code, " "), layout=layout)
        assert f"found '123' with measurement flag '{code}'; expected 0; correct the value or its flag" in fault


@LAYOUTS
@pytest.mark.parametrize(("code", "meaning"), table("QFLAG").items())
def test_quality_flags(tmp_path: Path, layout: Layout, code: str, meaning: str) -> None:
    """A value that failed any of the published checks is rejected, without depth; the others are kept."""
    block = block_of(tmp_path, one_value(layout, "123", " ", code), layout=layout)
    kept = meaning.startswith("did not fail")
    assert days(block) == {4: (12.3, "observed") if kept else (None, "rejected")}


@LAYOUTS
def test_flags_nobody_knows(tmp_path: Path, layout: Layout) -> None:
    """A flag that is not in the published table is refused, be it on a value or beside none."""
    faults = faults_of(tmp_path, one_value(layout, "12", "Y", "?"), layout=layout)
    assert [fault.split("; expected")[0] for fault in faults] == [
        f"1: gauge {ONE}: PRCP of 2031-05-04: found measurement flag 'Y'",
        f"1: gauge {ONE}: PRCP of 2031-05-04: found quality flag '?'",
    ]
    assert faults_of(tmp_path, one_value(layout, "-9999", "Y", " "), layout=layout)


def test_missing_is_never_zero(tmp_path: Path) -> None:
    """-9999 is missing whatever its flags are, also beside one that means a trace or a presumed zero."""
    block = block_of(tmp_path, month("PRCP", {1: "5", 2: "-9999T", 3: "-9999P", 4: "-9999 S", 5: "0"}))
    assert days(block) == {
        1: (0.5, "observed"), 2: (None, "missing"), 3: (None, "missing"), 4: (None, "missing"), 5: (0.0, "zero")
    }  # fmt: skip


@LAYOUTS
def test_elements(tmp_path: Path, layout: Layout) -> None:
    """Only precipitation is read: snow, temperature and the number of wet days of a total are not."""
    if layout == "ghcn-dly":
        lines = [month(e, {4: "77"}) for e in ("TMAX", "SNOW", "DWPR", "WT01")] + [month("PRCP", {4: "15"})]
    else:
        lines = [f"{ONE},20310504,{e},77,,,X," for e in ("TMAX", "SNOW", "DWPR", "WT01")]
        lines.append(f"{ONE},20310504,PRCP,15,,,X,")
    block = block_of(tmp_path, *lines, layout=layout)
    assert (block.gauges, days(block), block.lines.tolist()) == ((ONE,), {4: (1.5, "observed")}, [5])
    assert faults_of(tmp_path, *lines[:4], layout=layout) == [
        "the file: found no PRCP and no MDPR; expected daily precipitation"
    ]


@LAYOUTS
def test_stations_of_one_file(tmp_path: Path, layout: Layout) -> None:
    """Several stations of a file are its gauges; one without precipitation is none."""
    lines = {
        "ghcn-dly": [
            month("PRCP", {4: "15"}, station=TWO),
            month("TMAX", {4: "15"}, station="ORX00000003"),
            month("PRCP", {6: "20"}),
        ],
        "ghcn-csv": [
            f"{TWO},20310504,PRCP,15,,,X,",
            "ORX00000003,20310504,TMAX,15,,,X,",
            f"{ONE},20310506,PRCP,20,,,X,",
        ],
    }[layout]
    block = block_of(tmp_path, *lines, layout=layout)
    assert block.gauges == (TWO, ONE)
    np.testing.assert_array_equal(block.depth, [[1.5, np.nan], [np.nan, np.nan], [np.nan, 2.0]])


@pytest.mark.parametrize(
    ("hour", "date_means", "start"),
    [(None, "calendar-day", "2031-05-04T00"), (7, "ends", "2031-05-03T07"), (7, "starts", "2031-05-04T07")],
)
def test_what_a_date_names(
    tmp_path: Path, hour: int | None, date_means: Literal["calendar-day", "ends", "starts"], start: str
) -> None:
    """A date is the calendar day, or the 24 hours that end or start at the reading hour, in both layouts."""
    stamps = StampRules(
        interval=Interval("1d", DAY), read_hour=None if hour is None else hour * 3600, date_means=date_means
    )
    begin = np.datetime64(start, "s")
    for layout in ("ghcn-dly", "ghcn-csv"):
        record = record_of(block_of(tmp_path, one_value(layout, "15", " ", " "), layout=layout, stamps=stamps))
        assert (record.starts[0], record.ends[0]) == (begin, begin + np.timedelta64(DAY, "s"))
        assert record.day_phase == (hour or 0) * 3600


def test_an_iana_zone_has_one_offset(tmp_path: Path) -> None:
    """Dates are days of standard time, so that winter and summer days begin alike."""
    stamps = StampRules(interval=Interval("1d", DAY), timezone="Europe/Vienna", read_hour=25200, date_means="ends")
    lines = [month("PRCP", {4: "15"}, when=when) for when in ("203101", "203107")]
    ends = block_of(tmp_path, *lines, stamps=stamps).ends
    assert (str(ends[0]), str(ends[-1])) == ("2031-01-04T07:00:00", "2031-07-04T07:00:00")


def test_both_layouts_say_the_same(tmp_path: Path) -> None:
    """The same values, flags and totals in the two layouts are the same block."""
    lines = [
        month("PRCP", {1: "5", 2: "0T", 6: "31 S", 8: "0P", 9: "12B"}),
        month("MDPR", {5: "450", 12: "80"}),
        month("DAPR", {5: "3"}),
    ]
    rows = [
        f"{ONE},203105{d},{rest}"
        for d, rest in (
            ("05", "MDPR,450,,,X,"), ("05", "DAPR,3,,,X,"), ("01", "PRCP,5,,,X,0700"), ("02", "PRCP,0,T,,X,0700"),
            ("06", "PRCP,31,,S,X,"), ("08", "PRCP,0,P,,X,"), ("09", "PRCP,12,B,,X,"), ("12", "MDPR,80,,,X,"),
        )
    ]  # fmt: skip
    dly, by_row = block_of(tmp_path, *lines), block_of(tmp_path, *rows, layout="ghcn-csv")
    np.testing.assert_array_equal(by_row.depth, dly.depth)
    np.testing.assert_array_equal(by_row.status, dly.status)
    np.testing.assert_array_equal(by_row.ends, dly.ends)
    assert by_row.spans == dly.spans


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (gzip.compress(b"ORX"), r"the file: found compressed content; expected text; unpack it$"),
        (b"O\0R\0X\0", r"the file: found binary content; expected text$"),
        (b"", r"the file: found nothing in it; expected values of stations$"),
        (b"\n \n", r"the file: found no PRCP and no MDPR; expected daily precipitation$"),
    ],
)
@LAYOUTS
def test_no_such_file(tmp_path: Path, layout: Layout, content: bytes, message: str) -> None:
    """A file that is packed, binary or empty is refused in one line."""
    path = tmp_path / "orx.dly"
    path.write_bytes(content)
    problems = Problems()
    assert read_ghcn(path, layout=layout, stamps=DAILY, problems=problems) is None
    with pytest.raises(ReadError, match=message):
        problems.raise_as(ReadError)
    assert len(problems) == 1


def test_files_that_follow_each_other(tmp_path: Path) -> None:
    """A total of 1 January reaches into the year before, which stands in another file."""
    (tmp_path / "a").mkdir()
    (tmp_path / "b").mkdir()
    old = block_of(tmp_path / "a", f"{ONE},20301229,PRCP,10,,,X,", layout="ghcn-csv")
    new = block_of(
        tmp_path / "b", f"{ONE},20310101,MDPR,90,,,X,", f"{ONE},20310101,DAPR,3,,,X,", f"{ONE},20310103,PRCP,20,,,X,",
        layout="ghcn-csv",
    )  # fmt: skip
    record = record_of(old, new)
    assert [Status(code).label for code in record.status[:, 0]] == [
        "observed", "accumulated", "accumulated", "accumulated", "missing", "observed"
    ]  # fmt: skip
    assert [(str(t.start), str(t.end), t.depth) for t in record.totals] == [
        ("2030-12-30T00:00:00", "2031-01-02T00:00:00", 9.0)
    ]


def spread(tmp_path: Path, donor: list[int]) -> tuple[RainRecord, list[str]]:
    """Spread 45.0 mm over 4 to 6 May beside a station 1 km away; return the record and what it notes."""
    lines = [
        month("PRCP", {3: "0", 7: "11"}),
        month("MDPR", {6: "450"}),
        month("DAPR", {6: "3"}),
        month("PRCP", {d: str(10 * mm) for d, mm in zip(range(3, 8), [0, *donor, 0], strict=True)}, station=TWO),
    ]
    network = GaugeNetwork(ids=(ONE, TWO), x=np.array([0.0, 1000.0]), y=np.zeros(2), crs="local")
    record, notes = bring_to_step([record_of(block_of(tmp_path, *lines))], network)
    return record, [note.text for note in notes]


def test_a_total_of_three_days_is_spread(tmp_path: Path) -> None:
    """45.0 mm beside a station with 10, 0 and 20 mm are 15, 0 and 30 mm."""
    record, notes = spread(tmp_path, [10, 0, 20])
    np.testing.assert_allclose(record.depth[:, 0], [0.0, 15.0, 0.0, 30.0, 1.1], rtol=1e-12)
    assert [Status(code).label for code in record.status[:, 0]] == ["zero", "spread", "spread", "spread", "observed"]
    assert (notes, record.totals[0].depth) == ([], 45.0)


def test_a_total_beside_dry_stations(tmp_path: Path) -> None:
    """45.0 mm where all others are dry are 15 mm a day, and it is said."""
    record, notes = spread(tmp_path, [0, 0, 0])
    np.testing.assert_allclose(record.depth[:, 0], [0.0, 15.0, 15.0, 15.0, 1.1], rtol=1e-12)
    assert notes == [
        (
            f"Gauge {ONE}: 45 mm over 2031-05-04T00:00:00 to 2031-05-07T00:00:00 spread evenly over the steps, because "
            "none of the recording gauges near it has rain."
        )
    ]
