"""The areas of a design: the union above every point counts once, and each basin stands by itself."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely
from design_jobs import DEPTHS, QUARTERS, US_REDUCTION, design_tables, write_design_job
from drawn import basins_of
from hypothesis import given
from hypothesis import strategies as st

from basinrain.design_areas import Areas, areas_of
from basinrain.design_job import run_design
from basinrain.errors import JobError, MethodError
from basinrain.jobfile import parse_design_job


def areas(basins: Mapping[str, shapely.Geometry], *points: tuple[str, list[str]]) -> Areas:
    """Return the areas of basins drawn in metres, with points of interest by name and basins."""
    tables = design_tables(design__point=[{"name": name, "basins": above} for name, above in points] or None)
    design = parse_design_job(tables).design
    assert design is not None
    return areas_of(design, basins_of(1.0, **basins).with_union())


def points_of(*points: tuple[str, list[str]]) -> list[dict[str, Any]]:
    return [{"name": name, "basins": above} for name, above in points]


def test_without_points_all_basins_are_one_area() -> None:
    """Four squares of 25 are 100 to one point, called union."""
    found = areas(QUARTERS)
    assert found.names == ("union", "nw", "ne", "sw", "se")
    assert found.basins.areas.tolist() == [100, 25, 25, 25, 25]
    (point,) = found.points
    assert (point.name, point.row, point.basins, point.rows, point.apart) == (
        "union", 0, ("nw", "ne", "sw", "se"), (1, 2, 3, 4), True,
    )  # fmt: skip


def test_one_basin_is_its_own_point() -> None:
    """A single basin stands once, as the point and as the basin."""
    found = areas({"only": shapely.box(0, 0, 5, 5)})
    assert (found.names, found.basins.areas.tolist()) == (("only",), [25])
    assert (found.points[0].row, found.points[0].rows) == (0, (0,))


def test_every_point_has_its_own_area() -> None:
    """The upper point has 50, the outlet 100; a basin above both stands once."""
    found = areas(QUARTERS, ("ford", ["nw", "ne"]), ("mouth", ["se", "nw", "ne", "sw"]))
    assert found.names == ("ford", "mouth", "nw", "ne", "se", "sw")
    assert found.basins.areas.tolist() == [50, 100, 25, 25, 25, 25]
    assert [point.rows for point in found.points] == [(2, 3), (4, 2, 3, 5)]
    assert all(point.apart for point in found.points)


def test_basins_above_no_point_are_left_out() -> None:
    """What drains to no point of interest has no storm."""
    assert areas(QUARTERS, ("ford", ["nw"])).names == ("ford", "nw")


def test_nested_and_overlapping_basins_count_once() -> None:
    """A whole of 100 with its half of 50 is 100; two squares of 25 that share 15 are 35, and neither is apart."""
    nested = areas({"all": shapely.box(0, 0, 10, 10), "half": shapely.box(0, 0, 5, 10)})
    assert (nested.basins.areas.tolist(), nested.points[0].apart) == ([100, 100, 50], False)
    lapping = areas({"a": shapely.box(0, 0, 5, 5), "b": shapely.box(2, 0, 7, 5)})
    assert (lapping.basins.areas.tolist(), lapping.points[0].apart) == ([35, 25, 25], False)


def test_basins_that_lap_by_rounding_are_apart() -> None:
    """Corners that were rounded in the file make no overlap; a metre in ten kilometres does."""
    for lap, apart in [(0.001, True), (1.0, False)]:
        basins = {"a": shapely.box(0, 0, 10_000, 10_000), "b": shapely.box(10_000 - lap, 0, 20_000, 10_000)}
        assert areas(basins).points[0].apart is apart


def test_a_point_may_be_called_as_its_only_basin() -> None:
    """The name stands for both; one that has other basins above it needs its own."""
    found = areas(QUARTERS, ("nw", ["nw"]), ("mouth", ["nw", "ne"]))
    assert found.names == ("nw", "mouth", "ne")
    assert [point.rows for point in found.points] == [(0,), (0, 2)]
    with pytest.raises(
        JobError, match=r"^\[\[design.point\]\] nw: found the id of a basin that is not all that lies above"
    ):
        areas(QUARTERS, ("nw", ["nw", "ne"]))


def test_a_points_only_basin_is_no_area_of_its_own() -> None:
    """The point stands for it, whether it has the basin's name or another; the only basin stands for itself."""
    for found, names in [
        (areas(QUARTERS, ("ford", ["nw"]), ("mouth", ["nw", "ne"])), ["ford", "mouth", "ne"]),
        (areas(QUARTERS, ("nw", ["nw"]), ("mouth", ["nw", "ne"])), ["nw", "mouth", "ne"]),
        (areas({"only": shapely.box(0, 0, 5, 5)}), ["only"]),
    ]:
        assert [found.names[row] for row in found.rows_apart] == names


def test_unknown_basins_are_all_named() -> None:
    """Every basin that there is not is told with the nearest; the union is none."""
    with pytest.raises(JobError, match="basins") as caught:
        areas(QUARTERS, ("ford", ["nw", "nww"]), ("mouth", ["union"]))
    assert str(caught.value).splitlines() == [
        "[[design.point]] ford, basins: found 'nww'; expected the id of a basin; did you mean 'nw'?",
        "[[design.point]] mouth, basins: found 'union'; expected the id of a basin; one of: nw, ne, sw, se",
    ]


@given(st.lists(st.tuples(*[st.integers(0, 8)] * 2, *[st.integers(1, 6)] * 2), min_size=1, max_size=5))
def test_the_area_of_a_point_is_the_ground_that_its_basins_cover(boxes: list[tuple[int, int, int, int]]) -> None:
    """Rectangles on squared paper: the area is the number of squares that any of them covers, each once."""
    paper = np.zeros((14, 14), dtype=int)
    for x, y, width, height in boxes:
        paper[y : y + height, x : x + width] += 1
    found = areas({f"b{k}": shapely.box(x, y, x + w, y + h) for k, (x, y, w, h) in enumerate(boxes)})
    point = found.points[0]
    assert found.basins.areas[point.row] == pytest.approx((paper > 0).sum())
    assert [found.basins.areas[row] for row in point.rows] == [width * height for _, _, width, height in boxes]
    assert point.apart == (paper.max() <= 1)


def test_a_nested_polygon_takes_no_part_of_the_reduction_twice(tmp_path: Path) -> None:
    """100 mi2 with the half within them are reduced as 100 mi2: 53.22 mm, in the basin and in the half."""
    nested = {"all": shapely.box(0, 0, 10, 10), "half": shapely.box(0, 0, 5, 10)}
    run = run_design(write_design_job(tmp_path, squares=nested, design__areal_reduction=US_REDUCTION))
    assert run.design_depths["area"].tolist() == pytest.approx([100])
    assert run.design_depths["area_unit"].tolist() == ["mi2"]
    assert run.design_storms["depth"].round(2).tolist() == [53.22, 53.22]


def test_every_point_of_interest_has_its_own_reduction(tmp_path: Path) -> None:
    """60 mm in 6 h: 53.22 mm on the 100 mi2 to the mouth, more on the 50 mi2 to the ford, by the published formula."""
    job = write_design_job(
        tmp_path,
        design__areal_reduction=US_REDUCTION,
        design__point=points_of(("ford", ["nw", "ne"]), ("mouth", list(QUARTERS))),
    )
    depths = run_design(job).design_depths.set_index("point")
    # Leclerc and Schaake (1972): 1 - e^(-1.1 D^0.25) (1 - e^(-0.01 A)), hours and square miles.
    for point, area in [("ford", 50), ("mouth", 100)]:
        factor = 1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-0.01 * area))
        assert depths.loc[point, "area"] == pytest.approx(area)
        assert depths.loc[point, "areal_depth"] == pytest.approx(60 * factor, rel=1e-9)
    assert depths["areal_depth"].round(2).tolist() == [55.78, 53.22]


def test_overlapping_basins_have_no_own_depths(tmp_path: Path) -> None:
    """The refusal names the point; the same depth for all is made."""
    lapping = {"a": shapely.box(0, 0, 5, 5), "b": shapely.box(2, 0, 7, 5)}
    job = write_design_job(tmp_path, squares=lapping, depths=DEPTHS, design__sub_basins="own-depth")
    with pytest.raises(
        MethodError, match=r"\[\[design.point\]\] union: found basins that overlap; .*write sub_basins ="
    ):
        run_design(job)
    assert len(run_design(job, ["design.sub_basins=same-depth"]).storms) == 1
