"""The depths that a design rests on, and the weight of their points in every area."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from design_jobs import DEPTHS, TWO_POINTS, write_design_job
from drawn import gauges_at
from rasterfiles import write_asc

from basinrain.basins import Basins
from basinrain.design_areas import areas_of
from basinrain.design_asked import asked
from basinrain.design_job import run_design
from basinrain.design_sources import Sourced, interval_factors, nearest_points, sourced
from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, Frequency
from basinrain.errors import DataError, JobError, MethodError, ReadError
from basinrain.inputs import read_basins_of
from basinrain.jobfile import parse_design_job, read_design_job
from basinrain.reading import settle_basins

TEN = Frequency(10.0, ANNUAL_MAXIMUM)
SIX_HOURS = np.array([360.0])


def sourced_of(folder: Path, **changes: Any) -> tuple[Sourced, Basins]:  # noqa: ANN401 - values of a job
    """Return the depths of a job of squares in km, and its areas: the whole, nw, ne, sw, se."""
    job = read_design_job(write_design_job(folder, unit="km", **changes))
    wanted = asked(job)
    areas = areas_of(wanted.design, settle_basins(read_basins_of(job)[0])[0]).basins
    return sourced(job, wanted.design, areas), areas


def test_one_point_counts_everywhere(tmp_path: Path) -> None:
    """A table without a point column is one point with the weight 1 in every area."""
    found, areas = sourced_of(tmp_path)
    assert (found.source.points, found.method) == (("depths",), "one point")
    assert found.weights.tolist() == [[1.0]] * len(areas)
    assert found.source.at(SIX_HOURS, TEN).tolist() == [[60.0]]


def test_two_points_share_the_whole(tmp_path: Path) -> None:
    """A point in the middle of each half has half of the whole, and the squares of its own half."""
    found, areas = sourced_of(tmp_path, depths=TWO_POINTS, design__depths__crs="local")
    assert found.source.points == ("west", "east")
    assert areas.ids[1:] == ("nw", "ne", "sw", "se")
    assert found.weights == pytest.approx(np.array([[0.5, 0.5], [1, 0], [0, 1], [1, 0], [0, 1]]), abs=1e-12)
    assert found.method == "thiessen"


def test_the_weight_method_is_the_jobs(tmp_path: Path) -> None:
    """The arithmetic mean takes both points, which lie on the edges of the squares; IDW goes by distance."""
    depths = TWO_POINTS.replace("2500", "2000").replace("5000", "6000")
    arithmetic, _ = sourced_of(
        tmp_path / "a",
        depths=depths,
        design__depths__crs="local",
        design__depths__average="arithmetic",
        design__point=[{"name": "mouth", "basins": ["nw", "ne"]}],
    )
    assert arithmetic.weights.tolist() == [[0.5, 0.5], [1, 0], [0, 1]]
    idw, _ = sourced_of(tmp_path / "b", depths=TWO_POINTS, design__depths__crs="local", design__depths__average="idw")
    assert idw.weights[0] == pytest.approx([0.5, 0.5], abs=1e-3)
    assert (idw.weights[[1, 3], 0] > 0.7).all()
    assert idw.weights.sum(axis=1) == pytest.approx(np.ones(5), rel=1e-12)


def test_options_of_the_method_are_those_of_averaging(tmp_path: Path) -> None:
    """A steeper power brings the left squares closer to the left point."""
    shares = [
        sourced_of(
            tmp_path / str(power),
            depths=TWO_POINTS,
            design__depths__crs="local",
            design__depths__average="idw",
            averaging={"idw": {"power": power, "cell": 500}},
        )[0].weights[1, 0]
        for power in (1, 2, 4)
    ]
    assert shares == sorted(shares)
    assert shares[2] - shares[0] > 0.1


def test_a_method_without_weights_is_refused(tmp_path: Path) -> None:
    """No point inside a basin: the arithmetic mean has no number there, and every such area is named."""
    with pytest.raises(DataError, match="no weights by 'arithmetic'") as caught:
        sourced_of(tmp_path, depths=TWO_POINTS.replace("5000", "6000"), design__depths__crs="local",
                   design__depths__average="arithmetic")  # fmt: skip
    assert [problem.item for problem in caught.value.problems] == [
        "[design.depths] average, sw",
        "[design.depths] average, se",
    ]


@pytest.mark.parametrize(
    ("depths", "crs", "message"),
    [
        (
            TWO_POINTS.replace("west,2500,5000", "west,,"),
            "local",
            r"^\[design.depths\] file, point west: found no position; expected its coordinates, ",
        ),
        (
            TWO_POINTS.replace("7500", "2500"),
            "local",
            r"^\[design.depths\] file, points west and east: found one place for all of them; expected places apart, ",
        ),
        (
            TWO_POINTS.replace("00,5000", "0000,5000"),
            "local",
            r"^depth points and basins: found them nowhere near each other: depth point west, the nearest, is 240 km ",
        ),
        (
            TWO_POINTS.replace("2500,5000", "8,47").replace("7500,5000", "9,47"),
            "EPSG:4326",
            r"^\[design.depths\] crs: found 'EPSG:4326' beside basins in 'local'; expected both 'local', or both on ",
        ),
    ],
)
def test_points_that_cannot_be_placed(tmp_path: Path, depths: str, crs: str | None, message: str) -> None:
    """Points without a position, at one place, far away, or on another kind of ground are refused."""
    with pytest.raises(DataError, match=message):
        sourced_of(tmp_path, depths=depths, design__depths__crs=crs)


def test_one_point_far_away_is_refused_too(tmp_path: Path) -> None:
    """Where the one point has a position, it must be near."""
    one = "".join(line for line in TWO_POINTS.splitlines(keepends=True) if not line.startswith("east"))
    assert sourced_of(tmp_path / "near", depths=one, design__depths__crs="local")[0].method == "one point"
    with pytest.raises(DataError, match="depth point west, the nearest, is 2,490 km away"):
        sourced_of(tmp_path / "far", depths=one.replace("2500,", "2500000,"), design__depths__crs="local")
    with pytest.raises(DataError, match=r"\[design.depths\] crs: found 'local' beside basins that are not in 'local'"):
        run_design(
            write_design_job(
                tmp_path / "map",
                squares={"only": shapely.box(8, 47, 8.1, 47.1)},
                depths=one,
                basins__crs="EPSG:4326",
                basins__length_unit=None,
                design__depths__crs="local",
            )
        )


def test_problems_of_the_file_have_its_name(tmp_path: Path) -> None:
    """Percent where fractions are declared, and a file that is not there, are told of the file."""
    percent = "duration,aep,depth\n6h,50,40\n6h,10,60\n"
    with pytest.raises(ReadError, match=r"depths\.csv:2: .*found '?50'?; expected a fraction between 0 and 1"):
        sourced_of(tmp_path / "a", depths=percent, design__depths__probability="aep")
    with pytest.raises(ReadError, match=r"none\.csv: the file: found nothing of that name"):
        sourced_of(tmp_path / "b", design__depths__file="none.csv")


def test_probability_in_percent_where_it_is_declared(tmp_path: Path) -> None:
    """50 and 10 percent are 2 and 10 years."""
    percent = "duration,aep,depth\n6h,50,40\n6h,10,60\n"
    found, _ = sourced_of(tmp_path, depths=percent, design__depths__probability="aep-percent")
    assert [frequency.return_period for frequency in found.source.frequencies] == [2, 10]


@pytest.mark.parametrize(
    ("unit", "heading", "row"),
    [
        ("in", "depth", "6h,10,2"),
        ("cm", "depth", "6h,10,5.08"),
        ("mm/h", "intensity", "6h,10,8.466666666666667"),
        ("in/h", "intensity", "360min,10,0.3333333333333333"),
    ],
)
def test_units_of_depth_and_intensity(tmp_path: Path, unit: str, heading: str, row: str) -> None:
    """Two inches in six hours are 50.8 mm, however they are written."""
    text = f"duration,return_period,{heading}\n{row}\n"
    found, _ = sourced_of(tmp_path, depths=text, design__depths__unit=unit)
    assert found.source.at(SIX_HOURS, TEN)[0, 0] == pytest.approx(50.8)


def test_a_wide_table_with_plain_durations(tmp_path: Path) -> None:
    """Layout, unit of durations and names of columns reach the reader."""
    found, _ = sourced_of(
        tmp_path,
        depths="len,2,10\n1,20,30\n6,40,60\n",
        design__depths__layout="wide",
        design__depths__duration_unit="h",
        design__depths__columns={"duration": "len"},
    )
    assert found.source.at(SIX_HOURS, TEN).tolist() == [[60.0]]


EQUATION: dict[str, Any] = {
    "from": "equation",
    "equation": "talbot",
    "coefficients": [{"a": 2000, "b": 40}, {"a": 3000, "b": 40}],
    "return_periods": [2, 10],
    "valid": ["10min", "24h"],
    "unit": "mm/h",
    "duration_unit": "min",
    "series": ANNUAL_MAXIMUM,
    "source": "invented equation",
    "date": "2031",
}


def test_an_equation_is_one_point(tmp_path: Path) -> None:
    """I = a / (t + b) at 10 years: 3000 / 400 = 7.5 mm/h for 6 h, 45 mm."""
    found, areas = sourced_of(tmp_path, design__depths=EQUATION)
    assert found.source.at(SIX_HOURS, TEN)[0, 0] == pytest.approx(45)
    assert (found.source.shortest, found.source.longest, found.source.source) == (10, 1440, "invented equation")
    assert (found.weights.tolist(), found.method) == ([[1.0]] * len(areas), "one point")


def test_rasters_are_weighed_by_their_cells(tmp_path: Path) -> None:
    """Cells of 5 km with 40 mm on the left and 60 mm on the right: 50 mm over all, and the square's own value."""
    tmp_path.mkdir(exist_ok=True)
    write_asc(tmp_path / "ten.asc", [[40, 60], [40, 60]], cell=5000.0)
    write_asc(tmp_path / "two.asc", [[20, 30], [20, 30]], cell=5000.0)
    found, _ = sourced_of(
        tmp_path,
        design__depths={
            "from": "rasters",
            "crs": "local",
            "unit": "mm",
            "series": ANNUAL_MAXIMUM,
            "source": "invented rasters",
            "date": "2031",
            "raster": [
                {"file": "ten.asc", "duration": "6h", "aep": 0.1},
                {"file": "two.asc", "duration": "6h", "return_period": 2},
            ],
        },
    )
    means = found.weights @ found.source.at(SIX_HOURS, TEN)
    assert means[:, 0] == pytest.approx([50, 40, 60, 40, 60])
    assert found.method == "share of the area in every cell"
    assert [frequency.return_period for frequency in found.source.frequencies] == [2, 10]


def test_a_depth_between_two_frequencies(tmp_path: Path) -> None:
    """60 mm at 2 years and 90 mm at 10 years are 78.05 mm at 5 years, linear in Gumbel's reduced variate."""
    depths = "duration,return_period,depth\n6h,2,60\n6h,10,90\n"
    run = run_design(write_design_job(tmp_path, depths=depths, design__return_periods=5))
    y = [-np.log(-np.log(1 - 1 / years)) for years in (2, 5, 10)]
    by_hand = 60 + 30 * (y[1] - y[0]) / (y[2] - y[0])
    assert run.design_storms["depth"].tolist() == pytest.approx([by_hand] * 4, rel=1e-9)
    assert round(by_hand, 2) == 78.05


def test_a_partial_duration_table_through_a_whole_job(tmp_path: Path) -> None:
    """0.5, 2 and 10 years stand as they are; AEP 0.3935 is 2 years where the job allows it (Langbein 1949)."""
    depths = "duration,return_period,depth\n6h,0.5,20\n6h,2,40\n6h,10,60\n"
    job = write_design_job(
        tmp_path, depths=depths, design__depths__series="partial-duration", design__return_periods=[0.5, 2, 10]
    )
    run = run_design(job)
    assert run.design_depths["areal_depth"].tolist() == pytest.approx([20, 40, 60])
    assert run.design_depths["return_period"].tolist() == [0.5, 2, 10]
    assert run.design_depths["return_period_in"].unique().tolist() == ["partial-duration"]
    by_aep = write_design_job(
        tmp_path,
        depths=depths,
        design__depths__series="partial-duration",
        design__depths__convert=True,
        design__return_periods=None,
        design__aep=-np.expm1(-1 / 2).item(),
    )
    assert run_design(by_aep).design_depths["areal_depth"].tolist() == pytest.approx([40])


def test_outside_the_table_is_refused_unless_asked(tmp_path: Path) -> None:
    """A rarer frequency and a longer duration than the table has are refused, all of them together."""
    job = write_design_job(tmp_path, design__return_periods=[10, 50], design__durations=["6h", "48h"])
    with pytest.raises(MethodError, match="allow it with extrapolate = true") as caught:
        run_design(job)
    text = str(caught.value)
    assert "50" in text
    assert "48" in text
    run = run_design(job, ["design.depths.extrapolate=true"])
    assert "extrapolated" in {note.code for note in run.notes}


def test_interval_factors_are_made_only_if_stated() -> None:
    """None unless asked; 6 h read every hour: 8 x 6 / (8 x 6 - 1) by Weiss (1964); a record has its own step."""
    table = {"from": "table", "interval_factor": "weiss", "observed_every": "1h"}

    def factors(table: dict[str, Any], step: float | None = None) -> Any:  # noqa: ANN401 - a callable or None
        tables = {"job": {"name": "a"}, "basins": {"file": "b"}}
        design = {"aep": 0.1, "durations": "6h", "step": "1h", "pattern": {"shape": "uniform"}, "depths": table}
        job = parse_design_job({**tables, "design": design})
        assert job.design is not None
        return interval_factors(job.design.depths, step)

    assert factors({"from": "table"}) is None
    assert factors(table)(SIX_HOURS).tolist() == pytest.approx([48 / 47])
    assert factors({"from": "record", "interval_factor": "weiss"}, 180.0)(SIX_HOURS).tolist() == pytest.approx(
        [16 / 15]
    )
    with pytest.raises(MethodError, match=r"\[design.depths\] interval_factor 'weiss': found a duration of "):
        factors(table)(np.array([30.0]))


def test_the_nearest_point_of_every_gauge(tmp_path: Path) -> None:
    """With several points each gauge has its nearest; with one, or an equation, the only one."""
    network = gauges_at((1000, 1000), (9000, 1000), (5001, 5000))
    two, _ = sourced_of(tmp_path / "a", depths=TWO_POINTS, design__depths__crs="local")
    assert nearest_points(two.source, network).tolist() == [0, 1, 1]
    for name, changes in {"b": {}, "c": {"design__depths": EQUATION}}.items():
        one, _ = sourced_of(tmp_path / name, **changes)
        assert nearest_points(one.source, network).tolist() == [0, 0, 0]


def test_an_equation_that_cannot_be(tmp_path: Path) -> None:
    """Coefficients that the form does not have are named by their key."""
    wrong = {**EQUATION, "coefficients": [{"a": 2000}, {"a": -3000, "b": 40}]}
    with pytest.raises(JobError, match=r"\[design.depths\] coefficients"):
        sourced_of(tmp_path, design__depths=wrong)


def test_converted_return_periods_are_reduced_by_their_probability(tmp_path: Path) -> None:
    """Two years of a partial duration series are AEP 0.3935 (Langbein 1949); the Australian factor goes by it."""
    job = write_design_job(
        tmp_path,
        unit="km",
        depths=DEPTHS,
        design__jurisdiction="Australia",
        design__return_periods=[2],
        design__depths__series="partial-duration",
        design__depths__convert=True,
        design__areal_reduction={"method": "arr-2019", "region": "Tasmania"},
    )
    (row,) = run_design(job).design_depths.to_dict("records")
    aep = -np.expm1(-0.5)
    assert (row["aep"], row["point_depth"]) == (pytest.approx(aep), pytest.approx(40))
    factor = REDUCTIONS["arr-2019"].reduce(1e8, np.array([360.0]), Frequency.of_aep(aep), region="Tasmania").factor
    assert row["reduction"] == pytest.approx(factor.item(), rel=1e-12)
