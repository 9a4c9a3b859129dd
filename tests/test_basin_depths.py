"""Basin depths of a storm and where they come from, with every expected number as visible arithmetic."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from strips import BASINS, NAN, NETWORK, hourly

from basinrain import basin_depths
from basinrain.averaging import averaging_method
from basinrain.basin_depths import BasinDepths, average_storm, spread_across_methods
from basinrain.basins import Basins
from basinrain.errors import MethodError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete
from basinrain.rainfall import RainRecord, Status
from basinrain.weights import WeightTable


def averaged(record: RainRecord, options: InfillOptions, method: str = "arithmetic") -> BasinDepths:
    completed = complete(record, NETWORK, options)
    return average_storm(completed, averaging_method(method)(NETWORK, BASINS))


def test_gap_in_the_middle_of_a_storm_by_hand() -> None:
    """B = 6, 9, 5.5, 1 by the station average; mean 20.50; contributions 9.167, 2.333, 9.000; never 15.67."""
    record = hourly([[5, 6, 4], [10, NAN, 8], [5, NAN, 6], [0, 1, 2]])
    result = averaged(record, InfillOptions(method="station-average", scale="step"))
    assert result.depth[:, 0] == pytest.approx([(5 + 6 + 4) / 3, (10 + 9 + 8) / 3, (5 + 5.5 + 6) / 3, (0 + 1 + 2) / 3])
    assert result.total[0] == pytest.approx(20.50)
    # A: 20/3 of its own and half of (10 + 5)/3 through B; B: (6 + 1)/3; C: 20/3 and half of (8 + 6)/3.
    assert result.contribution[0] == pytest.approx([20 / 3 + 7.5 / 3, 7 / 3, 20 / 3 + 7 / 3])
    assert result.contribution[0] == pytest.approx([9.167, 2.333, 9.000], abs=5e-4)
    assert result.infilled[0] == pytest.approx((9 + 5.5) / 3)
    # One third while B reports, one half while it does not; B itself one third or nothing.
    assert result.least[0] == pytest.approx([1 / 3, 0, 1 / 3])
    assert result.most[0] == pytest.approx([1 / 2, 1 / 3, 1 / 2])
    assert result.observed_share[:, 0] == pytest.approx([1, 2 / 3, 2 / 3, 1])
    # Without infill the weights are rebuilt: (5+6+4)/3 + (10+8)/2 + (5+6)/2 + (0+1+2)/3.
    assert result.reporting_only[0] == pytest.approx(5 + 9 + 5.5 + 1)
    assert 15.67 not in np.round([result.total[0], result.reporting_only[0]], 2)


def test_normal_ratio_through_thirds_by_hand() -> None:
    """Normals 1500 (silent), 1000, 1200: 1/3 + 1/3·1/2·1.5 = .58333 and 1/3 + 1/3·1/2·1.25 = .54167; 123.33 at 10 %."""
    network = GaugeNetwork(
        ids=("A", "B", "C"), x=NETWORK.x, y=NETWORK.y, crs="local", normals=np.array([[1500.0], [1000.0], [1200.0]])
    )
    record = hourly([[NAN, 100.0, 120.0]])
    completed = complete(record, network, InfillOptions(method="normal-ratio", scale="storm"))
    result = average_storm(completed, averaging_method("arithmetic")(network, BASINS))
    assert result.total[0] == pytest.approx((150 + 100 + 120) / 3)
    assert result.total[0] == pytest.approx(123.33, abs=5e-3)
    assert result.least[0] == pytest.approx([0, 0.58333, 0.54167], abs=5e-6)
    assert result.least[0] == pytest.approx(result.most[0])
    assert result.contribution[0] == pytest.approx([0, 0.58333 * 100, 0.54167 * 120], abs=1e-3)


def test_moving_storm_is_flattened_by_averaging() -> None:
    """30 mm at hours 2, 3, 4 at three gauges: mean 10, 10, 10; peak ratio one third."""
    record = hourly([[0, 0, 0], [30, 0, 0], [0, 30, 0], [0, 0, 30], [0, 0, 0]])
    result = averaged(record, InfillOptions())
    assert result.depth[:, 0].tolist() == pytest.approx([0, 10, 10, 10, 0])
    peaks = result.table.apply(record.depth.max(axis=0))
    assert result.depth.max() / peaks[0] == pytest.approx(1 / 3)


def test_a_gauge_that_stays_missing_rebuilds_weights() -> None:
    """With nobody to infill from at the second step but one gauge, the strips are shared by those that are left."""
    record = hourly([[6, 3, 9], [6, NAN, NAN]])
    result = averaged(record, InfillOptions(method="station-average", scale="step", min_donors=2), "thiessen")
    # First step thirds: 6; second step A alone: 6.
    assert result.depth[:, 0] == pytest.approx([6, 6])
    assert result.without_depth.tolist() == [0, 1, 1]
    assert result.contribution[0] == pytest.approx([2 + 6, 1, 3])


def test_a_step_without_any_gauge_makes_the_total_missing() -> None:
    """No gauge at all is missing, never zero, and the total is not the sum of the other steps."""
    result = averaged(hourly([[1, 2, 3], [NAN, NAN, NAN]]), InfillOptions(method="station-average", scale="step"))
    assert result.depth[0, 0] == pytest.approx(2)
    assert np.isnan([result.depth[1, 0], result.observed_share[1, 0]]).all()
    assert np.isnan([result.total[0], result.reporting_only[0], *result.contribution[0]]).all()


def test_contributions_sum_to_the_mean_on_random_storms() -> None:
    """Whatever is missing, contributions of reporting gauges sum to every basin's total."""
    random = np.random.default_rng(7)
    basins = Basins(
        ids=("west", "east"),
        polygons=np.array([shapely.box(0, 0, 12e3, 10e3), shapely.box(12e3, 0, 30e3, 10e3)]),
        crs="local",
    ).with_union()
    checked = 0
    for _ in range(60):
        depth = np.where(random.random((6, 3)) < 0.3, NAN, random.gamma(0.5, 6, (6, 3)).round(1))
        if np.isnan(depth).all():
            continue
        for scale in ("step", "storm"):
            completed = complete(hourly(depth.tolist()), NETWORK, InfillOptions(scale=scale, min_donors=1))
            for method in ("arithmetic", "thiessen", "idw"):
                result = average_storm(
                    completed, averaging_method(method)(NETWORK, basins, {"cell": 1000.0} if method == "idw" else {})
                )
                known = ~np.isnan(result.total)
                assert result.contribution.sum(axis=1)[known] == pytest.approx(result.total[known], abs=1e-9)
                checked += int(known.sum())
    assert checked > 300


def test_spread_across_methods_leaves_out_what_has_no_number() -> None:
    """(18, no number, 22): least 18, greatest 22, apart 4, which is 20 % of 20."""
    assert spread_across_methods([18.0, NAN, 22.0]) == (18.0, 22.0, 4.0, 20.0)
    assert np.isnan(spread_across_methods([NAN])).all()


def test_reporting_only_has_no_number_where_the_method_refuses() -> None:
    """A method that refuses the few gauges which report gives no number, not a failed run."""
    table = WeightTable("toy", ("all",), NETWORK.ids, np.array([[1 / 3, 1 / 3, 1 / 3]]))

    def weigher(present: npt.NDArray[np.bool_]) -> WeightTable:
        if present.sum() < 3:
            raise MethodError([])
        return table

    completed = complete(hourly([[3, NAN, 6]]), NETWORK, InfillOptions(method="station-average", scale="step"))
    result = average_storm(completed, weigher)
    assert result.total[0] == pytest.approx((3 + 4.5 + 6) / 3)
    assert np.isnan(result.reporting_only[0])


def test_contributions_with_a_gauge_that_closes_inside_a_spread_total() -> None:
    """A total spread in a recorder's pattern while the set of gauges changes: contributions still sum to the mean."""
    network = GaugeNetwork(
        ids=("A", "B", "C", "D"),
        x=np.array([5e3, 12e3, 25e3, 16e3]),
        y=np.full(4, 5e3),
        crs="local",
        closed=np.array(["NaT", "NaT", "NaT", "2031-05-04T02"], dtype="datetime64[s]"),
    )
    record = hourly([[6, NAN, 1, 5], [0, NAN, 2, 5], [3, NAN, 9, NAN]], network)
    status = record.status.copy()
    status[2, 3] = Status.NOT_INSTALLED
    record = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1h")
    completed = complete(record, network, InfillOptions(method="station-average", scale="storm"))
    # B has the mean of A's 9 and C's 12 mm, in the times of A, which is nearest.
    assert completed.record.depth[:, 1] == pytest.approx([10.5 * 6 / 9, 0, 10.5 * 3 / 9])
    result = average_storm(completed, averaging_method("thiessen")(network, BASINS))
    assert result.contribution[0].sum() == pytest.approx(result.total[0], abs=1e-12)


def test_a_long_storm_is_averaged_a_few_steps_at_a_time(monkeypatch: pytest.MonkeyPatch) -> None:
    """Looked at two steps at a time, while B goes missing for good in the middle, nothing changes."""
    depth = np.random.default_rng(2).gamma(0.5, 6, (11, 3))
    depth[3:5, 0], depth[6:, 1] = NAN, NAN
    record = hourly(depth.tolist())
    status = record.status.copy()
    status[6:, 1] = Status.NOT_INSTALLED
    record = replace(record, status=status)
    options = InfillOptions(method="station-average", scale="step", min_donors=1)
    whole = averaged(record, options, "thiessen")
    monkeypatch.setattr(basin_depths, "_BLOCK", 6)
    parts = averaged(record, options, "thiessen")
    for name in ("depth", "infilled", "contribution", "least", "most", "observed_share", "reporting"):
        np.testing.assert_allclose(getattr(parts, name), getattr(whole, name), rtol=1e-13, err_msg=name)
    assert whole.contribution[0].sum() == pytest.approx(whole.total[0])
