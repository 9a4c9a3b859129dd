"""Thiessen polygons: hand cases, hard networks, and ways to the same numbers that share no code."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at
from hypothesis import given, settings
from references import nearest_areas, raster, raster_nearest
from strategies import Case, cases

from basinrain.averaging import thiessen, thiessen_cells, thiessen_pieces, thiessen_weights
from basinrain.basins import Basins
from basinrain.errors import DataError, MethodError
from basinrain.gauges import GaugeNetwork

SQUARE = shapely.box(0, 0, 10, 10)


def xy(network: GaugeNetwork) -> npt.NDArray[np.float64]:
    return np.column_stack((network.x, network.y))


def hollow_archipelago() -> shapely.Geometry:
    """Return a square with a square hole, and an island apart."""
    return shapely.union_all([shapely.box(0, 0, 10, 10) - shapely.box(2, 2, 6, 7), shapely.box(13, 1, 16, 3)])


def test_square_with_a_gauge_outside() -> None:
    """Bisectors x = 5 and x = 9.25: .5, .425, .075 of the square, so .5 x 10 + .425 x 30 + .075 x 100 = 25.25 mm."""
    table = thiessen_weights(gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM), basins_of(KM, square=SQUARE))
    np.testing.assert_allclose(table.weights, [[0.5, 0.425, 0.075]], rtol=1e-12)
    assert table.apply(np.array([10.0, 30.0, 100.0]))[0] == pytest.approx(25.25, rel=1e-12)


def test_halves_of_the_square() -> None:
    """East half .85 x 30 + .15 x 100 = 40.50, west half all of the first gauge = 10, the whole their mean 25.25."""
    halves = basins_of(KM, east=shapely.box(5, 0, 10, 10), west=shapely.box(0, 0, 5, 10)).with_union()
    table = thiessen_weights(gauges_at((2.5, 5), (7.5, 5), (11, 5), unit=KM), halves)
    means = table.apply(np.array([10.0, 30.0, 100.0]))
    np.testing.assert_allclose(means, [40.5, 10.0, 25.25], rtol=1e-12)


def test_a_gauge_too_far_to_count_has_no_weight_at_all() -> None:
    """The third gauge at x = 15 has its bisector at 11.25, beyond the square: weight 0, and it may be silent."""
    table = thiessen_weights(gauges_at((2.5, 5), (7.5, 5), (15, 5), unit=KM), basins_of(KM, square=SQUARE))
    np.testing.assert_allclose(table.weights, [[0.5, 0.5, 0.0]], rtol=1e-12)
    assert table.weights[0, 2] == 0.0
    assert table.apply(np.array([10.0, 30.0, np.nan]))[0] == pytest.approx(20.0)


def test_a_bisector_along_the_border_gives_no_sliver() -> None:
    """With bisectors on x = 1/3 and on the border x = 1, rounding leaves the outer gauge exactly nothing."""
    table = thiessen_weights(
        gauges_at((0, 0), (2 / 3, 0), (4 / 3, 0)), basins_of(unit_square=shapely.box(0, -0.5, 1, 0.5))
    )
    np.testing.assert_allclose(table.weights, [[1 / 3, 2 / 3, 0.0]], rtol=1e-12)
    assert table.weights[0, 2] == 0.0


def test_one_gauge_takes_everything_wherever_it_stands() -> None:
    """A single gauge, inside, on a corner or 1,000 km away, has weight 1."""
    for place in ((5.0, 5.0), (0.0, 0.0), (1000.0, -1000.0)):
        weights = thiessen_weights(gauges_at(place, unit=KM), basins_of(KM, square=SQUARE)).weights
        assert weights.tolist() == [[1.0]]


def test_gauges_in_one_line_share_in_strips() -> None:
    """Gauges at 1, 2, 6, 10 km along a slanting line cut a strip along it at 1.5, 4 and 8 km."""
    along = np.array([1.0, 2.0, 6.0, 10.0])
    places = [(0.8 * s, 0.6 * s) for s in along]
    strip = shapely.Polygon([(0.3, -0.4), (8.3, 5.6), (7.7, 6.4), (-0.3, 0.4)])  # 10 km by 1 km along the line
    weights = thiessen_weights(gauges_at(*places, unit=KM), basins_of(KM, strip=strip)).weights
    np.testing.assert_allclose(weights, [[0.15, 0.25, 0.4, 0.2]], rtol=1e-10)


def test_gauges_on_a_lattice_have_square_cells() -> None:
    """A 7 x 7 lattice, four cells meeting in every corner, shares its square evenly: 1/49 each."""
    places = [(i + 0.5, j + 0.5) for i in range(7) for j in range(7)]
    network = gauges_at(*places, ids=[f"G{k}" for k in range(49)], unit=KM)
    weights = thiessen_weights(network, basins_of(KM, lattice=shapely.box(0, 0, 7, 7))).weights
    np.testing.assert_allclose(weights, np.full((1, 49), 1 / 49), rtol=1e-10)


def test_a_gauge_far_outside_does_not_disturb_the_others() -> None:
    """A gauge 20,000 km away leaves the square's weights as they are without it, to 1e-7."""
    basins = basins_of(KM, square=SQUARE)
    near = thiessen_weights(gauges_at((2, 3), (7, 4), (5, 9), unit=KM), basins).weights
    with_far = thiessen_weights(gauges_at((2, 3), (7, 4), (5, 9), (2e4, 0), unit=KM), basins).weights
    np.testing.assert_allclose(with_far, np.append(near, [[0.0]], axis=1), atol=1e-7)


def test_thousands_of_gauges() -> None:
    """4,000 scattered gauges over a square: weights sum to 1, and agree with a raster of 360,000 points to 5e-5."""
    rng = np.random.default_rng(7)
    x, y = rng.uniform(0.0, 1e5, (2, 4000))
    network = GaugeNetwork(ids=tuple(map(str, range(4000))), x=x, y=y, crs="local")
    square = shapely.box(2e4, 2e4, 8e4, 8e4)
    weights = thiessen_weights(network, basins_of(square=square)).weights[0]
    assert weights.sum() == pytest.approx(1.0, rel=1e-12)
    points = raster(square, 100.0)
    nearest = shapely.STRtree(np.asarray(shapely.points(xy(network)), dtype=object)).nearest(
        np.asarray(shapely.points(points), dtype=object)
    )
    shares = np.bincount(nearest, minlength=4000) / len(points)
    assert np.abs(shares - weights).max() < 5e-5


@settings(max_examples=80, deadline=None)
@given(case=cases())
def test_equals_half_plane_clipping(case: Case) -> None:
    """Every weight is that of the polygon cut by the bisectors one after another, in plain arithmetic."""
    network = case.network.subset(case.present)
    weights = thiessen_weights(case.network, case.basins, case.present).weights[:, case.present]
    for polygon, area, row in zip(case.basins.polygons, case.basins.areas, weights, strict=True):
        np.testing.assert_allclose(row, nearest_areas(polygon, xy(network)) / area, atol=1e-9)


@settings(max_examples=80, deadline=None)
@given(case=cases(at_least=2))
def test_cells_are_those_of_geos(case: Case) -> None:
    """Cells agree in area with GEOS's own Voronoi diagram, cut to the basins' box, and hold their gauge."""
    box = shapely.box(*case.basins.bounds)
    mine = shapely.intersection(thiessen_cells(case.network, around=case.basins.bounds), box)
    points = shapely.MultiPoint(xy(case.network))
    theirs = shapely.get_parts(shapely.voronoi_polygons(points, extend_to=box.buffer(1e5), ordered=True))
    np.testing.assert_allclose(
        shapely.area(mine), shapely.area(shapely.intersection(theirs, box)), atol=1e-9 * box.area
    )


def test_holes_and_islands_are_cut_exactly() -> None:
    """A square with a hole and an island: weights as by half-plane clipping, and within 1e-3 of a dense raster."""
    basin = basins_of(KM, archipelago=hollow_archipelago())
    network = gauges_at((1, 1), (4, 4), (9, 8), (3, 9), (15, 2), (8, 1), unit=KM)
    weights = thiessen_weights(network, basin).weights[0]
    by_clipping = nearest_areas(basin.polygons[0], xy(network))
    np.testing.assert_allclose(weights, by_clipping / basin.areas[0], atol=1e-12)
    assert np.abs(weights - raster_nearest(raster(basin.polygons[0], 40.0), xy(network))).max() < 1e-3


def test_pieces_are_valid_and_fill_every_basin() -> None:
    """Pieces carry their polygons: valid, without overlap, together the basin; the union is cut like the others."""
    basins = basins_of(KM, islands=hollow_archipelago(), inner=shapely.box(2, 2, 6, 7)).with_union()
    network = gauges_at((1, 1), (4, 4), (9, 8), (3, 9), (15, 2), (8, 1), unit=KM)
    pieces = thiessen_pieces(network, basins)
    table = thiessen_weights(network, basins)
    assert shapely.is_valid(pieces.polygon).all()
    assert sorted(zip(pieces.basin, pieces.gauge, strict=True)) == list(zip(pieces.basin, pieces.gauge, strict=True))
    np.testing.assert_allclose(shapely.area(pieces.polygon), pieces.area)
    for b in range(len(basins)):
        mine = pieces.basin == b
        whole = shapely.union_all(pieces.polygon[mine])
        assert shapely.symmetric_difference(whole, basins.polygons[b]).area < 1e-6 * basins.areas[b]
        np.testing.assert_allclose(pieces.area[mine] / basins.areas[b], table.weights[b, pieces.gauge[mine]])


def test_no_gauge_present_gives_no_pieces_and_no_cells() -> None:
    """Without a present gauge there is nothing to draw."""
    network, basins = gauges_at((1, 1), (2, 2)), basins_of(square=SQUARE)
    assert len(thiessen_pieces(network, basins, [False, False]).area) == 0
    assert thiessen_cells(network, [False, False]).tolist() == [None, None]


def test_an_absent_gauge_has_no_cell() -> None:
    """Cells stand in the network's order, None for a gauge that is not present."""
    cells = thiessen_cells(gauges_at((0, 0), (1, 0), (2, 0)), [True, False, True])
    assert cells[1] is None
    assert cells[0].contains(shapely.Point(0.9, 0))
    assert cells[2].contains(shapely.Point(1.1, 0))


def test_overlapping_basins_are_averaged_each_by_itself() -> None:
    """Two basins that overlap and their union, each cut from its own polygon."""
    basins = basins_of(KM, low=shapely.box(0, 0, 8, 10), high=shapely.box(6, 0, 10, 10)).with_union()
    weights = thiessen_weights(gauges_at((2.5, 5), (7.5, 5), unit=KM), basins).weights
    np.testing.assert_allclose(weights, [[5 / 8, 3 / 8], [0.0, 1.0], [0.5, 0.5]], atol=1e-12)


def test_a_polygon_with_a_precision_of_its_own_is_cut_exactly() -> None:
    """A polygon held to whole metres is still cut at the bisector, 5/3 km, not at the metre next to it."""
    square = shapely.set_precision(shapely.box(0, 0, 10, 10), 1.0)
    weights = thiessen_weights(gauges_at((0, 5), (10 / 3, 5)), basins_of(square=square)).weights
    np.testing.assert_allclose(weights, [[1 / 6, 5 / 6]], rtol=1e-12)


def test_gauges_at_one_place_are_named() -> None:
    """Gauges nearer than 1 cm are refused, all pairs together, by name; an absent one does no harm."""
    network = gauges_at((1, 1), (5, 5), (1, 1.004), (5.002, 5))
    basins = basins_of(square=SQUARE)
    with pytest.raises(DataError, match="gauges A and C: found one place for both") as caught:
        thiessen_weights(network, basins)
    assert [p.item for p in caught.value.problems] == ["gauges A and C", "gauges B and D"]
    weights = thiessen_weights(network, basins, [True, True, False, False]).weights
    np.testing.assert_allclose(
        weights, [[0.18, 0.82, 0.0, 0.0]], rtol=1e-12
    )  # the bisector x + y = 6 cuts off 18 of 100


def test_gauges_a_few_centimetres_apart_are_told_apart() -> None:
    """Two gauges 2 cm apart within a network of 200 km halve the cell between them."""
    network = gauges_at((0, 0), (0.02, 0), (1e5, 1e5), (-1e5, -1e5))
    weights = thiessen_weights(network, basins_of(square=shapely.box(-500, -500, 500.02, 500))).weights
    np.testing.assert_allclose(weights, [[0.5, 0.5, 0.0, 0.0]], atol=1e-7)


def test_planes_must_agree_and_be_planes() -> None:
    """Two systems, or longitude and latitude, are refused with both named."""
    network = GaugeNetwork(ids=("A",), x=np.array([10.5]), y=np.array([50.5]), crs="EPSG:4326")
    polygons = np.array([shapely.box(10, 50, 11, 51)], dtype=object)
    with pytest.raises(DataError, match="found 'EPSG:4326' for the gauges and 'EPSG:3035' for the basins"):
        thiessen_weights(network, Basins(ids=("all",), polygons=polygons, crs="EPSG:3035"))
    with pytest.raises(DataError, match="found 'EPSG:4326', which is in degrees; expected a plane"):
        thiessen_pieces(network, Basins(ids=("all",), polygons=polygons, crs="EPSG:4326"))


def test_a_mask_of_another_length_is_refused() -> None:
    """A mask needs one value a gauge."""
    with pytest.raises(DataError, match=r"a mask of shape \(1,\); expected \(2,\), one value a gauge"):
        thiessen_weights(gauges_at((0, 0), (1, 0)), basins_of(square=SQUARE), [True])


def test_a_wrong_tessellation_is_never_passed_on(monkeypatch: pytest.MonkeyPatch) -> None:
    """When cells overlap or leave something out, the basin is named and nothing is returned."""

    def lapping(network: GaugeNetwork, *_: object, **__: object) -> npt.NDArray[np.object_]:
        return np.array([shapely.box(-9, -9, 6, 19), shapely.box(5, -9, 19, 19)], dtype=object)

    monkeypatch.setattr(thiessen, "thiessen_cells", lapping)
    with pytest.raises(
        MethodError, match=r"basin square: found pieces of 110 m²; expected pieces that sum to .* 100 m²"
    ):
        thiessen_weights(gauges_at((2.5, 5), (7.5, 5)), basins_of(square=SQUARE))


def test_what_the_short_cut_over_boxes_cannot_do_is_done_without_it(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where cutting to boxes loses area or fails, whole polygons are cut instead, and the weights are the same."""
    network, basins = gauges_at((2.5, 5), (7.5, 5), (11, 5)), basins_of(square=SQUARE)
    expected = thiessen_weights(network, basins).weights

    def lost(polygons: npt.NDArray[np.object_], cells: object, basin: npt.NDArray[np.int64], gauge: object) -> object:
        return np.full(len(basin), shapely.Polygon(), dtype=object)

    def failing(*_: object) -> object:
        raise shapely.GEOSException("TopologyException")

    for short_cut in (lost, failing):
        monkeypatch.setattr(thiessen, "_cut_to_boxes", short_cut)
        np.testing.assert_allclose(thiessen_weights(network, basins).weights, expected, rtol=1e-12)


def test_a_polygon_that_cannot_be_cut_is_named(monkeypatch: pytest.MonkeyPatch) -> None:
    """When GEOS fails on a basin altogether, the error names the basin."""

    def failing(*_: object) -> object:
        raise shapely.GEOSException("TopologyException: side location conflict")

    monkeypatch.setattr(shapely, "intersection", failing)
    with pytest.raises(
        MethodError, match=r"basin square: found no intersection with the Thiessen cells .*side location"
    ):
        thiessen_weights(gauges_at((2.5, 5), (7.5, 5)), basins_of(square=SQUARE))
