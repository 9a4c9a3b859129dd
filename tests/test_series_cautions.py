"""Warnings of a series: each where it holds, and not where it does not."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from tiny import JOB, write_tiny

from basinrain.results_series import SeriesRun
from basinrain.series_job import run_series

CODES = {
    "dominant-gauge",
    "network-changed",
    "policies-apart",
    "mean-on-one-gauge",
    "one-gauge-largest",
    "steps-missing",
    "little-observed",
}
DAYS = JOB.replace('interval = "1h"', 'interval = "1d"')
THIESSEN = ["averaging.methods=thiessen", "infill.method=station-average"]


def rain(rows: list[str]) -> str:
    start = np.datetime64("2031-05-04")
    return "date,A,B,C\n" + "".join(f"{start + k},{row}\n" for k, row in enumerate(rows))


def run(tmp_path: Path, rows: list[str], *settings: str) -> SeriesRun:
    return run_series(write_tiny(tmp_path, rain=rain(rows), job=DAYS), [*THIESSEN, *settings])


def texts(found: SeriesRun, code: str) -> list[str]:
    return [note.text for note in found.warnings if note.code == code]


def test_a_whole_record_is_warned_of_what_is_always_so(tmp_path: Path) -> None:
    """Three gauges that agree and always report: the west is A's, the east mostly B's; nothing else is told."""
    found = run(tmp_path, ["10,10,10", "4,4,4"])
    assert {note.code for note in found.warnings} & CODES == {"dominant-gauge"}
    (text,) = texts(found, "dominant-gauge")
    assert text == (
        "Even while all gauges are there one has over half of the weight (thiessen) in: west (A, 100.0 %), "
        "east (B, 85.0 %)."
    )


def test_policies_apart(tmp_path: Path) -> None:
    """B infilled between 2 and 30 mm is another mean than A's 2 mm to x = 6.75 and C's 30 mm beyond."""
    found = run(tmp_path, ["2,16,30", "2,,30"], "series.gaps=['infill', 'reweight']")
    (text,) = texts(found, "policies-apart")
    means = found.series_means.set_index(["basin", "gaps"])
    percent = {basin: means["difference_percent"][basin, "reweight"] for basin in ("west", "east", "union")}
    worst = max(percent, key=lambda basin: abs(percent[basin]))
    assert text.startswith(
        f"By 'reweight' the long-term mean of basin {worst} is {abs(percent[worst]):.1f} % "
        f"{'above' if percent[worst] > 0 else 'below'} that by 'infill' (thiessen)"
    )


def test_a_mean_that_hangs_on_one_gauge(tmp_path: Path) -> None:
    """Without A the west is B's; without B the east is A's to x = 6.75: 0.35 x 10 + 0.65 x 30 mm."""
    found = run(tmp_path, ["10,30,30", "0,0,0"])
    (text,) = texts(found, "mean-on-one-gauge")
    assert text.startswith(
        "Without a single gauge the long-term mean by 'infill-then-reweight' (thiessen) is another: "
        "A (+200.0 % in basin west), B (-23.3 % in basin east)"
    )


def test_the_network_changed(tmp_path: Path) -> None:
    """A gauge out for longer than may be infilled is a change, a short gap is none."""
    rows = ["1,1,1", "1,,1", "1,1,1", "1,,1", "1,,1", "1,1,1"]
    found = run(tmp_path, rows, "infill.longest_gap=1")
    (text,) = texts(found, "network-changed")
    assert text.startswith("The network changed at 2 times during the record (B came, went or fell silent for long;")
    assert texts(run(tmp_path, rows, "infill.longest_gap=2"), "network-changed") == []


def test_steps_without_a_number(tmp_path: Path) -> None:
    """A day without any gauge is missing in every series, and told of once a policy and method."""
    (text,) = texts(run(tmp_path, ["1,1,1", ",,", "1,1,1"]), "steps-missing")
    assert text == (
        "3 of 3 series by 'infill-then-reweight' (thiessen) have steps without a number, which are missing, not zero; "
        "most in basin west, 1 of 3."
    )


def test_what_is_the_same_in_several_series_is_told_once(tmp_path: Path) -> None:
    """The same day is missing whatever the policy and method, and the same weight observed whatever the policy."""
    settings = ["averaging.methods=['thiessen', 'arithmetic']", "averaging.arithmetic.gauges=all"]
    found = run(tmp_path, ["1,1,1", ",,", ",1,1", ",1,1"], "series.gaps=['infill', 'reweight']", *settings)
    (text,) = texts(found, "steps-missing")
    assert text == (
        "3 of 3 series by 'infill', 'reweight' (thiessen, arithmetic) have steps without a number, which are missing, "
        "not zero; most in basin west, 1 of 4."
    )
    (text,) = texts(found, "little-observed")
    assert text == (
        "In basin west 33 % of the weight was observed over the record (by 'infill', 'reweight' (thiessen)); the rest "
        "was infilled or reweighted."
    )


def test_little_observed(tmp_path: Path) -> None:
    """West is A's, which reports on one day of three."""
    found = run(tmp_path, ["1,1,1", ",1,1", ",1,1"], "series.gaps=reweight")
    (text,) = texts(found, "little-observed")
    assert text == (
        "In basin west 33 % of the weight was observed over the record ('reweight', thiessen); the rest was reweighted."
    )


def test_largest_depths_on_one_gauge(tmp_path: Path) -> None:
    """The largest depths of the east and the union while A alone reports have all of their weight on A."""
    found = run(tmp_path, ["90,,", "1,1,1"], "series.gaps=reweight", "infill.min_donors=1")
    (text,) = texts(found, "one-gauge-largest")
    assert text.startswith(
        "One of the largest depths of basin east, in the step ending 2031-05-05T00:00, has 100.0 % of its weight on "
        "gauge A, which has 0.0 % while all are there ('reweight', thiessen); 1 more of the largest depths rest on one"
    )
