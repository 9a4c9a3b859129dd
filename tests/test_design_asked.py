"""What a job asks of its design storms: what cannot be is told with everything else, before any file is read."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from design_jobs import US_REDUCTION, design_tables

from basinrain.design_asked import Asked, asked
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.errors import JobError
from basinrain.jobfile import parse_design_job, parse_job

GAUGED: dict[str, Any] = {"gauges": {"file": "g.csv"}, "rainfall": {"file": "r.csv", "unit": "mm", "interval": "1h"}}
UNIFORM: dict[str, Any] = {"shape": "uniform"}
ANNUAL = "years of an annual maximum series; expected more than 1; shorter ones are of a partial duration series"
EQUATION: dict[str, Any] = {
    "from": "equation",
    "equation": "sherman",
    "coefficients": {"k": 900, "x": 0.2, "b": 10, "n": 0.8},
    "return_periods": [2, 100],
    "valid": ["10min", "24h"],
    "unit": "mm/h",
    "duration_unit": "min",
    "series": ANNUAL_MAXIMUM,
    "source": "invented equation",
    "date": "2031",
}
RASTERS: dict[str, Any] = {
    "from": "rasters",
    "unit": "mm",
    "series": ANNUAL_MAXIMUM,
    "source": "invented rasters",
    "date": "2031",
    "raster": [{"file": "a.asc", "duration": "6h", "aep": 0.1}],
}


def asked_of(**changes: Any) -> Asked:  # noqa: ANN401 - values of a job
    return asked(parse_design_job(design_tables(**changes)))


def refusal(**changes: Any) -> list[str]:  # noqa: ANN401 - values of a job
    with pytest.raises(JobError, match="found") as caught:
        asked_of(**changes)
    return str(caught.value).splitlines()


def test_frequencies_and_durations_are_in_order() -> None:
    """The most frequent and the shortest come first, whatever the order in the job."""
    found = asked_of(
        design__return_periods=None,
        design__aep=[0.01, 0.5, 0.1],
        design__durations=["24h", "90min"],
        design__step="30min",
    )
    assert [frequency.return_period for frequency in found.frequencies] == [2.0, 10.0, 100.0]
    assert (found.minutes, found.step, found.start) == ((90, 1440), 30, None)


@pytest.mark.parametrize(
    ("start", "expected"),
    [
        ("2031-05-04", "2031-05-04T00:00:00"),
        ("2031-05-04T06:30", "2031-05-04T06:30:00"),
        ("2031-05-04T06:30:15", "2031-05-04T06:30:15"),
    ],
)
def test_a_start_is_a_date_or_a_time(start: str, expected: str) -> None:
    """A bare date is the midnight with which it begins."""
    assert asked_of(design__start=start).start == np.datetime64(expected)


@pytest.mark.parametrize("start", ["2031-05", "2031-05-04T06:00+02:00", "2031-05-04T06:00Z"])
def test_a_start_is_no_month_and_has_no_offset(start: str) -> None:
    """A nominal start stands on no clock of a place."""
    assert refusal(design__start=start)[0].startswith(
        f"[design] start: found '{start}'; expected a date, or a date and "
    )


@pytest.mark.parametrize(
    ("aep", "message"),
    [
        (0, "found 0; expected a fraction between 0 and 1; correct it"),
        (1, "found 1; expected a fraction between 0 and 1; correct it"),
        (-0.1, "found -0.1; expected a fraction between 0 and 1; correct it"),
        (10, "found 10; expected a fraction between 0 and 1; write 0.1 for 10 %"),
        (150, "found 150; expected a fraction between 0 and 1; correct it"),
    ],
)
def test_a_probability_is_a_fraction(aep: float, message: str) -> None:
    """0, 1, negative numbers and percent are refused by the key's name."""
    assert refusal(design__aep=aep, design__return_periods=None) == [f"[design] aep: {message}"]


@pytest.mark.parametrize("years", [1, 0.5, 0, -2])
def test_annual_maxima_have_return_periods_above_one_year(years: float) -> None:
    """A return period of a year or less is of no annual maximum series."""
    assert refusal(design__return_periods=[10, years]) == [f"[design] return_periods: found {years:g} {ANNUAL}"]


def test_a_partial_duration_series_has_any_return_period_above_zero() -> None:
    """Half a year is an everyday question; T of 0.5, 2 and 10 have AEP 0.8647, 0.3935 and 0.0952 (Langbein 1949)."""
    found = asked_of(design__depths__series=PARTIAL_DURATION, design__return_periods=[0.5, 2, 10])
    assert [round(frequency.aep, 4) for frequency in found.frequencies] == [0.8647, 0.3935, 0.0952]
    assert refusal(design__depths__series=PARTIAL_DURATION, design__return_periods=0) == [
        "[design] return_periods: found 0 years of a partial duration series; expected more than 0; correct it"
    ]


def test_probabilities_of_a_partial_duration_series_need_leave() -> None:
    """Aep beside such a series is refused unless convert allows it, which brings its return periods to AEP too."""
    changes: dict[str, Any] = {
        "design__depths__series": PARTIAL_DURATION,
        "design__aep": [0.3934693],
        "design__return_periods": None,
    }
    message = (
        "[design] aep: found annual exceedance probabilities beside depths of a partial duration series; expected "
        "return_periods, which such a series has; write return_periods, or allow AEP = 1 - exp(-1/T) with "
        "[design.depths] convert = true"
    )
    assert refusal(**changes) == [message]
    (as_asked,) = asked_of(**changes, design__depths__convert=True).frequencies
    assert (as_asked.series, as_asked.written_aep) == (ANNUAL_MAXIMUM, 0.3934693)
    changes |= {"design__aep": None, "design__return_periods": [2.0]}
    (converted,) = asked_of(**changes, design__depths__convert=True).frequencies
    # 1 - exp(-1/2) = 0.3934693
    assert (converted.series, round(converted.aep, 7)) == (ANNUAL_MAXIMUM, 0.3934693)


def test_one_of_aep_and_return_periods_is_given() -> None:
    """Both, as when --set brings the other one in, and neither are told apart."""
    tables = design_tables()
    with pytest.raises(
        JobError, match=r"^\[design\]: found both of aep and return_periods; .*take one of the two out$"
    ):
        asked(parse_design_job(tables, settings=["design.aep=0.1"]))
    assert refusal(design__return_periods=None) == [
        "[design]: found neither of aep and return_periods; expected one of them; give one of the two"
    ]


def test_durations_are_whole_numbers_of_steps() -> None:
    """A step that does not divide a duration, and one that is longer, are named with it."""
    assert refusal(design__durations=["6h", "1h", "24h"], design__step="4h") == [
        (
            "[design] durations: found 1h beside a step of 4h; expected a duration of one step at least; choose "
            "a shorter step"
        ),
        (
            "[design] durations: found 6h beside a step of 4h; expected a whole number of steps; choose a step "
            "that divides it"
        ),
    ]
    assert asked_of(design__durations="1h", design__step="60min").minutes == (60,)


def test_frequencies_of_rasters_are_named_by_their_number() -> None:
    """A probability or a return period of one raster that cannot be is told with its number."""
    rasters = [
        {"file": "a.asc", "duration": "6h", "aep": 10},
        {"file": "b.asc", "duration": "6h", "return_period": 1},
        {"file": "c.asc", "duration": "6h"},
        {"file": "d.asc", "duration": "6h", "aep": 0.1, "return_period": 10},
    ]
    assert refusal(design__depths={**RASTERS, "raster": rasters}) == [
        (
            "[[design.depths.raster]] no. 3: found neither of aep and return_period; expected one of them; give "
            "one of the two"
        ),
        (
            "[[design.depths.raster]] no. 4: found both of aep and return_period; expected one of them; take one "
            "of the two out"
        ),
        "[[design.depths.raster]] no. 1 aep: found 10; expected a fraction between 0 and 1; write 0.1 for 10 %",
        f"[[design.depths.raster]] no. 2 return_period: found 1 {ANNUAL}",
    ]


def test_return_periods_of_an_equation_rise() -> None:
    """Those that cannot be, and those out of order, are named by their key."""
    item = "[design.depths] return_periods"
    assert refusal(design__depths={**EQUATION, "return_periods": [100, 1]}) == [
        f"{item}: found 1 {ANNUAL}",
        f"{item}: found 1 years after 100; expected each once, rising",
    ]
    assert asked_of(design__depths=EQUATION).frequencies == (Frequency(10.0, ANNUAL_MAXIMUM),)


def test_an_areal_reduction_is_of_the_region_of_the_design() -> None:
    """Without a jurisdiction, with a blank one, or with that of another region, the method is refused."""
    stated = (
        "[design] jurisdiction: found none beside [design.areal_reduction] method = 'leclerc-schaake'; expected the"
    )
    for blank in (None, " "):
        (line,) = refusal(design__jurisdiction=blank, design__areal_reduction=US_REDUCTION)
        assert line.startswith(stated)
    (line,) = refusal(design__jurisdiction="Australia", design__areal_reduction=US_REDUCTION)
    assert line.startswith(
        "[design] jurisdiction: found 'Australia' beside [design.areal_reduction] method = 'leclerc-"
    )
    assert "for Australia: arr-2019, exponential, table" in line
    assert asked_of(design__jurisdiction="usa", design__areal_reduction=US_REDUCTION).step == 60


def test_values_of_a_reduction_are_checked_before_any_file_is_read() -> None:
    """An unknown region, coefficients that lack, that are too many or cannot be, and ranges the wrong way round."""
    arr = {"method": "arr-2019", "region": "Mars"}
    (line,) = refusal(design__jurisdiction="Australia", design__areal_reduction=arr)
    assert line.startswith("[design.areal_reduction] region: found 'Mars'; expected one of: East Coast North, ")
    own = {"method": "exponential", "source": "invented", "coefficients": {"c1": 0.01, "c2": 0.2, "c3": 0.2}}
    item = "[design.areal_reduction]"
    cases: list[tuple[dict[str, Any], list[str]]] = [
        (
            {"coefficients": {"c1": 0.01, "c5": 1, "c4": 1}},
            [
                f"{item} coefficients, {name}"
                for name in (
                    "c2: found none; expected c1, c2 and c3",
                    "c3: found none; expected c1, c2 and c3",
                    "c4: found it; expected c1, c2 and c3",
                    "c5: found it; expected c1, c2 and c3",
                )
            ],
        ),
        (
            {"coefficients": {"c1": -1, "c2": 0.2, "c3": 0.2}},
            [f"{item} coefficients, c1: found -1; expected a number above 0"],
        ),
        ({"valid": ["6h", "1h"]}, [f"{item} valid: found 6h to 1h; expected the shorter duration first"]),
        (
            {"valid_areas": [2, 1], "area_unit": "km2"},
            [f"{item} valid_areas: found 2e+06 to 1e+06 m²; expected the least and the greatest, in this order"],
        ),
        (
            {"valid_areas": [1, 2]},
            [
                (
                    f"{item} area_unit: found nothing beside valid_areas; expected the unit of valid_areas; give both, "
                    "or neither"
                )
            ],
        ),
        (
            {"area_unit": "km2"},
            [
                (
                    f"{item} valid_areas: found nothing beside area_unit; expected the least and the greatest area; "
                    "give both, or neither"
                )
            ],
        ),
    ]
    for changes, messages in cases:
        assert refusal(design__areal_reduction={**own, **changes}) == messages


def test_areal_depths_are_not_reduced() -> None:
    """Depths from the record are areal already: no method is taken, and none is shown beside."""
    found = "beside depths from the record, which are areal already; expected"
    tables = design_tables(
        design__depths={"from": "record"},
        design__areal_reduction={"method": "leclerc-schaake", "compare": ["keers-wescott"], "area": "own"},
        **GAUGED,
    )
    with pytest.raises(JobError, match="areal already") as caught:
        asked(parse_design_job(tables))
    assert str(caught.value).splitlines() == [
        f"[design.areal_reduction] method: found 'leclerc-schaake' {found} 'none'; take the table out",
        f"[design.areal_reduction] compare: found 'keers-wescott' {found} nothing; take the table out",
    ]
    tables["design"]["areal_reduction"] = {"method": "none"}
    assert asked(parse_design_job(tables)).frequencies == (Frequency(10.0, ANNUAL_MAXIMUM),)


def test_only_reductions_without_values_of_the_job_are_compared() -> None:
    """A method made of a job's own coefficients has none to be compared with; one by region needs the region."""
    (line,) = refusal(design__areal_reduction={"method": "none", "compare": ["exponential", "keers-wescott"]})
    assert line == (
        "[design.areal_reduction] compare: found 'exponential', which is made of values of the job's own; expected one "
        "of: leclerc-schaake, keers-wescott, arr-2019"
    )
    (line,) = refusal(design__areal_reduction={"method": "none", "compare": ["arr-2019"]})
    assert line == (
        "[design.areal_reduction] region: found nothing; expected it, which compare = 'arr-2019' needs; state it"
    )
    (line,) = refusal(design__areal_reduction={"method": "none", "compare": ["arr-2019"], "region": "Tasmannia"})
    assert "found 'Tasmannia'" in line
    assert line.endswith("did you mean 'Tasmania'?")


def test_names_stand_once() -> None:
    """Points and patterns are told apart by their names; the shape is the name of a pattern without one."""
    points = [{"name": name, "basins": ["nw"]} for name in ("b", "a", "b", "a", "c")]
    patterns = [UNIFORM, {"shape": "triangular", "name": "uniform"}]
    assert refusal(design__point=points, design__pattern=patterns) == [
        "[[design.point]] a: found the name twice; expected each once",
        "[[design.point]] b: found the name twice; expected each once",
        "[[design.pattern]] uniform: found the name twice; expected each once; give every pattern a name",
    ]


def test_durations_of_a_pattern_are_of_the_design() -> None:
    """A pattern is made for durations that the design has, by whichever word."""
    assert refusal(design__pattern=[UNIFORM, {"shape": "triangular", "durations": ["2h", "6h"]}]) == [
        "[[design.pattern]] no. 2 durations: found '2h'; expected of [design] durations: 6h"
    ]
    assert asked_of(design__pattern={**UNIFORM, "durations": "360min"}).design.pattern[0].durations == ("6h",)


@pytest.mark.parametrize(
    ("peak", "message"),
    [
        (0, "found 0; expected early, centre, late, or a fraction of the duration between 0 and 1; correct it"),
        (1, "found 1; expected early, centre, late, or a fraction of the duration between 0 and 1; correct it"),
        (30, (
            "found 30; expected early, centre, late, or a fraction of the duration between 0 and 1; write 0.3 "
            "for 30 %"
        )),
        ("middle", (
            "found 'middle'; expected early, centre, late, or a fraction of the duration between 0 and 1; "
            "one of: "
        )),
        ("lat", (
            "found 'lat'; expected early, centre, late, or a fraction of the duration between 0 and 1; did "
            "you mean "
        )),
    ],
)  # fmt: skip
def test_a_peak_is_a_word_or_a_fraction(peak: str | float, message: str) -> None:
    """A peak that is neither is told with the number of its pattern."""
    (line,) = refusal(design__pattern=[UNIFORM, {"shape": "triangular", "peak": peak}])
    assert line.startswith(f"[[design.pattern]] no. 2 peak: {message}")


def test_what_needs_a_record_is_refused_without_gauges() -> None:
    """Depths from the record, rarity, and storms as patterns have nothing to rest on in a job without gauges."""
    needs = "in a job without gauges; expected [gauges], [[rainfall]] and [[storm]]; add them, or take it out"
    assert refusal(
        design__depths={"from": "record"}, design__rarity={}, design__pattern={"shape": "observed", "storm": "May"}
    ) == [
        (
            "[[design.pattern]] no. 1 storm: found 'May'; expected the name of a [[storm]] of the job; add it, "
            "or choose another shape"
        ),
        f"[design.depths] from: found 'record' {needs}",
        f"[design.rarity]: found it {needs}",
    ]


def test_averaging_methods_are_not_chosen_where_nothing_averages_gauges() -> None:
    """[averaging] methods would go unheard in a job without gauges; options of the methods do not."""
    assert refusal(averaging={"methods": ["thiessen"]}) == [
        (
            "[averaging] methods: found it in a job without gauges; expected options of the methods alone; name "
            "the method in "
            "[design.depths] average"
        ),
    ]
    assert asked_of(averaging={"idw": {"power": 3}}).step == 60


def test_storms_are_of_the_job() -> None:
    """Storms of a pattern and of rarity that the job does not have are told with the nearest."""
    tables = design_tables(
        storm=[{"name": "Quill"}],
        design__rarity={"storms": ["Quil", "Quill"]},
        design__pattern={"shape": "observed", "storm": "Qill"},
        **GAUGED,
    )
    with pytest.raises(JobError, match="Quil") as caught:
        asked(parse_design_job(tables))
    assert str(caught.value).splitlines() == [
        (
            "[[design.pattern]] no. 1 storm: found 'Qill'; expected the name of a [[storm]] of the job; did you "
            "mean 'Quill'?"
        ),
        "[design.rarity] storms: found 'Quil'; expected the name of a [[storm]] of the job; did you mean 'Quill'?",
    ]
    del tables["storm"]
    tables["design"] |= {"rarity": {}, "pattern": UNIFORM}
    with pytest.raises(JobError, match=r"^\[design.rarity\]: found no \[\[storm\]\]; expected one at least; add it$"):
        asked(parse_design_job(tables))


def test_a_job_without_a_design_asks_nothing() -> None:
    """A whole job may lack the table, and is refused here."""
    with pytest.raises(JobError, match=r"^\[design\]: found no such table; expected it to be given; add it$"):
        asked(parse_job(design_tables(design=None, **GAUGED)))


def test_all_problems_of_a_job_are_told_together() -> None:
    """Depths, frequency, step, start, reduction, points and patterns: one list."""
    lines = refusal(
        design__aep=10,
        design__return_periods=None,
        design__step="7h",
        design__start="2031-05",
        design__depths__source=None,
        design__areal_reduction={"method": "arr-2019"},
        design__point=[{"name": "a", "basins": ["nw"]}] * 2,
        design__pattern=[{"shape": "uniform", "peak": 2}, {"shape": "table"}],
    )
    assert [line.partition(":")[0] for line in lines] == [
        "[design.depths] source",
        "[design] aep",
        "[design] durations",
        "[design] start",
        "[design] jurisdiction",
        "[design.areal_reduction] region",
        "[[design.point]] a",
        "[[design.pattern]] no. 1 peak",
        "[[design.pattern]] no. 2 file",
    ]
