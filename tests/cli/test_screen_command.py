"""Whole runs of ``basinrain screen``: findings printed and written, and what the job says of them carried out."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import jsonschema
import numpy as np
import pandas as pd
import pytest
from tiny import GAUGES, JOB, write_tiny

from basinrain.errors import JobError, ReadError
from basinrain.job import run_screen, run_storm

ROOT = Path(__file__).parents[2]
COMMAND = Path(sys.executable).with_name("basinrain")

# A fourth gauge, so that neighbours can be asked; two days of four hours' rain and dry between.
FOUR = GAUGES + "D,Dene Head,5,9,200,950\n"
EDIT = """
[[edit]]
gauge = "B"
from = 2031-05-04T00:00:00
to = 2031-05-04T04:00:00
action = "scale"
value = 0.1
reason = "logger set to 0.1 mm"
by = "duty hydrologist"
date = 2031-06-01
"""


def hourly() -> str:
    rows = ["time,A,B,C,D"]
    for k in range(1, 49):
        time = np.datetime64("2031-05-04T00:00") + np.timedelta64(k, "h")
        a, b, c, d = (1.2, 1.0, 0.8, 1.4) if k % 24 < 5 else (0, 0, 0, 0)
        rows.append(f"{time}:00,{a},{650 if k == 7 else b},{c},{d}")
    return "\n".join(rows) + "\n"


def basinrain(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *map(str, arguments)], capture_output=True, text=True, encoding="utf-8", check=False
    )


def test_a_finding_is_printed_with_its_evidence_and_the_words_that_name_it(tmp_path: Path) -> None:
    """650 mm in an hour is over what was ever measured: one finding, nothing changed, exit 0."""
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly())
    done = basinrain("screen", job)
    assert (done.returncode, done.stderr) == (0, "")
    found = pd.read_csv(tmp_path / "output" / "screen" / "findings.csv", keep_default_na=False)
    first = found[found["check"] == "greatest-depths"].iloc[0]
    assert (first["gauge"], first["severity"], first["state"]) == ("B", "erroneous", "open")
    assert first["key"] == "greatest-depths B 2031-05-04T06:00"
    assert "650" in first["evidence"]
    printed = f'\nerroneous: greatest-depths\n  "{first["key"]}"\n    {first["evidence"]} {first["action"]}\n'
    assert printed in done.stdout
    assert done.stdout.endswith(
        f"Written to {tmp_path / 'output' / 'screen'}: report.html, record.json and the CSV files\n"
    )


def test_the_files_are_these_and_the_record_keeps_its_schema(tmp_path: Path) -> None:
    """--json prints what record.json holds, and docs/record.schema.json describes it."""
    done = basinrain("screen", write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + EDIT), "--json")
    assert (done.returncode, done.stderr) == (0, "")
    document = json.loads(done.stdout)
    folder = tmp_path / "output" / "screen"
    assert document == json.loads((folder / "record.json").read_text(encoding="utf-8"))
    jsonschema.validate(document, json.loads((ROOT / "docs" / "record.schema.json").read_text(encoding="utf-8")))
    assert sorted(path.name for path in folder.iterdir()) == [
        "completeness.csv",
        "double_mass.csv",
        "edits.csv",
        "findings.csv",
        "homogeneity.csv",
        "record.json",
        "report.html",
    ]
    assert document["results"]["edits"] == [
        {
            "gauge": "B",
            "from": "2031-05-04T00:00",
            "to": "2031-05-04T04:00",
            "action": "scale",
            "value": "0.1",
            "reason": "logger set to 0.1 mm",
            "by": "duty hydrologist",
            "date": "2031-06-01",
            "steps_changed": 4,
            "depth_before": 4.0,
            "depth_after": pytest.approx(0.4),
            "depth_unit": "mm",
        }
    ]


def test_rejecting_a_finding_takes_its_value_and_nothing_else(tmp_path: Path) -> None:
    """The hour of 650 mm has no value any more, every other value stands; the storm's run says so."""
    plain = write_tiny(tmp_path / "plain", gauges=FOUR, rain=hourly())
    said = JOB + '\n[screening]\nreject = ["greatest-depths B"]\naccept = ["spatial-outlier"]\n'
    settled = write_tiny(tmp_path / "settled", gauges=FOUR, rain=hourly(), job=said)
    before, after = run_screen(plain), run_screen(settled)
    gone = np.isnan(after.record.depth) & ~np.isnan(before.record.depth)
    assert [(after.record.gauges[g], str(after.record.ends[t])) for t, g in np.argwhere(gone)] == [
        ("B", "2031-05-04T07:00:00")
    ]
    assert after.raw.depth[6, 1] == 650
    assert np.array_equal(before.record.depth[~gone], after.record.depth[~gone])
    run = run_storm(settled)
    status = run.gauge_depths[(run.gauge_depths["gauge"] == "B") & (run.gauge_depths["time"] == "2031-05-04T07:00")]
    assert status["status"].tolist() == ["infilled"]
    assert not [note for note in run.notes if note.code == "screening" and note.gauge == "B"]
    assert [note.gauge for note in run_storm(plain).notes if note.code == "screening"][:1] == ["B"]


def test_accepting_a_finding_ends_the_warning_and_keeps_the_value(tmp_path: Path) -> None:
    """It may have been the storm: the value stands and nobody is warned again."""
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + '\n[screening]\naccept = ["greatest-depths B"]\n')
    run = run_storm(job)
    assert run.gauge_totals.set_index("gauge")["depth"].to_dict()["B"] > 650
    assert not [note for note in run.notes if "greatest-depths" in note.text]


def test_entries_that_match_nothing_are_refused(tmp_path: Path) -> None:
    """A key with a slip settles nothing, so it is an error that names the nearest."""
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + '\n[screening]\nreject = ["greatest-depth B"]\n')
    done = basinrain("screen", job)
    assert done.returncode == 1
    assert done.stderr.startswith("[screening] reject 'greatest-depth B': found no such finding; expected the key")
    assert not (tmp_path / "output").exists()


def test_edits_that_match_nothing_or_overlap_are_refused_together(tmp_path: Path) -> None:
    """A gauge that is not there, a stretch without the gauge's steps, two edits of one stretch: one line each."""
    twice = EDIT.replace("0.1\nreason", "0.2\nreason")
    nobody = EDIT.replace('"B"', '"Q"')
    never = EDIT.replace('"B"', '"A"').replace("2031-05-04", "2041-05-04")
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + EDIT + twice + nobody + never)
    with pytest.raises(JobError) as caught:
        run_screen(job)
    lines = str(caught.value).splitlines()
    assert len(lines) == 3
    assert any("(gauge Q)" in line for line in lines)
    assert any("(gauge A)" in line for line in lines)
    assert any("[[edit]] 1" in line and "2" in line for line in lines)


def test_a_bare_date_is_the_day_of_the_gauges_own_source(tmp_path: Path) -> None:
    """Read at 07:00 for the day before: three dates are three readings, however the step is written."""
    rain = "date,A,B,C\n" + "".join(f"2031-05-{day:02d},{day},{day},{day}\n" for day in range(1, 9))
    edit = EDIT.replace("2031-05-04T00:00:00", "2031-05-03").replace("2031-05-04T04:00:00", "2031-05-05")
    changed = {}
    for step in ("1d", "24h"):
        daily = f'interval = "{step}"\nread_hour = "07:00"\ndate_means = "ends"'
        run = run_screen(write_tiny(tmp_path / step, rain=rain, job=JOB.replace('interval = "1h"', daily) + edit))
        changed[step] = run.edit_table[["steps_changed", "depth_before"]].values.tolist()
        assert run.record.depth[:, 1].tolist() == pytest.approx([1, 2, 0.3, 0.4, 0.5, 6, 7, 8])
    assert changed == {"1d": [[3, 12.0]], "24h": [[3, 12.0]]}


def test_a_bare_date_is_refused_where_a_gauge_has_days_of_two_kinds(tmp_path: Path) -> None:
    """The gauge's hours begin at midnight and its daily readings at 07:00: one date cannot mean both."""
    job = (
        JOB
        + """
[[rainfall]]
file = "daily.csv"
unit = "mm"
interval = "1d"
read_hour = "07:00"
date_means = "starts"
"""
    )
    edit = EDIT.replace("2031-05-04T00:00:00", "2031-05-06").replace("2031-05-04T04:00:00", "2031-05-06")
    daily = "date,B\n2031-05-06,4\n2031-05-07,5\n"
    with pytest.raises(JobError, match=r"\[\[edit\]\] 1 \(gauge B\): found a date, in sources of the gauge whose days"):
        run_screen(write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=job + edit, daily__csv=daily))


def test_months_beyond_the_year_are_refused_in_words(tmp_path: Path) -> None:
    """A thirteenth month is no month; the line says which entry and what may stand there."""
    job = write_tiny(tmp_path, job=JOB + '\n[screening]\nunheated = ["A"]\ncold_months = [1, 13]\n')
    with pytest.raises(JobError, match=r"\[screening\] cold_months no\. 2: found 13; expected a number of at most 12"):
        run_screen(job)


def test_an_envelope_is_an_input_like_any_other(tmp_path: Path) -> None:
    """Its depths are held against the record, its fingerprint is in the run; a file that is not there is named."""
    told = JOB + '\n[screening]\nenvelope = "greatest.csv"\n'
    job = write_tiny(
        tmp_path,
        gauges=FOUR,
        rain=hourly().replace("650", "120"),
        job=told,
        greatest__csv="duration,depth,unit\n1h,90,mm\n",
    )
    run = run_screen(job)
    assert "greatest.csv" in run.inputs
    assert [f.severity for f in run.screening.findings if f.check == "greatest-depths"] == ["doubtful"]
    (tmp_path / "greatest.csv").unlink()
    with pytest.raises(ReadError, match=r"greatest\.csv: .*"):
        run_screen(job)


def test_gauges_without_heating_are_checked_against_the_network(tmp_path: Path) -> None:
    """A gauge that is not there, and months without gauges, are errors."""
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + '\n[screening]\nunheated = ["Q"]\n')
    with pytest.raises(JobError) as caught:
        run_screen(job)
    assert str(caught.value).splitlines() == [
        "[screening] unheated: found 'Q'; expected the id of a gauge; one of: A, B, C, D",
        (
            "[screening]: found unheated without cold_months; expected both: the gauges without heating, and the "
            "months in which precipitation may be snow; add the other"
        ),
    ]


def test_a_rejected_recorder_no_longer_times_a_daily_gauge(tmp_path: Path) -> None:
    """9 mm of a day: in the times of both recorders, then, with the nearer one's burst rejected, of the other alone."""
    hours = ["time,A,B,C"]
    for k in range(1, 25):
        rest = 2 if k == 3 else 0
        hours += [f"2031-05-{4 + k // 24:02d}T{k % 24:02d}:00,{500 if k == 7 else 0},{rest},{rest}"]
    job = (
        JOB
        + """
[[rainfall]]
file = "daily.csv"
layout = "long"
unit = "mm"
interval = "1d"
"""
    )
    files = {"gauges": FOUR, "rain": "\n".join(hours) + "\n", "daily__csv": "gauge,date,depth\nD,2031-05-04,9\n"}
    before = run_screen(write_tiny(tmp_path / "before", job=job, **files))
    after = run_screen(
        write_tiny(tmp_path / "after", job=job + '\n[screening]\nreject = ["greatest-depths A"]\n', **files)
    )
    d = before.record.gauges.index("D")
    assert before.record.depth[6, d] > 8
    assert after.record.depth[:, d] == pytest.approx(np.where(np.arange(24) == 2, 9.0, 0.0))
    assert after.record.totals == before.record.totals


def test_an_edit_without_times_changes_the_whole_record(tmp_path: Path) -> None:
    """B is scaled throughout, up to a time, and from one: 8 hours of 1 mm and one of 650 that are tenths."""
    lines = EDIT.splitlines(keepends=True)
    whole = "".join(line for line in lines if not line.startswith(("from", "to")))
    before = "".join(line for line in lines if not line.startswith("from"))
    after = "".join(line for line in lines if not line.startswith("to")).replace("T00", "T04")
    plain = run_screen(write_tiny(tmp_path / "plain", gauges=FOUR, rain=hourly())).raw.depth
    for name, edits, times in (
        ("whole", whole, [("", "")]),
        ("halves", before + after, [("", "2031-05-04T04:00:00"), ("2031-05-04T04:00:00", "")]),
    ):
        run = run_screen(write_tiny(tmp_path / name, gauges=FOUR, rain=hourly(), job=JOB + edits))
        assert run.raw.depth == pytest.approx(plain * [1, 0.1, 1, 1])
        assert [(row["from"], row["to"]) for row in run.edit_rows] == times
        assert run.edit_table["steps_changed"].sum() == 48


def test_an_edge_within_a_step_is_refused(tmp_path: Path) -> None:
    """From half past two on would leave the third hour as it is: the step and both of its ends are named."""
    job = write_tiny(tmp_path, gauges=FOUR, rain=hourly(), job=JOB + EDIT.replace("T00:00:00", "T02:30:00"))
    text = (
        r"\[\[edit\]\] 1 \(gauge B\): found the step 2031-05-04T02:00:00 to 2031-05-04T03:00:00, which has a value and "
        r"lies .*; move that edge to 2031-05-04T02:00:00 or 2031-05-04T03:00:00"
    )
    with pytest.raises(JobError, match=text):
        run_screen(job)


def test_an_edit_of_a_daily_total_is_remarked_on_where_it_is_spread(tmp_path: Path) -> None:
    """D's 9 mm of a day are halved; in hours they are spread, and a remark says that they were changed."""
    daily = '[[rainfall]]\nfile = "daily.csv"\nlayout = "long"\nunit = "mm"\ninterval = "1d"\n'
    edit = (
        EDIT.replace('"B"', '"D"')
        .replace("T04:00:00", "")
        .replace("T00:00:00", "")
        .replace("value = 0.1", "value = 0.5")
    )
    hours = "\n".join(line.rpartition(",")[0] for line in hourly().splitlines()) + "\n"
    job = write_tiny(
        tmp_path,
        gauges=FOUR,
        rain=hours.replace("650", "1"),
        job=JOB + daily + edit,
        daily__csv="gauge,date,depth\nD,2031-05-04,9\n",
    )
    run = run_screen(job)
    d = run.record.gauges.index("D")
    assert np.nansum(run.record.depth[:, d]) == pytest.approx(4.5)
    (note,) = [note for note in run.notes if note.code == "edit-spread"]
    assert (note.level, note.gauge) == ("info", "D")
    assert note.text == (
        "[[edit]] 1 (gauge D) changes totals over longer times than the step: their 24 steps of D read 'spread', not "
        "'adjusted'."
    )


def test_consistency_is_of_the_record_after_rejections(tmp_path: Path) -> None:
    """Twelve years, C at half after 2004, E with 80 mm a day for 18 days: entries name findings of both kinds."""
    ids, days = "ABCDEF", np.arange(np.datetime64("1999-01-01"), np.datetime64("2011-01-01"))
    rng = np.random.default_rng(5)
    weather = np.where(rng.random(len(days)) < 0.4, rng.gamma(0.8, 9.0, len(days)), 0.0)[:, None]
    depths = weather * rng.lognormal(0, 0.2, (len(days), 6))
    depths[days >= np.datetime64("2005-01-01"), 2] *= 0.5
    depths[1000:1018, 4] = 80.0
    rain = "date," + ",".join(ids) + "\n"
    rain += "".join(f"{day},{','.join(f'{v:.1f}' for v in row)}\n" for day, row in zip(days, depths, strict=True))
    gauges = "id,name,x,y,elevation,normal\n" + "".join(f"{g},{g},{2 * k},5,100,900\n" for k, g in enumerate(ids))
    told = JOB.replace('interval = "1h"', 'interval = "1d"')
    said = '\n[screening]\nreject = ["stuck-values E 2001"]\naccept = ["double-mass-break C"]\n'
    raw = run_screen(write_tiny(tmp_path / "raw", gauges=gauges, rain=rain, job=told))
    run = run_screen(write_tiny(tmp_path / "settled", gauges=gauges, rain=rain, job=told + said))
    before, after = (
        next(c for c in r.screening.double_mass if c.gauge == "E" and c.years[2] == 2001) for r in (raw, run)
    )
    assert (before.days[2], after.days[2]) == (365, 347)
    assert before.totals[2] - after.totals[2] == pytest.approx(18 * 80)
    written = run.double_mass[(run.double_mass["gauge"] == "E") & (run.double_mass["year"] == 2001)]
    assert written["days"].tolist() == [347]
    assert written["total"].tolist() == pytest.approx([after.totals[2]])
    states = {(f.check, f.gauge): f.state for f in run.screening.findings}
    assert (states["stuck-values", "E"], states["double-mass-break", "C"]) == ("rejected", "accepted")
    # What else was said of those 18 days goes with them.
    assert {f.state for f in run.screening.findings if f.gauge == "E" and not f.whole_record} == {"rejected"}
    assert {f.state for f in raw.screening.findings} == {"open"}
    wrong = told + '\n[screening]\nreject = ["double-mass-break C"]\n'
    job = write_tiny(tmp_path / "wrong", gauges=gauges, rain=rain, job=wrong)
    with pytest.raises(JobError, match=r"reject 'double-mass-break C': found a break .* correct the older part by"):
        run_screen(job)
