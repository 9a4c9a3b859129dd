"""Gauges at one place become one."""

from __future__ import annotations

import numpy as np

from basinrain.colocated import merge_colocated
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def test_statuses_and_normals_of_merged_gauges() -> None:
    """The mean of those that report, missing only where none does; normals averaged; zero and wet are observed."""
    network = GaugeNetwork(
        ids=("A", "B", "C"),
        x=np.array([0.0, 900.0, 900.0]),
        y=np.zeros(3),
        crs="local",
        normals=np.array([[800.0], [900.0], [1000.0]]),
    )
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 5) * np.timedelta64(3600, "s")
    depth = [[1.0, 0.0, 3.0], [1.0, NAN, 4.0], [1.0, NAN, NAN], [1.0, 0.0, 0.0]]
    record = RainRecord.from_depths(network.ids, ends - 3600, ends, depth, step="1h")
    merged, rain, notes = merge_colocated(network, record)
    assert merged.ids == rain.gauges == ("A", "B+C")
    assert merged.normals is not None
    assert merged.normals.tolist() == [[800.0], [950.0]]
    assert rain.depth[:, 1].tolist()[:2] == [1.5, 4.0]
    assert [Status(s) for s in rain.status[:, 1]] == [Status.OBSERVED, Status.OBSERVED, Status.MISSING, Status.ZERO]
    assert [note.level for note in notes] == ["info"]


def test_gauges_apart_are_left_alone() -> None:
    """Without gauges at one place nothing changes."""
    network = GaugeNetwork(ids=("A", "B"), x=np.array([0.0, 1.0]), y=np.zeros(2), crs="local")
    ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    record = RainRecord.from_depths(network.ids, ends - 3600, ends, [[1.0, 2.0]], step="1h")
    assert merge_colocated(network, record) == (network, record, ())
