"""The areal reduction that a job asks for, with the values that the job states."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from design_jobs import US_REDUCTION, design_tables, write_design_job

from basinrain.design_job import run_design
from basinrain.design_reduction import reducer, stated_options
from basinrain.designstorm.areal_reduction import arr_2019, keers_wescott
from basinrain.designstorm.depth_chain import Reducer
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM, PARTIAL_DURATION, Frequency
from basinrain.errors import JobError, MethodError, ReadError
from basinrain.jobfile import parse_design_job
from basinrain.jobfile.design_tables import ArealReductionTable

TEN = Frequency(10.0, ANNUAL_MAXIMUM)
HOURS = np.array([60.0, 360.0])
OWN: dict[str, Any] = {
    "method": "exponential",
    "coefficients": {"c1": 0.0028, "c2": 0.9, "c3": 0.27},
    "source": "invented study",
}


def reducer_of(folder: Path = Path(), **table: Any) -> Reducer | None:  # noqa: ANN401 - values of a job
    job = parse_design_job(design_tables(design__areal_reduction=table or None), folder=folder)
    assert job.design is not None
    return reducer(job, job.design)


def factors(area: float, folder: Path = Path(), **table: Any) -> list[float]:  # noqa: ANN401 - values of a job
    reduce = reducer_of(folder, **table)
    assert reduce is not None
    result: list[float] = reduce(area, HOURS, TEN).factor.tolist()
    return result


def test_nothing_is_reduced_unless_asked() -> None:
    """Without the table, and with the method none, there is no reduction."""
    assert reducer_of() is None
    assert reducer_of(method="none") is None


def test_a_method_without_options() -> None:
    """The factors are those of the method's own formula."""
    assert factors(1e8, method="keers-wescott") == pytest.approx(keers_wescott(1e8, HOURS).tolist())


def test_a_region_is_handed_on() -> None:
    """The Australian factors are those of the region and of the probability."""
    expected = arr_2019(1e8, HOURS, aep=0.1, region="Tasmania")
    assert factors(1e8, method="arr-2019", region="Tasmania") == pytest.approx(expected.tolist())


def test_a_partial_duration_series_has_no_probability_to_reduce_by() -> None:
    """The Australian factors go by AEP: a return period of another series is refused, and convert named."""
    asked: dict[str, Any] = {"design__areal_reduction": {"method": "arr-2019", "region": "Tasmania"}}
    job = parse_design_job(design_tables(**asked), folder=Path())
    assert job.design is not None
    reduce = reducer(job, job.design)
    assert reduce is not None
    with pytest.raises(MethodError, match=r"found 2 years of a partial duration series.*convert = true"):
        reduce(1e8, HOURS, Frequency(2.0, PARTIAL_DURATION))


def test_coefficients_of_the_job() -> None:
    """1 - (1 - e^(-c1 A)) e^(-c2 d^c3), A in km² and d in hours."""
    by_hand = [1 - (1 - np.exp(-0.28)) * np.exp(-0.9 * hours**0.27) for hours in (1, 6)]
    assert factors(1e8, **OWN) == pytest.approx(by_hand, rel=1e-12)


def test_the_range_of_coefficients_is_held() -> None:
    """Areas in their unit and durations outside the range are refused, or clamped where the job asks."""
    table = {**OWN, "valid": ["1h", "24h"], "valid_areas": [5, 40], "area_unit": "mi2"}
    assert factors(40 * 1609.344**2, **table)
    with pytest.raises(MethodError, match=r'outside = "clamp" takes the factor of the range\'s nearest end'):
        factors(41 * 1609.344**2, **table)
    clamped = reducer_of(**table, outside="clamp")
    assert clamped is not None
    found = clamped(1e8 * 10, HOURS, TEN)
    assert found.factor.tolist() == pytest.approx(factors(40 * 1609.344**2, **table), rel=1e-12)
    assert len(found.clamped) == 1
    short = reducer_of(**table, outside="refuse")
    assert short is not None
    with pytest.raises(MethodError, match="duration"):
        short(5e7, np.array([30.0]), TEN)


def test_a_table_of_factors(tmp_path: Path) -> None:
    """Nodes of the user's own file are given back, areas in the unit that the job declares."""
    (tmp_path / "factors.csv").write_text("duration,10,100\n1h,0.9,0.75\n6h,0.96,0.9\n")
    table = {"method": "table", "file": "factors.csv", "source": "invented", "area_unit": "mi2"}
    assert factors(100 * 1609.344**2, tmp_path, **table) == pytest.approx([0.75, 0.9])
    (tmp_path / "factors.csv").write_text("duration,10,100\n1h,1.2,0.75\n6h,0.96,0.9\n")
    with pytest.raises(ReadError, match=r"factors.csv:2: "):
        reducer_of(tmp_path, **table)
    with pytest.raises(ReadError, match=r"none.csv: the file: found nothing of that name"):
        reducer_of(tmp_path, **{**table, "file": "none.csv"})


def test_options_that_the_job_states() -> None:
    """A region, coefficients, or none; what the coefficients lack is told by name, in the order of the alphabet."""
    assert stated_options("leclerc-schaake", ArealReductionTable(method="leclerc-schaake")) == {}
    assert stated_options("arr-2019", ArealReductionTable(method="arr-2019", region="Tasmania")) == {
        "region": "Tasmania"
    }
    assert stated_options("table", ArealReductionTable(method="table", file="f.csv")) == {}
    given = stated_options(
        "exponential", ArealReductionTable.model_validate({**OWN, "valid_areas": [1, 2], "area_unit": "ha"})
    )
    assert (given["coefficients"].c2, given["coefficients"].areas, given["coefficients"].minutes) == (
        0.9,
        (1e4, 2e4),
        None,
    )
    with pytest.raises(
        JobError, match=r"c1: found none; (.|\n)*c3: found none; (.|\n)*c0: found it; (.|\n)*c9: found it; "
    ):
        stated_options(
            "exponential", ArealReductionTable.model_validate({**OWN, "coefficients": {"c9": 1, "c2": 1, "c0": 1}})
        )


def quarters(side: float) -> dict[str, shapely.Polygon]:
    """Return four squares that make one of 2 x 2 sides."""
    return {name: shapely.box(x, y, x + side, y + side) for name, x, y in [("nw", 0, side), ("ne", side, side)]} | {
        name: shapely.box(x, 0, x + side, side) for name, x in [("sw", 0), ("se", side)]
    }


@pytest.mark.parametrize(("unit", "side", "area"), [("mi", 5, 100), ("km", 5 * 1.609344, 258.9988110336)])
def test_four_basins_of_25_square_miles(tmp_path: Path, unit: str, side: float, area: float) -> None:
    """60 mm in 6 h on 100 mi², drawn in miles or in kilometres: 53.22 mm each by Leclerc and Schaake (1972).

    By each basin's own 25 mi² it is 57.63 mm, only where the job asks for it, and said.
    """
    job = write_design_job(tmp_path, unit=unit, squares=quarters(side), design__areal_reduction=US_REDUCTION)
    run = run_design(job)
    assert run.design_depths["area"].tolist() == pytest.approx([area])
    by_hand = 60 * (1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-1)))
    assert run.design_storms["depth"].tolist() == pytest.approx([by_hand] * 4, rel=1e-9)
    assert round(by_hand, 2) == 53.22
    own = run_design(job, ["design.areal_reduction.area=own"])
    assert own.design_storms["depth"].round(2).tolist() == [57.63] * 4
    assert "own-area" in {note.code for note in own.notes} - {note.code for note in run.notes}


def test_a_method_of_another_region_is_only_compared(tmp_path: Path) -> None:
    """The British factors are shown beside, and are told to be outside their region."""
    table = {**US_REDUCTION, "compare": ["keers-wescott"]}
    (compared,) = run_design(write_design_job(tmp_path, design__areal_reduction=table)).compared
    assert (compared.method.name, compared.outside) == ("keers-wescott", True)
    area = 100 * 1609.344**2
    assert compared.factors["union", TEN, 360] == pytest.approx(keers_wescott(area, HOURS)[1], rel=1e-9)


def test_an_area_outside_the_range(tmp_path: Path) -> None:
    """40 x 40 mi are over the 400 mi² of the method: refused, or clamped and said."""
    squares = {"large": shapely.box(0, 0, 40, 40)}
    job = write_design_job(tmp_path, squares=squares, design__areal_reduction=US_REDUCTION)
    with pytest.raises(MethodError, match=r"leclerc-schaake, area: found .*1600 mi².*; expected at most .*400 mi²"):
        run_design(job)
    run = run_design(job, ["design.areal_reduction.outside=clamp"])
    by_hand = 60 * (1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-4)))
    assert run.design_storms["depth"].tolist() == pytest.approx([by_hand], rel=1e-6)
    assert "reduction-clamped" in {note.code for note in run.warnings}
