"""How basin means move with the infill method, by hand on three strips and by running every method separately."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import numpy.typing as npt
import pytest
from drawn import gauges_at
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks
from strips import BASINS, NAN, NETWORK, hourly

from basinrain.averaging import Weigher, averaging_method
from basinrain.basin_depths import BasinDepths, average_storm
from basinrain.basins import Basins
from basinrain.errors import DataError, MethodError, Problem
from basinrain.gauges import GaugeNetwork
from basinrain.infill import METHODS, InfillOptions, complete
from basinrain.infill.leave_one_out import candidates_of
from basinrain.infill.relations import relations_of
from basinrain.infill_effect import InfillEffect, infill_effect, infill_spread_cautions
from basinrain.rainfall import RainRecord, Status
from basinrain.weights import WeightTable

NORMALS = replace(NETWORK, normals=np.array([[1000.0], [1500.0], [1200.0]]))
IDW = "inverse-distance (power 2)"


def effect_of(
    record: RainRecord,
    options: InfillOptions,
    network: GaugeNetwork = NETWORK,
    weighers: Mapping[str, Weigher] | None = None,
) -> InfillEffect:
    chosen = {"thiessen": averaging_method("thiessen")(network, BASINS)} if weighers is None else weighers
    return infill_effect(record, network, complete(record, network, options), chosen, options=options)


def by_label(effect: InfillEffect, values: npt.NDArray[np.float64]) -> dict[str, float]:
    return dict(zip(effect.methods, values[:, 0].tolist(), strict=True))


def test_three_infill_methods_by_hand() -> None:
    """B silent between 6 and 12 mm: 9 by the mean, 6 by the nearest, 750·(6/1000 + 12/1200) = 12 by normals; thirds."""
    effect = effect_of(hourly([[6, NAN, 12]]), InfillOptions(method="station-average"), NORMALS)
    totals = by_label(effect, effect.totals["thiessen"])
    assert totals["station-average"] == pytest.approx((6 + 9 + 12) / 3)
    assert totals["nearest-gauge"] == pytest.approx((6 + 6 + 12) / 3)
    assert totals["normal-ratio"] == pytest.approx((6 + 12 + 12) / 3)
    assert totals[IDW] == pytest.approx(9)
    differences = by_label(effect, effect.difference("thiessen"))
    assert differences["nearest-gauge"] == pytest.approx(-1)
    assert differences["station-average"] == 0
    shares = by_label(effect, effect.share_infilled["thiessen"])
    assert shares["nearest-gauge"] == pytest.approx(6 / 24)
    assert shares["normal-ratio"] == pytest.approx(12 / 30)
    (spread,) = effect.spread("thiessen")
    assert spread.least == pytest.approx(8)
    assert spread.least_by == "nearest-gauge"
    assert spread.greatest == pytest.approx(max(totals.values()))
    assert spread.percent == pytest.approx(100 * (spread.greatest - 8) / np.mean(list(totals.values())))
    assert effect.left.tolist() == [0] * len(effect.methods)


def test_what_cannot_run_is_skipped_with_its_reason() -> None:
    """Without normals, and with too few days for relations, the methods that rest on them are named, and no other."""
    effect = effect_of(hourly([[6, NAN, 12]]), InfillOptions(method="station-average"))
    lacking = {m.name for m in METHODS.values() if m.needs_normals or m.needs_relations}
    assert {label.split(" (")[0] for label in effect.skipped} == lacking
    assert {label.split(" (")[0] for label in effect.methods} == set(METHODS) - lacking
    assert effect.skipped["normal-ratio"].startswith("gauges: found no normals; expected a normal above 0")
    assert effect.skipped["regression"] == "it cannot infill the missing value"
    some = replace(NETWORK, normals=np.array([[1000.0], [NAN], [0.0]]))
    skipped = effect_of(hourly([[6, NAN, 12]]), InfillOptions(method="station-average"), some).skipped
    assert skipped["normal-ratio"].startswith("gauge B: found no normal for the year; expected")
    assert skipped["normal-ratio"].endswith("(and 1 more)")


@pytest.mark.parametrize("pairs", [6, 7])
def test_a_method_that_leaves_most_gaps_is_skipped(pairs: int) -> None:
    """Every choice of silent gauges, one a pair: the nearest gauge fills them, two donors are only at the trio.

    Six pairs have 63 sets with someone silent, for which weights are rebuilt; the 127 of seven pairs are too many.
    """
    places = [(100 * k + off, 5) for k in range(pairs) for off in (0, 2)] + [(900, 5), (902, 5), (904, 5)]
    network = gauges_at(*places, unit=1e3)
    rows = np.ones((2**pairs, len(places)))
    for k in range(pairs):
        rows[(np.arange(2**pairs) >> k) % 2 == 1, 2 * k] = NAN
    rows[0, -2] = NAN
    effect = effect_of(
        hourly(rows.tolist(), network), InfillOptions(method="nearest-gauge", scale="step", radius=3e3), network
    )
    silent = pairs * 2 ** (pairs - 1)
    if pairs == 6:
        assert effect.left[effect.methods.index("station-average")] == silent
        assert effect.totals["thiessen"] == pytest.approx(64)
    else:
        assert "station-average" not in effect.methods
        assert effect.skipped["station-average"] == (
            f"it leaves {silent} of {silent + 1} missing values without a depth, and the weights would have to be "
            "rebuilt for 127 sets of gauges, more than 100"
        )


def test_order_is_from_simple_to_complex() -> None:
    """The labels stand in the order of the registry, the job's own in its place among them."""
    effect = effect_of(hourly([[6, NAN, 12]]), InfillOptions(method="normal-ratio"), NORMALS)
    order = [METHODS[label.split(" (")[0]].order for label in effect.methods]
    assert order == sorted(order)
    assert effect.own == "normal-ratio"


def test_the_others_share_the_jobs_limits_and_numbers_of_donors() -> None:
    """With nearest = 1 inverse distance takes A alone, 6 mm, and so does the station average; not four-quadrant."""
    own = InfillOptions(method="inverse-distance", power=1, nearest=1, min_donors=1)
    effect = effect_of(hourly([[6, NAN, 12]]), own)
    totals = by_label(effect, effect.totals["thiessen"])
    own_label = "inverse-distance (power 1)"
    assert effect.own == own_label
    assert totals[own_label] == pytest.approx(8)
    assert totals["station-average"] == pytest.approx(8)
    # A is in the west, C in the east, and the nearest of each quadrant donates.
    assert totals["four-quadrant"] == pytest.approx(9)
    near = effect_of(hourly([[6, NAN, 12]]), replace(own, radius=9e3))
    assert (near.methods, near.left.tolist()) == ((own_label,), [1])
    assert near.skipped["station-average"] == "it cannot infill the missing value"


def test_what_the_job_says_holds_where_a_comparison_chose_the_method() -> None:
    """The nearest gauge was chosen and takes no number of donors; nearest = 1 and the power hold for the others."""
    record, own = hourly([[6, NAN, 12]]), InfillOptions(method="nearest-gauge")
    asked = InfillOptions(nearest=1, min_donors=1, power=3)
    completed, weighers = complete(record, NETWORK, own), {"toy": toy}
    found = infill_effect(record, NETWORK, completed, weighers, options=own, asked=asked)
    assert by_label(found, found.totals["toy"])["station-average"] == pytest.approx(8)
    assert "inverse-distance (power 3)" in found.methods
    alone = infill_effect(record, NETWORK, completed, weighers, options=own)
    assert by_label(alone, alone.totals["toy"])["station-average"] == pytest.approx(9)


def test_a_comparison_tries_the_others_with_the_same_numbers() -> None:
    """Each candidate of the leave-one-out comparison is the effect's run of that label."""
    asked = InfillOptions(nearest=3, min_donors=1, radius=5e4, power=2)
    candidates = {candidate.label: candidate.options for candidate in candidates_of(asked)}
    for method in METHODS:
        other = asked.with_method(method)
        assert candidates[other.label] == other


def test_progress_names_every_other_method() -> None:
    """The job's own is not run again."""
    said: list[str] = []
    record, own = hourly([[6, NAN, 12]]), InfillOptions(method="station-average")
    infill_effect(record, NETWORK, complete(record, NETWORK, own), {"toy": toy}, options=own, progress=said.append)
    assert [label.split(" (")[0] for label in said] == [name for name in METHODS if name != "station-average"]


def test_a_record_too_short_for_correlations_says_so() -> None:
    """Three days are too few, thirty would do."""
    record, own = hourly([[6, NAN, 12]]), InfillOptions(method="station-average")
    few, many = (relations_of(np.arange(3.0 * n).reshape(n, 3), NETWORK) for n in (3, 30))
    completed = complete(record, NETWORK, own)
    effect = infill_effect(record, NETWORK, completed, {"toy": toy}, options=own, relations=few)
    assert effect.skipped["regression"] == (
        "it cannot infill the missing value; a correlation needs 30 days, or longer steps, in common, and no two "
        "gauges have more than 3"
    )
    assert "regression" in infill_effect(record, NETWORK, completed, {"toy": toy}, options=own, relations=many).methods


def test_the_power_is_the_jobs_wherever_a_method_has_one() -> None:
    """Power 1 at 10 and 20 km gives A and B the weights 1/3 and 2/3 at C: (6 + 2·12)/3 = 10 mm; power 2 1/5, 4/5."""
    record = hourly([[6, 12, NAN]])
    for power, depth in ((1.0, (6 * 1 + 12 * 2) / 3), (2.0, (6 * 1 + 12 * 4) / 5)):
        effect = effect_of(record, InfillOptions(method="inverse-distance", power=power))
        assert by_label(effect, effect.totals["thiessen"])[effect.own] == pytest.approx((6 + 12 + depth) / 3)
        assert effect.own == f"inverse-distance (power {power:g})"
        assert f"inverse-distance-ratios (power {power:g})" in effect.skipped
    assert IDW in effect_of(record, InfillOptions(method="station-average")).methods


def test_weights_are_rebuilt_where_a_method_leaves_a_gap() -> None:
    """C is not there. B = 6 by the nearest gauge, (6 + 6)/2; two donors are too many, and A alone has all: 6 mm."""
    record = hourly([[6, NAN, NAN], [8, 2, NAN]])
    status = record.status.copy()
    status[:, 2] = Status.NOT_INSTALLED
    record = replace(record, status=status)
    effect = effect_of(record, InfillOptions(method="station-average", scale="step"))
    totals = by_label(effect, effect.totals["thiessen"])
    # A has the western strip of three, B the other two.
    assert totals["nearest-gauge"] == pytest.approx((6 / 3 + 6 * 2 / 3) + (8 / 3 + 2 * 2 / 3))
    assert totals["station-average"] == pytest.approx(6 + (8 / 3 + 2 * 2 / 3))
    left = dict(zip(effect.methods, effect.left.tolist(), strict=True))
    assert (left["nearest-gauge"], left["station-average"]) == (0, 1)
    assert by_label(effect, effect.share_infilled["thiessen"])["station-average"] == 0


def test_a_step_without_any_gauge_has_no_number() -> None:
    """Nobody reports in the second hour, so no method has a total, never the sum of what is left."""
    effect = effect_of(hourly([[6, 1, 12], [NAN, NAN, NAN]]), InfillOptions(method="station-average", scale="step"))
    assert np.isnan(effect.totals["thiessen"]).all()
    assert np.isnan(effect.share_infilled["thiessen"]).all()
    (spread,) = effect.spread("thiessen")
    assert np.isnan([spread.least, spread.greatest, spread.percent]).all()
    assert (spread.least_by, spread.greatest_by) == ("", "")
    assert effect.refused["thiessen", "station-average"] == "at some step no gauge has a depth"


def toy(present: npt.NDArray[np.bool_]) -> WeightTable:
    """Give thirds, and refuse fewer than three gauges."""
    if present.sum() < 3:
        raise MethodError(Problem(item="toy", found="two gauges", expected="three"))
    return WeightTable("toy", ("all",), NETWORK.ids, np.array([[1 / 3, 1 / 3, 1 / 3]]))


def _never(present: npt.NDArray[np.bool_]) -> WeightTable:
    raise MethodError(Problem(item="toy", found="two gauges", expected="three"))


def test_an_averaging_method_that_refuses_has_no_number_and_says_why() -> None:
    """The nearest gauge fills B; two donors do not, and what refuses two gauges then has no number."""
    record = hourly([[6, NAN, 4], [6, NAN, NAN]])
    effect = effect_of(record, InfillOptions(method="nearest-gauge", scale="step"), weighers={"toy": toy})
    totals = by_label(effect, effect.totals["toy"])
    assert totals["nearest-gauge"] == pytest.approx((6 + 6 + 4) / 3 + 6)
    assert np.isnan(totals["station-average"])
    assert effect.refused["toy", "station-average"] == "toy: found two gauges; expected three"
    assert ("toy", "nearest-gauge") not in effect.refused
    lone, own = hourly([[6, NAN, NAN]]), InfillOptions(method="station-average")
    with pytest.raises(MethodError, match="toy: found two gauges; expected three"):
        infill_effect(lone, NETWORK, complete(lone, NETWORK, own), {"toy": _never}, options=own)


def test_options_of_another_method_are_refused() -> None:
    """What was completed by one method is not passed off as another's."""
    record = hourly([[6, NAN, 12]])
    completed = complete(record, NETWORK, InfillOptions(method="station-average"))
    with pytest.raises(DataError, match="infilled by station-average; expected infilled by inverse-distance, as the"):
        infill_effect(record, NETWORK, completed, {"toy": toy}, options=InfillOptions())


def test_a_dry_basin_is_infilled_by_weight() -> None:
    """B silent in one of two dry hours holds a third of the weight there: 1/6 of the whole."""
    effect = effect_of(hourly([[0, NAN, 0], [0, 0, 0]]), InfillOptions(method="station-average", scale="step"))
    assert effect.share_infilled["thiessen"] == pytest.approx(1 / 6)
    assert (effect.totals["thiessen"] == 0).all()


def random_case(random: np.random.Generator, network: GaugeNetwork, n_steps: int = 8) -> RainRecord:
    """Return hours of which some are missing, rejected, spread, or before a gauge came or after it went."""
    n = len(network)
    depth = random.gamma(0.5, 6, (n_steps, n)).round(1) * (random.random((n_steps, n)) < 0.7)
    record = hourly(depth.tolist(), network)
    status = record.status.copy()
    for code, share in ((Status.MISSING, 0.2), (Status.REJECTED, 0.05)):
        status[random.random((n_steps, n)) < share] = code
    for g in range(n):
        if random.random() < 0.3:
            at = random.integers(1, n_steps)
            status[slice(0, at) if random.random() < 0.5 else slice(at, None), g] = Status.NOT_INSTALLED
    without = np.isin(status, [Status.MISSING, Status.REJECTED, Status.NOT_INSTALLED])
    return replace(record, status=status, depth=np.where(without, NAN, record.depth))


def share_of(depths: BasinDepths) -> npt.NDArray[np.float64]:
    """Return the share infilled, each basin by its own sum."""
    shares = []
    for b, total in enumerate(depths.total):
        if total == 0:
            shares.append(1 - depths.observed_share[:, b].mean())
        else:
            shares.append(depths.infilled[b] / total)
    return np.array(shares)


@pytest.mark.parametrize("scale", ["step", "storm"])
def test_every_total_is_what_average_storm_gives_for_that_method_alone(scale: str, basins: Basins) -> None:
    """Totals and shares of each method equal those of completing and averaging by it alone, gauges coming and going."""
    random = np.random.default_rng(11)
    network = gauges_at((3, 5), (9, 2), (14, 8), (21, 4), (27, 6), ids="DBACE", unit=1e3)
    network = replace(network, normals=np.array([[900.0], [1000.0], [1150.0], [1300.0], [1000.0]]))
    relations = relations_of(random.gamma(0.5, 6, (60, 1)) + random.gamma(0.5, 1, (60, 5)), network)
    weighers = {
        name: averaging_method(name)(network, basins, {"cell": 1000.0} if name == "idw" else {})
        for name in ("arithmetic", "thiessen", "idw")
    }
    compared: set[tuple[str, str]] = set()
    for _ in range(12):
        record = random_case(random, network)
        if not record.reporting.any():
            continue
        own = InfillOptions(scale=scale, min_donors=2)  # type: ignore[arg-type]
        completed = complete(record, network, own, relations=relations)
        effect = infill_effect(record, network, completed, weighers, options=own, relations=relations)
        assert not effect.skipped
        for k, label in enumerate(effect.methods):
            name = label.split(" (")[0]
            alone = own if label == effect.own else replace(own, method=name, min_donors=None)
            again = complete(record, network, alone, relations=relations)
            for averaging, weigher in weighers.items():
                expected = average_storm(again, weigher)
                np.testing.assert_allclose(effect.totals[averaging][k], expected.total, rtol=1e-12, atol=1e-12)
                np.testing.assert_allclose(
                    effect.share_infilled[averaging][k], share_of(expected), rtol=1e-12, atol=1e-12
                )
                if (expected.infilled > 0).any():
                    compared.add((label, averaging))
    assert len(compared) == 3 * len(METHODS)


@pytest.fixture(name="basins")
def _basins() -> Basins:
    import shapely

    halves = np.array([shapely.box(0, 0, 12e3, 10e3), shapely.box(12e3, 0, 30e3, 10e3)])
    return Basins(ids=("west", "east"), polygons=halves, crs="local").with_union()


@given(networks(at_least=3), st.data())
def test_without_gaps_the_infill_method_does_not_matter(network: GaugeNetwork, data: st.DataObject) -> None:
    """With every value there all methods give the very same means, and nothing is infilled."""
    n = len(network)
    depth = data.draw(st.lists(st.lists(st.integers(0, 300), min_size=n, max_size=n), min_size=1, max_size=4))
    record = hourly((np.array(depth) / 10).tolist(), network)
    effect = effect_of(record, InfillOptions(), network)
    assert (effect.difference("thiessen") == 0).all()
    assert (effect.share_infilled["thiessen"] == 0).all()
    assert (effect.left == 0).all()
    assert list(infill_spread_cautions("Quill", ("all",), effect)) == []


@given(networks(at_least=3), st.data())
def test_the_order_of_the_gauges_does_not_matter(network: GaugeNetwork, data: st.DataObject) -> None:
    """The same gauges in another order give the same totals by every method."""
    n = len(network)
    value = st.one_of(st.just(-1), st.integers(0, 300))
    rows = np.array(data.draw(st.lists(st.lists(value, min_size=n, max_size=n), min_size=1, max_size=4))) / 10
    rows[:, data.draw(st.integers(0, n - 1))] = 1.0
    record = hourly(np.where(rows < 0, NAN, rows).tolist(), network)
    order = data.draw(st.permutations(range(n)))
    ids = tuple(network.ids[g] for g in order)
    shuffled = GaugeNetwork(ids=ids, x=network.x[order], y=network.y[order], crs="local")
    one = effect_of(record, InfillOptions(scale="step"), network)
    two = effect_of(record.ordered(ids), InfillOptions(scale="step"), shuffled)
    assert one.methods == two.methods
    np.testing.assert_allclose(one.totals["thiessen"], two.totals["thiessen"], rtol=1e-9, atol=1e-12)
    np.testing.assert_array_equal(one.left, two.left)


def spread_of(*totals: float, own: int = 0) -> InfillEffect:
    labels = tuple(f"method-{k}" for k in range(len(totals)))
    return InfillEffect(
        methods=labels,
        own=labels[own],
        totals={"thiessen": np.array(totals)[:, None], "idw": np.full((len(totals), 1), 20.0)},
        share_infilled={},
        left=np.zeros(len(totals), dtype=np.int64),
        skipped={},
        refused={},
    )


def test_warned_from_just_over_ten_percent() -> None:
    """19 to 21 mm is 10 % of 20 and not over; 18.9 to 21 is; methods without a number do not count."""
    assert list(infill_spread_cautions("Quill", ("all",), spread_of(19, 21))) == []
    assert list(infill_spread_cautions("Quill", ("all",), spread_of(19, NAN, 21))) == []
    (note,) = infill_spread_cautions("Quill", ("all",), spread_of(18.9, NAN, 21, own=2))
    assert (note.code, note.level, note.storm, note.basin) == ("infill-spread", "warning", "Quill", "all")
    assert note.text == (
        "The mean of basin all by thiessen depends on the infill method: from 18.9 mm (method-0) to 21.0 mm "
        "(method-2), 11 % of their mean; the job has method-2, 21.0 mm."
    )
    (note,) = infill_spread_cautions("Quill", ("all",), spread_of(25.4, 50.8), depth_unit="in")
    assert (
        "from 1.00 in (method-0) to 2.00 in (method-1), 67 % of their mean; the job has method-0, 1.00 in." in note.text
    )


def test_a_warning_names_the_widest_averaging_method_first() -> None:
    """One warning a basin: the widest spread in full, the others by their percent."""
    effect = replace(
        spread_of(18, 22), totals={"arithmetic": np.array([[18.0], [22.0]]), "idw": np.array([[10.0], [30.0]])}
    )
    (note,) = infill_spread_cautions("Quill", ("all",), effect)
    assert "basin all by idw" in note.text
    assert "100 % of their mean, 20 % by arithmetic; the job has" in note.text
