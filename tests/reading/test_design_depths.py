"""Tables of depths by duration and frequency, as files."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from depth_tables import tables
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from rainfiles import written

from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.designstorm.measures import duration_words
from basinrain.designstorm.point_depths import PointDepths
from basinrain.errors import JobError, ReadError
from basinrain.reading.design_depths import read_point_depths

SAME_FOLDER = settings(suppress_health_check=[HealthCheck.function_scoped_fixture], deadline=None)

LONG = "point,duration,aep,depth\nA,1h,0.5,20\nA,1h,0.1,30\nA,2h,0.5,28\nA,2h,0.1,40\n"
DEPTH = [[[20.0, 30.0], [28.0, 40.0]]]


def read(folder: Path, text: str, **options: Any) -> PointDepths:  # noqa: ANN401 - any option of the reader
    """Return the table of a file; long, in mm, AEP as fractions, unless the options say otherwise."""
    fields: dict[str, Any] = {
        "unit": "mm",
        "series": ANNUAL_MAXIMUM,
        "probability": "aep",
        "source": "invented",
        "date": "2031",
    }
    return read_point_depths(written(folder, text, "quill.csv"), **(fields | options))


def test_long(tmp_path: Path) -> None:
    """A row for every value becomes a table with its source and date."""
    table = read(tmp_path, LONG)
    assert (table.points, table.series, table.source, table.date) == (("A",), ANNUAL_MAXIMUM, "invented", "2031")
    assert (table.durations.tolist(), table.return_periods.tolist()) == ([60.0, 120.0], [2.0, 10.0])
    assert table.depth.tolist() == DEPTH
    assert not table.areal
    assert np.isnan(table.positions).all()


@pytest.mark.parametrize(
    ("text", "options"),
    [
        ("duration,0.5,0.1\n1h,20,30\n2h,28,40\n", {"layout": "wide"}),
        ("duration,0.1,0.5\n120min,40,28\n1h,30,20\n", {"layout": "wide"}),
        ("d;50 %;10%\n1;20;30\n2;28,0;40\n", {"layout": "wide", "probability": "aep-percent", "duration_unit": "h"}),
        ("d,2,10\n60,20,30\n120,28,40\n", {"layout": "wide", "probability": "return-period", "duration_unit": "min"}),
        ("d,2-year,10 yr\n1h,20,30\n2h,28,40\n", {"layout": "wide", "probability": "return-period"}),
        ("2,10,d\n20,30,1h\n14,20,2h\n", {"layout": "wide", "probability": "return-period", "unit": "mm/h",
                                         "columns": {"duration": "d"}}),
        ("duration,aep,depth\n1h,.5,20\n1h,.1,30\n2h,.5,28\n2h,.1,40\n", {}),
        ("duration,aep,depth\n1h,.5,2\n1h,.1,3\n2h,.5,2.8\n2h,.1,4\n", {"unit": "cm"}),
        ("dur,T,intensity\n1h,2,20\n1h,10,30\n2h,2,14\n2h,10,20\n", {"unit": "mm/h", "probability": "return-period"}),
        ("a,b,c\n1h,2,20\n1h,10,30\n2h,2,28\n2h,10,40\n",
         {"probability": "return-period", "columns": {"duration": "a", "probability": "b", "depth": "c"}}),
        ("\ufeffduration\taep_percent\tdepth\r\n1h\t50\t20\r\n1h\t10\t30\r\n2h\t50\t28\r\n2h\t10\t40\r\n",
         {"probability": "aep-percent"}),
    ],
)  # fmt: skip
def test_the_same_table(tmp_path: Path, text: str, options: dict[str, Any]) -> None:
    """One table, however it is written; without a column of points it is of one, named after the file."""
    table = read(tmp_path, text, **options)
    assert table.points == ("quill",)
    assert (table.durations.tolist(), table.return_periods.tolist()) == ([60.0, 120.0], [2.0, 10.0])
    np.testing.assert_allclose(table.depth, DEPTH, rtol=1e-14)


def test_inches(tmp_path: Path) -> None:
    """An inch is 25.4 mm; 1 in/h over 2 h is 50.8 mm."""
    text = "duration,aep,{}\n1h,0.1,1.5\n2h,0.1,1\n"
    np.testing.assert_allclose(
        read(tmp_path, text.format("intensity"), unit="in/h").depth, [[[38.1], [50.8]]], rtol=1e-14
    )
    text = "duration,aep,{}\n1h,0.1,1.5\n2h,0.1,2\n"
    np.testing.assert_allclose(read(tmp_path, text.format("depth"), unit="in").depth, [[[38.1], [50.8]]], rtol=1e-14)


def test_partial_duration(tmp_path: Path) -> None:
    """Return periods of 3 and 6 months are everyday drainage, in a partial duration series."""
    text = "duration,return_period,depth\n1h,0.25,8\n1h,0.5,11\n1h,2,20\n"
    table = read(tmp_path, text, series=PARTIAL_DURATION, probability="return-period")
    assert table.return_periods.tolist() == [0.25, 0.5, 2.0]
    assert table.at(np.array([60.0]), Frequency(0.5, PARTIAL_DURATION)).tolist() == [[11.0]]


def test_points_with_positions(tmp_path: Path) -> None:
    """Points stand in the file's order, with their positions and what these are in."""
    text = "point,duration,aep,depth,x,y\nB,1h,0.1,30,7,8\nA,1h,0.1,31,5,6\nB,2h,0.1,40,7,8\nA,2h,0.1,41,,\n"
    table = read(tmp_path, text, crs="local")
    assert (table.points, table.crs) == (("B", "A"), "local")
    assert table.positions.tolist() == [[7.0, 8.0], [5.0, 6.0]]
    assert table.depth[:, :, 0].tolist() == [[30.0, 40.0], [31.0, 41.0]]


@given(tables(), st.sampled_from(["mm", "in", "mm/h", "in/h"]), st.randoms(use_true_random=False))
@SAME_FOLDER
def test_units_and_order_do_not_matter(
    tmp_path_factory: pytest.TempPathFactory,
    expected: PointDepths,
    unit: str,
    random: Any,  # noqa: ANN401 - a Random
) -> None:
    """Depths or intensities, mm or inches, rows in any order: the same table."""
    factor = 25.4 if unit.startswith("in") else 1.0
    rows = []
    for p, point in enumerate(expected.points):
        for d, minutes in enumerate(expected.durations):
            hours = minutes / 60 if unit.endswith("/h") else 1.0
            for t, years in enumerate(expected.return_periods):
                value = float(expected.depth[p, d, t] / factor / hours)
                rows.append(f"{point},{duration_words(float(minutes))},{float(years)!r},{value!r}")
    random.shuffle(rows)
    kind = "intensity" if unit.endswith("/h") else "depth"
    text = "\n".join([f"point,duration,return_period,{kind}", *rows])
    found = read(tmp_path_factory.mktemp("any"), text, unit=unit, probability="return-period")
    order = [found.points.index(point) for point in expected.points]
    np.testing.assert_array_equal(found.durations, expected.durations)
    np.testing.assert_array_equal(found.return_periods, expected.return_periods)
    np.testing.assert_allclose(found.depth[order], expected.depth, rtol=1e-12)


FRACTION = "expected a fraction between 0 and 1; "
PERCENT = (
    FRACTION
    + "declare probability = 'aep-percent' where it is percent, 'return-period' where it is years, or correct it"
)
NO_UNIT = "expected a number with min, h or d: 15min, 1h, 2d; write the unit, or declare duration_unit"


def test_rows_of_a_wide_table_are_counted_not_their_cells(tmp_path: Path) -> None:
    """A duration that cannot be read stands in one row of a wide table, however many frequencies there are."""
    with pytest.raises(ReadError) as caught:
        read(tmp_path, "duration,0.5,0.1\n1h,20,30\n120,28,40\n", layout="wide")
    assert [problem.found for problem in caught.value.problems] == ["'120' without a unit"]


@pytest.mark.parametrize(
    ("old", "new", "options", "lines"),
    [
        ("0.1", "10", {}, [f":3: column aep: found '10' in this row and 1 more; {PERCENT}"]),
        ("0.5", "1", {}, [f":2: column aep: found '1' in this row and 1 more; {PERCENT}"]),
        ("0.5", "0", {}, [f":2: column aep: found '0' in this row and 1 more; {FRACTION}correct it"]),
        ("0.5", "-0.5", {}, [f":2: column aep: found '-0.5' in this row and 1 more; {FRACTION}correct it"]),
        ("2h,0.1", "2h,often", {}, [":5: column aep: found 'often'; expected a fraction between 0 and 1"]),
        ("2h,0.1", "2h,", {}, [":5: column aep: found nothing; expected a fraction between 0 and 1"]),
        ("0.5", "100", {"probability": "aep-percent"},
         [":2: column aep: found '100' in this row and 1 more; expected a percentage between 0 and 100; correct it"]),
        ("1h", "60", {}, [f":2: column duration: found '60' without a unit in this row and 1 more; {NO_UNIT}"]),
        ("2h,0.1", "later,0.1", {},
         [":5: column duration: found 'later'; expected a number with min, h or d: 15min, 1h, 2d"]),
        ("0.5,28", "0.5,-28", {},
         [":4: point A, 2 h, AEP 0.5 (1 in 2): found -28 mm (-14 mm/h); expected a depth above 0; correct it"]),
        ("0.5,28", "0.5,0", {},
         [":4: point A, 2 h, AEP 0.5 (1 in 2): found 0 mm (0 mm/h); expected a depth above 0; correct it"]),
        ("0.5,28", "0.5,19", {},
         [(":4: point A, 2 h, AEP 0.5 (1 in 2): found 19 mm (9.5 mm/h), less than 20 mm (20 mm/h) of 1 h (line 2); "
          "expected a depth that does not fall with duration; correct one of them")]),
        ("0.5,28", "0.5,39.5", {"unit": "in"}, []),
        ("0.5,28", "0.5,40.5", {"unit": "in"},
         [(":5: point A, 2 h, AEP 0.1 (1 in 10): found 40 in (20 in/h), less than 40.5 in (20.25 in/h) of AEP 0.5 (1 "
          "in 2) (line 4); expected a depth that does not fall with rarity; correct one of them"),
          (":4: point A, 2 h, AEP 0.5 (1 in 2): found 40.5 in (20.25 in/h), more intense than 20 in (20 in/h) of 1 h "
          "(line 2); expected an intensity that does not rise with duration; correct one of them")]),
        ("A,2h,0.5,28\n", "", {},
         [(": point A, 2 h, AEP 0.5 (1 in 2): found no depth; expected a depth for every duration and frequency of a "
          "point; add it")]),
        ("A,2h,0.5,28\n", "A,2h,0.5,28\nA,120min,.50,29\n", {},
         [(":5: point A, 2 h, AEP 0.5 (1 in 2): found a depth again, first on line 4; expected each once; remove one "
          "of them")]),
        ("0.5,28", "0.5,28mm", {},
         [":4: column depth: point A, duration 2h, aep 0.5: found '28mm'; expected a number; correct the cell"]),
        ("0.5,28", "0.5,", {},
         [":4: column depth: point A, duration 2h, aep 0.5: found nothing; expected a number; correct the cell"]),
        ("A,2h,0.5", ",2h,0.5", {}, [":4: column point: found a blank cell; expected the point"]),
    ],
)  # fmt: skip
def test_one_fault(tmp_path: Path, old: str, new: str, options: dict[str, Any], lines: list[str]) -> None:
    """Each fault is a line of its own with the file's line, what was found and what was expected."""
    text = LONG.replace(old, new)
    if not lines:
        assert read(tmp_path, text, **options).points == ("A",)
        return
    with pytest.raises(ReadError, match=re.escape(lines[0])) as caught:
        read(tmp_path, text, **options)
    assert str(caught.value).replace(str(tmp_path / "quill.csv"), "").splitlines() == lines


def test_typical_percents(tmp_path: Path) -> None:
    """50, 10 and 1 % where fractions are declared: three lines, not thirty."""
    rows = [f"{d}h,{p},{10 + d}" for d in (1, 2, 3) for p in (50, 10, 1)]
    with pytest.raises(
        ReadError, match=r"column aep: found '50' in this row and 2 more; expected a fraction"
    ) as caught:
        read(tmp_path, "duration,aep,depth\n" + "\n".join(rows))
    assert [problem.line for problem in caught.value.problems] == [2, 3, 4]


@pytest.mark.parametrize("years", ["1", "0.5"])
def test_annual_maximum_return_periods(tmp_path: Path, years: str) -> None:
    """A return period of a year or less is no annual maximum's; told is where such are."""
    with pytest.raises(
        ReadError,
        match=rf"quill\.csv: column {years}: found {years} years of an annual maximum series; expected more than 1; "
        "shorter ones are of a partial duration series$",
    ) as caught:
        read(tmp_path, f"duration,{years},2\n1h,10,20\n", layout="wide", probability="return-period")
    assert len(caught.value.problems) == 1


def test_wide_faults(tmp_path: Path) -> None:
    """In a wide table the heading or the cell is named, with the line of the cell; all faults together."""
    cell = "point quill, duration {}h, return-period 100"
    before = "20 mm (20 mm/h) of 1 h (line 2); expected a depth that does not fall with duration; correct one of them"
    text = "duration,2,x,100\n1h,20,30,40\n2h,19,31,\n3h,25,32,forty\n"
    with pytest.raises(ReadError, match="column x") as caught:
        read(tmp_path, text, layout="wide", probability="return-period")
    assert str(caught.value).replace(str(tmp_path / "quill.csv"), "").splitlines() == [
        ": column x: found 'x'; expected a number of years",
        f":3: column 100: {cell.format(2)}: found nothing; expected a number; correct the cell",
        f":4: column 100: {cell.format(3)}: found 'forty'; expected a number; correct the cell",
        f":3: point quill, 2 h, AEP 0.5 (1 in 2): found 19 mm (9.5 mm/h), less than {before}",
    ]


def test_two_headings_of_one_frequency(tmp_path: Path) -> None:
    """0.1 and 0.10 are one frequency, which may not come twice."""
    with pytest.raises(
        ReadError, match=r"quill\.csv:2: point quill, 1 h, AEP 0\.1 .*: found a depth again, first on line 2"
    ):
        read(tmp_path, "duration,0.1,0.10\n1h,20,21\n", layout="wide")


def test_points_with_two_positions(tmp_path: Path) -> None:
    """A point has one position; what else is wrong is said with it."""
    text = "point,duration,aep,depth,lon,lat\nA,1h,0.1,20,9,47\nA,2h,0.1,15,9,48\n"
    with pytest.raises(
        ReadError, match=r"quill\.csv:3: point A: found position \(9, 48\), and \(9, 47\) on line 2"
    ) as caught:
        read(tmp_path, text)
    assert [problem.line for problem in caught.value.problems] == [3, 3]


def test_gaps_of_several_points(tmp_path: Path) -> None:
    """Every point must have every duration and frequency; each gap is named."""
    text = LONG + "B,1h,0.5,20\nB,3h,0.5,30\n"
    with pytest.raises(ReadError, match="found no depth") as caught:
        read(tmp_path, text)
    assert [problem.item for problem in caught.value.problems] == [
        "point A, 3 h, AEP 0.5 (1 in 2)",
        "point A, 3 h, AEP 0.1 (1 in 10)",
        "point B, 1 h, AEP 0.1 (1 in 10)",
        "point B, 2 h, AEP 0.5 (1 in 2)",
        "point B, 2 h, AEP 0.1 (1 in 10)",
        "point B, 3 h, AEP 0.1 (1 in 10)",
    ]


def test_columns_that_hold_something_else(tmp_path: Path) -> None:
    """Depths read as durations would make a table of a million gaps: said in one line, and not made."""
    rows = [f"P{k},{k}min,{k + 2},{k}" for k in range(1, 201)]
    with pytest.raises(
        ReadError,
        match=r"quill\.csv: the table of depths: found 200 points, 200 durations and 200 frequencies in 200 val",
    ) as caught:
        read(tmp_path, "point,duration,T,depth\n" + "\n".join(rows), probability="return-period")
    assert len(caught.value.problems) == 1


def test_missing_columns(tmp_path: Path) -> None:
    """Columns that are not there are named, with those that are; all together."""
    with pytest.raises(ReadError, match="found no column for the probability among: when, how_rare, depth") as caught:
        read(tmp_path, "when,how_rare,depth\n1h,0.1,2\n")
    assert [problem.remedy for problem in caught.value.problems] == [
        "name it in columns.duration",
        "name it in columns.probability",
    ]
    with pytest.raises(ReadError, match=r"columns\.duration: found no column 'wenn'; .*did you mean 'when'"):
        read(tmp_path, "when,0.1\n1h,2\n", layout="wide", columns={"duration": "wenn"})


def test_nothing_to_read(tmp_path: Path) -> None:
    """A file that is not there, and one whose axes cannot be read at all."""
    with pytest.raises(ReadError, match=r"none\.csv: the file: found nothing of that name"):
        read_point_depths(
            tmp_path / "none.csv", unit="mm", series=ANNUAL_MAXIMUM, probability="aep", source="invented", date="2031"
        )
    with pytest.raises(ReadError, match=r":2: column duration: found 'x'; .*\n.*:2: column aep: found 'y'; ") as caught:
        read(tmp_path, "duration,aep,depth\nx,y,1\n")
    assert len(caught.value.problems) == 2


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"unit": "inch"}, "unit: found 'inch'; expected one of: mm, cm, m, in, 0.1 mm, "),
        ({"unit": "mm/hr"}, "unit: found 'mm/hr'; expected one of: mm/h, cm/h, m/h, in/h, "),
        ({"series": "annual"}, "series: found 'annual'; expected one of: annual-maximum, partial-duration"),
        ({"probability": "percent"}, "probability: found 'percent'; expected one of: aep, aep-percent, return-p"),
        ({"layout": "wid"}, "layout: found 'wid'; expected one of: long, wide; did you mean 'wide'?"),
        ({"duration_unit": "hours"}, "duration_unit: found 'hours'; expected one of: min, h, d"),
        ({"columns": {"dept": "x"}}, "columns: found 'dept'; expected one of: point, duration, probability, depth, "),
        ({"columns": {"depth": "x"}, "layout": "wide"}, "columns: found 'depth'; expected one of: duration"),
        ({"crs": "EPSG:nonsense"}, "crs: found 'EPSG:nonsense'; expected 'local', or a map's system"),
        ({"source": " "}, "source: found nothing; expected the source of the depths"),
        ({"date": ""}, "date: found nothing; expected the date of the depths"),
        ({"series": PARTIAL_DURATION}, "probability: found 'aep' of a partial duration series; expected 'return"),
    ],
)  # fmt: skip
def test_options_that_cannot_be(tmp_path: Path, options: dict[str, Any], message: str) -> None:
    """What the job gives is checked before the file is read, in the job's words."""
    with pytest.raises(JobError, match=re.escape(f"quill.csv: [design.depths] {message}")) as caught:
        read(tmp_path, LONG, **options)
    assert len(caught.value.problems) == 1


def test_a_depth_is_never_taken_for_an_intensity(tmp_path: Path) -> None:
    """The unit that may have been meant is of the same kind as the one given."""
    for unit, meant in (("inch", "in"), ("in/hr", "in/h")):
        with pytest.raises(JobError, match=rf"unit: found '{unit}'; expected .*; did you mean '{meant}'\?$"):
            read(tmp_path, LONG, unit=unit)


def test_all_options_that_cannot_be(tmp_path: Path) -> None:
    """All are said together."""
    with pytest.raises(JobError, match="layout") as caught:
        read(tmp_path, LONG, unit="x", series="x", probability="x", layout="x", duration_unit="x", crs="x", source="")
    assert len(caught.value.problems) == 7
