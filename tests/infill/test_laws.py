"""Laws that every registered infill method keeps, and a plain loop that does the same thing slowly."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from gappy import Case, gappy, options_of, settings_of
from hypothesis import given
from hypothesis import strategies as st
from slow_infill import slow_span, slow_step

from basinrain.infill import METHODS
from basinrain.rainfall import Status

methods = pytest.mark.parametrize("method", METHODS)
SUM_TO_ONE = [name for name, method in METHODS.items() if method.sums_to_one]
KEEP_NORMALS = [name for name, method in METHODS.items() if method.keeps_normals]


def reordered(case: Case, order: npt.NDArray[np.int64]) -> Case:
    network = case.network
    ids = tuple(network.ids[k] for k in order)
    assert network.normals is not None
    moved = replace(
        network,
        ids=ids,
        names=ids,
        x=network.x[order],
        y=network.y[order],
        normals=network.normals[order],
        elevation=network.elevation[order],
    )
    return Case(case.record.ordered(ids), moved, case.days[:, order])


@methods
@given(case=gappy(), options=settings_of(), data=st.data())
def test_gauge_order_does_not_matter(method: str, case: Case, options: dict[str, Any], data: st.DataObject) -> None:
    """The same gauges in another order get the same depths and the same donors."""
    order = np.array(data.draw(st.permutations(range(len(case.network)))))
    chosen = options_of(method, options)
    first, second = case.completed(chosen), reordered(case, order).completed(chosen)
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
    network = case.network
    moved = replace(network, x=-network.y * scale + shift * 1e5, y=network.x * scale - shift * 5e4)
    radius = options["radius"]
    other = {**options, "radius": None if radius is None else radius * scale}
    first = case.completed(options_of(method, options))
    second = case._replace(network=moved).completed(options_of(method, other))
    assert np.allclose(first.record.depth, second.record.depth, rtol=1e-9, atol=1e-9, equal_nan=True)


@pytest.mark.parametrize("method", SUM_TO_ONE)
@given(case=gappy(), options=settings_of(), rain=st.sampled_from([0.5, 7.25, 300.0]))
def test_constant_rain_returns_the_constant(method: str, case: Case, options: dict[str, Any], rain: float) -> None:
    """Everywhere the same in every step: so it is in the gaps."""
    constant = replace(case.record, depth=np.where(np.isnan(case.record.depth), np.nan, rain))
    completed = case._replace(record=constant).completed(options_of(method, options))
    filled = completed.record.depth[completed.record.status == Status.INFILLED]
    assert filled == pytest.approx(rain)


@pytest.mark.parametrize("method", KEEP_NORMALS)
@given(case=gappy(), options=settings_of(), share=st.sampled_from([0.01, 0.1, 1.0]))
def test_rain_as_the_normals_returns_the_targets_normal(
    method: str, case: Case, options: dict[str, Any], share: float
) -> None:
    """A tenth of the normal at every donor gives a tenth of the target's own (one month's normals all year)."""
    record, bare, _ = case
    assert bare.normals is not None
    network = replace(bare, normals=np.repeat(bare.normals[:, :1], 12, axis=1))
    normal = bare.normals[:, 0] * share
    as_normal = replace(record, depth=np.where(np.isnan(record.depth), np.nan, normal[None, :]))
    completed = case._replace(record=as_normal, network=network).completed(options_of(method, options))
    assert np.allclose(np.nan_to_num(completed.record.depth - normal), 0, atol=1e-9)


@methods
@given(case=gappy(), options=settings_of())
def test_what_infilling_may_and_may_not_touch(method: str, case: Case, options: dict[str, Any]) -> None:
    """Observed values stay, estimates are not negative, gauges not in service stay away, totals are kept."""
    record, chosen = case.record, options_of(method, options)
    completed = case.completed(chosen)
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
    record, chosen = case.record, options_of(method, options)
    completed = case.completed(chosen)
    for e in completed.estimates:
        donors = [record.gauges.index(gauge) for gauge in e.donors]
        steps = slice(e.first, e.stop)
        assert e.gauge not in e.donors
        assert len(donors) >= chosen.donors_required
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
    record, chosen = case.record, options_of(method, options)
    completed = case.completed(chosen)
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


@methods
@given(case=gappy(), options=settings_of())
def test_equals_a_plain_loop(method: str, case: Case, options: dict[str, Any]) -> None:
    """Step by step, day by day and storm by storm, for gaps of any length."""
    record, network, _ = case
    relations = case.relations
    scale = options["scale"] or ("storm" if record.recorders == set(record.gauges) else "day")
    chosen = options_of(method, {**options, "scale": scale, "longest_gap": 1e6})
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
                missing = [t for t in steps if not record.reporting[t, g]]
                found = {t: slow_step(record, network, t, g, chosen, relations) for t in missing}
            else:
                found = slow_span(record, network, steps, g, chosen, relations)
            for t, depth in found.items():
                expected[t, g] = depth
    assert np.allclose(case.completed(chosen).record.depth, expected, atol=1e-9, equal_nan=True)
