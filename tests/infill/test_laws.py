"""Laws that every registered infill method keeps, and a plain loop that does the same thing slowly."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks

from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillOptions, complete
from basinrain.rainfall import KnownTotal, RainRecord, Status

methods = pytest.mark.parametrize("method", METHODS)
SUM_TO_ONE = [name for name, method in METHODS.items() if method.sums_to_one]
RATIO = [name for name, method in METHODS.items() if method.needs_normals]


@st.composite
def gappy(draw: st.DrawFn) -> tuple[RainRecord, GaugeNetwork]:
    """Draw a network with monthly normals, and a record with gaps, spread values and gauges that come and go."""
    bare = draw(networks(at_least=2, at_most=6))
    n = len(bare)
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    network = replace(bare, normals=rng.integers(20, 200, (n, 12)).astype(float))
    n_steps = draw(st.integers(1, 14))
    step = np.timedelta64(draw(st.sampled_from([3600, 6 * 3600, 86400])), "s")
    ends = np.datetime64("2031-04-29T00", "s") + np.arange(1, n_steps + 1) * step
    depth = rng.integers(0, 80, (n_steps, n)) * 0.5 * (rng.random((n_steps, n)) < draw(st.sampled_from([0.2, 0.8])))
    depth[rng.random((n_steps, n)) < draw(st.sampled_from([0.1, 0.4, 0.7]))] = np.nan
    depth[:, rng.random(n) < 0.2] = np.nan
    record = RainRecord.from_depths(network.ids, ends - step, ends, depth, step="some")
    status = record.status.copy()
    absent = (np.arange(n_steps)[:, None] < rng.integers(0, n_steps + 1, n)) & (rng.random(n) < 0.25) & np.isnan(depth)
    status[absent] = Status.NOT_INSTALLED
    spread = rng.random(n) < 0.2
    status[(status == Status.OBSERVED) & spread] = Status.SPREAD
    recorders = frozenset(np.array(network.ids)[~spread])
    totals = []
    for g in np.flatnonzero(spread).tolist():
        length, early = int(rng.integers(1, 5)), int(rng.integers(0, 3))
        for first in range(-early, n_steps, length):
            held = slice(max(first, 0), first + length)
            # What a total holds before the first and after the last step of the window is not in the depths.
            outside = 3.0 * (rng.random() < 0.5) if first < 0 or first + length > n_steps else 0.0
            if first + length > 0 and np.isin(status[held, g], [Status.SPREAD, Status.ZERO]).all():
                bounds = ends[0] + (first - 1) * step, ends[0] + (first + length - 1) * step
                totals.append(KnownTotal(network.ids[g], *bounds, float(depth[held, g].sum()) + outside))
    phase = draw(st.sampled_from([0, 9 * 3600]))
    return replace(record, status=status, recorders=recorders, day_phase=phase, totals=tuple(totals)), network


@st.composite
def settings_of(draw: st.DrawFn) -> dict[str, Any]:
    """Options apart from the method."""
    min_donors = draw(st.integers(1, 3))
    return {
        "scale": draw(st.sampled_from([None, "step", "day", "storm"])),
        "min_donors": min_donors,
        "nearest": draw(st.sampled_from([None, "all", min_donors, min_donors + 1])),
        "radius": draw(st.sampled_from([None, 8e3, 20e3])),
        "longest_gap": draw(st.sampled_from([0.5, 2, 31])),
        "power": draw(st.sampled_from([0.5, 1, 2, 3])),
    }


Case = tuple[RainRecord, GaugeNetwork]


def reordered(case: Case, order: npt.NDArray[np.int64]) -> Case:
    record, network = case
    ids = tuple(network.ids[k] for k in order)
    assert network.normals is not None
    moved = replace(
        network,
        ids=ids,
        names=ids,
        x=network.x[order],
        y=network.y[order],
        normals=network.normals[order],
    )
    return record.ordered(ids), moved


@methods
@given(case=gappy(), options=settings_of(), data=st.data())
def test_gauge_order_does_not_matter(method: str, case: Case, options: dict[str, Any], data: st.DataObject) -> None:
    """The same gauges in another order get the same depths and the same donors."""
    order = np.array(data.draw(st.permutations(range(len(case[1])))))
    chosen = InfillOptions(method=method, **options)
    first, second = complete(*case, chosen), complete(*reordered(case, order), chosen)
    assert np.allclose(first.record.depth[:, order], second.record.depth, rtol=1e-9, atol=1e-9, equal_nan=True)
    donors = [{(e.gauge, e.first): sorted(e.donors) for e in result.estimates} for result in (first, second)]
    assert donors[0] == donors[1]
    assert {(n.code, n.gauge, n.text) for n in first.notes} == {(n.code, n.gauge, n.text) for n in second.notes}


@methods
@given(case=gappy(), options=settings_of(), scale=st.sampled_from([0.25, 1, 8]), shift=st.integers(-30, 30))
def test_moving_turning_and_scaling_the_plane_do_not_matter(
    method: str, case: Case, options: dict[str, Any], scale: float, shift: int
) -> None:
    """A quarter turn, a shift of up to 3000 km and another scale, the radius scaled too, change nothing."""
    record, network = case
    moved = replace(network, x=-network.y * scale + shift * 1e5, y=network.x * scale - shift * 5e4)
    radius = options["radius"]
    other = {**options, "radius": None if radius is None else radius * scale}
    first = complete(record, network, InfillOptions(method=method, **options))
    second = complete(record, moved, InfillOptions(method=method, **other))
    assert np.allclose(first.record.depth, second.record.depth, rtol=1e-9, atol=1e-9, equal_nan=True)


@pytest.mark.parametrize("method", SUM_TO_ONE)
@given(case=gappy(), options=settings_of(), rain=st.sampled_from([0.5, 7.25, 300.0]))
def test_constant_rain_returns_the_constant(method: str, case: Case, options: dict[str, Any], rain: float) -> None:
    """Everywhere the same in every step: so it is in the gaps."""
    record, network = case
    constant = replace(record, depth=np.where(np.isnan(record.depth), np.nan, rain))
    completed = complete(constant, network, InfillOptions(method=method, **options))
    filled = completed.record.depth[completed.record.status == Status.INFILLED]
    assert filled == pytest.approx(rain)


@pytest.mark.parametrize("method", RATIO)
@given(case=gappy(), options=settings_of(), share=st.sampled_from([0.01, 0.1, 1.0]))
def test_rain_as_the_normals_returns_the_targets_normal(
    method: str, case: Case, options: dict[str, Any], share: float
) -> None:
    """A tenth of the normal at every donor gives a tenth of the target's own (one month's normals all year)."""
    record, bare = case
    assert bare.normals is not None
    network = replace(bare, normals=np.repeat(bare.normals[:, :1], 12, axis=1))
    normal = bare.normals[:, 0] * share
    as_normal = replace(record, depth=np.where(np.isnan(record.depth), np.nan, normal[None, :]))
    completed = complete(as_normal, network, InfillOptions(method=method, **options))
    assert np.allclose(np.nan_to_num(completed.record.depth - normal), 0, atol=1e-9)


@methods
@given(case=gappy(), options=settings_of())
def test_what_infilling_may_and_may_not_touch(method: str, case: Case, options: dict[str, Any]) -> None:
    """Observed values stay, estimates are not negative, gauges not in service stay away, totals are kept."""
    record, network = case
    completed = complete(record, network, InfillOptions(method=method, **options))
    depth, status = completed.record.depth, completed.record.status
    own = record.reporting
    assert np.array_equal(depth[own], record.depth[own])
    assert np.array_equal(status[own], record.status[own])
    assert (status[record.status == Status.NOT_INSTALLED] == Status.NOT_INSTALLED).all()
    filled = status == Status.INFILLED
    assert (depth[filled] >= 0).all()
    assert np.isnan(depth[~own & ~filled]).all()
    told = {note.gauge for note in completed.notes if note.code == "not-infilled"}
    left = np.isin(status, [Status.MISSING, Status.REJECTED, Status.ACCUMULATED])
    assert told == {gauge for g, gauge in enumerate(record.gauges) if left[:, g].any()}
    covered = np.zeros(depth.shape, dtype=int)
    for e in completed.estimates:
        g = record.gauges.index(e.gauge)
        covered[e.first : e.stop, g] += 1
        assert e.depth == pytest.approx(depth[e.first : e.stop, g].sum(), abs=1e-9)
    assert (covered <= 1).all()
    assert (covered[filled] == 1).all()


@methods
@given(case=gappy(), options=settings_of())
def test_donors_are_observed_at_their_own_scale(method: str, case: Case, options: dict[str, Any]) -> None:
    """Every donor of a step was measured at it, every donor of a total reported all through it; the sum is theirs."""
    record, network = case
    completed = complete(record, network, InfillOptions(method=method, **options))
    for e in completed.estimates:
        donors = [record.gauges.index(gauge) for gauge in e.donors]
        steps = slice(e.first, e.stop)
        assert e.gauge not in e.donors
        assert len(donors) >= options["min_donors"]
        values = record.measured if e.scale == "step" else record.reporting
        assert values[steps, donors].all()
        totals = record.depth[steps, donors].sum(axis=0)
        assert e.depth == pytest.approx(float(np.dot(list(e.donors.values()), totals)), abs=1e-9)


@methods
@given(case=gappy(), options=settings_of(), data=st.data())
def test_sources_sum_to_the_completed_depths(
    method: str, case: Case, options: dict[str, Any], data: st.DataObject
) -> None:
    """Over the window, over any choice of steps, and group by group; only reporting gauges are sources."""
    record, network = case
    completed = complete(record, network, InfillOptions(method=method, **options))
    depth = np.nan_to_num(completed.record.depth)
    assert completed.sources().sum(axis=1) == pytest.approx(depth.sum(axis=0), abs=1e-9)
    some = np.array(sorted(data.draw(st.sets(st.integers(0, len(record) - 1)))), dtype=np.int64)
    assert completed.sources(some).sum(axis=1) == pytest.approx(depth[some].sum(axis=0), abs=1e-9)
    groups = list(completed.donor_tables())
    assert sorted(np.concatenate([steps for steps, _ in groups]).tolist()) == list(range(len(record)))
    parts = sum(completed.sources(steps) for steps, _ in groups)
    assert parts == pytest.approx(completed.sources(), abs=1e-9)
    # The donor tables give the same totals, since over a whole day or storm the pattern cancels out.
    own = np.where(record.reporting, record.depth, 0.0)
    products = sum(table * own[steps].sum(axis=0) for steps, table in groups)
    assert products == pytest.approx(completed.sources(), abs=1e-9)
    assert (completed.sources()[:, ~record.reporting.any(axis=0)] == 0).all()
    for steps, table in groups:
        assert all(np.array_equal(table, completed.donor_table(int(step))) for step in steps)
        assert (record.reporting[steps] == record.reporting[steps[0]]).all()


def slow_weights(
    network: GaugeNetwork, g: int, usable: list[bool], month: int, options: InfillOptions
) -> dict[int, float]:
    """Donor weights of one gauge by plain loops and the formulas as printed."""
    away = network.distances()[g]
    near = sorted((round(float(away[i]), 6), network.ids[i], i) for i in range(len(network)) if i != g and usable[i])
    near = [item for item in near if options.radius is None or item[0] <= options.radius]
    if options.donors_wanted != "all":
        near = near[: options.donors_wanted]
    if len(near) < options.min_donors:
        return {}
    normals = network.normals
    assert normals is not None
    if options.method == "station-average":
        return {i: 1 / len(near) for _, _, i in near}
    if options.method == "normal-ratio":
        return {i: normals[g, month] / normals[i, month] / len(near) for _, _, i in near}
    total = sum(d**-options.power for d, _, _ in near)
    return {i: d**-options.power / total for d, _, i in near}


def month_index(record: RainRecord, first: int, last: int) -> int:
    middle = record.starts[first] + (record.ends[last] - record.starts[first]) // 2
    return int(str(middle)[5:7]) - 1


def slow_step(record: RainRecord, network: GaugeNetwork, t: int, g: int, options: InfillOptions) -> float:
    usable = [bool(record.measured[t, i]) for i in range(len(network))]
    weights = slow_weights(network, g, usable, month_index(record, t, t), options)
    return sum(w * record.depth[t, i] for i, w in weights.items()) if weights else np.nan


def whole(record: RainRecord, i: int, steps: list[int]) -> bool:
    """Whether every total of a gauge that reaches into some steps fell in them."""
    for total in record.totals:
        if total.gauge == record.gauges[i]:
            inside = [t for t in steps if total.start <= record.starts[t] and record.ends[t] <= total.end]
            if inside and abs(sum(record.depth[t, i] for t in inside) - total.depth) > 1e-9:
                return False
    return True


def slow_span(
    record: RainRecord, network: GaugeNetwork, steps: list[int], g: int, options: InfillOptions
) -> dict[int, float]:
    """Depths of the missing steps of one gauge's day or storm, by plain loops."""
    missing = [t for t in steps if not record.reporting[t, g]]
    seen = [t for t in steps if record.reporting[t, g]]
    by_step = {t: slow_step(record, network, t, g, options) for t in missing}
    if len(seen) * 2 >= len(steps):
        return by_step
    usable = [all(record.reporting[t, i] for t in steps) and whole(record, i, steps) for i in range(len(network))]
    weights = slow_weights(network, g, usable, month_index(record, steps[0], steps[-1]), options)
    if not weights:
        return dict.fromkeys(missing, np.nan)
    rest = sum(w * record.depth[t, i] for i, w in weights.items() for t in steps)
    rest -= sum(record.depth[t, g] for t in seen)
    if rest < -1e-9:
        return by_step
    away = network.distances()[g]
    for _, _, i in sorted((round(float(away[i]), 6), network.ids[i], i) for i in range(len(network)) if i != g):
        caught = sum(record.depth[t, i] for t in missing)
        recorder = network.ids[i] in record.recorders and all(record.measured[t, i] for t in steps)
        if recorder and caught > 0:
            return {t: rest * record.depth[t, i] / caught for t in missing}
    return {t: rest / len(missing) for t in missing}


@methods
@given(case=gappy(), options=settings_of())
def test_equals_a_plain_loop(method: str, case: Case, options: dict[str, Any]) -> None:
    """Step by step, day by day and storm by storm, for gaps of any length."""
    record, network = case
    scale = options["scale"] or ("storm" if record.recorders == set(record.gauges) else "day")
    chosen = InfillOptions(method=method, **{**options, "scale": scale, "longest_gap": 1e6})
    expected = record.depth.copy()
    for g in range(len(network)):
        spans: dict[tuple[int, int], list[int]] = {}
        service = 0
        for t in range(len(record)):
            if record.status[t, g] == Status.NOT_INSTALLED:
                service += 1
                continue
            middle = record.starts[t] + (record.ends[t] - record.starts[t]) // 2 - np.timedelta64(record.day_phase, "s")
            day = int(middle.astype("datetime64[D]").astype(int))
            span = {"step": t, "day": day, "storm": 0}[scale]
            spans.setdefault((span, service), []).append(t)
        for steps in spans.values():
            if scale == "step":
                found = {t: slow_step(record, network, t, g, chosen) for t in steps if not record.reporting[t, g]}
            else:
                found = slow_span(record, network, steps, g, chosen)
            for t, depth in found.items():
                expected[t, g] = depth
    assert np.allclose(complete(record, network, chosen).record.depth, expected, atol=1e-9, equal_nan=True)
