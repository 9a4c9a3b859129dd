"""The models of a job file: what values become, what they refuse, and what they hand on."""

from __future__ import annotations

from datetime import date, datetime, time
from pathlib import Path
from typing import Any

import pytest
from pydantic import BaseModel, ValidationError

from basinrain import averaging, infill
from basinrain.infill import InfillOptions
from basinrain.jobfile.fields import is_month
from basinrain.jobfile.tables import (
    ArithmeticTable,
    AveragingTable,
    BasinsTable,
    GaugesTable,
    IdwTable,
    InfillTable,
    Job,
    RainfallTable,
    StormTable,
)

RAIN = {"file": "r.csv", "unit": "mm", "interval": "1h"}


def job(**tables: object) -> Job:
    content = {"job": {"name": "x"}, "gauges": {"file": "g.csv"}, "rainfall": RAIN, "basins": {"file": "b.json"}}
    return Job.model_validate({**content, **tables})


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (datetime(2031, 5, 4, 6), "2031-05-04T06:00:00"),
        (date(2031, 5, 4), "2031-05-04"),
        ("2031-05", "2031-05"),
        ("2031-05-04T06:00+02:00", "2031-05-04T06:00+02:00"),
        (None, None),
    ],
)
def test_times_of_toml_become_text(value: object, text: str | None) -> None:
    """A date stays a date and a month a month, since each names all of itself; a time keeps its offset."""
    storm = StormTable.model_validate({"name": "Q", "start": value, "end": value})
    assert (storm.start, storm.end) == (text, text)


@pytest.mark.parametrize("value", ["2031-13", "2031-02-30", "4 May 2031", "06:00", ""])
def test_what_is_no_time_is_refused(value: str) -> None:
    """A month or day that the calendar does not have, words and hours alone are not the time of a storm."""
    with pytest.raises(ValidationError, match="a date and time such as 2031-05-04T06:00"):
        StormTable(name="Q", start=value)


def test_a_month_is_four_and_two_digits() -> None:
    """Nothing before, behind or between."""
    assert is_month("2031-05")
    assert [text for text in ("2031-5", "2031-05-04", "2031", "x2031-05", "203105") if is_month(text)] == []


@pytest.mark.parametrize(
    ("value", "kept"), [(time(7, 0), "07:00"), ("07:00", "07:00"), (7, 7), (time(18, 30), "18:30"), (None, None)]
)
def test_a_reading_hour_of_toml_becomes_text(value: object, kept: object) -> None:
    """A TOML time is brought to hours and minutes; text and whole hours stay for the reader to check."""
    assert RainfallTable.model_validate({**RAIN, "read_hour": value}).read_hour == kept


def test_a_source_has_one_file_or_several() -> None:
    """Either way `paths` lists them; both or neither is refused, and so is a record without its step."""
    assert RainfallTable.model_validate(RAIN).paths == ("r.csv",)
    several = {"files": ["a.csv", "b.csv"], "unit": "mm", "interval": "1h"}
    assert RainfallTable.model_validate(several).paths == ("a.csv", "b.csv")
    for wrong in ({**RAIN, "files": ["a.csv"]}, {"unit": "mm", "interval": "1h"}):
        with pytest.raises(ValidationError, match="either file or files"):
            RainfallTable.model_validate(wrong)
    with pytest.raises(ValidationError, match="interval, such as '1h'"):
        RainfallTable(file="r.csv", unit="mm")
    assert RainfallTable(file="r.csv", unit="mm", layout="totals").interval is None


@pytest.mark.parametrize(
    ("table", "content", "message"),
    [
        (RainfallTable, {**RAIN, "unit": "inch"}, "one of: mm, cm, m, in"),
        (RainfallTable, {**RAIN, "layout": "tall"}, "one of: wide, long, totals"),
        (RainfallTable, {**RAIN, "stamp": "middle"}, "one of: end, start"),
        (GaugesTable, {"file": "g.csv", "colocated": "drop"}, "one of: refuse, mean"),
        (GaugesTable, {"file": "g.csv", "catch_factor": {"A": 0}}, "greater than 0"),
        (GaugesTable, {"file": "g.csv", "length_unit": "mile"}, "one of: m, km, ft, us-ft, mi"),
        (BasinsTable, {"file": "b.json", "repeated": "drop"}, "one of: refuse, merge"),
        (BasinsTable, {"file": "b.json", "area_unit": "sqkm"}, "one of: m2, km2, ha"),
        (InfillTable, {"longest_gap": 0}, "greater than 0"),
        (InfillTable, {"nearest": 0}, "greater than or equal to 1"),
        (InfillTable, {"scale": "week"}, "one of: step, day, storm"),
        (IdwTable, {"cell": float("nan")}, "finite number"),
        (ArithmeticTable, {"gauges": {"buffer": -1}}, "greater than or equal to 0"),
        (AveragingTable, {"methods": []}, "at least 1 item"),
        (AveragingTable, {"method": "idw"}, "Extra inputs are not permitted"),
    ],
)
def test_wrong_values_are_refused(table: type[BaseModel], content: dict[str, Any], message: str) -> None:
    """Every table refuses what it does not know, and says what it accepts."""
    with pytest.raises(ValidationError, match=message):
        table.model_validate(content)


def test_one_name_may_stand_for_a_list() -> None:
    """A method by itself is a list of one; a storm in single brackets too."""
    assert AveragingTable.model_validate({"methods": "idw"}).methods == ("idw",)
    assert job(storm={"name": "Q"}).storm == (StormTable(name="Q"),)


def test_options_are_those_with_which_methods_are_prepared() -> None:
    """Each method gets its own table, without the keys that were left out; one without options gets none."""
    table = AveragingTable.model_validate({"idw": {"cell": 500}, "arithmetic": {"gauges": {"buffer": 1000}}})
    assert table.options("idw") == {"power": 2.0, "cell": 500.0, "allow_uncovered": False}
    assert table.options("arithmetic") == {"gauges": {"buffer": 1000.0}}
    assert table.options("thiessen") == {}


def test_the_defaults_name_registered_methods() -> None:
    """By default every averaging method is run, and the infill table is what infill takes."""
    assert set(AveragingTable().methods) == set(averaging.METHODS)
    assert InfillTable().method in infill.METHODS
    options = InfillOptions(**InfillTable().model_dump(exclude={"normals"}))
    assert (options.method, options.donors_required, options.longest_gap) == ("inverse-distance", 2, 31.0)


def test_a_job_cannot_be_changed() -> None:
    """A job is a value: neither it nor a table of it takes another value, or a key that it does not have."""
    whole = job()
    with pytest.raises(ValidationError, match="Instance is frozen"):
        whole.infill = InfillTable()  # type: ignore[misc]
    with pytest.raises(ValidationError, match="Instance is frozen"):
        whole.infill.power = 3.0  # type: ignore[misc]
    with pytest.raises(ValidationError, match="Extra inputs are not permitted"):
        job(infil={})


def test_paths_start_at_the_jobs_folder() -> None:
    """Relative names are under the folder, absolute ones are themselves; the folder is no part of the record."""
    whole = job(folder=Path("jobs"))
    assert whole.path("g.csv") == Path("jobs/g.csv")
    assert whole.path("/data/g.csv") == Path("/data/g.csv")
    assert whole.inputs == (Path("jobs/g.csv"), Path("jobs/r.csv"), Path("jobs/b.json"))
    assert "folder" not in whole.model_dump()
