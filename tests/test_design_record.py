"""Depths from the record: annual maxima of a fixed network by brute force, and the years that count."""

from __future__ import annotations

import re
from collections.abc import Hashable
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd
import pytest
import scipy.stats
from record_jobs import FROM_RECORD, GAUGES, area_means, daily_record, hourly_record, write_record_job

from basinrain.design_job import run_design
from basinrain.errors import BasinRainError, DataError, JobError, MethodError
from basinrain.results_design import DesignRun

WET = [10, 11, 12, 1, 2, 3]


def water_year(times: pd.DatetimeIndex) -> npt.NDArray[np.int64]:
    """Return the year, from October on that which is to come."""
    return np.asarray(times.year + (times.month >= 10))


def maxima(run: DesignRun, area: Hashable, duration: str) -> pd.Series:
    table = run.annual_maxima
    rows = table[(table["area_of"] == area) & (table["duration"] == duration)]
    return rows.set_index("year")["depth"]


def gumbel(values: npt.ArrayLike, years: npt.ArrayLike) -> npt.NDArray[np.float64]:
    """Return depths of a Gumbel distribution by the first two sample L-moments (Hosking & Wallis 1997), by SciPy."""
    mean, second = scipy.stats.lmoment(np.asarray(values), order=[1, 2], standardize=False)
    scale = second / np.log(2)
    return np.asarray(scipy.stats.gumbel_r.isf(1 / np.asarray(years), loc=mean - np.euler_gamma * scale, scale=scale))


@pytest.fixture(scope="module")
def daily(tmp_path_factory: pytest.TempPathFactory) -> DesignRun:
    """Fifteen years of days, depths of 2 and 10 years in one and two days."""
    changes: dict[str, Any] = {"design__return_periods": [2, 10], "design__durations": ["1d", "2d"]}
    return run_design(write_record_job(tmp_path_factory.mktemp("daily"), daily_record(), **changes))


@pytest.fixture(scope="module")
def hourly(tmp_path_factory: pytest.TempPathFactory) -> DesignRun:
    """Fifteen years of hours, depths of 10 years in one and six hours."""
    return run_design(
        write_record_job(
            tmp_path_factory.mktemp("hourly"), hourly_record(), interval="1h", design__durations=["1h", "6h"]
        )
    )


def test_daily_maxima_are_those_of_pandas(daily: DesignRun) -> None:
    """The greatest of the weighted means of every water year, one and two days long, in all three areas."""
    means = area_means(daily_record())
    for area in means:
        one = means[area].groupby(water_year(pd.DatetimeIndex(means.index))).max()
        np.testing.assert_allclose(maxima(daily, area, "24h"), one, rtol=1e-12)
        assert maxima(daily, area, "24h").index.tolist() == one.index.tolist() == list(range(2002, 2017))
        two = means[area].rolling(2).sum()
        # Two days belong to the year that holds their middle, the midnight between them.
        np.testing.assert_allclose(
            maxima(daily, area, "48h"), two.groupby(water_year(pd.DatetimeIndex(two.index))).max(), rtol=1e-12
        )


def test_hourly_maxima_are_those_of_a_plain_loop(hourly: DesignRun) -> None:
    """Windows that begin at any hour, each in the water year that holds its middle."""
    means = area_means(hourly_record())
    for hours in (1, 2, 3, 6):
        sums = means.rolling(hours).sum().dropna()
        middles = pd.DatetimeIndex(sums.index) - pd.Timedelta(minutes=30 * hours)
        wanted = sums.groupby(water_year(middles)).max()
        for area in means:
            np.testing.assert_allclose(maxima(hourly, area, f"{hours}h"), wanted[area], rtol=1e-9)
    assert sorted(hourly.annual_maxima["duration"].unique()) == ["1h", "2h", "3h", "6h"]


def test_depths_are_those_of_a_gumbel_distribution_by_l_moments(daily: DesignRun, hourly: DesignRun) -> None:
    """Every fit is that of SciPy's L-moments and its Gumbel distribution, and the depth of the union is it."""
    for run, durations in ((daily, ("24h", "48h")), (hourly, ("1h", "6h"))):
        fits = run.record_fits
        assert set(fits[fits["taken"]]["distribution"]) == {"gumbel"}
        for area in ("union", "west", "east"):
            for duration in durations:
                rows = fits[
                    (fits["area_of"] == area) & (fits["duration"] == duration) & (fits["distribution"] == "gumbel")
                ]
                assert rows["years"].tolist() == [15] * len(rows)
                wanted = gumbel(maxima(run, area, duration), rows["return_period"])
                np.testing.assert_allclose(rows["fitted"], wanted, rtol=1e-9)
                assert (rows["lower_90"] < rows["depth"]).all()
                assert (rows["depth"] < rows["upper_90"]).all()
    depths = daily.design_depths.set_index(["duration", "return_period"])["areal_depth"]
    np.testing.assert_allclose(
        [depths["24h", years] for years in (2.0, 10.0)], gumbel(maxima(daily, "union", "24h"), [2, 10]), rtol=1e-9
    )


def test_the_generalised_distribution_is_that_of_its_published_formulas(tmp_path: Path) -> None:
    """By Hosking & Wallis (1997): its shape to their approximation, its depths SciPy's, its mean the sample's."""
    job = write_record_job(tmp_path, daily_record(), design__depths=FROM_RECORD | {"distribution": "gev"})
    run = run_design(job)
    fits = run.record_fits
    (row,) = fits[
        (fits["area_of"] == "union") & fits["taken"] & (fits["return_period"] == 10) & (fits["duration"] == "24h")
    ].to_dict("records")
    mean, _, ratio = scipy.stats.lmoment(maxima(run, "union", "24h"), order=[1, 2, 3])
    at = 2 / (3 + ratio) - np.log(2) / np.log(3)
    assert row["distribution"] == "gev"
    assert row["shape"] == pytest.approx(7.8590 * at + 2.9554 * at**2, abs=9e-4)
    wanted = scipy.stats.genextreme(row["shape"], loc=row["location"], scale=row["scale"])
    assert row["fitted"] == pytest.approx(wanted.isf(0.1), rel=1e-9)
    assert row["l_skewness"] == pytest.approx(ratio, rel=1e-9)
    # The spread of samples as long as the record: scipy's draws of the fit, far fewer than make the digits agree.
    samples = scipy.stats.lmoment(wanted.rvs((15, 20_000), random_state=np.random.default_rng(3)), order=[3], axis=0)
    assert row["l_skewness_error"] == pytest.approx(float(samples.std()), rel=0.1)
    assert wanted.mean() == pytest.approx(mean, rel=1e-6)


def test_a_gauge_that_opened_later_is_left_out_and_said_so(daily: DesignRun) -> None:
    """Cairn, which opened in the seventh year, has no weight in any year."""
    assert daily.from_record is not None
    assert daily.from_record.gauges == ("Alder", "Birch")
    texts = [note.text for note in daily.notes if note.code == "network-held"]
    assert texts == ["Depths from the record rest on a network that is held fixed, without Cairn."]


def test_years_before_a_named_gauge_opened_do_not_count(tmp_path: Path) -> None:
    """Alder and Cairn part the square at x = 3.75; of 20 years the 13 from October 2008 on count, in the west too."""
    rain = daily_record(20)
    job = write_record_job(tmp_path, rain, design__depths=FROM_RECORD | {"gauges": ["Alder", "Cairn"]})
    run = run_design(job)
    assert run.from_record is not None
    assert run.from_record.gauges == ("Alder", "Cairn")
    for area, alder in (("union", 0.375), ("west", 0.75), ("east", 0.0)):
        means = alder * rain["Alder"] + (1 - alder) * rain["Cairn"]
        wanted = means.groupby(water_year(pd.DatetimeIndex(rain.index))).max()
        found = maxima(run, area, "24h")
        assert found[found.isna()].index.tolist() == list(range(2002, 2009))
        np.testing.assert_allclose(found.loc[2009:], wanted.loc[2009:], rtol=1e-12)
    years = "2002, 2003, 2004, 2005, 2006, 2007, 2008"
    reason = "do not count, less than 90 % of their wet season having a depth"
    assert f"union, west, east: 7 of 20 years {reason}: {years}." in texts(run)


def texts(run: DesignRun) -> list[str]:
    return [note.text for note in run.notes]


def test_a_gap_is_infilled_by_gauges_that_are_not_held(tmp_path: Path) -> None:
    """Birch is silent for a day on which Alder has 100 mm and Cairn 200: by 7 and 4.5 km it had 171."""
    rain = daily_record()
    rain.loc["2012-11-05"] = [100.0, np.nan, 200.0]
    run = run_design(write_record_job(tmp_path, rain))
    birch = (100 / 7**2 + 200 / 4.5**2) / (1 / 7**2 + 1 / 4.5**2)
    assert maxima(run, "east", "24h")[2013] == pytest.approx(0.2 * 100 + 0.8 * birch)
    assert maxima(run, "west", "24h")[2013] == pytest.approx(100)
    assert birch == pytest.approx(170.8, abs=0.05)


def test_a_gap_that_cannot_be_infilled_takes_the_step_away_where_it_counts(tmp_path: Path) -> None:
    """Birch is silent for 40 days, longer than is infilled: east and union lose that year, the west does not."""
    rain = daily_record()
    rain.loc["2012-11-01":"2012-12-10", "Birch"] = np.nan
    rain.loc["2012-11-05", "Alder"] = 300.0
    run = run_design(write_record_job(tmp_path, rain))
    assert maxima(run, "west", "24h")[2013] == 300
    for area in ("union", "east"):
        assert np.isnan(maxima(run, area, "24h")[2013])
        assert maxima(run, area, "24h").notna().sum() == 14
    table = run.annual_maxima.set_index(["area_of", "duration", "year"])["season_share"]
    assert table["east", "24h", 2013] == pytest.approx((365 - 40) / 365)
    assert table["west", "24h", 2013] == 1
    counts = run.record_fits.groupby("area_of")["years"].unique()
    assert {area: years.tolist() for area, years in counts.items()} == {"east": [14], "union": [14], "west": [15]}


@pytest.mark.parametrize(
    ("gap", "share"),
    [
        (("2004-11-01", "2004-11-18"), 1 - 18 / 182),
        (("2004-11-01", "2004-11-19"), 1 - 19 / 182),
        (("2005-04-01", "2005-09-30"), 1.0),
        (("2005-03-14", "2005-09-30"), 1 - 18 / 182),
        (("2005-03-13", "2005-09-30"), 1 - 19 / 182),
    ],
)
def test_a_year_counts_by_its_wet_season_alone(tmp_path: Path, gap: tuple[str, str], share: float) -> None:
    """Of the 182 days from October to March 18 may be missing, not 19, whether or not summer is missing as a whole."""
    rain = daily_record()
    rain.loc[gap[0] : gap[1]] = np.nan
    job = write_record_job(tmp_path, rain, design__depths=FROM_RECORD | {"wet_season": WET})
    run = run_design(job)
    table = run.annual_maxima.set_index(["area_of", "duration", "year"])
    assert table["season_share"]["union", "24h", 2005] == pytest.approx(share, rel=1e-12)
    assert np.isnan(table["depth"]["union", "24h", 2005]) == (share < 0.9)
    if share >= 0.9:
        left = area_means(rain)["union"]
        wanted = left[water_year(pd.DatetimeIndex(left.index)) == 2005].max()
        assert table["depth"]["union", "24h", 2005] == pytest.approx(wanted)
    assert [text for text in texts(run) if "do not count" in text] == (
        []
        if share >= 0.9
        else ["union, west, east: 1 of 15 years do not count, less than 90 % of their wet season having a depth: 2005."]
    )


def test_a_storm_of_the_dry_months_counts_in_a_year_that_counts(tmp_path: Path) -> None:
    """The wet season decides whether a year counts, not which of its storms."""
    rain = daily_record()
    rain.loc["2005-07-01"] = 300.0
    job = write_record_job(tmp_path, rain, design__depths=FROM_RECORD | {"wet_season": WET})
    run = run_design(job)
    assert maxima(run, "union", "24h")[2005] == pytest.approx(300)
    (told,) = [note.text for note in run.notes if note.code == "maxima-out-of-season"]
    assert " annual maxima fell outside the wet season. Only its months decide whether a year counts" in told


def test_years_that_the_record_has_in_part_do_not_count(tmp_path: Path) -> None:
    """A record of calendar years has its first and its last water year in part; with water_year = 1 it has none."""
    rain = daily_record(15).loc["2002-01-01":"2015-12-31"]
    found = maxima(run_design(write_record_job(tmp_path / "october", rain)), "union", "24h")
    assert found.index[found.isna()].tolist() == [2002, 2016]
    calendar = write_record_job(tmp_path / "january", rain, series={"water_year": 1})
    found = maxima(run_design(calendar), "union", "24h")
    np.testing.assert_allclose(
        found, area_means(rain)["union"].groupby(pd.DatetimeIndex(rain.index).year).max(), rtol=1e-12
    )
    assert found.index.tolist() == list(range(2002, 2016))


def test_a_duration_between_steps_lies_between_those_of_whole_steps(tmp_path: Path) -> None:
    """90 min of an hourly record: the log of depth halfway in the log of duration between one and two hours."""
    job = write_record_job(tmp_path, hourly_record(), interval="1h", design__durations=["90min"], design__step="30min")
    run = run_design(job)
    one, two = (gumbel(maxima(run, "union", duration), 10.0) for duration in ("1h", "2h"))
    wanted = np.exp(np.interp(np.log(90), np.log([60, 120]), np.log([one, two])))
    assert run.design_depths["areal_depth"].item() == pytest.approx(wanted, rel=1e-9)


def test_a_factor_for_fixed_intervals_is_that_of_the_record_s_step(tmp_path: Path) -> None:
    """One day in steps of a day times 8/7, two days times 16/15 (Weiss 1964); without it a warning says what is so."""
    asked: dict[str, Any] = {"design__durations": ["1d", "2d"]}
    plain = run_design(write_record_job(tmp_path / "plain", daily_record(), **asked))
    raised = run_design(
        write_record_job(
            tmp_path / "raised", daily_record(), design__depths=FROM_RECORD | {"interval_factor": "weiss"}, **asked
        )
    )
    np.testing.assert_allclose(
        raised.design_depths["areal_depth"] / plain.design_depths["areal_depth"], [8 / 7, 16 / 15], rtol=1e-12
    )
    assert "fixed-intervals" in {note.code for note in plain.warnings}
    assert "fixed-intervals" not in {note.code for note in raised.notes}
    assert "interval-factor" in {note.code for note in raised.notes}


def test_one_basin_is_its_own_point_of_interest(tmp_path: Path) -> None:
    """A job of a single basin has one area, and each of its tables has it once."""
    job = write_record_job(tmp_path, daily_record(), design__point=[{"name": "west", "basins": ["west"]}])
    run = run_design(job)
    assert run.annual_maxima["area_of"].unique().tolist() == ["west"]
    assert len(run.annual_maxima) == 15
    assert run.design_storms[["point", "basin"]].to_numpy().tolist() == [["west", "west"]]
    np.testing.assert_allclose(
        run.design_storms["depth"],
        gumbel(daily_record()["Alder"].groupby(water_year(pd.DatetimeIndex(daily_record().index))).max(), [10]),
        rtol=1e-9,
    )


NINE = "found 9 years with an annual maximum; expected 10 at least; take a longer record, or depths of a table"

REFUSED: dict[str, tuple[dict[str, Any], type[BasinRainError], str]] = {
    "nine years": (
        {"years": 9},
        MethodError,
        f"area union, 24 h: {NINE}\narea west, 24 h: {NINE}\narea east, 24 h: {NINE}",
    ),
    "beyond twice the record": (
        {"design__return_periods": [30, 31]},
        MethodError,
        (
            "AEP 0.03226 (1 in 31): found a return period of over 2 times the 15 years of area union, 24 h; expected "
            "30 years at most; ask for a less rare one, or allow it with beyond_record = true"
        ),
    ),
    "an areal reduction": (
        {"design__areal_reduction": {"method": "leclerc-schaake"}},
        JobError,
        (
            "[design.areal_reduction] method: found 'leclerc-schaake' beside depths from the record, which are "
            "areal already; expected 'none'; take the table out"
        ),
    ),
    "no such gauge": (
        {"design__depths": FROM_RECORD | {"gauges": ["Aldr", "Birch", "Crag"]}},
        JobError,
        (
            "[design.depths] gauges: found 'Aldr'; expected the id of a gauge; did you mean 'Alder'?\n"
            "[design.depths] gauges: found 'Crag'; expected the id of a gauge; one of: Alder, Birch, Cairn"
        ),
    ),
    "no gauge throughout": (
        {"gauges": GAUGES.replace("5,\n", "5,2003-01-01\n")},
        DataError,
        (
            "[design.depths] gauges: found none, and no gauge that is in service throughout the record; expected "
            "the gauges whose network is to be held; name them; years in which one of them was not in service do not "
            "count"
        ),
    ),
    "shorter than the step": (
        {"design__durations": ["6h", "1d"], "design__step": "6h"},
        JobError,
        (
            "[design] durations: found 6 h; expected the record's step of 24 h at least; ask for longer durations, or "
            "give a record of shorter steps"
        ),
    ),
    "no whole number of steps": (
        {"design__depths": FROM_RECORD | {"durations": ["6h", "1d", "30h"]}},
        JobError,
        (
            "[design.depths] durations: found '6h'; expected a whole number of the record's steps of 24 h; correct it, "
            "or leave durations out\n"
            "[design.depths] durations: found '30h'; expected a whole number of the record's steps of 24 h; correct "
            "it, or leave durations out"
        ),
    ),
    "no weights": (
        {"gauges": GAUGES.replace("9.5", "4.5"), "design__depths": FROM_RECORD | {"average": "arithmetic"}},
        DataError,
        (
            "[design.depths] average, east: found no weights by 'arithmetic' from the gauges that are held; expected "
            "gauges that the method can use; choose 'thiessen', which takes the nearest"
        ),
    ),
}


@pytest.mark.parametrize("name", REFUSED)
def test_refusals(tmp_path: Path, name: str) -> None:
    """Every problem is told, in the words of the job, and nothing else."""
    changes, kind, text = REFUSED[name]
    rain = daily_record(changes.get("years", 15))
    given = {key: value for key, value in changes.items() if key != "years"}
    with pytest.raises(kind, match=f"^{re.escape(text)}$"):
        run_design(write_record_job(tmp_path, rain, **given))


def test_return_periods_beyond_the_record_if_the_job_says_so(tmp_path: Path) -> None:
    """beyond_record lets 100 years pass for 15 years of record, and a warning says what that is worth."""
    job = write_record_job(
        tmp_path,
        daily_record(),
        design__return_periods=[100],
        design__depths=FROM_RECORD | {"beyond_record": True},
    )
    run = run_design(job)
    assert run.design_depths["areal_depth"].item() == pytest.approx(gumbel(maxima(run, "union", "24h"), 100.0).item())
    assert [text for text in texts(run) if "1 in 100" in text]


def test_totals_without_times_are_no_record(tmp_path: Path) -> None:
    """A job whose record is one of storm totals is refused."""
    job = write_record_job(
        tmp_path,
        daily_record(10),
        rainfall=[{"file": "totals.csv", "layout": "totals", "unit": "mm"}],
    )
    (tmp_path / "totals.csv").write_text("gauge,depth\nAlder,20\nBirch,30\nCairn,25\n")
    with pytest.raises(DataError, match="found storm totals without times; expected a record of steps with times"):
        run_design(job)
