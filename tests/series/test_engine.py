"""The series engine: hand arithmetic, and step by step with new weights every time."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import basins_of, gauges_at
from hypothesis import given, settings
from hypothesis import strategies as st
from strategies import Case, cases

from basinrain.averaging import METHODS, averaging_method, choose_grid
from basinrain.basins import Basins
from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.rainfall import RainRecord, Status
from basinrain.series.engine import SeriesEngine, SeriesSetup
from basinrain.series.flags import Flag
from basinrain.series.policies import GAPS, INFILL, INFILL_THEN_REWEIGHT, REWEIGHT

N = np.nan
SQUARE = basins_of(1000.0, square=shapely.box(0, 0, 10, 10))
"""A square of 10 km; A and B stand in the middles of its halves, C to the right of it."""
GAUGES = gauges_at((2.5, 5), (7.5, 5), (12.5, 5), unit=1000.0)


def daily(network: GaugeNetwork, depth: Sequence[Sequence[float]] | npt.NDArray[np.float64]) -> RainRecord:
    values = np.array(depth, dtype=float)
    ends = np.datetime64("2031-05-02", "s") + np.arange(len(values)) * np.timedelta64(86400, "s")
    return RainRecord.from_depths(network.ids, ends - 86400, ends, values, step="1d")


def setup_of(network: GaugeNetwork, basins: Basins, **given: object) -> SeriesSetup:
    options: dict[str, object] = {
        "network": network,
        "basins": basins,
        "methods": {"thiessen": {}},
        "gaps": GAPS,
        "infill": InfillOptions(method="station-average", scale="step", longest_gap=1.0),
        **given,
    }
    return SeriesSetup(**options)  # type: ignore[arg-type]


def test_three_policies_by_hand() -> None:
    """A and B share the square half and half; C takes B's half when B is out, or B gets the mean of A and C."""
    record = daily(GAUGES, [[2, 4, 8], [2, N, 8], [2, N, N], [N, N, N], [6, N, 2], [6, N, 2]])
    long = longer_than(record, gap_mask(record), 1.0)
    parts = SeriesEngine(setup_of(GAUGES, SQUARE)).compute(record, long)
    # C's half begins at x = 7.5, so that A has three quarters while B is out.
    reweighted = parts[REWEIGHT, "thiessen"]
    np.testing.assert_allclose(reweighted.depth[:, 0], [3, 0.75 * 2 + 0.25 * 8, 2, N, 5, 5])
    infilled = parts[INFILL, "thiessen"]
    # Two donors at least: on day 3 A alone cannot estimate B, and has the square.
    np.testing.assert_allclose(infilled.depth[:, 0], [3, 0.5 * 2 + 0.5 * 5, 2, N, 0.5 * 6 + 0.5 * 4, 5])
    # B's gap is longer than a day, so that the third policy leaves it out.
    np.testing.assert_allclose(parts[INFILL_THEN_REWEIGHT, "thiessen"].depth[:, 0], reweighted.depth[:, 0])
    np.testing.assert_allclose(reweighted.observed_share[:, 0], [1, 0.5, 0.5, N, 0.5, 0.5])
    assert reweighted.flags[:, 0].tolist() == [0, 2, 2, 16, 2, 2]
    assert infilled.flags[:, 0].tolist() == [0, 1, 2, 16, 1, 1]


def test_short_gaps_are_infilled_and_long_ones_reweighted() -> None:
    """A gap of a day is infilled, one of two days is not."""
    record = daily(GAUGES, [[2, N, 8], [2, 4, 8], [2, N, 8], [2, N, 8]])
    long = longer_than(record, gap_mask(record), 1.0)
    part = SeriesEngine(setup_of(GAUGES, SQUARE)).compute(record, long)[INFILL_THEN_REWEIGHT, "thiessen"]
    np.testing.assert_allclose(part.depth[:, 0], [3.5, 3, 3.5, 3.5])
    assert part.flags[:, 0].tolist() == [Flag.INFILLED, 0, Flag.REWEIGHTED, Flag.REWEIGHTED]


def test_a_gauge_out_of_service_is_no_gap() -> None:
    """Before B opens, A and C share the square, nothing is infilled, and all of the weight is observed."""
    record = daily(GAUGES, [[2, N, 8], [2, 4, 8]])
    status = record.status.copy()
    status[0, 1] = Status.NOT_INSTALLED
    record = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1d")
    for part in SeriesEngine(setup_of(GAUGES, SQUARE)).compute(record).values():
        np.testing.assert_allclose(part.depth[:, 0], [0.75 * 2 + 0.25 * 8, 3])
        assert part.observed_share.tolist() == [[1], [1]]
        assert part.flags.tolist() == [[0], [0]]


def test_marks_of_what_values_rest_on() -> None:
    """A spread and an adjusted value mark the basins in which their gauges have weight, and no others."""
    record = daily(GAUGES, [[2, 4, 8], [2, 4, 8], [2, 4, 8]])
    status = record.status.copy()
    status[0, 0], status[1, 1], status[2, 2] = Status.SPREAD, Status.ADJUSTED, Status.ESTIMATED
    record = RainRecord(record.gauges, record.starts, record.ends, record.depth, status, step="1d")
    part = SeriesEngine(setup_of(GAUGES, SQUARE)).compute(record)[REWEIGHT, "thiessen"]
    assert part.flags[:, 0].tolist() == [Flag.SPREAD, Flag.ESTIMATED, 0]


def test_ratios_to_normals_by_hand() -> None:
    """A's half has a normal of 500 mm, B's of 1,500: while B is out, A and C give the ratio, the basin the depth."""
    network = GaugeNetwork(
        ids=GAUGES.ids, x=GAUGES.x, y=GAUGES.y, crs="local", normals=np.array([[500.0], [1500.0], [1000.0]])
    )
    record = daily(network, [[5, 15, 10], [5, N, 20], [N, N, N]])
    setup = setup_of(network, SQUARE, gaps=(REWEIGHT,), ratios=True)
    part = SeriesEngine(setup).compute(record)[REWEIGHT, "thiessen"]
    # The basin's normal: (500 + 1500) / 2 = 1000. Day 2: 0.75 * 5/500 + 0.25 * 20/1000.
    np.testing.assert_allclose(part.depth[:, 0], [0.01 * 1000, (0.75 * 0.01 + 0.25 * 0.02) * 1000, N])


def test_ratios_take_the_normals_of_the_month() -> None:
    """On the last of May ratios are to May's normals and times May's, a day later June's; a day is of its middle."""
    monthly = np.full((3, 12), 100.0)
    monthly[:, 4], monthly[:, 5] = [50, 100, 200], [80, 40, 40]
    network = GaugeNetwork(ids=GAUGES.ids, x=GAUGES.x, y=GAUGES.y, crs="local", normals=monthly)
    ends = np.array(["2031-06-01T00", "2031-06-02T00"], dtype="datetime64[s]")
    record = RainRecord.from_depths(network.ids, ends - 86400, ends, [[5, N, 40], [8, N, 12]], step="1d")
    part = SeriesEngine(setup_of(network, SQUARE, gaps=(REWEIGHT,), ratios=True)).compute(record)[REWEIGHT, "thiessen"]
    # The basin's normals: (50 + 100) / 2 = 75 and (80 + 40) / 2 = 60.
    may, june = (0.75 * 5 / 50 + 0.25 * 40 / 200) * 75, (0.75 * 8 / 80 + 0.25 * 12 / 40) * 60
    np.testing.assert_allclose(part.depth[:, 0], [may, june])


def test_ratios_need_normals() -> None:
    """Every gauge without a usable normal is named."""
    network = GaugeNetwork(ids=GAUGES.ids, x=GAUGES.x, y=GAUGES.y, crs="local", normals=np.array([[500.0], [0.0], [N]]))
    with pytest.raises(DataError, match=r"gauge B: found a normal of 0 mm(?s:.*)gauge C: found"):
        SeriesEngine(setup_of(network, SQUARE, ratios=True))


@st.composite
def records(draw: st.DrawFn) -> tuple[Case, RainRecord]:
    """Draw a case of gauges and basins, and up to twelve days with gaps, values and days before a gauge opened."""
    case = draw(cases(at_least=2))
    network = case.network
    n = draw(st.integers(1, 12))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    depth = np.round(rng.gamma(0.5, 8.0, (n, len(network))), 1)
    depth[rng.random(depth.shape) < draw(st.sampled_from([0.05, 0.3, 0.8]))] = np.nan
    record = daily(network, depth)
    status = record.status.copy()
    for g in range(len(network)):
        opens = int(rng.integers(-2 * n, n))
        if opens > 0:
            depth[:opens, g], status[:opens, g] = np.nan, Status.NOT_INSTALLED
    return case, RainRecord(record.gauges, record.starts, record.ends, depth, status, step="1d")


def one_by_one(setup: SeriesSetup, record: RainRecord, gaps: str, method: str) -> npt.NDArray[np.float64]:
    """Return the series with a weight table of its own for every step."""
    options = setup.infill
    if gaps != REWEIGHT:
        long = longer_than(record, gap_mask(record), options.longest_gap)
        none = np.zeros_like(long)
        record = complete(record, setup.network, options, long=none if gaps == INFILL else long).record
    weigh = averaging_method(method)(setup.network, setup.basins, setup.methods[method])
    result = np.full((len(record), len(setup.basins)), np.nan)
    for t, row in enumerate(record.depth):
        present = ~np.isnan(row)
        if present.any():
            result[t] = weigh(present).weights @ np.where(present, row, 0.0)
    return result


@given(drawn=records())
@settings(deadline=None, max_examples=40)
def test_equal_to_new_weights_at_every_step(drawn: tuple[Case, RainRecord]) -> None:
    """Every policy and method gives what a tessellation, a grid or a count made anew at every step gives."""
    case, record = drawn
    cell = float(np.sqrt(case.basins.areas.min()) / 6)
    methods: dict[str, dict[str, Any]] = {name: {} for name in METHODS}
    methods["idw"] = {"grid": choose_grid(case.network, case.basins, cell=cell)}
    setup = setup_of(case.network, case.basins, methods=methods)
    long = longer_than(record, gap_mask(record), setup.infill.longest_gap)
    parts = SeriesEngine(setup).compute(record, long)
    for (gaps, method), part in parts.items():
        expected = one_by_one(setup, record, gaps, method)
        tolerance = 1e-5 if method == "idw" else 1e-9
        scale = np.nan_to_num(record.depth).max(initial=1.0)
        np.testing.assert_allclose(part.depth, expected, rtol=0, atol=tolerance * scale)
        none = np.isnan(part.depth)
        assert ((part.flags == Flag.MISSING) == none).all()
        assert (np.isnan(part.observed_share) == none).all()


@given(drawn=records(), cut=st.integers(0, 12))
@settings(deadline=None, max_examples=25)
def test_the_same_in_chunks(drawn: tuple[Case, RainRecord], cut: int) -> None:
    """A chunk's bytes do not hang on what was computed before it."""
    case, record = drawn
    cut = min(cut, len(record))
    setup = setup_of(case.network, case.basins)
    long = longer_than(record, gap_mask(record), setup.infill.longest_gap)
    used, fresh = SeriesEngine(setup), SeriesEngine(setup)
    used.compute(record, long)
    for first, stop in ((0, cut), (cut, len(record))):
        after = used.compute(record.window(first, stop), long[first:stop])
        alone = fresh.compute(record.window(first, stop), long[first:stop])
        for series, part in alone.items():
            assert part.depth.tobytes() == after[series].depth.tobytes()
            assert part.observed_share.tobytes() == after[series].observed_share.tobytes()
            assert part.flags.tobytes() == after[series].flags.tobytes()
