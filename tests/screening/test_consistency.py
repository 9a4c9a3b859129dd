"""Double-mass curves and homogeneity over a network: what is found, what is left alone, and what cannot be told."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from screening.break_rates import N_GAUGES, NETWORK, START, days_of, planted_breaks
from screening.break_rates import record_of as days_record

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status
from basinrain.screening import screen
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS, Consistency, consistency
from basinrain.screening.edits import SUGGESTED, apply_edits
from basinrain.screening.homogeneity import homogeneity_of


def network_of(n: int) -> GaugeNetwork:
    """Return n gauges A, B, ... in a line, 5 km apart."""
    return GaugeNetwork(ids=tuple("ABCDEFGHIJ"[:n]), x=np.arange(float(n)) * 5e3, y=np.zeros(n), crs="local")


def record_of(depths: npt.NDArray[np.float64]) -> RainRecord:
    """Return a record of months from January 1991 on."""
    first = np.datetime64("1991-01", "M")
    bounds = (first + np.arange(len(depths) + 1)).astype("datetime64[s]")
    return RainRecord.from_depths(network_of(depths.shape[1]).ids, bounds[:-1], bounds[1:], depths, step="1mo")


def months(years: int, gauges: int, seed: int = 3, noise: float = 0.12) -> npt.NDArray[np.float64]:
    """Return monthly depths in mm that share their weather: each gauge's factor, and noise that is its own."""
    rng = np.random.default_rng(seed)
    shared = rng.gamma(4.0, 20.0, (12 * years, 1)) * np.linspace(0.8, 1.3, gauges)
    return np.asarray(shared * (1 + noise * rng.standard_normal((12 * years, gauges))).clip(0.1))


def found(depths: npt.NDArray[np.float64]) -> Consistency:
    return consistency(record_of(depths), network_of(depths.shape[1]))


def keys(result: Consistency) -> list[tuple[str, str]]:
    return [(finding.check, finding.gauge) for finding in result.findings]


def test_a_clean_network() -> None:
    """Thirty years of six gauges have curves and tests, and nothing is found."""
    result = found(months(30, 6))
    assert [curve.gauge for curve in result.double_mass] == list("ABCDEF")
    assert [tested.grade for tested in result.homogeneity] == ["useful"] * 6
    assert (result.findings, dict(result.skipped)) == ((), {})


def test_false_alarms() -> None:
    """Over 60 clean networks of six gauges, at most 2 % of curves and of tests are called out."""
    results = [keys(found(months(30, 6, seed))) for seed in range(60)]
    for check in (DOUBLE_MASS_BREAK, INHOMOGENEOUS):
        assert sum(name == check for result in results for name, _ in result) <= 0.02 * 360


def test_one_break() -> None:
    """C lost 25 % after 2004: it is named, with the years, the slopes and the edit, and no neighbour is."""
    depths = months(30, 6)
    depths[14 * 12 :, 2] *= 0.75
    result = found(depths)
    assert keys(result) == [(DOUBLE_MASS_BREAK, "C"), (INHOMOGENEOUS, "C")]
    finding = result.findings[0]
    curve = result.double_mass[2]
    assert curve.break_after == 2004
    assert curve.ratio == pytest.approx(0.75, rel=0.05)
    assert (str(finding.start), str(finding.end)) == ("1991-01-01T00:00:00", "2005-01-01T00:00:00")
    assert finding.key == "double-mass-break C 1991-01-01T00:00"
    assert finding.severity == "doubtful"
    assert finding.evidence == (
        f"Against the mean of B, D, A, E, F over 30 years, 1991 to 2020, the slope of the double-mass curve is "
        f"{curve.slopes[0]:.3f} to 2004 and {curve.slopes[1]:.3f} after (F = {curve.f:.1f}, probability below 0.001). "
        "The finding's stretch is the older part."
    )
    assert finding.others == tuple("ABDEF")
    assert f"scale the record to 2004 by {curve.ratio:.3f}" in finding.action
    second = result.findings[1]
    assert (second.severity, second.whole_record) == ("doubtful", True)
    assert second.evidence == (
        "4 of 4 tests (SNHT, Buishand's range, Pettitt, von Neumann) reject homogeneity at 1 % for 30 ratios of annual "
        "totals to the mean of B, D, A, E, F, which grades the record suspect; the change is most likely after 2004."
    )


def test_the_suggested_edit_mends_it() -> None:
    """Carried out, the edit scales the older part, and nothing is found any more."""
    depths = months(30, 6)
    depths[14 * 12 :, 2] *= 0.75
    record, network = record_of(depths), network_of(6)
    edit = consistency(record, network).findings[0].edit
    assert edit is not None
    assert (edit.gauge, edit.action, edit.by) == ("C", "scale", SUGGESTED)
    (mended,), _ = apply_edits([record], [edit])
    assert (mended.status[: 14 * 12, 2] == Status.ADJUSTED).all()
    assert np.array_equal(mended.depth[14 * 12 :], record.depth[14 * 12 :])
    assert consistency(mended, network).findings == ()


def test_a_break_spoils_no_neighbours() -> None:
    """C at half and F at double after 2004: both are named, the neighbours are judged without them."""
    depths = months(30, 8)
    depths[14 * 12 :, 2] *= 0.5
    depths[14 * 12 :, 5] *= 2.0
    result = found(depths)
    assert {gauge for _, gauge in keys(result)} == {"C", "F"}
    for curve in result.double_mass:
        assert not {"C", "F"} & set(curve.reference)


def test_order_of_gauges_does_not_matter() -> None:
    """With the columns and the network turned round, the same is said of every gauge."""
    depths = months(30, 6)
    depths[14 * 12 :, 2] *= 0.75
    record, network = record_of(depths), network_of(6)
    turned = GaugeNetwork(ids=network.ids[::-1], x=network.x[::-1], y=network.y[::-1], crs="local")
    plain, other = consistency(record, network), consistency(record.ordered(network.ids[::-1]), turned)
    assert [finding.key for finding in plain.findings] == [finding.key for finding in other.findings]
    for one, two in zip(plain.double_mass, other.double_mass[::-1], strict=True):
        assert (one.gauge, one.reference, one.break_after) == (two.gauge, two.reference, two.break_after)
        assert one.f == pytest.approx(two.f, rel=1e-9)


def test_without_neighbours() -> None:
    """Two gauges have no reference: no curve, and their totals are tested by themselves."""
    depths = months(30, 2)
    result = found(depths)
    assert result.double_mass == ()
    assert result.skipped == {
        DOUBLE_MASS_BREAK: "A, B: 1 neighbour; it takes 3",
    }
    assert [tested.reference for tested in result.homogeneity] == [(), ()]
    totals = depths[:, 1].reshape(30, 12).sum(axis=1)
    lengths = np.where(np.arange(1991, 2021) % 4 == 0, 366, 365)
    expected = homogeneity_of(np.arange(1991, 2021), totals / lengths, gauge="B")
    assert result.homogeneity[1].series == pytest.approx(totals / result.homogeneity[1].days)
    assert result.homogeneity[1].days[:2].tolist() == [365, 366]
    assert result.homogeneity[1].tests[0].statistic == pytest.approx(expected.tests[0].statistic)


def test_totals_by_themselves_are_named_as_such() -> None:
    """The evidence says whether totals or ratios were tested."""
    depths = months(30, 1, noise=0.02)
    depths[14 * 12 :] *= 0.4
    finding = found(depths).findings[0]
    assert (
        "reject homogeneity at 1 % for 30 annual means of the gauge alone, which grades the record suspect"
        in finding.evidence
    )


ALL_SIX = "A, B, C, D, E and 1 more"


@pytest.mark.parametrize(
    ("years", "curves", "tested", "skipped"),
    [
        (
            9,
            0,
            0,
            {
                DOUBLE_MASS_BREAK: f"{ALL_SIX}: at most 9 calendar years with 90 % of the days; it takes 10",
                INHOMOGENEOUS: f"{ALL_SIX}: at most 9 calendar years with 90 % of the days; it takes 20",
            },
        ),
        (
            12,
            6,
            0,
            {INHOMOGENEOUS: f"{ALL_SIX}: at most 12 calendar years with 90 % of the days; it takes 20"},
        ),
    ],
)
def test_short_records(years: int, curves: int, tested: int, skipped: dict[str, str]) -> None:
    """Ten years make a curve, twenty a test; below that it is said how many there are."""
    result = found(months(years, 6))
    assert (len(result.double_mass), len(result.homogeneity), dict(result.skipped)) == (curves, tested, skipped)


def test_one_short_gauge() -> None:
    """A gauge that lacks two months in most years is left out, as target and, as it cannot be judged, as neighbour."""
    depths = months(30, 6)
    for month in (0, 6):
        depths[month : 22 * 12 : 12, 1] = np.nan
    result = found(depths)
    assert [curve.gauge for curve in result.double_mass] == list("ACDEF")
    assert all("B" not in curve.reference and len(curve.years) == 30 for curve in result.double_mass)
    assert result.skipped == {
        DOUBLE_MASS_BREAK: "B: 8 calendar years with 90 % of the days; it takes 10",
        INHOMOGENEOUS: "B: 8 calendar years with 90 % of the days; it takes 20",
    }


def test_eleven_months_will_do() -> None:
    """Where D lacks a month a year, its sums and its neighbours' are over the other eleven, and every year counts."""
    depths = months(30, 6)
    depths[5::12, 3] = np.nan
    result = found(depths)
    curve = result.double_mass[3]
    assert (curve.gauge, len(curve.years), sorted(set(curve.days.tolist()))) == ("D", 30, [335, 336])
    assert curve.totals == pytest.approx(np.nansum(depths[:, 3].reshape(30, 12), axis=1))
    assert result.findings == ()


def test_alone_takes_complete_years() -> None:
    """Without neighbours there are no shared days: of A's 25 years one lacks a month and is left out, 24 are tested."""
    depths = months(25, 1)
    depths[12 * 3 + 5] = np.nan
    (tested,) = found(depths).homogeneity
    assert (len(tested.years), 1994 in tested.years.tolist()) == (24, False)


@pytest.mark.parametrize(
    ("full", "said"),
    [((0, 0), "A, B: no calendar year"), ((1, 0), "A, B: at most 1 calendar year")],
)
def test_words_for_few_years(full: tuple[int, int], said: str) -> None:
    """None and one are said as such."""
    depths = months(3, 2)
    for g, years in enumerate(full):
        depths[12 * years :: 6, g] = np.nan
    assert found(depths).skipped[DOUBLE_MASS_BREAK] == f"{said} with 90 % of the days; it takes 10"


@pytest.mark.parametrize(
    ("noise", "factor", "least", "most_false"),
    [(0.1, 0.9, 0.98, 0.01), (0.2, 0.8, 0.98, 0.01), (0.3, 0.8, 0.88, 0.01)],
)
def test_planted_breaks(noise: float, factor: float, least: float, most_false: float) -> None:
    """Of 200 breaks planted in eight gauges over 30 years the clear ones are found, and hardly any where none is.

    Noise of 0.1, 0.2 and 0.3 a month leaves the ratio of a gauge's years to its neighbours' varying by 3, 6 and 10 %.
    """
    hits = {DOUBLE_MASS_BREAK: 0, INHOMOGENEOUS: 0}
    false = hits.copy()
    for seed in range(200):
        rng = np.random.default_rng([7, seed])
        depths, target, year = months(30, 8, seed, noise), int(rng.integers(8)), int(rng.integers(8, 23))
        depths[12 * year :, target] *= factor
        for check, gauge in keys(found(depths)):
            counted = hits if gauge == "ABCDEFGH"[target] else false
            counted[check] += 1
    assert min(hits.values()) >= least * 200
    assert max(false.values()) <= most_false * 200 * 7


@pytest.mark.parametrize(
    ("gaps", "curve", "tests"),
    # Of 200; the table of docs/verification.md less three standard errors.
    [(0.0, 0.98, 0.98), (0.05, 0.98, 0.98), (0.08, 0.93, 0.56)],
)
def test_planted_breaks_with_gaps(gaps: float, curve: float, tests: float) -> None:
    """In daily records with outages breaks of 10 % are found where years enough are left, hardly any where none is."""
    rates = planted_breaks(0.22, 0.9, gaps)
    assert rates.share(DOUBLE_MASS_BREAK) >= curve
    assert rates.share(INHOMOGENEOUS) >= tests
    assert max(rates.alarms(DOUBLE_MASS_BREAK), rates.alarms(INHOMOGENEOUS)) <= 0.015


def lost(depths: npt.NDArray[np.float64], year: int, days: slice, gauge: int) -> None:
    """Take some days of a year away from a gauge."""
    first = int((np.datetime64(f"{year}-01-01") - START).astype(int))
    depths[first + days.start : first + days.stop, gauge] = np.nan


def test_one_day_missing_a_year_takes_nothing_away() -> None:
    """Every gauge lacks a day of its own in every year: all 30 years count, over 364 days, and the break is found."""
    depths = days_of(1, 0.22, 0.0)
    for year in range(1991, 2021):
        for g in range(N_GAUGES):
            lost(depths, year, slice(10 + g, 11 + g), g)
    depths[5479:, 3] *= 0.8
    result = consistency(days_record(depths), NETWORK)
    assert {len(c.years) for c in result.double_mass} == {len(t.years) for t in result.homogeneity} == {30}
    assert {int(c.days.min()) for c in result.double_mass} == {364}
    assert keys(result) == [(DOUBLE_MASS_BREAK, "D"), (INHOMOGENEOUS, "D")]
    assert "over 30 years, 1991 to 2020, on the 99.7 % of their days that they share" in result.findings[0].evidence


def test_a_neighbour_with_gaps_stands_in_where_it_reports() -> None:
    """B lacks two months in twelve of thirty years: the others' years all count, over all months, B among them."""
    depths = months(30, 6)
    depths[: 12 * 12 : 6, 1] = np.nan
    result = found(depths)
    curves = {curve.gauge: curve for curve in result.double_mass}
    assert {gauge: len(curve.years) for gauge, curve in curves.items()} == dict.fromkeys("ACDEF", 30) | {"B": 18}
    assert all("B" in curve.reference and curve.days.min() == 365 for gauge, curve in curves.items() if gauge != "B")
    assert result.findings == ()
    depths[2 : 12 * 12 : 12, 1] = np.nan
    # With nine months it has less than 80 % of the days, and that in over a fifth of the years.
    assert all("B" not in curve.reference for curve in found(depths).double_mass)


def test_years_that_are_left_out_are_named() -> None:
    """D lacks 37 days of 1998 and of 2006, the first year after the break: both are named."""
    depths = days_of(2, 0.22, 0.0)
    lost(depths, 1998, slice(0, 37), 3)
    lost(depths, 2006, slice(200, 237), 3)
    depths[5479:, 3] *= 0.8
    finding = consistency(days_record(depths), NETWORK).findings[0]
    assert (finding.gauge, str(finding.end)) == ("D", "2006-01-01T00:00:00")
    assert (
        "over 28 years, 1991 to 2020 without 1998, 2006, of which they share less than 90 % of the days, the slope"
        in finding.evidence
    )
    assert "to 2005 and" in finding.evidence
    assert "from 2007 (F" in finding.evidence
    assert finding.action.endswith("The years between 2005 and 2007 are left out, so that the change may lie there.")


def test_what_is_rejected_takes_no_part() -> None:
    """D holds 60 mm on 18 days of 1993: the raw record's curve has them; after their rejection they are in no sum."""
    depths = days_of(3, 0.22, 0.0)
    depths[800:818, 3] = 60.0
    record = days_record(depths)
    raw = screen(record, NETWORK)
    settled = screen(record, NETWORK, reject=["stuck-values D 1993-03"])
    curves = [next(c for c in s.double_mass if c.gauge == "D") for s in (raw, settled)]
    sums = [c.totals[c.years.tolist().index(1993)] for c in curves]
    assert sums[0] - sums[1] == pytest.approx(18 * 60)
    assert [int(c.days[2]) for c in curves] == [365, 347]


def test_screening_has_it_all() -> None:
    """The whole screening ends with curves, tests and what they found, and says for which gauges they could not be."""
    depths = months(30, 6)
    depths[14 * 12 :, 2] *= 0.75
    for month in (0, 6):
        depths[month : 22 * 12 : 12, 1] = np.nan
    screening = screen(record_of(depths), network_of(6))
    assert [finding.key for finding in screening.findings][-2:] == [
        "double-mass-break C 1991-01-01T00:00",
        "inhomogeneous C",
    ]
    assert (len(screening.double_mass), len(screening.homogeneity)) == (5, 5)
    assert screening.checks_run[-2:] == (DOUBLE_MASS_BREAK, INHOMOGENEOUS)
    assert screening.checks_skipped[INHOMOGENEOUS] == "B: 8 calendar years with 90 % of the days; it takes 20"


def test_screening_without_years() -> None:
    """Where no gauge has years enough the two did not run."""
    screening = screen(record_of(months(3, 4)), network_of(4))
    assert not {DOUBLE_MASS_BREAK, INHOMOGENEOUS} & set(screening.checks_run)
    assert {DOUBLE_MASS_BREAK, INHOMOGENEOUS} <= set(screening.checks_skipped)


def test_too_few_that_can_be_trusted() -> None:
    """Of four gauges one breaks: the other three have only two sound neighbours each, which is said."""
    depths = months(30, 4, noise=0.05)
    depths[14 * 12 :, 0] *= 0.5
    result = found(depths)
    assert [curve.gauge for curve in result.double_mass] == ["A"]
    assert result.skipped[DOUBLE_MASS_BREAK] == (
        "B, C, D: fewer than 10 years in which 3 neighbours report beside it on 90 % of the days, not counting A "
        "with a break of their own"
    )


def test_a_gauge_that_went_dry() -> None:
    """A gauge without rain in half of its years has no factor, so no edit is suggested."""
    depths = months(30, 6)
    depths[14 * 12 :, 2] = 0.0
    finding = found(depths).findings[0]
    assert (finding.gauge, finding.edit) == ("C", None)
    assert finding.action == "Look for what happened to the gauge: one part of its record has no rain."


def test_storm_totals_without_times() -> None:
    """A record without times has no years."""
    nat = np.full(2, "NaT", dtype="datetime64[s]")
    storms = RainRecord.from_depths(("A",), nat, nat, [[10.0], [20.0]], step="storm")
    result = consistency(storms, network_of(1))
    assert (result.double_mass, result.homogeneity, result.findings) == ((), (), ())
    assert result.skipped[DOUBLE_MASS_BREAK] == "A: no calendar year with 90 % of the days; it takes 10"
