"""Which gauges donate."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill.donors import choose_donors, distances_from, donor_order

# On a line, the target T in the middle: distances 1, 1, 2, 3 km.
LINE = GaugeNetwork(ids=("T", "D", "C", "B", "A"), x=np.array([0.0, 1e3, -1e3, 2e3, -3e3]), y=np.zeros(5), crs="local")
EVERYONE = np.ones(5, dtype=bool)


def donors(reporting: np.ndarray = EVERYONE, **options: object) -> list[str]:
    chosen = choose_donors(LINE, 0, reporting, **{"nearest": "all", **options})  # type: ignore[arg-type]
    return [gauge for gauge, yes in zip(LINE.ids, chosen, strict=True) if yes]


def test_the_nearest_reporting_ones_donate() -> None:
    """With C silent the two nearest reporting gauges are D and B."""
    assert donors(nearest=2) == ["D", "C"]
    assert donors(np.array([True, True, False, True, True]), nearest=2) == ["D", "B"]


def test_one_of_two_equally_near_is_chosen_by_id() -> None:
    """Of C and D, both 1 km away, the nearest one is C."""
    assert donors(nearest=1, min_donors=1) == ["C"]


def test_the_target_never_donates_to_itself() -> None:
    """T reports here, and is still no donor."""
    assert donors() == ["D", "C", "B", "A"]


def test_radius_includes_its_edge() -> None:
    """2 km away is within 2 km."""
    assert donors(radius=2e3) == ["D", "C", "B"]


def test_too_few_donors_are_none() -> None:
    """Two within 1 km where three are asked for."""
    assert donors(radius=1e3, min_donors=2) == ["D", "C"]
    assert donors(radius=1e3, min_donors=3) == []


def test_a_gauge_at_the_targets_place_does_not_donate() -> None:
    """Its distance is zero, which no inverse distance can use."""
    network = GaugeNetwork(ids=("T", "U", "V"), x=np.array([5.0, 5.0, 9.0]), y=np.zeros(3), crs="local")
    chosen = choose_donors(network, 0, np.ones(3, dtype=bool), nearest="all", min_donors=1)
    assert chosen.tolist() == [False, False, True]


def test_distances_are_geodesic_on_the_map() -> None:
    """One degree of latitude at the equator is 110 574 m on the WGS 84 ellipsoid (Karney 2013), not 111 195 m."""
    network = GaugeNetwork(ids=("A", "B"), x=np.zeros(2), y=np.array([0.0, 1.0]), crs="EPSG:4326")
    assert distances_from(network, 0) == pytest.approx([0, 110574.4], abs=0.1)


# T at 300 m; D 100, C 200 and B 201 m off; A's elevation is not known.
HIGH = replace(LINE, elevation=np.array([300.0, 200.0, 500.0, 501.0, np.nan]))
KNOWN = np.array([True, True, True, True, False])


def test_gauges_at_other_elevations_do_not_donate() -> None:
    """C is just 200 m above the target, B a metre more; A without an elevation does not report."""
    for limit, chosen in ((200, [1, 2]), (201, [1, 2, 3]), (99, [])):
        donors = choose_donors(HIGH, 0, KNOWN, nearest="all", min_donors=1, elevation_limit=limit)
        assert np.flatnonzero(donors).tolist() == chosen


def test_the_next_of_like_elevation_steps_in() -> None:
    """The two nearest within 201 m are D and C; with C silent D and B."""
    silent = KNOWN & (np.arange(5) != 2)
    assert np.flatnonzero(choose_donors(HIGH, 0, silent, nearest=2, elevation_limit=201)).tolist() == [1, 3]


def test_every_gauge_without_an_elevation_is_named() -> None:
    """The silent target and a reporting gauge; another gauge that reports nowhere does not matter."""
    bare = replace(HIGH, elevation=np.array([np.nan, 200.0, np.nan, 501.0, np.nan]))
    with pytest.raises(DataError) as caught:
        choose_donors(bare, 0, KNOWN & (np.arange(5) > 0), nearest=2, elevation_limit=50)
    assert str(caught.value).splitlines() == [
        f"gauge {gauge}: found no elevation; expected one, since [infill] elevation_limit is set; give it, leave the "
        "gauge out, or remove elevation_limit"
        for gauge in ("T", "C")
    ]


def test_another_order_than_by_distance() -> None:
    """The farthest comes first, C and D tie, and A may not donate."""
    farthest_first = 9e3 - distances_from(LINE, 0)
    order = donor_order(LINE, 0, EVERYONE, rank_by=farthest_first, among=np.array([1, 1, 1, 1, 0], bool))
    assert [LINE.ids[k] for k in order] == ["B", "C", "D"]
