from __future__ import annotations

from dataclasses import replace

import numpy as np
import shapely
from report.small_run import make_run

from basinrain.basins import Basins
from basinrain.gauges import GaugeNetwork
from basinrain.report import limits
from basinrain.results import StormRun


def _wide(run: StormRun, n: int) -> StormRun:
    squares = [shapely.box(k, 0, k + 1, 1) for k in range(n)]
    return replace(
        run, basins=Basins(ids=tuple(f"b{k}" for k in range(n)), polygons=np.array(squares), crs="local").with_union()
    )


def test_the_first_dozen_basins_and_the_union_are_drawn(run: StormRun) -> None:
    """Of 20 basins the last row, the union, is kept."""
    assert limits.drawn_basins(_wide(run, 20)) == [*range(12), 20]
    assert limits.drawn_basins(run) == [0, 1, 2]


def test_what_is_left_out_is_said(run: StormRun) -> None:
    """The sentence names counts and the file; a small run has none."""
    assert limits.left_out(run, "weights.csv") == ()
    assert limits.left_out(_wide(run, 20), "weights.csv") == (
        "Shown here: the first 12 basins and the union of 21 rows. The others are in weights.csv.",
    )
    many = make_run(storms=tuple(f"S{k}" for k in range(6)))
    assert limits.left_out(many, "weights.csv") == (
        "Shown here: the first 4 of 6 storms. The others are in weights.csv.",
    )


def test_a_large_network_is_listed_by_weight(run: StormRun) -> None:
    """Beyond 60 gauges those without weight in any basin are left out of the lists of gauges."""
    n = 70
    network = GaugeNetwork(
        ids=tuple(f"g{k:02d}" for k in range(n)), x=np.arange(n, dtype=float), y=np.zeros(n), crs="local"
    )
    result = run.storms[0]
    weights = np.zeros((3, n))
    weights[:, 0], weights[:, 1], weights[:, 2] = 0.99, 0.006, 0.004
    depths = {
        name: replace(d, table=replace(d.table, gauges=network.ids, weights=weights))
        for name, d in result.depths.items()
    }
    large = replace(run, network=network, storms=(replace(result, depths=depths),))
    assert np.flatnonzero(limits.listed_gauges(large)).tolist() == [0, 1]
    assert limits.listed_gauges(run).all()


def test_storms_that_look_the_same_are_drawn_once() -> None:
    """Two storms with one key share a figure and both are named."""
    run = make_run(storms=("Quill", "Sedge", "Rush"))
    groups = limits.same_storms(run, lambda result: result.storm.name == "Rush")
    assert [(result.storm.name, names) for result, names in groups] == [
        ("Quill", ("Quill", "Sedge")),
        ("Rush", ("Rush",)),
    ]
