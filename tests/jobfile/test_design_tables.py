"""The tables of a job about design storms: what their keys take, and where a wrong one stands."""

from __future__ import annotations

from datetime import date, datetime, time
from pathlib import Path
from typing import Any

import pytest
from design_jobs import design_tables, write_design_job

from basinrain.errors import JobError, SettingError
from basinrain.jobfile import DesignJob, Job, parse_design_job, parse_job, read_design_job
from basinrain.jobfile.design_tables import DesignTable, minutes_of

INF, NAN = float("inf"), float("nan")
LENGTH = "expected a number with min, h or d, 31d at most: 10min, 6h, 1d"
NUMBERS = "expected a number, or a list of numbers"


def design_of(**changes: Any) -> DesignTable:  # noqa: ANN401 - values of a job
    job = parse_design_job(design_tables(**changes))
    assert job.design is not None
    return job.design


def refusal(settings: tuple[str, ...] = (), **changes: Any) -> str:  # noqa: ANN401 - values of a job
    with pytest.raises(JobError, match="found") as caught:
        parse_design_job(design_tables(**changes), settings=settings)
    return str(caught.value)


def test_a_job_without_gauges_is_one_of_design_storms() -> None:
    """Without tables about gauges there is a DesignJob; with one there is a whole Job, which then lacks the others."""
    assert isinstance(parse_design_job(design_tables()), DesignJob)
    gauged: dict[str, Any] = {
        "gauges": {"file": "g.csv"},
        "rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h"},
    }
    job = parse_design_job(design_tables(**gauged))
    assert isinstance(job, Job)
    assert job.input_names == ("g.csv", "r.csv", "basins.geojson", "depths.csv")
    assert refusal(storm=[{"name": "May"}]) == (
        "[gauges]: found no such table; expected it to be given; add it\n"
        "[[rainfall]]: found no such table; expected it to be given; add it"
    )


def test_a_job_with_gauges_may_have_no_design() -> None:
    """The table [design] is optional in a whole job and needed in one without gauges."""
    gauged: dict[str, Any] = {
        "gauges": {"file": "g.csv"},
        "rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h"},
    }
    assert parse_job(design_tables(design=None, **gauged)).design is None
    assert refusal(design=None) == "[design]: found no such table; expected it to be given; add it"


def test_defaults_are_resolved() -> None:
    """What a job does not say has the default of the documentation."""
    design = design_of(design__jurisdiction=None)
    assert (design.sub_basins, design.formats, design.start, design.jurisdiction) == ("same-depth", ("csv",), None, "")
    assert (design.uplift, design.areal_reduction, design.rarity, design.point) == (None, None, None, ())
    depths = design.depths
    assert (depths.layout, depths.average, depths.convert, depths.extrapolate) == ("long", "thiessen", False, False)
    reduction = design_of(design__areal_reduction={"method": "none"}).areal_reduction
    assert reduction is not None
    assert (reduction.area, reduction.outside, reduction.compare) == ("to-point", "refuse", ())


def test_one_value_may_stand_without_a_list() -> None:
    """One probability, duration, basin, table of a point, pattern, raster or set of coefficients needs no brackets."""
    design = design_of(
        design__aep=0.1,
        design__return_periods=None,
        design__durations="6h",
        design__point={"name": "mouth", "basins": "nw"},
        design__pattern={"shape": "uniform", "durations": "6h"},
        design__depths__raster={"file": "a.asc", "duration": "6h", "aep": 0.1},
        design__depths__coefficients={"k": 900},
        design__depths__return_periods=10,
    )
    assert (design.aep, design.durations, design.point[0].basins) == ((0.1,), ("6h",), ("nw",))
    assert (design.pattern[0].durations, len(design.depths.raster)) == (("6h",), 1)
    assert (design.depths.coefficients, design.depths.return_periods) == (({"k": 900.0},), (10.0,))


def test_durations_have_one_word_each() -> None:
    """360min, 6h and 1d, 24h are the same: hours up to three days, as results have them."""
    design = design_of(design__durations=["360min", "1d"], design__step="60min")
    assert (design.durations, design.step) == (("6h", "24h"), "1h")
    assert [minutes_of(word) for word in design.durations] == [360, 1440]


def test_dates_may_be_dates() -> None:
    """A date of TOML or a year stands for its text, in the source's date, the horizon and the start."""
    uplift = {"factor": 1.1, "source": "note", "horizon": 2070}
    design = design_of(design__depths__date=date(2031, 5, 4), design__uplift=uplift, design__start=date(2032, 1, 1))
    assert design.uplift is not None
    assert (design.depths.date, design.uplift.horizon, design.start) == ("2031-05-04", "2070", "2032-01-01")
    assert design_of(design__start=datetime(2032, 1, 1, 6)).start == "2032-01-01T06:00:00"


def test_a_pattern_is_called_by_its_name_or_its_shape() -> None:
    """The label of a pattern is what results call it."""
    design = design_of(design__pattern=[{"shape": "uniform"}, {"shape": "triangular", "name": " late "}])
    assert [pattern.label for pattern in design.pattern] == ["uniform", "late"]


def test_input_files_are_listed_once_a_name_in_the_job() -> None:
    """Depths, rasters, the table of factors and those of patterns are inputs, in this order."""
    design = design_of(
        design__depths__raster=[{"file": "a.asc", "duration": "6h", "aep": 0.1}],
        design__areal_reduction={"method": "table", "file": "factors.csv"},
        design__pattern=[{"shape": "table", "file": "curve.csv"}],
    )
    assert design.input_names == ("depths.csv", "a.asc", "factors.csv", "curve.csv")


@pytest.mark.parametrize(
    ("key", "value", "message"),
    [
        ("aep", [], "[design] aep: found an empty list; expected at least one; name one"),
        ("aep", "10%", f"[design] aep: found '10%'; {NUMBERS}; correct the value"),
        ("aep", True, f"[design] aep: found True; {NUMBERS}; correct the value"),
        ("aep", [0.1, True], "[design] aep no. 2: found True; expected a number; correct the value"),
        ("aep", NAN, "[design] aep no. 1: found nan; expected a finite number; correct the value"),
        ("return_periods", [10, INF], "[design] return_periods no. 2: found inf; expected a finite number; "),
        ("return_periods", [10, 10.0], "[design] return_periods: found [10, 10.0]; expected each of them once"),
        ("durations", [], "[design] durations: found an empty list; expected at least one; name one"),
        ("durations", ["6h", "1mo"], f"[design] durations no. 2: found '1mo'; {LENGTH}; correct the value"),
        ("durations", "60d", f"[design] durations no. 1: found '60d'; {LENGTH}"),
        ("durations", 6, f"[design] durations: found 6; {LENGTH}"),
        ("durations", [6], f"[design] durations no. 1: found 6; {LENGTH}"),
        ("durations", date(2031, 1, 1), f"[design] durations: found datetime.date(2031, 1, 1); {LENGTH}"),
        ("durations", ["6h", "360min"], "[design] durations: found ['6h', '360min']; expected each of them once"),
        ("step", 10, f"[design] step: found 10; {LENGTH}"),
        ("step", "0min", f"[design] step: found '0min'; {LENGTH}"),
        ("step", None, "[design] step: found no such key; expected it to be given; add it"),
        ("start", time(6), "[design] start: found datetime.time(6, 0); expected text in quotes"),
        ("formats", ["xlsx"], "[design] formats no. 1: found 'xlsx'; expected one of: csv, csv-per-basin, "),
        ("sub_basins", "own", "[design] sub_basins: found 'own'; expected one of: same-depth, own-depth"),
        ("depths", None, "[design.depths]: found no such table; expected it to be given; add it"),
        ("depths", "table", "[design.depths]: found 'table'; expected a table; correct the value"),
        ("depths__from", None, "[design.depths] from: found no such key; expected it to be given; add it"),
        ("depths__from", "tabel", "[design.depths] from: found 'tabel'; expected one of: table, rasters, "),
        ("depths__origin", "table", "[design.depths] origin: found a key that is not known; expected one of: from, "),
        ("depths__sorce", "x", "did you mean 'source'?"),
        ("depths__unit", "mm/hour", "[design.depths] unit: found 'mm/hour'; expected one of: mm, cm, m, in, "),
        ("depths__unit", "mm/hour", "mm/h, cm/h, m/h, in/h, "),
        ("depths__date", True, "[design.depths] date: found True; expected text in quotes"),
        ("depths__average", "kriging", "[design.depths] average: found 'kriging'; expected one of: arithmetic, "),
        ("depths__valid", "1h", "[design.depths] valid: found '1h'; expected a list in square brackets"),
        ("depths__valid", ["1h"], "[design.depths] valid: found ['1h']; expected a list of at least 2; add what"),
        (
            "depths__valid",
            ["1h", "2h", "1d"],
            "[design.depths] valid: found ['1h', '2h', '1d']; expected a list of 2; ",
        ),
        ("depths__coefficients", {"k": INF}, "[design.depths] coefficients no. 1.k: found inf; expected a finite"),
        ("depths__coefficients", {"k": "9"}, "[design.depths] coefficients no. 1.k: found '9'; expected a number"),
        ("depths__wet_season", [6, 13], "[design.depths] wet_season no. 2: found 13; expected a number of at most 12"),
        ("depths__wet_season", [6, 6], "[design.depths] wet_season: found [6, 6]; expected each of them once"),
        ("depths__gauges", ["A", "A"], "[design.depths] gauges: found ['A', 'A']; expected each of them once"),
        ("depths__columns", {"depth": 3}, "[design.depths] columns.depth: found 3; expected text in quotes"),
        (
            "depths__raster",
            "a.asc",
            "[[design.depths.raster]]: found 'a.asc'; expected a table [[design.depths.raster]]",
        ),
        ("depths__raster", [{"file": "a"}], "[[design.depths.raster]] no. 1 duration: found no such key; "),
        ("uplift", {"factor": 1.1}, "[design.uplift] source: found no such key; expected it to be given; add it\n"),
        ("uplift", {"factor": 1.1}, "[design.uplift] horizon: found no such key; expected it to be given; add it"),
        (
            "uplift",
            {"factor": 0, "source": " ", "horizon": ""},
            (
                "[design.uplift] factor: found 0; expected a factor from 0.5 to 5: 1.1 for 10 % more; correct the "
                "value\n[design.uplift] source: found ' '; expected it to be stated; correct the value\n"
                "[design.uplift] horizon: found ''; expected it to be stated; correct the value"
            ),
        ),
        (
            "uplift",
            {"factor": True, "source": "x", "horizon": "y"},
            "[design.uplift] factor: found True; expected a number; correct the value",
        ),
        ("areal_reduction", {}, "[design.areal_reduction] method: found no such key"),
        ("areal_reduction", {"method": "leclerc"}, "did you mean 'leclerc-schaake'?"),
        (
            "areal_reduction",
            {"method": "exponential", "valid_areas": [-5, 10]},
            "[design.areal_reduction] valid_areas no. 1: found -5; expected a number of at least 0",
        ),
        (
            "areal_reduction",
            {"method": "none", "compare": ["keers-wescott"] * 2},
            "[design.areal_reduction] compare: found ['keers-wescott', 'keers-wescott']; expected each of them once",
        ),
        ("point", ["nw"], "[[design.point]] no. 1: found 'nw'; expected a table; correct the value"),
        ("point", "nw", "[[design.point]]: found 'nw'; expected a table [[design.point]]; write it so"),
        (
            "point",
            [{"name": " ", "basins": ["nw"]}],
            "[[design.point]] no. 1 name: found ' '; expected it to be stated",
        ),
        ("point", [{"name": "a", "basins": []}], "[[design.point]] no. 1 basins: found an empty list"),
        ("point", [{"name": "a", "basins": ["nw", "nw"]}], "[[design.point]] no. 1 basins: found ['nw', 'nw']; "),
        ("pattern", [], "[[design.pattern]]: found no table; expected at least one; add it"),
        ("pattern", None, "[[design.pattern]]: found no such table; expected it to be given; add it"),
        ("pattern", [{"shape": "uniforn"}], "did you mean 'uniform'?"),
        ("pattern", [{"name": "a"}], "[[design.pattern]] no. 1 shape: found no such key"),
        (
            "pattern",
            [{"shape": "uniform", "name": ""}],
            "[[design.pattern]] no. 1 name: found ''; expected it to be stated",
        ),
        (
            "pattern",
            [{"shape": "uniform", "peak": NAN}],
            "[[design.pattern]] no. 1 peak: found nan; expected a finite number",
        ),
        ("rarity", {"storms": ["a", "a"]}, "[design.rarity] storms: found ['a', 'a']; expected each of them once"),
        ("depth", {}, "[design] depth: found a key that is not known; expected one of: aep, return_periods, "),
    ],
)
def test_a_wrong_value_says_what_is_accepted(key: str, value: Any, message: str) -> None:  # noqa: ANN401 - values of a job
    """Each kind of wrong value is named by its heading and key, with what was found and what is accepted."""
    assert message in refusal(**{f"design__{key}": value})


@pytest.mark.parametrize("factor", [10, 0.1, -1, 5.01, 0.49])
def test_an_uplift_is_no_percentage(factor: float) -> None:
    """10 and 0.1, written for ten percent, are refused; 0.5 and 5 pass."""
    uplift = {"factor": factor, "source": "note", "horizon": 2070}
    assert refusal(design__uplift=uplift) == (
        f"[design.uplift] factor: found {factor}; expected a factor from 0.5 to 5: 1.1 for 10 % more; correct the value"
    )
    for passes in (0.5, 5):
        found = design_of(design__uplift={**uplift, "factor": passes}).uplift
        assert found is not None
        assert found.factor == passes


LINES = """[job]
name = "Lines"
[basins]
file = "basins.geojson"
[design]
aep = [0.1]
durations = ["6h"]
step = "fast"
[design.depths]
from = "table"
extrapolat = true
[[design.depths.raster]]
file = "a.asc"
duration = "6h"
[[design.depths.raster]]
file = "b.asc"
duration = "six"
[design.uplift]
factor = 0
source = "note"
[design.areal_reduction]
method = "none"
regio = "x"
[[design.point]]
name = "ford"
basins = ["nw"]
[[design.point]]
name = "mouth"
[[design.pattern]]
shape = "uniform"
[[design.pattern]]
name = "second"
shape = "triangle"
"""


def test_every_problem_stands_on_its_line(tmp_path: Path) -> None:
    """Headings within headings, and those that repeat, lead to the line of their own key, or of the heading."""
    path = tmp_path / "job.toml"
    path.write_text(LINES)
    with pytest.raises(JobError, match="found") as caught:
        read_design_job(path)
    places = [str(problem).removeprefix(f"{path}:").partition("; ")[0] for problem in caught.value.problems]
    assert sorted(places, key=lambda place: int(place.partition(":")[0])) == [
        "8: [design] step: found 'fast'",
        "11: [design.depths] extrapolat: found a key that is not known",
        "17: [[design.depths.raster]] no. 2 duration: found 'six'",
        "18: [design.uplift] horizon: found no such key",
        "19: [design.uplift] factor: found 0",
        "23: [design.areal_reduction] regio: found a key that is not known",
        "27: [[design.point]] no. 2 basins: found no such key",
        "33: [[design.pattern]] no. 2 shape: found 'triangle'",
    ]


def test_tables_written_as_keys_have_lines_too(tmp_path: Path) -> None:
    """A table in braces, or a list of them, is found on the line of its key."""
    path = tmp_path / "job.toml"
    path.write_text(
        '[job]\nname = "a"\n[basins]\nfile = "b"\n[design]\naep = 0.1\ndurations = "6h"\nstep = "1h"\n'
        'depths = { from = "tables", raster = [{ file = "a" }] }\npattern = [{ shape = "uniform", peek = 1 }]\n'
        'point = "nw"\n'
    )
    with pytest.raises(JobError, match="found") as caught:
        read_design_job(path)
    assert [(problem.line, problem.item) for problem in caught.value.problems] == [
        (9, "[design.depths] from"),
        (9, "[[design.depths.raster]] no. 1 duration"),
        (11, "[[design.point]]"),
        (10, "[[design.pattern]] no. 1 peek"),
    ]


def test_settings_speak_the_words_of_the_job() -> None:
    """--set reaches tables within tables, and those that repeat by their number."""
    tables = design_tables(
        design__return_periods=None, design__pattern=[{"shape": "uniform"}, {"shape": "alternating-block"}]
    )
    words = ["design.aep=0.1", "design.pattern.2.peak=late", "design.depths.unit=in", "design.point.name=mouth"]
    design = parse_design_job(
        tables, settings=[*words, "design.point.basins=nw", "design.durations=['6h', '12h']"]
    ).design
    assert design is not None
    assert (design.aep, design.pattern[1].peak, design.pattern[0].peak) == ((0.1,), "late", None)
    assert (design.depths.unit, design.point[0].name, design.durations) == ("in", "mouth", ("6h", "12h"))


@pytest.mark.parametrize(
    ("setting", "message"),
    [
        ("design.pattern.peak=late", r"found 2 such tables; .*; write design\.pattern\.1\.peak=\.\.\."),
        ("design.pattern.3.peak=late", "found '3'; expected the number of a table that the job has, 1 to 2"),
        ("design.pattern.0.peak=late", "found '0'; expected the number of a table that the job has, 1 to 2"),
        ("design.step.of=1h", "found 'of' inside a plain value of step; expected a table there"),
    ],
)
def test_a_setting_that_cannot_be_placed_is_refused(setting: str, message: str) -> None:
    """A --set for one of several tables needs its number, and the advice can be followed."""
    tables = design_tables(design__pattern=[{"shape": "uniform"}, {"shape": "alternating-block"}])
    with pytest.raises(SettingError, match=message):
        parse_design_job(tables, settings=[setting])


def test_a_wrong_setting_has_no_line_of_the_file(tmp_path: Path) -> None:
    """What --set brought in does not stand in the file; what the file has does."""
    path = write_design_job(tmp_path, design__step="fast")
    with pytest.raises(JobError, match="found") as caught:
        read_design_job(path, ["design.depths.unit=inch"])
    assert [(problem.item, problem.file, problem.line) for problem in caught.value.problems] == [
        ("[design] step", str(path), 13),
        ("[design.depths] unit", "", None),
    ]
