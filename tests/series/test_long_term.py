"""Long-term figures of a series, and what single gauges do to them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import basins_of, gauges_at

from basinrain.infill import InfillOptions
from basinrain.rainfall import RainRecord, Status
from basinrain.series.engine import SeriesEngine, SeriesSetup
from basinrain.series.flags import Flag
from basinrain.series.long_term import gauges_to_leave_out, left_out, long_term
from basinrain.series.policies import GAPS, REWEIGHT

N = np.nan


@dataclass
class Stored:
    """Series of one policy and method."""

    values: npt.NDArray[np.float64]
    shares: npt.NDArray[np.float32]
    marks: npt.NDArray[np.uint8]
    series: tuple[tuple[str, str], ...] = (("infill", "thiessen"),)

    @property
    def n_steps(self) -> int:
        """Steps of the series."""
        return len(self.values)

    def depth(self, *_: str) -> npt.NDArray[np.float64]:
        """Return the depths."""
        return self.values

    def observed_share(self, *_: str) -> npt.NDArray[np.float32]:
        """Return the shares."""
        return self.shares

    def flags(self, *_: str) -> npt.NDArray[np.uint8]:
        """Return the marks."""
        return self.marks


def daily(depth: Sequence[Sequence[float]] | npt.NDArray[np.float64], gauges: tuple[str, ...]) -> RainRecord:
    values = np.array(depth, dtype=float)
    ends = np.datetime64("2031-05-02", "s") + np.arange(len(values)) * np.timedelta64(86400, "s")
    return RainRecord.from_depths(gauges, ends - 86400, ends, values, step="1d")


def strip(**given: object) -> SeriesSetup:
    """Return a strip of 30 km with A, B and C in the middles of its thirds."""
    options: dict[str, object] = {
        "network": gauges_at((5, 5), (15, 5), (25, 5), unit=1000.0),
        "basins": basins_of(1000.0, strip=shapely.box(0, 0, 30, 10), west=shapely.box(0, 0, 10, 10)),
        "methods": {"thiessen": {}},
        "gaps": (REWEIGHT,),
        "infill": InfillOptions(method="station-average", scale="step"),
        **given,
    }
    return SeriesSetup(**options)  # type: ignore[arg-type]


def test_sums_shares_and_counts() -> None:
    """Steps without a number count in nothing but as missing; a basin without any has no total."""
    depth = np.array([[1.0, N], [N, N], [3.0, N]])
    share = np.array([[1.0, N], [N, N], [0.5, N]], dtype=np.float32)
    marks = np.array([[Flag.SPREAD, 16], [16, 16], [Flag.INFILLED | Flag.REWEIGHTED, 16]], dtype=np.uint8)
    found = long_term(Stored(depth, share, marks), "infill", "thiessen", np.array([60.0, 120.0, 180.0]))
    np.testing.assert_array_equal(found.total, [4, N])
    np.testing.assert_array_equal(found.observed_share, [0.75, N])
    assert found.seconds.tolist() == [240, 0]
    assert found.steps.tolist() == [2, 0]
    assert found.infilled.tolist() == [1, 0]
    assert found.reweighted.tolist() == [1, 0]
    assert found.missing.tolist() == [1, 3]


def test_a_gauge_left_out_by_hand() -> None:
    """Without B its third goes to A and C by halves; the western third is A's alone and does not change."""
    record = daily([[3, 9, 6], [0, 3, 0]], ("A", "B", "C"))
    (found,) = left_out(strip(), [lambda: (record, None)], ["B"])
    np.testing.assert_allclose(found.with_it, [(6 + 1) / 2, 1.5])
    np.testing.assert_allclose(found.without, [(4.5 + 0) / 2, 1.5])
    np.testing.assert_allclose(found.percent, [100 * (2.25 / 3.5 - 1), 0], atol=1e-12)


def test_means_are_over_steps_with_both() -> None:
    """A step that only the gauge itself has does not enter either mean."""
    record = daily([[3, 9, 6], [N, 30, N]], ("A", "B", "C"))
    (found,) = left_out(strip(), [lambda: (record, None)], ["B"])
    np.testing.assert_allclose(found.with_it, [6, 3])
    np.testing.assert_allclose(found.without, [4.5, 3])


def test_dry_means_have_no_percentage() -> None:
    """No change is stated in proportion to a mean of zero."""
    record = daily([[0, 9, 6]], ("A", "B", "C"))
    (found,) = left_out(strip(), [lambda: (record, None)], ["B"])
    assert found.with_it[1] == 0
    assert np.isnan(found.percent[1])


def test_left_out_in_chunks_and_by_every_policy() -> None:
    """Chunks add up, and leaving a gauge out is computing without it."""
    rng = np.random.default_rng(4)
    depth = np.round(rng.gamma(0.6, 6, (40, 3)), 1)
    depth[rng.random(depth.shape) < 0.2] = N
    record = daily(depth, ("A", "B", "C"))
    setup = strip(gaps=GAPS)
    chunks = [lambda: (record.window(0, 17), None), lambda: (record.window(17, 40), None)]
    status, values = record.status.copy(), record.depth.copy()
    status[:, 0], values[:, 0] = Status.NOT_INSTALLED, N
    engine = SeriesEngine(setup)
    without = engine.compute(replace(record, status=status, depth=values))
    whole = engine.compute(record)
    for found in left_out(setup, chunks, ["A"]):
        mine, theirs = without[found.gaps, found.method].depth, whole[found.gaps, found.method].depth
        both = ~np.isnan(mine) & ~np.isnan(theirs)
        np.testing.assert_allclose(found.without, np.where(both, mine, 0).sum(axis=0) / both.sum(axis=0))
        np.testing.assert_allclose(found.with_it, np.where(both, theirs, 0).sum(axis=0) / both.sum(axis=0))


def test_gauges_are_told_as_they_are_left_out() -> None:
    """Progress names each gauge."""
    told: list[str] = []
    left_out(strip(), [lambda: (daily([[1, 2, 3]], ("A", "B", "C")), None)], ["C", "A"], progress=told.append)
    assert told == ["C", "A"]


def test_small_networks_are_tried_whole_and_large_ones_by_what_gauges_put_in() -> None:
    """Gauges that never report are not left out; of thirty, the twenty that put most into a mean are."""
    record = daily([[3, N, 6]], ("A", "B", "C"))
    assert gauges_to_leave_out(strip(), record) == ("A", "C")
    network = gauges_at(*[(2 * k + 1, 5) for k in range(30)], ids=[f"G{k:02d}" for k in range(30)])
    setup = strip(network=network, basins=basins_of(1.0, all=shapely.box(0, 0, 60, 10)))
    wet = np.arange(30.0)
    chosen = gauges_to_leave_out(setup, daily(wet[None, :], network.ids))
    assert chosen == tuple(f"G{k:02d}" for k in range(29, 9, -1))


def test_nothing_is_left_out_of_an_unknown_gauge() -> None:
    """A gauge that is not in the record is an error of the caller."""
    with pytest.raises(ValueError, match=r"tuple\.index"):
        left_out(strip(), [lambda: (daily([[1, 2, 3]], ("A", "B", "C")), None)], ["Q"])
