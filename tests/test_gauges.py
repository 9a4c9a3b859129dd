"""The gauge network as a value: order, service, distances, and gauges at one place."""

import numpy as np
import pytest
import strategies
from hypothesis import given
from hypothesis import strategies as st

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork, colocated_groups, refuse_colocated


def network(*places: tuple[float, float], ids: str = "ABCDEFGH", crs: str = "local") -> GaugeNetwork:
    """Return gauges A, B ... at these places."""
    x, y = np.array(places, dtype=float).reshape(-1, 2).T
    return GaugeNetwork(ids=tuple(ids[: len(places)]), x=x, y=y, crs=crs)


def test_what_is_not_given_is_not_known() -> None:
    """Names are the ids; elevations are NaN, times NaT, normals none: nothing is invented."""
    plain = network((0, 0), (1, 1))
    assert plain.names == ("A", "B")
    assert np.isnan(plain.elevation).all()
    assert plain.normals is None
    assert np.isnat(plain.opened).all()
    assert np.isnat(plain.closed).all()


def test_a_network_cannot_be_changed() -> None:
    """Arrays are copies that refuse writing."""
    x = np.array([1.0])
    fixed = GaugeNetwork(ids=("A",), x=x, y=np.array([2.0]), crs="local")
    x[0] = 99
    assert fixed.x[0] == 1
    with pytest.raises(ValueError, match="read-only"):
        fixed.x[0] = 5


def test_a_subset_keeps_everything_of_its_gauges() -> None:
    """Every array is cut alike."""
    whole = GaugeNetwork(
        ids=("A", "B", "C"),
        x=np.array([1.0, 2.0, 3.0]),
        y=np.array([4.0, 5.0, 6.0]),
        crs="local",
        names=("a", "b", "c"),
        elevation=np.array([7.0, 8.0, np.nan]),
        normals=np.array([[10.0], [11.0], [12.0]]),
        normal_period="1991-2020",
        opened=np.array(["2001-01-01", "NaT", "2003-01-01"], dtype="datetime64[s]"),
        closed=np.array(["NaT", "2002-01-01", "NaT"], dtype="datetime64[s]"),
    )
    part = whole.subset([True, False, True])
    assert (part.ids, part.names, part.x.tolist(), part.y.tolist()) == (("A", "C"), ("a", "c"), [1, 3], [4, 6])
    np.testing.assert_array_equal(part.elevation, [7, np.nan])
    assert part.normals is not None
    assert part.normals.tolist() == [[10], [12]]
    assert part.normal_period == "1991-2020"
    np.testing.assert_array_equal(part.opened, whole.opened[[0, 2]])
    np.testing.assert_array_equal(part.closed, whole.closed[[0, 2]])
    assert len(whole.subset([False, False, False])) == 0


@given(strategies.networks())
def test_ranks_follow_the_ids(gauges: GaugeNetwork) -> None:
    """The gauge of rank k has the k-th id in sorted order, whatever the network's order."""
    assert [gauges.ids[i] for i in np.argsort(gauges.id_rank)] == sorted(gauges.ids)


@given(strategies.networks())
def test_distances_by_brute_force(gauges: GaugeNetwork) -> None:
    """Between local gauges they are those of Pythagoras, and the same both ways."""
    got = gauges.distances()
    for i in range(len(gauges)):
        for j in range(len(gauges)):
            expected = ((gauges.x[i] - gauges.x[j]) ** 2 + (gauges.y[i] - gauges.y[j]) ** 2) ** 0.5
            assert got[i, j] == pytest.approx(expected, rel=1e-12)
    np.testing.assert_array_equal(got, got.T)


def test_service_is_from_an_instant_to_an_instant() -> None:
    """An interval counts when it lies wholly within the service, its ends included; no limit is always in service."""
    gauges = GaugeNetwork(
        ids=("A", "B"),
        x=np.array([0.0, 1.0]),
        y=np.array([0.0, 0.0]),
        crs="local",
        opened=np.array(["2031-05-01T06:00", "NaT"], dtype="datetime64[s]"),
        closed=np.array(["2031-05-01T09:00", "NaT"], dtype="datetime64[s]"),
    )
    ends = np.arange("2031-05-01T06", "2031-05-01T11", dtype="datetime64[h]").astype("datetime64[s]")
    starts = np.arange("2031-05-01T05", "2031-05-01T10", dtype="datetime64[h]").astype("datetime64[s]")
    assert gauges.in_service(starts, ends).T.tolist() == [[False, True, True, True, False], [True] * 5]


def test_positions_move_and_the_rest_stays() -> None:
    """Changing the coordinate system changes x, y and crs only."""
    there = network((-157.8168, 21.2716), crs="EPSG:4326").to_crs("EPSG:26904")
    assert there.crs == "EPSG:26904"
    np.testing.assert_allclose((there.x[0], there.y[0]), (622751.8, 2352667.2), atol=0.1)
    assert there.ids == ("A",)


def test_all_that_is_wrong_is_told_together() -> None:
    """Ids, lengths and positions are checked in one pass."""
    with pytest.raises(
        DataError,
        match=r"^gauge A: found the id twice; expected each gauge once; rename or remove one of them\n"
        r"a gauge: found an empty id; expected an id for every gauge\n"
        r"elevation: found 2 values; expected 3, one a gauge\n"
        r"normals: found an array of shape \(3, 2\); expected \(3, 1\) for the year or \(3, 12\) for the months\n"
        r"gauge A: found position \(0.0, inf\); expected two finite coordinates$",
    ):
        GaugeNetwork(
            ids=("A", "A", " "),
            x=np.array([0.0, 0.0, 0.0]),
            y=np.array([0.0, np.inf, 0.0]),
            crs="local",
            elevation=np.array([1.0, 2.0]),
            normals=np.ones((3, 2)),
        )


@pytest.mark.parametrize(
    ("places", "groups"),
    [
        ([(0, 0)], []),
        ([(0, 0), (0.02, 0)], []),
        ([(0, 0), (0.009, 0)], [("A", "B")]),
        ([(0, 0), (5, 5), (0, 0), (5, 5), (5, 5), (9, 9)], [("A", "C"), ("B", "D", "E")]),
        # B is within reach of both A and C.
        ([(0, 0), (0.008, 0), (0.016, 0)], [("A", "B", "C")]),
        ([(600_000.0, 2_300_000.0), (600_000.0, 2_300_000.0)], [("A", "B")]),
    ],
)
def test_gauges_at_one_place(places: list[tuple[float, float]], groups: list[tuple[str, ...]]) -> None:
    """Within a centimetre is one place; groups and their gauges stand in the network's order."""
    assert colocated_groups(network(*places)) == groups


def test_no_gauges_stand_together() -> None:
    """An empty network has no groups."""
    assert colocated_groups(network()) == []


def test_gauges_at_one_place_are_refused_by_name() -> None:
    """Every place is one line, with the ways out."""
    advice = 'expected places apart; correct a position, exclude all but one, or average them with colocated = "mean"'
    with pytest.raises(
        DataError,
        match=rf"^gauges A and C: found one place \(x 0\.00, y 1\.50\); {advice}\n"
        rf"gauges B, D and E: found one place \(x 5\.00, y 5\.00\); {advice}$",
    ):
        refuse_colocated(network((0, 1.5), (5, 5), (0, 1.5), (5, 5), (5, 5)))


@given(strategies.networks(), st.integers(0, 100))
def test_apart_is_accepted(gauges: GaugeNetwork, pick: int) -> None:
    """Networks of distinct places pass, and stop passing once a gauge is set beside another."""
    refuse_colocated(gauges)
    beside = pick % len(gauges)
    twice = GaugeNetwork(
        ids=(*gauges.ids, "beside"),
        x=np.array([*gauges.x, gauges.x[beside] + 0.005]),
        y=np.array([*gauges.y, gauges.y[beside]]),
        crs="local",
    )
    assert colocated_groups(twice) == [(gauges.ids[beside], "beside")]


# On a line, T in the middle: distances 1, 1, 2, 3 km.
LINE = GaugeNetwork(ids=("T", "D", "C", "B", "A"), x=np.array([0.0, 1e3, -1e3, 2e3, -3e3]), y=np.zeros(5), crs="local")


def test_nearest_come_first_and_ties_go_by_id() -> None:
    """C and D are both 1 km away; C comes first by its id though D stands before it in the file."""
    assert [LINE.ids[g] for g in LINE.nearest_first(LINE.distances()[0])] == ["T", "C", "D", "B", "A"]


def test_rounding_makes_no_difference_between_equal_distances() -> None:
    """One part in 10 to the 12 is rounding, one in 10 000 is not; so row by row, and among some gauges only."""
    rounded = np.array([0.0, 1e3, 1e3 * (1 + 1e-12), 2e3, 3e3])
    apart = np.array([0.0, 1e3, 1e3 * (1 + 1e-4), 2e3, 3e3])
    both = np.array([rounded, rounded[::-1]])
    assert LINE.nearest_first(rounded).tolist() == [0, 2, 1, 3, 4]
    assert LINE.nearest_first(apart).tolist() == [0, 1, 2, 3, 4]
    assert LINE.nearest_first(np.array([rounded, apart])).tolist() == [[0, 2, 1, 3, 4], [0, 1, 2, 3, 4]]
    assert LINE.nearest_first(np.array([1e3, 5.0, 1e3 * (1 - 1e-12)]), np.array([1, 3, 2])).tolist() == [1, 2, 0]
    assert LINE.nearest_first(both)[1].tolist() == [4, 3, 2, 1, 0]


def test_no_gauges_have_no_order() -> None:
    """An empty network has an empty order."""
    nobody = GaugeNetwork(ids=(), x=np.empty(0), y=np.empty(0), crs="local")
    assert nobody.nearest_first(np.empty(0)).shape == (0,)


def test_a_mask_of_another_length_is_refused() -> None:
    """A mask that is too short would leave gauges out without a word."""
    network = GaugeNetwork(ids=("A", "B", "C"), x=np.arange(3.0), y=np.zeros(3), crs="local")
    with pytest.raises(IndexError, match="boolean index did not match"):
        network.subset([True, False])
