"""No method has seen what it is scored on."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from leave_one_out_data import daily_record, plain_estimates, small_depths, small_network

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.days import day_totals
from basinrain.infill.leave_one_out.cross_fit import PARTS, CrossFit, Fitted, parts_of
from basinrain.infill.record_normals import normals_from_record
from basinrain.infill.relations import relations_of
from basinrain.rainfall import RainRecord


def monthly(years: int, *, seed: int = 1) -> tuple[RainRecord, GaugeNetwork]:
    """Return months of some years at four gauges, whole and wet."""
    network = replace(small_network(4), normals=None)
    months = np.arange(np.datetime64("1981-01"), np.datetime64("1981-01") + 12 * years + 1)
    bounds = months.astype("datetime64[s]")
    rng = np.random.default_rng(seed)
    depth = rng.gamma(4.0, 15.0, (12 * years, 1)) * rng.gamma(9.0, 0.1, (12 * years, 4))
    return RainRecord.from_depths(network.ids, bounds[:-1], bounds[1:], depth, step="1mo"), network


@pytest.mark.parametrize("n", [0, 1, 4, 5, 6, 123])
def test_parts_are_stretches_of_equal_size(n: int) -> None:
    """In order, to one day equal; fewer where there are fewer days than parts."""
    part = parts_of(n)
    assert len(part) == n
    assert (np.diff(part) >= 0).all()
    sizes = np.unique(part, return_counts=True)[1]
    assert len(sizes) == min(n, PARTS)
    assert not n or sizes.max() - sizes.min() <= 1


def test_relations_of_a_part_know_only_the_others() -> None:
    """Whatever happens in a part, its own relations stay, and those of the other parts change."""
    network, depth = small_network(4), small_depths(200, 4)
    changed = depth.copy()
    changed[40:80] *= np.random.default_rng(8).gamma(2.0, 1.0, (40, 4))
    fits = [
        CrossFit(record, network, day_totals(record), None)
        for record in (daily_record(network, depth), daily_record(network, changed))
    ]
    before, after = (fit.relations for fit in fits)
    for k in range(PARTS):
        assert np.array_equal(before[k].slope, after[k].slope, equal_nan=True) == (k == 1)
        assert np.array_equal(before[k].correlation, after[k].correlation, equal_nan=True) == (k == 1)


def test_estimates_of_each_part_use_its_relations() -> None:
    """The plain loop, part by part, with relations of the other four fifths."""
    network, depth = small_network(), small_depths(250)
    record = daily_record(network, depth)
    days = day_totals(record)
    options = InfillOptions(method="regression")
    part = parts_of(250)
    found = Fitted(options, CrossFit(record, network, days, None), network.distances()).estimates(
        depth, days.months, part
    )
    for k in range(PARTS):
        relations = relations_of(depth[part != k], network, days.months[part != k])
        expected = plain_estimates(network, depth[part == k], options, days.months[part == k], relations=relations)
        np.testing.assert_allclose(found[part == k], expected, rtol=1e-12, atol=1e-12)


def test_normals_from_a_long_record_are_those_of_the_other_years() -> None:
    """30 years: the normals of a part are means of the 24 others."""
    record, network = monthly(30)
    ratios, _ = normals_from_record(record, network)
    fit = CrossFit(record, network, day_totals(record), ratios)
    assert not fit.normals_see_all
    third = fit.part_ratios[2]
    assert third is not None
    january = record.depth[::12]
    assert third.means[0, 1, 3] == pytest.approx(np.delete(january[:, 1], range(12, 18)).mean())
    assert ratios.means[0, 1, 3] == pytest.approx(january[:, 1].mean())


def test_normals_from_a_record_of_twelve_years_are_those_of_all() -> None:
    """Ten years are needed and fewer would be left."""
    record, network = monthly(12)
    ratios, _ = normals_from_record(record, network)
    fit = CrossFit(record, network, day_totals(record), ratios)
    assert fit.normals_see_all
    assert set(map(id, fit.part_ratios)) == {id(ratios)}


def test_without_normals_from_the_record_there_is_nothing_to_see() -> None:
    """The network's normals are taken as they are."""
    record, network = monthly(12)
    fit = CrossFit(record, network, day_totals(record), None)
    assert not fit.normals_see_all
    assert set(fit.part_ratios) == {None}
