"""How rare a drawn storm was: its greatest depths against areal and point depths, by hand."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any, Final

import numpy as np
import pandas as pd
import pytest
from design_jobs import design_tables
from record_jobs import daily_record, write_record_job

from basinrain.design_job import run_design
from basinrain.errors import JobError, MethodError
from basinrain.results_design import DesignRun

GAUGES: Final = "id,x,y,from\nAlder,2.5,5,\nBirch,9.5,5,\n"

# Over the whole, .6 and .4 of them, 18 mm fall in the wettest hour and 50.8 in the wettest six.
ALDER: Final = (0, 0, 4, 8, 20, 10, 4, 2, 0, 0, 0, 0)
BIRCH: Final = (0, 0, 0, 0, 5, 30, 15, 5, 5, 0, 0, 0)

QUILL: Final = [{"name": "Quill", "start": "2031-05-04T00:00", "end": "2031-05-04T12:00"}]

# Areal over point depth 0.8 in an hour and 0.9 in six over 100 km2, .84 and .94 over 50, the table's least area.
REDUCTION: Final = "area,duration,factor\n50,1h,0.84\n50,6h,0.94\n100,1h,0.8\n100,6h,0.9\n"


def rain(alder: Any = ALDER, birch: Any = BIRCH) -> pd.DataFrame:  # noqa: ANN401 - numbers
    """Return twelve hours of two gauges."""
    times = pd.date_range("2031-05-04T01:00", periods=12, freq="h")
    return pd.DataFrame({"Alder": alder, "Birch": birch}, index=times, dtype=float)


def job(folder: Path, record: pd.DataFrame | None = None, **changes: Any) -> Path:  # noqa: ANN401 - values of a job
    """Write a job that asks how rare the storm was, in an hour and in six, by Thiessen."""
    given: dict[str, Any] = {
        "storm": QUILL,
        "design__depths": design_tables()["design"]["depths"],
        "design__durations": ["1h", "6h"],
        "design__rarity": {"average": "thiessen", "durations": ["1h", "6h"]},
    }
    return write_record_job(
        folder, rain() if record is None else record, interval="1h", gauges=GAUGES, **(given | changes)
    )


def rows(run: DesignRun, kind: str = "areal") -> pd.DataFrame:
    table = run.storm_rarity
    return table[table["kind"] == kind].set_index(["place", "duration"])


def one_row(table: pd.DataFrame, place: str, duration: str) -> dict[str, Any]:
    """Return what is found of a place and a duration, by column."""
    (row,) = table.reset_index().query("place == @place and duration == @duration").to_dict("records")
    return {str(name): value for name, value in row.items()}


def variate(years: float) -> float:
    """Return Gumbel's reduced variate of a return period in an annual maximum series."""
    return float(-np.log(-np.log(1 - 1 / years)))


def years_of(depth: float, two: float, ten: float) -> float:
    """Return the return period of a depth between those of 2 and of 10 years."""
    y = variate(2) + (depth - two) / (ten - two) * (variate(10) - variate(2))
    return float(1 / (1 - np.exp(-np.exp(-y))))


def test_depths_of_the_storm_are_those_on_the_drawing(tmp_path: Path) -> None:
    """The west is Alder's, a fifth of the east and three fifths of the whole; windows end when they should."""
    found = rows(run_design(job(tmp_path)))
    alder, birch = np.array(ALDER), np.array(BIRCH)
    for area, share in (("union", 0.6), ("west", 1.0), ("east", 0.2)):
        mean = share * alder + (1 - share) * birch
        for hours in (1, 6):
            sums = [mean[k : k + hours].sum() for k in range(13 - hours)]
            row = one_row(found, area, f"{hours}h")
            assert row["depth"] == pytest.approx(max(sums), rel=1e-12)
            assert row["window_end"] == f"2031-05-04T{int(np.argmax(sums)) + hours:02d}:00"
            assert row["depth_aligned"] == pytest.approx(max(sums[::hours]), rel=1e-12)
    assert found.index.tolist() == [(area, d) for area in ("union", "west", "east") for d in ("1h", "6h")]


def test_each_area_is_compared_with_its_own_reduction(tmp_path: Path) -> None:
    """The whole's hour is looked for in 0.8 of 20 to 30 mm; each half's depths in those of 50 km2."""
    reduction = {"method": "table", "file": "reduction.csv", "area_unit": "km2", "source": "invented"}
    place = job(tmp_path, design__areal_reduction=reduction)
    (tmp_path / "reduction.csv").write_text(REDUCTION)
    found = rows(run_design(place))
    for area, one, six in (("union", 0.8, 0.9), ("west", 0.84, 0.94), ("east", 0.84, 0.94)):
        for duration, factor, (two, ten) in (("1h", one, (20, 30)), ("6h", six, (40, 60))):
            row = one_row(found, area, duration)
            if row["depth"] <= factor * ten:
                wanted = years_of(row["depth"], factor * two, factor * ten)
                assert row["estimate_return_period"] == pytest.approx(wanted, rel=1e-9)
                assert row["estimate_aep"] == pytest.approx(1 / wanted, rel=1e-9)
                assert (row["at_least_return_period"], row["at_most_return_period"]) == (2, 10)
            else:
                assert row["words"] == "rarer than 1 in 10 a year (the table's end)"
                blank = ("estimate_aep", "estimate_return_period", "at_most_return_period")
                assert all(np.isnan(row[name]) for name in blank)
                assert row["at_least_return_period"] == 10
    # 18 mm of 16 to 24, 50.8 of 36 to 54; 20 of 16.8 to 25.2, 48 of 37.6 to 56.4; 26 of 25.2 and 56.8 of 56.4.
    assert found["estimate_aep"].notna().tolist() == [True, True, True, True, False, False]


def test_rarity_leaves_the_uplift_out(tmp_path: Path) -> None:
    """A storm that has fallen is compared with the climate that the depths are of, whatever is to come."""
    plain = run_design(job(tmp_path / "plain"))
    uplift = {"factor": 1.5, "source": "invented", "horizon": "2080"}
    lifted = run_design(job(tmp_path / "lifted", design__uplift=uplift))
    pd.testing.assert_frame_equal(plain.storm_rarity, lifted.storm_rarity)
    np.testing.assert_allclose(lifted.design_depths["areal_depth"], 1.5 * plain.design_depths["areal_depth"])


TWO_POINTS: Final = """point,x,y,duration,return_period,depth
near Alder,2500,4000,1h,2,20
near Alder,2500,4000,1h,10,40
near Birch,9000,5000,1h,2,10
near Birch,9000,5000,1h,10,34
"""


def test_the_wettest_gauge_is_compared_with_its_nearest_point_unreduced(tmp_path: Path) -> None:
    """30 mm at Birch lie in the 10 to 34 mm of the point half a kilometre away, whatever the areal reduction."""
    depths = design_tables()["design"]["depths"] | {"crs": "local"}
    reduction = {"method": "table", "file": "reduction.csv", "area_unit": "km2", "source": "invented"}
    place = job(
        tmp_path,
        depths=TWO_POINTS,
        design__depths=depths,
        design__durations=["1h"],
        design__rarity={"average": "thiessen", "durations": ["1h"]},
        design__areal_reduction=reduction,
    )
    (tmp_path / "reduction.csv").write_text(REDUCTION)
    run = run_design(place)
    (row,) = rows(run, "point").reset_index().to_dict("records")
    assert (row["place"], row["depth"]) == ("Birch", 30)
    assert row["estimate_return_period"] == pytest.approx(years_of(30, 10, 34), rel=1e-9)
    # The union: points part the square at x = 5.75 but for the kilometre between them in y.
    weights = run.point_weights.set_index(["area_of", "depth_point"])["weight"]
    two, ten = (
        0.8 * sum(weights["union", point] * depth for point, depth in (("near Alder", a), ("near Birch", b)))
        for a, b in ((20, 10), (40, 34))
    )
    areal = one_row(rows(run), "union", "1h")
    assert areal["estimate_return_period"] == pytest.approx(years_of(18, two, ten), rel=1e-9)


def test_a_duration_without_a_reduction_is_compared_at_gauges_alone(tmp_path: Path) -> None:
    """The table of reductions ends at 6 h: of 12 h nothing is known over the areas, at Birch it is."""
    reduction = {"method": "table", "file": "reduction.csv", "area_unit": "km2", "source": "invented"}
    place = job(
        tmp_path,
        design__areal_reduction=reduction,
        design__rarity={"average": "thiessen", "durations": ["1h", "6h", "12h"]},
    )
    (tmp_path / "reduction.csv").write_text(REDUCTION)
    run = run_design(place)
    row = one_row(rows(run), "union", "12h")
    assert row["depth"] == pytest.approx(0.6 * sum(ALDER) + 0.4 * sum(BIRCH))
    assert row["words"] == "not known: no depths of the table"
    assert np.isnan(row["at_least_return_period"])
    assert np.isnan(row["at_most_return_period"])
    # 12 h lie halfway between 6 and 24 h on logarithms: 49 mm at 2 and 73.5 at 10 years.
    at_gauge = one_row(rows(run, "point"), "Birch", "12h")
    assert at_gauge["estimate_return_period"] == pytest.approx(years_of(60, 2400**0.5, 5400**0.5), rel=1e-9)
    assert one_row(rows(run), "union", "6h")["at_least_return_period"] == 2


def test_what_was_clamped_for_the_comparison_is_warned_of(tmp_path: Path) -> None:
    """The table of reductions ends at 6 h: of 12 h its factor at 6 h is taken, which is said of all areas once."""
    reduction = {"method": "table", "file": "reduction.csv", "area_unit": "km2", "source": "invented"}
    asked = {"average": "thiessen", "durations": ["1h", "12h"]}
    for outside, told in (("refuse", []), ("clamp", ["warning"])):
        place = job(tmp_path / outside, design__areal_reduction={**reduction, "outside": outside}, design__rarity=asked)
        (place.parent / "reduction.csv").write_text(REDUCTION)
        run = run_design(place)
        notes = [note for note in run.notes if note.code == "rarity-clamped"]
        assert [note.level for note in notes] == told
    assert notes[0].storm == "Quill"
    assert "the factor of 12 h is that of 6 h, the nearest end of the method's range" in notes[0].text
    # 2400 mm2 and 5400 mm2 as below 12 h of the gauge, here by 0.9 over the whole.
    two, ten = 0.9 * 2400**0.5, 0.9 * 5400**0.5
    depth = 0.6 * sum(ALDER) + 0.4 * sum(BIRCH)
    row = one_row(rows(run), "union", "12h")
    assert row["estimate_return_period"] == pytest.approx(years_of(depth, two, ten), rel=1e-9)


def test_nothing_is_extrapolated_for_a_storm_that_has_fallen(tmp_path: Path) -> None:
    """Where the design goes on beyond the table's 6 h, the storm's 12 h are compared with nothing all the same."""
    depths = {**design_tables()["design"]["depths"], "extrapolate": True}
    asked = {"average": "thiessen", "durations": ["6h", "12h"]}
    place = job(tmp_path, design__depths=depths, design__durations=["12h"], design__rarity=asked)
    kept = [line for line in (tmp_path / "depths.csv").read_text().splitlines() if not line.startswith("24h")]
    (tmp_path / "depths.csv").write_text("\n".join(kept) + "\n")
    run = run_design(place)
    assert run.design_depths["duration"].tolist() == ["12h"]
    assert set(rows(run).index.get_level_values("duration")) == {"6h"}
    (note,) = (note for note in run.notes if note.code == "rarity-left-out")
    assert note.text == "12 h: the table has no depths of it"


def test_what_was_infilled_is_said(tmp_path: Path) -> None:
    """Birch has its first four hours, Alder stands in for the rest: 36 of the 44 mm over the east are infilled."""
    record = rain()
    record.iloc[4:, 1] = np.nan
    run = run_design(job(tmp_path, record))
    mean = 0.2 * np.array(ALDER) + 0.8 * np.where(np.arange(12) < 4, BIRCH, ALDER)
    assert rows(run).loc[("east", "1h"), "depth"] == pytest.approx(mean.max())
    share = 0.8 * sum(ALDER[4:]) / mean.sum()
    (sentence,) = [text for text in run.rarities[0].sentences if "infilled" in text]
    assert f"east {100 * share:.0f} %" in sentence
    assert "west" not in sentence
    warned = [str(note) for note in run.warnings if note.code == "much-infilled"]
    assert f"Quill: Much of the mean of basin east rests on infilled values: {100 * share:.0f} % by thiessen." in warned


def test_durations_that_cannot_be_compared_are_named(tmp_path: Path) -> None:
    """Longer than the storm, shorter than a step, no whole number of steps: each is said, none is compared."""
    asked = {"average": "thiessen", "durations": ["10min", "90min", "6h", "24h"]}
    run = run_design(job(tmp_path, design__rarity=asked))
    assert run.rarities[0].left_out == (
        "10 min: shorter than the record's step of 1 h",
        "90 min: no whole number of the record's steps of 1 h",
        "24 h: longer than the storm's window of 12 h",
    )
    assert rows(run).index.get_level_values("duration").unique().tolist() == ["6h"]
    assert [str(note) for note in run.notes if note.code == "rarity-left-out"] == [
        f"Quill: {text}" for text in run.rarities[0].left_out
    ]


def test_durations_that_the_job_does_not_name_are_those_of_the_table_and_the_record(tmp_path: Path) -> None:
    """1, 2, 3, 6 and 12 h are steps of the record and within the table; the 24 h of the table are not in the storm."""
    run = run_design(job(tmp_path, design__rarity={"average": "thiessen"}))
    assert rows(run).index.get_level_values("duration").unique().tolist() == ["1h", "2h", "3h", "6h", "12h"]


def test_a_storm_over_one_basin_has_it_once(tmp_path: Path) -> None:
    """A point with one basin above it, whatever its name, is compared once; two basins are there besides."""
    points = [{"name": "gate", "basins": ["west"]}, {"name": "mouth", "basins": ["west", "east"]}]
    run = run_design(job(tmp_path / "named", design__point=points))
    assert rows(run).index.get_level_values("place").unique().tolist() == ["gate", "mouth", "east"]
    points[0]["name"] = "west"
    run = run_design(job(tmp_path / "same", design__point=points))
    assert rows(run).index.get_level_values("place").unique().tolist() == ["west", "mouth", "east"]
    assert rows(run).loc[("west", "1h"), "depth"] == 20


def test_depths_from_the_record_are_areal_and_have_no_gauge_beside_them(tmp_path: Path) -> None:
    """Against its own record no gauge is compared, and sums of its steps are like with like."""
    record = daily_record()
    record.loc["2010-06-02"] = 500.0
    storm = [{"name": "Reed", "start": "2010-06-01", "end": "2010-06-05"}]
    run = run_design(write_record_job(tmp_path, record, storm=storm, design__rarity={"average": "thiessen"}))
    assert rows(run, "point").empty
    assert rows(run).loc[("union", "24h"), "words"] == "rarer than 1 in 20 a year (the table's end)"
    assert (rows(run)["remark"] == "").all()
    assert "storms-averaged" in {note.code for note in run.notes}


def test_the_window_is_widened_to_whole_steps_and_said_so(tmp_path: Path) -> None:
    """A storm that begins at half past has the whole of that hour, as with every other command."""
    storm = [{"name": "Quill", "start": "2031-05-04T02:30", "end": "2031-05-04T12:00"}]
    run = run_design(job(tmp_path, storm=storm))
    (note,) = [note for note in run.notes if note.code == "window-widened"]
    assert "2031-05-04T02:00 to 2031-05-04T12:00" in note.text


TOTALS: Final = "gauge,depth\nAlder,20\nBirch,30\n"
OBSERVED: Final = [{"name": "as Quill", "shape": "observed", "storm": "Quill"}]


@pytest.mark.parametrize("asked", ["rarity", "pattern"])
def test_totals_without_times_are_refused(tmp_path: Path, asked: str) -> None:
    """A storm that is a total has neither a greatest hour nor a pattern."""
    changes = {"rarity": {}, "pattern": {"design__rarity": None, "design__pattern": OBSERVED}}[asked]
    source = [{"file": "totals.csv", "layout": "totals", "unit": "mm", "columns": {}}]
    place = job(tmp_path, rainfall=source, storm=[{"name": "storm"}], **(changes | _named("storm", changes)))
    (tmp_path / "totals.csv").write_text(TOTALS)
    text = (
        "storm storm: found totals without times; expected a record in steps, from which depths of shorter durations "
        "and a pattern can be had; give such a record, or leave the storm out of [design]"
    )
    with pytest.raises(JobError, match=f"^{re.escape(text)}$"):
        run_design(place)


def _named(storm: str, changes: dict[str, Any]) -> dict[str, Any]:
    pattern = changes.get("design__pattern")
    return {} if pattern is None else {"design__pattern": [pattern[0] | {"storm": storm}]}


def test_a_storm_without_a_gauge_that_reports_is_refused(tmp_path: Path) -> None:
    """Nothing is known of it, and nothing is invented."""
    record = rain()
    record.iloc[:6] = np.nan
    storm = [{"name": "Quill", "start": "2031-05-04T00:00", "end": "2031-05-04T06:00"}]
    with pytest.raises(JobError, match=r"^storm Quill: found no gauge that reports in it; expected one at least; "):
        run_design(job(tmp_path, record, storm=storm))


def test_a_storm_too_short_for_everything_is_refused(tmp_path: Path) -> None:
    """With no duration to compare there is no answer."""
    storm = [{"name": "Quill", "start": "2031-05-04T04:00", "end": "2031-05-04T06:00"}]
    text = (
        "[design.rarity] Quill: found no duration that is a whole number of the record's steps, within the storm and "
        "in the table; expected one at least; widen the storm's window, or give depths of longer durations"
    )
    with pytest.raises(MethodError, match=f"^{re.escape(text)}$"):
        run_design(job(tmp_path, storm=storm, design__rarity={"average": "thiessen", "durations": ["6h"]}))


def test_the_observed_pattern_is_the_storm_s_own(tmp_path: Path) -> None:
    """Two, one and one parts of a storm of twelve hours, at a design of six: half the depth in the first two."""
    shape = np.repeat([2.0, 1.0, 1.0], 4)
    run = run_design(job(tmp_path, rain(shape, shape), design__pattern=OBSERVED))
    (depth,) = run.design_depths.loc[run.design_depths["duration"] == "6h", "areal_depth"]
    table = run.design_hyetographs
    for basin in ("west", "east"):
        found = table[(table["basin"] == basin) & (table["duration"] == "6h")]["depth"]
        np.testing.assert_allclose(found, depth * np.array([2, 2, 1, 1, 1, 1]) / 8, rtol=1e-12)


def test_the_observed_pattern_is_that_of_the_largest_area(tmp_path: Path) -> None:
    """Rain at Alder in the first half and at Birch in the second comes three to two over the whole."""
    first = np.repeat([1.0, 0.0], 6)
    run = run_design(job(tmp_path, rain(first, 1 - first), design__pattern=OBSERVED))
    table = run.design_hyetographs
    six = table[(table["basin"] == "east") & (table["duration"] == "6h")]["depth"]
    np.testing.assert_allclose(six / six.sum(), np.array([3, 3, 3, 2, 2, 2]) / 15, rtol=1e-12)


@pytest.mark.parametrize(
    ("alder", "birch", "average", "text"),
    [
        ((0,) * 12, (0,) * 12, "thiessen", "storm Quill: found no rain in its 12 steps; expected a storm with rain; "),
        (
            (*ALDER[:3], np.nan, *ALDER[4:]),
            (*BIRCH[:3], np.nan, *BIRCH[4:]),
            "thiessen",
            "storm Quill: found no gauge with a depth, infilled or its own, in the steps that end at ",
        ),
    ],
    ids=["dry", "gap"],
)
def test_storms_that_are_no_pattern_are_refused(
    tmp_path: Path, alder: tuple[float, ...], birch: tuple[float, ...], average: str, text: str
) -> None:
    """A storm that is dry, or has no depth at a step even after infill, is told by its name."""
    place = job(tmp_path, rain(alder, birch), design__pattern=OBSERVED, design__rarity={"average": average})
    with pytest.raises(JobError, match=f"^{re.escape(text)}"):
        run_design(place)


def test_an_area_that_the_method_has_no_mean_of_has_no_pattern(tmp_path: Path) -> None:
    """The arithmetic mean has no gauge inside; the message says by what it was averaged."""
    outside = GAUGES.replace("2.5,5", "2.5,11").replace("9.5,5", "9.5,11")
    place = write_record_job(
        tmp_path,
        rain(),
        interval="1h",
        gauges=outside,
        storm=QUILL,
        design__rarity={"average": "arithmetic"},
        design__depths=design_tables()["design"]["depths"],
        design__durations=["6h"],
        design__pattern=OBSERVED,
    )
    text = (
        "storm Quill: found no mean over union by 'arithmetic' at any step; expected one at every step; choose another "
        "method in [design.rarity] average"
    )
    with pytest.raises(JobError, match=f"^{re.escape(text)}$"):
        run_design(place)


def test_storms_of_another_name_are_refused(tmp_path: Path) -> None:
    """Both the pattern and the rarity name a storm that the job does not have; both are told before a file is read."""
    place = job(
        tmp_path,
        design__pattern=[{"shape": "observed", "storm": "Quil"}],
        design__rarity={"storms": ["Quill", "Reed"]},
    )
    (tmp_path / "rain.csv").unlink()
    one = "expected the name of a [[storm]] of the job"
    text = (
        f"[[design.pattern]] no. 1 storm: found 'Quil'; {one}; did you mean 'Quill'?\n"
        f"[design.rarity] storms: found 'Reed'; {one}; one of: Quill"
    )
    with pytest.raises(JobError, match=f"^{re.escape(text)}$"):
        run_design(place)
