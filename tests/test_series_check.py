"""What averaging and infill do to a basin's series: by hand on three strips, and as laws."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks
from strips import BASINS, NAN, NETWORK, hourly

from basinrain.averaging import averaging_method
from basinrain.basin_depths import average_storm
from basinrain.errors import MethodError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.rainfall import RainRecord, Status
from basinrain.series_check import COMPLETED, GAUGES, REPORTING_GAUGES, TOP, SeriesFigures, series_check
from basinrain.weights import WeightTable


def figures_of(
    record: RainRecord, network: GaugeNetwork = NETWORK, options: InfillOptions | None = None
) -> dict[str, SeriesFigures]:
    """Return the figures of the Thiessen means of a record, by series, infilled step by step."""
    completed = complete(record, network, options or InfillOptions(method="station-average", scale="step"))
    depths = {"thiessen": average_storm(completed, averaging_method("thiessen")(network, BASINS))}
    return {row.series: row for row in series_check(completed.record, depths).figures}


def test_a_gap_by_hand() -> None:
    """B silent when A and C have 0 and 3 mm: the basin has 1.5 mm with the infill, and 1.5 from A and C in halves."""
    rows = figures_of(hourly([[6, 0, 0], [0, NAN, 3], [0, 0, 0]]))
    done, only, gauges = rows[COMPLETED], rows[REPORTING_GAUGES], rows[GAUGES]
    # Basin: 2, (0 + 1.5 + 3)/3 = 1.5 and 0; mean 3.5/3.
    assert (done.steps, done.top_n) == (3, 3)
    assert done.wet_share == pytest.approx(2 / 3)
    assert done.top_mean == pytest.approx((2 + 1.5 + 0) / 3)
    mean = 3.5 / 3
    assert done.variance == pytest.approx(((2 - mean) ** 2 + (1.5 - mean) ** 2 + mean**2) / 2)
    # A and C share the strip of B half and half.
    assert only.steps == 3
    assert only.top_mean == pytest.approx((2 + (0 + 3) / 2 + 0) / 3)
    # A: 6, 0, 0; B: 0, 0 in two steps; C: 0, 3, 0. Variances 12, 0, 3.
    assert (gauges.steps, gauges.top_n) == (2, 2)
    assert gauges.wet_share == pytest.approx((1 / 3 + 0 + 1 / 3) / 3)
    assert gauges.top_mean == pytest.approx((2 + 0 + 1) / 3)
    assert gauges.variance == pytest.approx((12 + 0 + 3) / 3)


def test_infill_that_changes_the_series_is_seen() -> None:
    """Filling B by the mean of dry A and wet C turns drizzle on; where C is far from B, the reporting gauges do not."""
    network = GaugeNetwork(ids=("A", "B", "C"), x=np.array([5e3, 15e3, 95e3]), y=np.full(3, 5e3), crs="local")
    rows = figures_of(hourly([[0, NAN, 8], [2, 2, 2]]), network)
    assert rows[COMPLETED].wet_share == 1
    assert rows[REPORTING_GAUGES].wet_share == 0.5


def test_wet_from_a_tenth_of_a_millimetre() -> None:
    """A mean of exactly 0.1 mm is wet, however it rounds; 0.09 mm is not."""
    assert figures_of(hourly([[0.1, 0.1, 0.1], [0.0, 0.3, 0.0]]))[COMPLETED].wet_share == 1
    assert figures_of(hourly([[0.09, 0.09, 0.09]]))[COMPLETED].wet_share == 0


def test_the_top_twenty_of_longer_series() -> None:
    """Of 1 to 30 mm the top 20 are 11 to 30, mean 20.5; with 7 steps all of them count, and n says so."""
    long = figures_of(hourly([[k, k, k] for k in np.random.default_rng(1).permutation(np.arange(1.0, 31.0)).tolist()]))
    for series in (COMPLETED, GAUGES):
        assert long[series].top_n == TOP
        assert long[series].top_mean == pytest.approx(20.5)
    assert long[COMPLETED].variance == pytest.approx(np.var(np.arange(1, 31), ddof=1))
    short = figures_of(hourly([[k, k, k] for k in range(7)]))[COMPLETED]
    assert short.top_n == 7
    assert short.top_mean == pytest.approx(3.0)


def test_steps_without_a_number_do_not_count() -> None:
    """An hour in which no gauge reports is left out, never counted dry."""
    rows = figures_of(hourly([[3, 3, 3], [NAN, NAN, NAN], [1, 1, 1]]))
    assert (rows[COMPLETED].steps, rows[COMPLETED].wet_share) == (2, 1)
    assert rows[COMPLETED].top_mean == rows[REPORTING_GAUGES].top_mean == rows[GAUGES].top_mean == 2
    assert rows[COMPLETED].variance == 2


def test_one_step_has_no_variance() -> None:
    """A storm total has a depth and no variance."""
    for row in figures_of(hourly([[3, 3, 6]])).values():
        assert row.steps == 1
        assert row.top_mean == pytest.approx(4)
        assert np.isnan(row.variance)


def test_a_gauge_without_steps_of_its_own_leaves_its_weight_to_the_others() -> None:
    """B was never there, or all of it is spread: the mean of A's and C's figures, 4 and 2 mm, by equal weights."""
    missing = hourly([[4, NAN, 2], [4, NAN, 2]])
    status = missing.status.copy()
    status[:, 1] = Status.SPREAD
    spread = replace(missing, status=status, depth=np.where(np.isnan(missing.depth), 9.0, missing.depth))
    for record in (missing, spread):
        assert figures_of(record)[GAUGES].top_mean == pytest.approx(3)
    # Spread values do report.
    assert figures_of(spread)[REPORTING_GAUGES].top_mean == pytest.approx((4 + 9 + 2) / 3)


def test_a_basin_without_a_number_has_no_figures() -> None:
    """The arithmetic mean with no gauge inside: no steps, no figures, and no false zero."""
    away = GaugeNetwork(ids=("A", "B"), x=np.array([50e3, 60e3]), y=np.full(2, 5e3), crs="local")
    record = hourly([[1, 2], [3, 4]], away)
    depths = {"arithmetic": average_storm(Completed(record, (), ()), averaging_method("arithmetic")(away, BASINS))}
    rows = series_check(record, depths).figures
    assert len(rows) == 3
    for row in rows:
        assert (row.steps, row.top_n) == (0, 0)
        assert np.isnan([row.wet_share, row.top_mean, row.variance]).all()


def test_a_set_of_gauges_that_is_refused_leaves_its_steps_out() -> None:
    """A method that refuses two gauges has the two steps at which three report."""

    def weigher(present: npt.NDArray[np.bool_]) -> WeightTable:
        if present.sum() < 3:
            raise MethodError(Problem(item="toy", found="two gauges", expected="three"))
        return WeightTable("toy", ("all",), NETWORK.ids, np.full((1, 3), 1 / 3))

    record = hourly([[3, 3, 3], [6, NAN, 6], [1, 1, 1]])
    completed = complete(record, NETWORK, InfillOptions(method="station-average", scale="step"))
    result = average_storm(completed, weigher)
    np.testing.assert_allclose(result.reporting[:, 0], [3, NAN, 1])
    rows = {row.series: row for row in series_check(completed.record, {"toy": result}).figures}
    assert (rows[COMPLETED].steps, rows[REPORTING_GAUGES].steps) == (3, 2)
    assert rows[REPORTING_GAUGES].top_mean == pytest.approx(2)


def drawn_record(data: st.DataObject, network: GaugeNetwork, *, gaps: bool) -> RainRecord:
    n = len(network)
    value = st.one_of(st.just(-1), st.integers(0, 200)) if gaps else st.integers(0, 200)
    rows = np.array(data.draw(st.lists(st.lists(value, min_size=n, max_size=n), min_size=2, max_size=25))) / 10
    return hourly(np.where(rows < 0, NAN, rows).tolist(), network)


@given(networks(at_least=3), st.data())
def test_without_gaps_infill_changes_nothing(network: GaugeNetwork, data: st.DataObject) -> None:
    """With every value there the completed series is that of the reporting gauges; a mean is flatter than its gauges.

    The mean of the greatest depths is subadditive and the variance convex, so neither can rise by averaging.
    """
    rows = figures_of(drawn_record(data, network, gaps=False), network)
    done, only, gauges = rows[COMPLETED], rows[REPORTING_GAUGES], rows[GAUGES]
    assert replace(only, series=COMPLETED) == done
    assert done.top_mean <= gauges.top_mean + 1e-9
    assert done.variance <= gauges.variance + 1e-9


@given(networks(at_least=3), st.data())
def test_the_order_of_the_gauges_does_not_matter(network: GaugeNetwork, data: st.DataObject) -> None:
    """The same gauges in another order give the same figures."""
    record = drawn_record(data, network, gaps=True)
    order = data.draw(st.permutations(range(len(network))))
    ids = tuple(network.ids[g] for g in order)
    shuffled = GaugeNetwork(ids=ids, x=network.x[order], y=network.y[order], crs="local")
    one, two = figures_of(record, network), figures_of(record.ordered(ids), shuffled)
    for series, row in one.items():
        other = two[series]
        assert (row.steps, row.top_n) == (other.steps, other.top_n)
        for name in ("wet_share", "top_mean", "variance"):
            assert getattr(row, name) == pytest.approx(getattr(other, name), abs=1e-9, nan_ok=True)


def test_figures_equal_a_loop_over_steps_and_gauges() -> None:
    """Every figure equals that of a plain loop, with gaps and more steps than are averaged."""
    random = np.random.default_rng(5)
    depth = random.gamma(0.4, 5, (60, 3)).round(1)
    depth[random.random((60, 3)) < 0.2] = NAN
    completed = complete(hourly(depth.tolist()), NETWORK, InfillOptions(method="station-average", scale="step"))
    result = average_storm(completed, averaging_method("thiessen")(NETWORK, BASINS))
    rows = {row.series: row for row in series_check(completed.record, {"thiessen": result}).figures}
    gauges = [[d for d in column if not np.isnan(d)] for column in depth.T.tolist()]
    series = [d for d in result.depth[:, 0].tolist() if not np.isnan(d)]
    assert rows[COMPLETED].wet_share == pytest.approx(sum(d >= 0.1 - 1e-9 for d in series) / len(series))
    assert rows[COMPLETED].top_mean == pytest.approx(sum(sorted(series)[-20:]) / 20)
    assert rows[GAUGES].steps == min(len(g) for g in gauges)
    assert rows[GAUGES].top_mean == pytest.approx(sum(sum(sorted(g)[-20:]) / 20 for g in gauges) / 3)
    assert rows[GAUGES].variance == pytest.approx(sum(np.var(g, ddof=1) for g in gauges) / 3)
    assert rows[GAUGES].wet_share == pytest.approx(sum(np.mean(np.array(g) >= 0.1) for g in gauges) / 3)


def test_gauges_without_weight_and_methods_that_were_not_run_have_no_figures() -> None:
    """B weighs nothing and was silent for an hour, which does not count; nothing averaged is nothing checked."""
    record = hourly([[4, 90, 2], [4, NAN, 2]])

    def outer(present: npt.NDArray[np.bool_]) -> WeightTable:
        return WeightTable("outer", ("all",), NETWORK.ids, np.array([[0.5, 0.0, 0.5]]))

    rows = series_check(record, {"outer": average_storm(Completed(record, (), ()), outer)}).figures
    gauges = next(row for row in rows if row.series == GAUGES)
    assert (gauges.steps, gauges.top_mean) == (2, 3)
    assert series_check(record, {}).figures == ()
