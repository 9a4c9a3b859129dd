"""Which keys of a design's tables go together: what lacks and what nothing would hear is told by its name."""

from __future__ import annotations

from typing import Any

import pytest
from design_jobs import design_tables

from basinrain.design_keys import check_depth_keys, check_one_of, check_pattern_keys, check_reduction_keys
from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.patterns import PATTERNS
from basinrain.errors import JobError, Problems
from basinrain.jobfile import parse_design_job
from basinrain.jobfile.design_tables import ORIGINS, ArealReductionTable, DesignDepthsTable, PatternTable

ORIGIN: dict[str, dict[str, Any]] = {
    "table": {"file": "d.csv", "probability": "aep"},
    "rasters": {"raster": [{"file": "a.asc", "duration": "6h", "aep": 0.1}]},
    "equation": {
        "equation": "bernard",
        "coefficients": {"k": 9, "x": 0.2, "n": 0.8},
        "return_periods": [2, 100],
        "valid": ["10min", "1d"],
        "duration_unit": "h",
    },
    "record": {},
}
SOURCE = {"unit": "mm/h", "series": "annual-maximum", "source": "invented", "date": "2031"}
VALUES: dict[str, Any] = {
    **{key: value for keys in ORIGIN.values() for key, value in keys.items()},
    **SOURCE,
    "layout": "wide",
    "columns": {"depth": "d"},
    "crs": "local",
    "convert": True,
    "extrapolate": True,
    "average": "idw",
    "interval_factor": "weiss",
    "durations": ["1h"],
    "gauges": ["A"],
    "wet_season": [6],
    "distribution": "gev",
    "beyond_record": True,
}
"""A value for every key of [design.depths], none the default."""

TAKEN = {
    "table": {"layout", "duration_unit", "columns", "crs", "convert", "extrapolate", "interval_factor", "average"},
    "rasters": {"crs", "convert", "extrapolate", "interval_factor"},
    "equation": {"convert", "extrapolate", "interval_factor"},
    "record": {"durations", "gauges", "wet_season", "distribution", "beyond_record", "extrapolate", "interval_factor"}
    | {"average"},
}
"""The keys of [design.depths] that go with an origin besides those that it needs."""


def depths_table(origin: str, **keys: Any) -> DesignDepthsTable:  # noqa: ANN401 - values of a job
    needed = {} if origin == "record" else SOURCE
    tables = design_tables(design__depths={"from": origin, **needed, **ORIGIN[origin], **keys})
    gauged = {"gauges": {"file": "g.csv"}, "rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h"}}
    job = parse_design_job({**tables, **gauged})
    assert job.design is not None
    return job.design.depths


def told(problems: Problems) -> list[str]:
    if not len(problems):
        return []
    with pytest.raises(JobError, match="found") as caught:
        problems.raise_as(JobError)
    return str(caught.value).splitlines()


def of_depths(table: DesignDepthsTable) -> list[str]:
    problems = Problems()
    check_depth_keys(table, problems)
    return told(problems)


def of_reduction(**keys: Any) -> list[str]:  # noqa: ANN401 - values of a job
    problems = Problems()
    check_reduction_keys(ArealReductionTable.model_validate(keys), problems)
    return told(problems)


def of_pattern(**keys: Any) -> list[str]:  # noqa: ANN401 - values of a job
    problems = Problems()
    check_pattern_keys("[[design.pattern]] no. 1", PatternTable.model_validate(keys), problems)
    return told(problems)


@pytest.mark.parametrize("origin", ORIGINS)
def test_what_an_origin_needs_is_enough(origin: str) -> None:
    """The keys that an origin needs make a table without fault."""
    assert of_depths(depths_table(origin)) == []


@pytest.mark.parametrize("origin", ["table", "rasters", "equation"])
def test_every_key_that_an_origin_needs_is_missed(origin: str) -> None:
    """Without the source of the depths, their date, series, unit or any other needed key the job is refused."""
    for key in (*SOURCE, *ORIGIN[origin]):
        full = {**SOURCE, **ORIGIN[origin]}
        del full[key]
        tables = design_tables(design__depths={"from": origin, **full})
        (line,) = of_depths(parse_design_job(tables).design.depths)  # type: ignore[union-attr]
        assert line.startswith(f"[design.depths] {key}: found nothing; expected ")
        assert line.endswith("; state it")


def test_blanks_are_no_source() -> None:
    """A source or a date of blanks alone is not stated."""
    assert [line.partition(":")[0] for line in of_depths(depths_table("table", source=" ", date="  "))] == [
        "[design.depths] source",
        "[design.depths] date",
    ]


@pytest.mark.parametrize("origin", ORIGINS)
def test_a_key_goes_with_its_own_origins_alone(origin: str) -> None:
    """Every key of the table is either heard or refused, whatever the depths come from."""
    needed = set() if origin == "record" else {*SOURCE, *ORIGIN[origin]}
    every = set(DesignDepthsTable.model_fields) - {"origin", "observed_every"}
    assert every == set(VALUES)
    for key in every:
        more = {"observed_every": "1h"} if key == "interval_factor" and origin != "record" else {}
        more |= {"series": "partial-duration"} if key == "convert" and origin != "record" else {}
        lines = of_depths(depths_table(origin, **{key: VALUES[key]}, **more))
        if key in needed | TAKEN[origin]:
            assert lines == []
        else:
            (line,) = lines
            assert line.startswith(
                f"[design.depths] {key}: found it beside from = '{origin}'; expected what goes with "
            )
            assert line.endswith("; remove it")


def test_annual_maxima_need_no_conversion() -> None:
    """A conversion would do nothing there, so that it is refused."""
    (line,) = of_depths(depths_table("table", convert=True))
    assert line == (
        "[design.depths] convert: found it beside series = 'annual-maximum'; expected it with depths of a "
        "partial-duration series, which it brings to probabilities; remove it"
    )


def test_an_interval_factor_needs_the_interval() -> None:
    """observed_every goes with interval_factor, and a record states its own step."""
    assert of_depths(depths_table("table", interval_factor="weiss")) == [
        (
            "[design.depths] observed_every: found nothing; expected the fixed interval at which the depths were "
            "read, which "
            "interval_factor needs; state it, or take interval_factor out"
        ),
    ]
    for table in (depths_table("table", observed_every="1h"), depths_table("record", observed_every="1h")):
        (line,) = of_depths(table)
        assert line.startswith("[design.depths] observed_every: found it beside from = ")
    (line,) = of_depths(depths_table("record", observed_every="1h", interval_factor="weiss"))
    assert line.startswith("[design.depths] observed_every: found it beside from = 'record'")


def test_the_range_of_an_equation_is_in_order() -> None:
    """The shorter duration stands first."""
    assert of_depths(depths_table("equation", valid=["1d", "24h"])) == [
        "[design.depths] valid: found 24h to 24h; expected the shorter duration first"
    ]


REDUCTION: dict[str, Any] = {
    "region": "x",
    "coefficients": {"c1": 1.0},
    "source": "invented",
    "file": "f.csv",
    "area_unit": "km2",
    "valid": ["1h", "6h"],
    "valid_areas": [1, 2],
    "area": "own",
    "outside": "clamp",
    "compare": ["keers-wescott"],
}
"""A value for every key of [design.areal_reduction] but its method, none the default."""

NEEDED = {
    "arr-2019": ("region",),
    "exponential": ("coefficients", "source"),
    "table": ("file", "source", "area_unit"),
}


@pytest.mark.parametrize("method", [*REDUCTIONS, "none"])
def test_a_key_of_a_reduction_goes_with_its_own_methods_alone(method: str) -> None:
    """Every key of the table is either heard or refused, whatever the method."""
    assert {"method", *REDUCTION} == set(ArealReductionTable.model_fields)
    needed = {key: REDUCTION[key] for key in NEEDED.get(method, ())}
    assert of_reduction(method=method, **needed) == []
    heard = {"compare", *needed, *(() if method == "none" else ("area", "outside"))}
    if method == "exponential":
        heard |= {"valid"}
        assert of_reduction(method=method, **needed, valid_areas=[1, 2], area_unit="km2") == []
    for key in REDUCTION.keys() - (set() if method != "exponential" else {"valid_areas", "area_unit"}):
        lines = of_reduction(method=method, **{**needed, key: REDUCTION[key]})
        if key in heard:
            assert lines == []
        else:
            (line,) = lines
            assert line.startswith(
                f"[design.areal_reduction] {key}: found it beside method = '{method}'; expected method, "
            )
    for key in needed:
        (line,) = of_reduction(method=method, **{other: value for other, value in needed.items() if other != key})
        assert line == (
            f"[design.areal_reduction] {key}: found nothing; expected it, which method = '{method}' needs; state it"
        )


def test_areas_of_validity_have_their_unit() -> None:
    """An area without a unit is refused, and so is a unit without areas."""
    own = {"method": "exponential", "coefficients": {"c1": 1.0}, "source": "invented"}
    assert of_reduction(**own, valid_areas=[1, 2]) == [
        (
            "[design.areal_reduction] area_unit: found nothing beside valid_areas; expected the unit of "
            "valid_areas; give both, "
            "or neither"
        ),
    ]
    assert of_reduction(**own, area_unit="km2") == [
        (
            "[design.areal_reduction] valid_areas: found nothing beside area_unit; expected the least and the "
            "greatest area; "
            "give both, or neither"
        ),
    ]


PATTERN: dict[str, Any] = {
    "peak": 0.3,
    "basis": "area",
    "smooth": True,
    "file": "p.csv",
    "percent": True,
    "columns": {"time": "t"},
    "storm": "May",
}
"""A value for every key of [[design.pattern]] that goes with some shapes alone."""


@pytest.mark.parametrize("shape", PATTERNS)
def test_a_key_of_a_pattern_goes_with_its_own_shapes_alone(shape: str) -> None:
    """Every key of the table is either heard or refused, whatever the shape."""
    assert {"name", "shape", "durations", *PATTERN} == set(PatternTable.model_fields)
    files = {"table": ("file", "percent", "columns"), "observed": ("storm",)}.get(shape, ())
    needed = {key: PATTERN[key] for key in files[:1]}
    assert of_pattern(shape=shape, name="own", durations=["6h"], **needed) == []
    for key, value in PATTERN.items():
        lines = of_pattern(shape=shape, **{**needed, key: value})
        if key in files or key in PATTERNS[shape].options:
            assert lines == []
        else:
            (line,) = lines
            assert line.startswith(f"[[design.pattern]] no. 1 {key}: found it beside shape = '{shape}'; expected ")


def test_a_table_needs_its_file_and_a_storm_its_name() -> None:
    """An empty name is none."""
    for keys in ({}, {"file": ""}):
        assert of_pattern(shape="table", **keys) == [
            "[[design.pattern]] no. 1 file: found nothing; expected the file of the pattern; name it"
        ]
    assert of_pattern(shape="observed") == [
        "[[design.pattern]] no. 1 storm: found nothing; expected the name of a [[storm]] of the job; name it"
    ]


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ((True, True), "both of a and b; expected one of them; take one of the two out"),
        ((True, False), ""),
        ((False, True), ""),
        ((False, False), "neither of a and b; expected one of them; give one of the two"),
    ],
)
def test_one_of_two_keys(given: tuple[bool, bool], words: str) -> None:
    """Both and neither are refused."""
    problems = Problems()
    check_one_of("here", ("a", "b"), given, problems)
    assert told(problems) == ([f"here: found {words}"] if words else [])
