"""Spacing of rows beside the declared interval."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rainfiles import labels, read, written

from basinrain.errors import ReadError
from basinrain.reading.rainfall import read_rainfall

START = np.datetime64("2031-05-04T00:00")


def wide(minutes: list[int]) -> str:
    """Return rows of 1 mm so many minutes after the start."""
    return "time,A,B\n" + "".join(f"{START + np.timedelta64(m, 'm')},1,1\n" for m in minutes)


def long(gauges: dict[str, list[int]]) -> str:
    """Return rows of 1 mm by gauge."""
    return "gauge,time,depth\n" + "".join(
        f"{gauge},{START + np.timedelta64(m, 'm')},1\n" for gauge, minutes in gauges.items() for m in minutes
    )


def refusal(folder: Path, text: str, **options: Any) -> list[str]:  # noqa: ANN401 - any option of the reader
    with pytest.raises(ReadError, match=r"rain.csv") as caught:
        read(folder, text, **options)
    return [line.split("rain.csv: ")[1] for line in str(caught.value).splitlines()]


@pytest.mark.parametrize("gaps", ["refuse", "missing"])
@pytest.mark.parametrize(
    ("minutes", "interval", "found"),
    [
        (list(range(60, 60 * 9, 60)), "30min", "1h"),
        ([60, 120, 180], "30min", "1h"),
        # One row of 20 hours is lost.
        ([60 * k for k in range(1, 21) if k != 7], "5min", "1h"),
        # An hour is no multiple of 45 minutes.
        ([60, 120, 180, 240], "45min", "1h"),
        ([1440 * k for k in range(1, 5)], "1h", "1d"),
        ([1440 * 7 * k for k in range(1, 5)], "1d", "7d"),
        ([1440 * 30 * k for k in range(1, 5)], "1d", "30d"),
        # The first of January, February, March and April.
        ([1440 * (day - 4) for day in (-119, -88, -60, -29)], "1d", "1mo"),
    ],
)
def test_rows_farther_apart_than_declared(
    tmp_path: Path, gaps: str, minutes: list[int], interval: str, found: str
) -> None:
    """Rows of a longer step are no rows with gaps between: declaring the gaps would make wrong depths of them."""
    assert refusal(tmp_path, wide(minutes), interval=interval, gaps=gaps) == [
        f"interval: found rows {found} apart; expected {interval}, as declared; correct interval"
    ]


@pytest.mark.parametrize(
    ("minutes", "interval", "found"),
    [
        (list(range(15, 2000, 15)), "1h", "15min"),
        ([15, 30, 60, 75, 90, 105, 120, 135, 150, 165, 180], "1h", "15min"),
        (list(range(60, 5000, 60)), "1d", "1h"),
        ([1, 4, 9, 11, 30, 31, 40], "1h", "1min to 19min"),
    ],
)
def test_rows_closer_than_declared(tmp_path: Path, minutes: list[int], interval: str, found: str) -> None:
    """Rows of a shorter step are told in one line that names both, not row by row."""
    assert refusal(tmp_path, wide(minutes), interval=interval) == [
        (
            f"interval: found rows {found} apart; expected {interval}, as declared; correct interval; [step] common "
            "can sum to a longer step"
        )
    ]


def test_seconds(tmp_path: Path) -> None:
    """Rows may stand less than a minute apart, or not whole minutes."""
    text = "time,A\n" + "".join(f"2031-05-04 00:0{k // 2}:{30 * (k % 2):02d},1\n" for k in range(1, 9))
    assert refusal(tmp_path, text, interval="1min")[0].startswith("interval: found rows 30 s apart; expected 1min,")


def test_quarters_are_no_months(tmp_path: Path) -> None:
    """Months are counted, not days."""
    text = "month,A\n2031-01,1\n2031-04,1\n2031-07,1\n"
    assert refusal(tmp_path, text, interval="1mo", gaps="missing") == [
        "interval: found rows 3mo apart; expected 1mo, as declared; correct interval"
    ]


@pytest.mark.parametrize(
    ("minutes", "steps"),
    [
        # Half of the spacings, four fifths, and one alone are no rule.
        ([60, 120, 240, 300, 420], 7),
        ([60, 180, 300, 420, 540, 600], 10),
        ([60, 240], 4),
        ([60, 120, 180, 1200], 20),
    ],
)
def test_gaps_are_gaps(tmp_path: Path, minutes: list[int], steps: int) -> None:
    """Spacings that do not repeat are gaps, which can be declared."""
    record = read(tmp_path, wide(minutes), gaps="missing")
    assert (len(record), int((~np.isnan(record.depth[:, 0])).sum())) == (steps, len(minutes))


def test_accumulated_rows_may_stand_apart(tmp_path: Path) -> None:
    """A daily gauge that is read weekly, its totals marked as such, has gaps and no other interval."""
    text = "date,A\n2031-05-01,1\n" + "".join(f"2031-05-{day:02d},7S\n" for day in (8, 15, 22, 29))
    record = read(tmp_path, text, interval="1d", accumulated="S", gaps="missing")
    assert [total.depth for total in record.totals] == [7.0] * 4
    assert labels(record)[1:] == [["accumulated"]] * 28
    rows = [f"A,2031-05-{day:02d},7,S\n" for day in (8, 15, 22, 29)] + [f"B,2031-05-{d:02d},1,\n" for d in range(1, 30)]
    text = "gauge,date,depth,flag\nA,2031-05-01,1,\n" + "".join(rows)
    record = read(tmp_path, text, layout="long", interval="1d", accumulated="S", gaps="missing")
    assert [(total.gauge, total.depth) for total in record.totals] == [("A", 7.0)] * 4


def test_a_gauge_of_a_longer_step_in_a_long_file(tmp_path: Path) -> None:
    """One gauge of a long file may be coarser than the others; its gaps are none to be declared."""
    hours = list(range(60, 60 * 25, 60))
    text = long({"A": hours, "B": hours[2::3], "C": hours[:3] + hours[5:9]})
    assert refusal(tmp_path, text, layout="long", gaps="missing") == [
        (
            "gauge B: found rows 3h apart; expected 1h, as declared; correct interval, or put the gauge into a source "
            "of its own"
        )
    ]
    record = read(tmp_path, long({"A": hours, "B": [180, 360, 540, 720]}), layout="long", gaps="missing")
    assert labels(record)[2][1] == "observed"


def test_every_file_of_a_source_is_judged(tmp_path: Path) -> None:
    """Of several files the one that does not fit is named, beside what is off the axis in the others."""
    good = written(tmp_path, wide([60, 120, 185, 240]), "good.csv")
    coarse = written(tmp_path, wide([600, 720, 840, 960]), "coarse.csv")
    with pytest.raises(ReadError, match=r"(?s)^.*coarse\.csv: interval: found rows 2h apart; .*\n.*good\.csv:4: ") as e:
        read_rainfall([good, coarse], layout="wide", unit="mm", interval="1h", gaps="missing")
    assert len(e.value.problems) == 2


def test_blank_rows_are_rows(tmp_path: Path) -> None:
    """A daily gauge that reports every second day, with blank cells between, has the interval of its rows."""
    rows = "".join(f"A,2031-05-{day:02d},{day % 2 or ''}\n" for day in range(1, 21))
    record = read(tmp_path, "gauge,date,depth\n" + rows, layout="long", interval="1d", gaps="missing")
    assert labels(record) == [["observed"], ["missing"]] * 10
