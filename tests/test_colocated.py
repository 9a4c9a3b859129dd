"""Gauges at one place become one."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pytest

from basinrain.colocated import merge_colocated
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import KnownTotal, RainRecord, Status

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


HOUR = np.timedelta64(3600, "s")
ENDS = np.datetime64("2031-05-04T00", "s") + np.arange(1, 3) * HOUR


def pair(
    depth: object,
    status: object,
    totals: tuple[KnownTotal, ...] = (),
    normals: object = None,
    service: Mapping[str, object] | None = None,
) -> tuple[GaugeNetwork, RainRecord]:
    """Return two hours of A, which stands alone, and of B and C at one place."""
    network = GaugeNetwork(
        ids=("A", "B", "C"),
        x=np.array([0.0, 900.0, 900.0]),
        y=np.zeros(3),
        crs="local",
        normals=None if normals is None else np.array(normals, dtype=float),
        **{name: np.array(times, dtype="datetime64[s]") for name, times in (service or {}).items()},  # type: ignore[arg-type]
    )
    values, codes = np.array(depth, dtype=float), np.array(status, dtype=np.uint8)
    return network, RainRecord(network.ids, ENDS - HOUR, ENDS, values, codes, step="1h", totals=totals)


SEEN, ZERO, GAP, SPREAD, ABSENT = Status.OBSERVED, Status.ZERO, Status.MISSING, Status.SPREAD, Status.NOT_INSTALLED


@pytest.mark.parametrize(
    ("one", "other", "merged"),
    [
        ((4.0, SEEN), (2.0, SPREAD), (3.0, SPREAD)),
        ((4.0, SEEN), (0.0, SPREAD), (2.0, SPREAD)),
        ((0.0, ZERO), (2.0, SPREAD), (1.0, SPREAD)),
        ((NAN, GAP), (2.0, SPREAD), (2.0, SPREAD)),
        ((NAN, ABSENT), (NAN, GAP), (NAN, GAP)),
        ((NAN, GAP), (NAN, ABSENT), (NAN, GAP)),
        ((NAN, ABSENT), (NAN, ABSENT), (NAN, ABSENT)),
        ((NAN, ABSENT), (2.0, SEEN), (2.0, SEEN)),
        ((0.0, ZERO), (2.0, SEEN), (1.0, SEEN)),
        ((0.0, ZERO), (0.0, ZERO), (0.0, ZERO)),
    ],
)
def test_status_of_the_mean(
    one: tuple[float, Status], other: tuple[float, Status], merged: tuple[float, Status]
) -> None:
    """Spread where any of them is, a gap as long as one is in service, else as the first that reports; in any order."""
    for first, second in ((one, other), (other, one)):
        cells = [[1.0, first[0], second[0]]] * 2, [[SEEN, first[1], second[1]]] * 2
        _, rain, _ = merge_colocated(*pair(*cells))
        np.testing.assert_array_equal(rain.depth[0], [1.0, merged[0]])
        assert rain.status[0].tolist() == [SEEN, merged[1]]


def test_a_normal_that_one_of_them_lacks_is_the_others() -> None:
    """Known and unknown is the known one, two known are averaged, two unknown stay unknown."""
    normals = [[9.0] * 12, [80.0, NAN, NAN, 20.0] + [50.0] * 8, [100.0, 60.0, NAN, NAN] + [50.0] * 8]
    merged, _, _ = merge_colocated(*pair(np.ones((2, 3)), np.zeros((2, 3)), normals=normals))
    assert merged.normals is not None
    np.testing.assert_array_equal(merged.normals[1], [90.0, 60.0, NAN, 20.0] + [50.0] * 8)


def test_service_is_that_of_them_all() -> None:
    """From the earliest opening to the latest closing; without a limit where one of them has none."""
    limited = {"opened": ["NaT", "2000-01-01", "1990-01-01"], "closed": ["NaT", "2040-01-01", "2050-01-01"]}
    open_ended = {"opened": ["2010-01-01", "2000-01-01", "NaT"], "closed": ["2040-01-01", "NaT", "2041-01-01"]}
    cells = np.ones((2, 3)), np.zeros((2, 3))
    merged, _, _ = merge_colocated(*pair(*cells, service=limited))
    assert [str(merged.opened[1])[:4], str(merged.closed[1])[:4]] == ["1990", "2050"]
    assert np.isnat([merged.opened[0], merged.closed[0]]).all()
    merged, _, _ = merge_colocated(*pair(*cells, service=open_ended))
    assert np.isnat([merged.opened[1], merged.closed[1]]).all()
    assert [str(merged.opened[0])[:4], str(merged.closed[0])[:4]] == ["2010", "2040"]


def test_totals_of_merged_and_other_gauges() -> None:
    """A keeps its total; what B and C know over the two hours is the sum of their means, 3 + 5 = 8, once."""
    bounds = ENDS[0] - HOUR, ENDS[1]
    totals = tuple(KnownTotal(gauge, *bounds, mm) for gauge, mm in (("A", 2.0), ("B", 4.0), ("C", 12.0)))
    _, rain, _ = merge_colocated(*pair([[1.0, 2.0, 4.0], [1.0, 2.0, 8.0]], [[SPREAD, SPREAD, SPREAD]] * 2, totals))
    assert rain.totals == (KnownTotal("A", *bounds, 2.0), KnownTotal("B+C", *bounds, 8.0))
