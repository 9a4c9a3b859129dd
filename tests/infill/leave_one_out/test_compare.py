"""Every infill method on the same cases, and the one that is taken."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from leave_one_out_data import daily_record, every_candidate, plain_estimates, small_depths, small_network

from basinrain.errors import DataError, JobError
from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.days import day_totals
from basinrain.infill.leave_one_out import Candidate, Comparison, compare, compare_infill
from basinrain.infill.record_normals import normals_from_record
from basinrain.infill.relations import relations_of
from basinrain.rainfall import RainRecord, Status

ANY_DONOR = InfillOptions(min_donors=1)
RATIOS = "inverse-distance-ratios (power 2)"
LABELS = tuple(candidate.label for candidate in every_candidate(min_donors=1))


@pytest.fixture(scope="module")
def network() -> GaugeNetwork:
    return small_network(6)


@pytest.fixture(scope="module")
def record(network: GaugeNetwork) -> RainRecord:
    return daily_record(network, small_depths(400, 6, missing=0.15))


@pytest.fixture(scope="module")
def comparison(record: RainRecord, network: GaugeNetwork) -> Comparison:
    return compare_infill(record, network, options=ANY_DONOR)


def test_scores_are_those_of_plain_loops_on_the_common_cases(
    record: RainRecord, network: GaugeNetwork, comparison: Comparison
) -> None:
    """RMSE of all methods to 1e-12, on wet days at gauges that all of them can estimate, relations from the others."""
    days = day_totals(record)
    depth = record.depth
    wet = np.nanmean(depth, axis=1) >= 1
    part = np.arange(400) * 5 // 400
    estimates = {}
    for candidate in every_candidate(min_donors=1):
        table = np.full(depth.shape, np.nan)
        for k in range(5):
            relations = relations_of(depth[part != k], network, days.months[part != k])
            further = {"relations": relations} if candidate.options.chosen_method.needs_relations else {}
            mine = wet & (part == k)
            table[mine] = plain_estimates(network, depth[mine], candidate.options, days.months[mine], **further)
        estimates[candidate.label] = table
    common = np.isfinite(np.stack(list(estimates.values()))).all(axis=0)
    assert comparison.candidates == LABELS
    assert not comparison.skipped
    for label, table in estimates.items():
        score = comparison.score(label)
        assert score.n == common.sum()
        assert score.rmse == pytest.approx(np.sqrt(((table - depth)[common] ** 2).mean()), rel=1e-12)
    assert comparison.best == min(LABELS, key=lambda label: comparison.score(label).rmse)
    rows = common.any(axis=1)
    assert np.array_equal(comparison.ends, record.ends[rows])
    assert np.array_equal(comparison.observed, np.where(common, depth, np.nan)[rows], equal_nan=True)
    chosen = np.where(common, estimates[comparison.chosen], np.nan)[rows]
    np.testing.assert_allclose(comparison.estimated, chosen, rtol=1e-12, atol=1e-12)


def test_the_first_that_cannot_be_told_from_the_best_is_taken(comparison: Comparison) -> None:
    """All before it are distinguishable; the reason names both."""
    k = comparison.candidates.index(comparison.chosen)
    assert all(difference.distinguishable for difference in comparison.differences[:k])
    assert not comparison.differences[k].distinguishable
    assert comparison.chosen in comparison.reason
    assert comparison.best in comparison.reason
    assert comparison.chosen_options == every_candidate(min_donors=1)[k].options
    for difference in comparison.differences:
        rmse = [comparison.score(label).rmse for label in (difference.candidate, difference.best)]
        assert difference.difference == pytest.approx(rmse[0] - rmse[1])


def test_the_order_of_the_gauges_does_not_matter(
    record: RainRecord, network: GaugeNetwork, comparison: Comparison
) -> None:
    """Columns turned round give the same scores, intervals, winner and cases."""
    order = [3, 5, 0, 2, 4, 1]
    turned = GaugeNetwork(
        ids=tuple(network.ids[k] for k in order),
        x=network.x[order],
        y=network.y[order],
        crs="local",
        elevation=network.elevation[order],
        normals=None if network.normals is None else network.normals[order],
    )
    other = compare_infill(record.ordered(turned.ids), turned, options=ANY_DONOR)
    assert (other.chosen, other.best, other.reason) == (comparison.chosen, comparison.best, comparison.reason)
    for score in comparison.scores:
        same = other.score(score.candidate, gauge=score.gauge)
        assert replace(same, rmse=0, mae=0, bias=0, correlation=0, top20_ratio=0) == replace(
            score, rmse=0, mae=0, bias=0, correlation=0, top20_ratio=0
        )
        mine, theirs = ((s.rmse, s.mae, s.bias, s.correlation, s.top20_ratio) for s in (score, same))
        np.testing.assert_allclose(mine, theirs, rtol=1e-9, atol=1e-9)
    for here, there in zip(comparison.differences, other.differences, strict=True):
        np.testing.assert_allclose((here.low, here.high), (there.low, there.high), atol=1e-9)
    np.testing.assert_allclose(other.estimated[:, np.argsort(order)], comparison.estimated, rtol=1e-9)


def test_infilled_values_are_no_donors_and_no_cases(
    record: RainRecord, network: GaugeNetwork, comparison: Comparison
) -> None:
    """Filling all gaps with a metre of rain changes nothing."""
    gaps = record.status == Status.MISSING
    filled = replace(
        record,
        depth=np.where(gaps, 1000.0, record.depth),
        status=np.where(gaps, Status.INFILLED, record.status).astype(np.uint8),
    )
    other = compare_infill(filled, network, options=ANY_DONOR)
    assert other.scores == comparison.scores
    assert other.reason == comparison.reason


def test_hours_are_scored_beside_their_days() -> None:
    """The score is the day's; steps of the wet days, dry ones too, are scored beside."""
    network = small_network(4)
    rng = np.random.default_rng(6)
    depth = rng.gamma(0.2, 4.0, (24 * 60, 1)) * rng.gamma(4.0, 0.25, (24 * 60, 4)) * (rng.random((24 * 60, 1)) < 0.2)
    depth[(np.arange(24 * 60) // 24) % 3 == 0] = 0.0
    depth[rng.random(depth.shape) < 0.02] = np.nan
    ends = np.datetime64("2031-05-01", "s") + np.arange(1, 24 * 60 + 1) * np.timedelta64(3600, "s")
    record = RainRecord.from_depths(network.ids, ends - np.timedelta64(3600, "s"), ends, depth, step="1h")
    found = compare_infill(record, network, options=ANY_DONOR)
    assert found.scale == "day"
    days, steps = found.score("station-average"), found.score("station-average", scale="step")
    assert steps.n > 10 * days.n
    assert steps.dry_hits + steps.hits + steps.misses + steps.false_alarms == steps.n
    assert steps.dry_hits > 0
    assert {score.scale for score in found.scores} == {"day", "step"}
    # The sum of a day's estimates is the estimate of its sum where donors and hours are all there.
    whole = ~np.isnan(depth).reshape(60, 24, 4).any(axis=(1, 2))
    day = np.flatnonzero(whole & (depth.reshape(60, 24, 4).sum(axis=1).mean(axis=1) >= 1))[0]
    total = depth[24 * day : 24 * day + 24].sum(axis=0)
    at = np.flatnonzero(found.ends == ends[24 * day + 23])[0]
    weights = found.chosen_options.weights(network, 0, np.array([False, True, True, True]), relations=None)
    assert found.estimated[at, 0] == pytest.approx(weights @ total)


def test_without_normals_their_methods_are_skipped(record: RainRecord, network: GaugeNetwork) -> None:
    """With the reason in words; and with a normal of 0 the gauge is named."""
    bare = compare_infill(record, replace(network, normals=None), options=ANY_DONOR)
    assert set(bare.skipped) == {"normal-ratio", "ten-percent-rule", RATIOS, "ratio-regression"}
    assert set(bare.skipped.values()) == {"it needs normals, and the gauges have none"}
    normals = np.array(network.normals)
    normals[2] = 0.0
    zero = compare_infill(record, replace(network, normals=normals), options=ANY_DONOR)
    assert set(zero.skipped) >= {"normal-ratio", RATIOS}
    assert zero.skipped["normal-ratio"].startswith(f"gauge {network.ids[2]}: found a normal of 0 mm for the year")


def test_a_record_too_short_for_relations(network: GaugeNetwork) -> None:
    """35 days leave 28 outside each fifth, which are too few for a correlation."""
    found = compare_infill(daily_record(network, small_depths(35, 6, missing=0.0)), network, options=ANY_DONOR)
    assert set(found.skipped) == {"correlation-weighting", "regression", "ratio-regression"}
    assert found.skipped["regression"] == (
        f"it can estimate no value, under 80 % of the {found.score('nearest-gauge').n} that are usual for this record; "
        "relations need 30 days or longer steps in common, besides the fifth of the record estimated, and the record "
        "has 35"
    )


def test_normals_from_a_record_of_few_years(network: GaugeNetwork, record: RainRecord) -> None:
    """Without ten common years no method on ratios can estimate anything."""
    ratios, _ = normals_from_record(record, network)
    found = compare_infill(record, network, options=InfillOptions(), ratios=ratios)
    assert "normals from the record need 10 years in common" in found.skipped["normal-ratio"]


def test_a_method_that_can_estimate_little_does_not_choose_the_cases(record: RainRecord, network: GaugeNetwork) -> None:
    """One that asks for all five donors is left out with its count; cases of the others are as without it."""
    common = [Candidate(label="mean", options=InfillOptions(method="station-average", min_donors=1))]
    picky = Candidate(label="picky", options=InfillOptions(method="station-average", min_donors=5))
    alone = compare_infill(record, network, options=InfillOptions(), candidates=common)
    both = compare_infill(record, network, options=InfillOptions(), candidates=[*common, picky])
    assert both.score("mean") == alone.score("mean")
    assert list(both.skipped) == ["picky"]
    assert both.skipped["picky"].endswith("that are usual for this record; it needs 5 donors")
    assert both.reason.startswith("Nothing could be compared: mean alone")


@pytest.mark.parametrize("missing", [0.05, 0.14, 0.3])
def test_a_small_network_with_gaps_is_compared(missing: float) -> None:
    """Of three gauges the nearest is there far more often than both: the methods of two donors still take part."""
    network = GaugeNetwork(ids=("A", "B", "C"), x=np.array([0.0, 4e3, 8e3]), y=np.array([0.0, 1e3, 0.0]), crs="local")
    depth = small_depths(900, 3, missing=missing)
    found = compare_infill(daily_record(network, depth), network, options=InfillOptions())
    assert {"nearest-gauge", "station-average", "inverse-distance (power 2)", "regression"} <= set(found.candidates)
    # The cases are those of two donors: wet days on which all three report.
    whole = ~np.isnan(depth).any(axis=1) & (depth.mean(axis=1) >= 1)
    assert found.score("nearest-gauge").n == 3 * whole.sum()


def test_methods_that_learn_little_do_not_choose_the_cases() -> None:
    """Every pair of eight gauges has 25 days, one has 100 more: relations of that pair alone count for nothing."""
    network, pairs = replace(small_network(8), normals=None), list(combinations(range(8), 2))
    depth = small_depths(25 * len(pairs) + 100, 8, missing=0.0)
    for day, row in enumerate(depth):
        row[[g for g in range(8) if g not in (pairs[day % 28] if day < 700 else (0, 1))]] = np.nan
    record = daily_record(network, depth)
    found = compare_infill(record, network, options=ANY_DONOR)
    assert {"correlation-weighting", "regression"} <= set(found.skipped)
    assert found.score("station-average").n == 2 * (np.nanmean(depth, axis=1) >= 1).sum()


def test_two_gauges_have_the_nearest_only() -> None:
    """Two donors are not to be had, so nothing is compared, and it is said."""
    network = GaugeNetwork(ids=("A", "B"), x=np.array([0.0, 4e3]), y=np.zeros(2), crs="local")
    found = compare_infill(daily_record(network, small_depths(90, 2, missing=0.0)), network, options=InfillOptions())
    assert found.candidates == ("nearest-gauge",)
    assert found.reason.startswith("Nothing could be compared: nearest-gauge alone can estimate enough of the values")
    assert found.skipped["station-average"].endswith("that are usual for this record; it needs 2 donors")


def test_one_day_has_no_normals_without_itself() -> None:
    """Normals asked from a record of a day leave every method that needs none."""
    network = replace(small_network(3), normals=None)
    record = daily_record(network, np.array([[5.0, 6.0, 7.0]]))
    ratios, _ = normals_from_record(record, network)
    with_normals = compare_infill(record, network, options=InfillOptions(), ratios=ratios)
    without = compare_infill(record, network, options=InfillOptions())
    assert with_normals.chosen == without.chosen
    assert "normals from the record need 10 years in common" in with_normals.skipped["normal-ratio"]


def test_estimates_made_again_are_the_same(
    record: RainRecord, network: GaugeNetwork, comparison: Comparison, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where they do not fit in memory they are made anew, and nothing changes."""
    monkeypatch.setattr(compare, "_KEPT", 0)
    again = compare_infill(record, network, options=ANY_DONOR)
    assert again.scores == comparison.scores
    assert again.differences == comparison.differences
    assert np.array_equal(again.estimated, comparison.estimated, equal_nan=True)


def test_progress_names_every_method(record: RainRecord, network: GaugeNetwork) -> None:
    """Before each is tried."""
    said: list[str] = []
    compare_infill(record, network, options=InfillOptions(), progress=said.append)
    assert tuple(said) == LABELS


def test_storm_totals_without_times(network: GaugeNetwork) -> None:
    """They are cases each by itself, and are drawn each by itself."""
    undated = np.full(60, "NaT", dtype="datetime64[s]")
    depth = small_depths(60, 6, missing=0.1)
    plain = daily_record(network, depth)
    record = RainRecord(network.ids, undated, undated, plain.depth, plain.status, step="storm")
    found = compare_infill(record, network, options=ANY_DONOR)
    assert found.scale == "step"
    assert np.isnat(found.ends).all()
    assert found.drawn == "time"
    assert not np.isnan(found.differences[0].low)
    assert "storm totals with a mean above 0" in str(found.notes[1])
    assert "drawing whole storm totals, all gauges of each together, anew 1,000 times" in str(found.notes[2])


def test_one_gauge_only() -> None:
    """Nothing can be estimated from others."""
    network = small_network(1)
    with pytest.raises(
        DataError, match=r"found 1 gauge; expected two gauges or more.*gauges, or name the infill method$"
    ):
        compare_infill(daily_record(network, np.ones((9, 1))), network, options=ANY_DONOR)


def test_other_columns(record: RainRecord, network: GaugeNetwork) -> None:
    """A record in another order is refused."""
    with pytest.raises(DataError, match="rain record: found columns that are not the network's gauges in their order"):
        compare_infill(record.ordered(network.ids[::-1]), network, options=ANY_DONOR)


def test_no_case(network: GaugeNetwork) -> None:
    """A dry record; and one in which no two gauges ever report together."""
    dry = daily_record(network, np.zeros((40, 6)))
    with pytest.raises(DataError, match=r"found no wet day; expected wet days .*; give a longer record, or ask Pim$"):
        compare_infill(dry, network, options=ANY_DONOR, instead="ask Pim")
    lonely = np.where(np.arange(60)[:, None] % 6 == np.arange(6), 5.0, np.nan)
    with pytest.raises(DataError, match="found no gauge that could be estimated from others on any of 60 wet days"):
        compare_infill(daily_record(network, lonely), network, options=ANY_DONOR)
    with pytest.raises(
        DataError, match="found no gauge that could be estimated from others on the one wet day; expected"
    ):
        compare_infill(daily_record(network, lonely[:1]), network, options=ANY_DONOR)


@pytest.mark.parametrize(("hours", "found"), [(23, "no whole rainfall day"), (24, "no wet day")])
def test_no_whole_day(network: GaugeNetwork, hours: int, found: str) -> None:
    """It rains throughout, but the day lacks an hour; a whole day without rain is another matter."""
    ends = np.datetime64("2031-05-04", "s") + np.arange(1, hours + 1) * np.timedelta64(3600, "s")
    depths = np.full((hours, 6), 5.0 if hours < 24 else 0.0)
    record = RainRecord.from_depths(network.ids, ends - 3600, ends, depths, step="1h")
    with pytest.raises(
        DataError, match=rf"found {found}; expected wet days on which several gauges have values; give a"
    ):
        compare_infill(record, network, options=ANY_DONOR)


def test_no_case_in_common(record: RainRecord, network: GaugeNetwork, monkeypatch: pytest.MonkeyPatch) -> None:
    """Candidates that can estimate different gauges only cannot be compared, and are named."""
    nearby = Candidate(label="nearby", options=InfillOptions(method="nearest-gauge", radius=5e3))
    level = Candidate(label="level", options=InfillOptions(method="nearest-gauge", radius=5e3, elevation_limit=1e-6))
    monkeypatch.setattr(compare, "ENOUGH", 0.0)
    with pytest.raises(DataError, match="estimated from others by each of nearby, level on any of"):
        compare_infill(record, network, options=ANY_DONOR, candidates=[nearby, level])


def test_an_elevation_limit_needs_elevations(record: RainRecord, network: GaugeNetwork) -> None:
    """Every gauge that reports and has none is named."""
    bare = replace(network, elevation=np.array([np.nan, *network.elevation[1:]]))
    with pytest.raises(DataError, match=f"gauge {network.ids[0]}: found no elevation"):
        compare_infill(record, bare, options=InfillOptions(elevation_limit=300))
    limited = compare_infill(record, network, options=InfillOptions(elevation_limit=600))
    assert limited.chosen_options.elevation_limit == 600


def two_lines(n_days: int) -> tuple[RainRecord, GaugeNetwork]:
    """B is the mean of A and C, which stand 1 and 2 km away; A has 10 mm more than C every day."""
    network = GaugeNetwork(ids=("A", "B", "C"), x=np.array([0.0, 1e3, 3e3]), y=np.zeros(3), crs="local")
    rain = 5.0 + np.arange(n_days) % 3
    return daily_record(network, np.column_stack([rain + 10, rain + 5, rain])), network


def candidate(method: str) -> Candidate:
    return Candidate(label=method, options=InfillOptions(method=method))


PAIR = [candidate("nearest-gauge"), candidate("station-average")]


def test_single_cases_are_drawn_where_times_are_few() -> None:
    """Two days of three gauges are six cases: errors of 5, 5, 5 mm against 7.5, 0, 7.5 mm, drawn one by one."""
    record, network = two_lines(2)
    found = compare_infill(record, network, options=InfillOptions(), candidates=PAIR)
    assert found.drawn == "case"
    assert (found.best, found.chosen) == ("nearest-gauge", "nearest-gauge")
    worse = found.differences[1]
    assert worse.difference == pytest.approx(7.5 * np.sqrt(2 / 3) - 5)
    # The second and the fifth case are B's, which the mean estimates without error.
    share = np.random.default_rng(1).multinomial(6, [1 / 6] * 6, 1000)[:, [1, 4]].sum(axis=1) / 6
    expected = np.percentile(7.5 * np.sqrt(1 - share) - 5, [2.5, 97.5])
    np.testing.assert_allclose((worse.low, worse.high), expected, atol=1e-12)
    assert {note.code for note in found.notes if note.level == "warning"} == {"few-cases", "intervals-too-narrow"}


def test_a_simple_method_that_is_far_worse_is_not_taken_for_want_of_weeks() -> None:
    """Three days, eight gauges on a line, in turn 5 mm above and below: the nearest is 10 mm off, the mean 5 + 5/7."""
    network = GaugeNetwork(ids=tuple("ABCDEFGH"), x=1e3 * np.arange(8.0), y=np.zeros(8), crs="local")
    record = daily_record(network, np.array([[20.0], [30.0], [25.0]]) + 5 * (-1.0) ** np.arange(8))
    mean = Candidate(label="mean", options=InfillOptions(method="station-average", nearest="all"))
    found = compare_infill(record, network, options=InfillOptions(), candidates=[PAIR[0], mean])
    assert found.score("nearest-gauge").rmse == pytest.approx(10)
    assert found.score("mean").rmse == pytest.approx(5 + 5 / 7)
    assert (found.drawn, found.chosen) == ("case", "mean")
    assert "every simpler method is distinguishably worse (95 % intervals, single cases drawn anew and so too" in str(
        found.reason
    )


def test_days_are_drawn_where_weeks_are_few() -> None:
    """63 days are nine weeks, 64 days ten."""
    nine, ten = (compare_infill(*two_lines(n), options=InfillOptions(), candidates=PAIR) for n in (63, 64))
    assert (nine.drawn, ten.drawn) == ("time", "week")
    assert "63 days of fewer than 10 weeks" in str([note for note in nine.notes if note.code == "intervals-too-narrow"])
    assert [note.level for note in ten.notes if note.code.startswith("interval")] == ["info"]


def test_with_fewer_than_five_cases_the_least_error_decides() -> None:
    """One day, three cases: the nearest gauge is simpler, but the mean is better, and nothing can be told of either."""
    network = GaugeNetwork(ids=("A", "B", "C"), x=np.array([0.0, 1e3, 3e3]), y=np.zeros(3), crs="local")
    record = daily_record(network, np.array([[10.0, 20.0, 10.0]]))
    found = compare_infill(record, network, options=InfillOptions(), candidates=PAIR)
    # Nearest: 10, -10, 10; mean: 5, -10, 5.
    assert found.score("nearest-gauge").rmse == pytest.approx(10)
    assert found.score("station-average").rmse == pytest.approx(np.sqrt(50))
    assert (found.drawn, found.best, found.chosen) == ("", "station-average", "station-average")
    assert not any(difference.distinguishable for difference in found.differences)
    assert np.isnan([difference.low for difference in found.differences]).all()
    assert found.reason == (
        "station-average has the least RMSE, 7.07 mm over 3 cases (few); with fewer than 5 cases nothing can be told "
        "apart, so it is taken for that alone."
    )
    assert "no-intervals" in {note.code for note in found.notes}


def test_inches_are_in_the_words_only(record: RainRecord, network: GaugeNetwork, comparison: Comparison) -> None:
    """Scores stay in mm; reason and notes name inches; another unit is refused."""
    found = compare_infill(record, network, options=ANY_DONOR, depth_unit="in")
    assert found.scores == comparison.scores
    rmse = found.score(found.best).rmse
    assert f"has the least RMSE, {rmse / 25.4:.3f} in over" in found.reason
    assert "at least 0.039 in (1 mm)" in str(found.notes[1])
    assert " mm" not in found.reason
    with pytest.raises(JobError, match="depth unit: found 'inch'"):
        compare_infill(record, network, options=ANY_DONOR, depth_unit="inch")


def test_few_cases_are_said_to_be_few(network: GaugeNetwork) -> None:
    """Two wet days: the simplest method, a remark and a word in the reason."""
    found = compare_infill(daily_record(network, np.full((2, 6), 7.0)), network, options=ANY_DONOR)
    assert "few-cases" in {note.code for note in found.notes}
    assert "over 12 cases (few)" in found.reason
    assert found.chosen == "nearest-gauge"
