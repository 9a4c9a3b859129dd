"""Long records infilled stretch by stretch: the same as all at once, and as the weights of every step by themselves."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from gappy import Case, gappy, options_of, settings_of
from hypothesis import given
from hypothesis import strategies as st
from windows import hourly, network, with_status

from basinrain.errors import DataError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import (
    METHODS,
    InfillOptions,
    NormalRatios,
    RecordFiller,
    Relations,
    complete,
    donor_sums,
    record_filling,
    relations_of,
    substitutes,
)
from basinrain.infill.gaps import gap_mask, longer_than
from basinrain.infill.spans import span_starts
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")
Floats = npt.NDArray[np.float64]
methods = pytest.mark.parametrize("method", METHODS)


def gauges(n: int, *, seed: int = 1, monthly: bool = True) -> GaugeNetwork:
    """Return scattered gauges with normals and elevations."""
    rng = np.random.default_rng(seed)
    return GaugeNetwork(
        ids=tuple(f"G{k}" for k in rng.permutation(n)),
        x=rng.uniform(0, 90e3, n),
        y=rng.uniform(0, 90e3, n),
        crs="local",
        normals=rng.uniform(40, 90, (n, 12 if monthly else 1)),
        elevation=rng.uniform(0, 300, n),
    )


def relations(net: GaugeNetwork, ratios: NormalRatios | None = None) -> Relations:
    """Return relations from 60 days."""
    rng = np.random.default_rng(5)
    days = rng.gamma(0.5, 6, (60, 1)) * rng.gamma(2, 0.5, (60, len(net)))
    return relations_of(days, net, np.arange(60) % 12 + 1, ratios=ratios)


def long_record(net: GaugeNetwork, n_steps: int, *, seed: int = 2, share: float = 0.1) -> RainRecord:
    """Return six-hourly depths over some months, with outages, gaps, spread values, and gauges that come or go."""
    rng = np.random.default_rng(seed)
    n = len(net)
    depth = rng.gamma(0.4, 4.0, (n_steps, n)) * (rng.random((n_steps, 1)) < 0.4)
    depth[rng.random(depth.shape) < share / 4] = NAN
    for g in range(n):
        for at in rng.integers(0, n_steps, max(int(share * n_steps / 12), 1)):
            depth[at : at + int(rng.integers(1, 30)), g] = NAN
    step = np.timedelta64(6, "h")
    ends = np.datetime64("2031-04-20T00", "s") + np.arange(1, n_steps + 1) * step
    record = RainRecord.from_depths(net.ids, ends - step, ends, depth, step="6h")
    status = record.status.copy()
    status[(status == Status.OBSERVED) & (rng.random(n) < 0.15)] = Status.SPREAD
    for g in np.flatnonzero(rng.random(n) < 0.15).tolist():
        away = slice(0, n_steps // 3 + 1) if g % 2 else slice(n_steps // 2 + 1, None)
        status[away, g], depth[away, g] = Status.NOT_INSTALLED, NAN
    return replace(record, depth=depth, status=status)


@methods
@given(case=gappy(), options=settings_of())
def test_completing_goes_through_it(method: str, case: Case, options: dict[str, Any]) -> None:
    """Depths and what was infilled are those of a completed record, traced or not, bit for bit."""
    record, net, _ = case
    chosen = options_of(method, options)
    filled = RecordFiller(net, chosen, relations=case.relations).fill(record)
    for trace in (True, False):
        completed = complete(record, net, chosen, relations=case.relations, trace=trace).record
        assert np.array_equal(filled.depth, completed.depth, equal_nan=True)
        assert np.array_equal(filled.filled, completed.status == Status.INFILLED)
    assert filled.spans is None


@methods
@given(case=gappy(), options=settings_of(), data=st.data())
def test_stretches_of_whole_days_are_filled_as_the_whole(
    method: str, case: Case, options: dict[str, Any], data: st.DataObject
) -> None:
    """A day at a time, in any order, by one filler: what the whole record gives, whatever came before."""
    record, net, _ = case
    chosen = options_of(method, {**options, "scale": data.draw(st.sampled_from(["step", "day"]))})
    long = longer_than(record, gap_mask(record), chosen.longest_gap)
    filler = RecordFiller(net, chosen, relations=case.relations)
    whole = filler.fill(record, long)
    borders = [*span_starts(record, "day").tolist(), len(record)]
    days = list(pairwise(borders))
    for first, stop in data.draw(st.permutations(days)):
        day = filler.fill(record.window(first, stop), long[first:stop])
        fresh = RecordFiller(net, chosen, relations=case.relations).fill(record.window(first, stop), long[first:stop])
        assert day.depth.tobytes() == fresh.depth.tobytes()
        np.testing.assert_allclose(day.depth, whole.depth[first:stop], rtol=1e-12, atol=1e-12)
        assert np.array_equal(day.filled, whole.filled[first:stop])


def by_single_steps(record: RainRecord, net: GaugeNetwork, options: InfillOptions, **further: Any) -> Floats:  # noqa: ANN401 - as the filler's
    """Return depths with the weights of every missing value asked for by themselves."""
    expected = record.depth.copy()
    months = record.ends - (record.ends - record.starts) // 2
    month = months.astype("datetime64[M]").astype(int) % 12 + 1
    for t, g in np.argwhere(gap_mask(record)):
        weights = options.weights(net, int(g), record.measured[t], month=int(month[t]), **further)
        if weights.any():
            expected[t, g] = weights @ np.where(record.measured[t], record.depth[t], 0.0)
    return expected


@methods
@pytest.mark.parametrize("given_options", [{}, {"nearest": "all"}, {"nearest": "all", "radius": 40e3}, {"nearest": 34}])
def test_equals_the_weights_of_every_step(method: str, given_options: dict[str, Any]) -> None:
    """Forty gauges over the border of two months: few donors, all, all within a radius, too many to look up."""
    net = gauges(40)
    record = long_record(net, 70)
    options = options_of(method, {"scale": "step", "longest_gap": 1e6, **given_options})
    further: dict[str, Any] = {"relations": relations(net)} if options.chosen_method.needs_relations else {}
    filled = RecordFiller(net, options, **further).fill(record)
    assert filled.filled.sum() > 150
    np.testing.assert_allclose(filled.depth, by_single_steps(record, net, options, **further), rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("nearest", [None, "all"])
@pytest.mark.parametrize("method", [name for name, method in METHODS.items() if method.needs_normals])
def test_normals_from_the_record(method: str, nearest: Any) -> None:  # noqa: ANN401 - as the option
    """Every pair has its own ratio, and a pair without one does not donate."""
    net = gauges(12)
    rng = np.random.default_rng(3)
    means = rng.uniform(20, 80, (12, 12, 12))
    means[rng.random(means.shape) < 0.15] = NAN
    ratios = NormalRatios(net.ids, np.full(means.shape, 10), means)
    record = long_record(net, 80)
    options = InfillOptions(method=method, scale="step", longest_gap=1e6, nearest=nearest)
    further: dict[str, Any] = {"ratios": ratios}
    if options.chosen_method.needs_relations:
        further["relations"] = relations(net, ratios)
    filled = RecordFiller(net, options, **further).fill(record)
    np.testing.assert_allclose(filled.depth, by_single_steps(record, net, options, **further), rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("power", [0.5, 30.0, 200.0])
def test_steep_powers_with_all_gauges(power: float) -> None:
    """However steep, a far gauge that is left alone with another still donates."""
    net, record = gauges(10), long_record(gauges(10), 60, share=0.8)
    options = InfillOptions(power=power, nearest="all", scale="step", longest_gap=1e6)
    filled = RecordFiller(net, options).fill(record)
    expected = by_single_steps(record, net, options)
    assert filled.filled.sum() > 100
    np.testing.assert_allclose(filled.depth, expected, rtol=1e-12, atol=1e-12)


@pytest.mark.parametrize("nearest", [None, "all"])
@pytest.mark.parametrize("scale", ["step", "day"])
def test_memory_and_blocks_change_no_number(
    monkeypatch: pytest.MonkeyPatch,
    scale: Any,  # noqa: ANN401 - as the options
    nearest: Any,  # noqa: ANN401
) -> None:
    """With next to nothing kept, and looked at a few steps at a time, depths are the same to the last bit or nearly."""
    net, record = gauges(20), long_record(gauges(20), 300)
    options = InfillOptions(method="inverse-distance-ratios", scale=scale, nearest=nearest)
    expected = RecordFiller(net, options).fill(record, np.zeros(record.depth.shape, dtype=bool))
    monkeypatch.setattr(donor_sums, "MOST_BYTES", 4000)
    monkeypatch.setattr(donor_sums, "_CELLS", 7)
    monkeypatch.setattr(substitutes, "_BATCH", 50)
    monkeypatch.setattr(record_filling, "_BLOCK", 200)
    monkeypatch.setattr(record_filling, "_NEAR", 2)
    found = RecordFiller(net, options).fill(record, np.zeros(record.depth.shape, dtype=bool))
    np.testing.assert_allclose(found.depth, expected.depth, rtol=1e-13, atol=1e-13)
    assert np.array_equal(found.filled, expected.filled)
    assert found.filled.sum() > 500


def test_what_is_handed_in_is_not_changed() -> None:
    """Neither the record nor the mask of long gaps, in either order of memory."""
    net, record = gauges(8), long_record(gauges(8), 50)
    fortran = replace(record, depth=np.asfortranarray(record.depth), status=np.asfortranarray(record.status))
    before, long = record.depth.copy(), np.zeros(record.depth.shape, dtype=bool)
    results = [RecordFiller(net, InfillOptions(scale="day")).fill(one, long).depth for one in (record, fortran)]
    assert np.array_equal(results[0], results[1], equal_nan=True)
    assert np.array_equal(record.depth, before, equal_nan=True)
    assert np.array_equal(fortran.depth, before, equal_nan=True)
    assert not long.any()


def test_long_gaps_are_left_and_forbid_the_days_total() -> None:
    """B's second day is missing whole, in part by a gap that is too long: nothing is made up for it; its third is."""
    record = hourly([1.0] * 12, [2.0] * 4 + [NAN] * 8, [3.0] * 12, hours=6)
    long = np.zeros((12, 3), dtype=bool)
    long[4:6, 1] = True
    filled = RecordFiller(network(3), InfillOptions(method="station-average", scale="day")).fill(record, long)
    assert filled.depth[:, 1].tolist()[:4] == [2.0] * 4
    assert np.isnan(filled.depth[4:8, 1]).all()
    assert filled.depth[8:, 1] == pytest.approx([2.0] * 4)
    assert np.flatnonzero(filled.filled[:, 1]).tolist() == [8, 9, 10, 11]


def test_nothing_to_infill() -> None:
    """A record without gaps, and one without steps, come back as they are."""
    filler = RecordFiller(network(3), InfillOptions(scale="day"))
    whole = filler.fill(hourly([1.0, 2.0], [3.0, 4.0], [5.0, 6.0]))
    assert whole.depth.tolist() == [[1, 3, 5], [2, 4, 6]]
    assert not whole.filled.any()
    assert filler.fill(hourly([], [], [])).depth.shape == (0, 3)


@pytest.mark.parametrize(("method", "remedied"), [("normal-ratio", True), ("inverse-distance", False)])
def test_normals_that_are_not_known_matter_where_a_gauge_takes_part(method: str, remedied: bool) -> None:  # noqa: FBT001 - a case
    """C has no normal for May. While it is not installed all is well; when it reports, the method says so first."""
    normals = np.full((4, 12), 50.0)
    normals[2, 4] = NAN
    net = network(4, normals)
    record = hourly([1.0, 1.0], [NAN, 2.0], [3.0, 3.0], [4.0, 5.0])
    away = with_status(hourly([1.0, 1.0], [NAN, 2.0], [NAN, NAN], [4.0, 5.0]), "C", slice(None), Status.NOT_INSTALLED)
    filler = RecordFiller(net, InfillOptions(method=method, scale="step"))
    assert filler.fill(away).filled.sum() == 1
    if remedied:
        with pytest.raises(DataError, match="gauge C: found no normal for May; expected a normal above 0 for the"):
            filler.fill(record)
    assert filler.fill(away).filled.sum() == 1


def test_elevations_that_are_not_known() -> None:
    """They are asked for where a limit is set and the gauge takes part."""
    net = replace(network(3), elevation=np.array([10.0, NAN, 20.0]))
    filler = RecordFiller(net, InfillOptions(scale="step", elevation_limit=50.0, min_donors=1))
    with pytest.raises(DataError, match=r"gauge B: found no elevation; expected one, since \[infill\] elevation_limit"):
        filler.fill(hourly([NAN], [2.0], [3.0]))


def test_records_that_cannot_be_filled() -> None:
    """Another network's columns, values infilled before, and a method without its relations."""
    filler = RecordFiller(network(3), InfillOptions(method="regression", scale="step"))
    with pytest.raises(DataError, match="rain record: found columns that are not the network's gauges in their order"):
        filler.fill(hourly([1.0], [2.0]))
    with pytest.raises(DataError, match="gauge B: found infilled values; expected a record as it was observed"):
        filler.fill(with_status(hourly([1.0], [2.0], [3.0]), "B", slice(None), Status.INFILLED))
    with pytest.raises(
        DataError, match="relations between gauges: found none; expected those of the record for method"
    ):
        filler.fill(hourly([1.0], [NAN], [3.0]))
