"""[[rainfall]] of instruments and published formats."""

from __future__ import annotations

import inspect
from datetime import date, datetime
from pathlib import Path
from typing import Any

import pytest
from pydantic import ValidationError

from basinrain.errors import JobError
from basinrain.jobfile import parse_job
from basinrain.jobfile.tables import RainfallTable
from basinrain.jobfile.times import rainfall_day_start
from basinrain.reading.rainfall import read_rainfall

JOB: dict[str, Any] = {
    "job": {"name": "Quill Brook"},
    "gauges": {"file": "gauges.csv"},
    "basins": {"file": "basins.geojson"},
}


def problem(**source: object) -> str:
    """Return what is said of a job with such a source."""
    with pytest.raises(JobError) as caught:
        parse_job({**JOB, "rainfall": {"file": "r.csv", **source}}, folder=Path())
    return str(caught.value)


def test_keys_of_tips_and_counters() -> None:
    """Tips and counters have keys of their own; times of TOML become text, and a bare date stays one."""
    tips = RainfallTable.model_validate(
        {"file": "r.csv", "layout": "tips", "unit": "mm", "interval": "5min", "tip": 0.2, "start": date(2031, 5, 4),
         "end": datetime(2031, 5, 6, 12, 0)}
    )  # fmt: skip
    assert (tips.tip, tips.start, tips.end) == (0.2, "2031-05-04", "2031-05-06T12:00:00")
    counter = RainfallTable(file="r.csv", layout="counter", unit="mm", interval="1h", rollover=100, jitter=0.1)
    assert (counter.rollover, counter.jitter) == (100.0, 0.1)


@pytest.mark.parametrize("layout", ["ghcn-dly", "ghcn-csv"])
def test_published_formats_need_no_unit_and_step(layout: str) -> None:
    """The step is the day and counts as one; the unit may be said as the format has it, and no other."""
    table = RainfallTable(file="r.csv", layout=layout, read_hour="07:00", date_means="ends")
    assert (table.unit, table.interval) == (None, "1d")
    assert rainfall_day_start([table]).astype(int) == -17 * 3600
    assert RainfallTable(file="r.csv", layout=layout, unit="0.1 mm").unit == "0.1 mm"
    head = "[[rainfall]] no. 1"
    assert problem(layout=layout, unit="mm") == (
        f"{head} unit: found 'mm'; expected '0.1 mm', which the format prescribes; leave it out"
    )
    assert problem(layout=layout, interval="1h") == (
        f"{head} interval: found '1h'; expected '1d', which the format prescribes; leave it out"
    )


@pytest.mark.parametrize(
    ("source", "message"),
    [
        ({"tip": 0.2}, "tip: found 0.2; expected it with layout 'tips' only; leave it out"),
        ({"layout": "tips", "jitter": 0.2}, "jitter: found 0.2; expected it with layout 'counter' only; leave it out"),
        (
            {"layout": "counter", "stamp": "start"},
            "stamp: found 'start'; expected it with layout 'wide', 'long' or 'totals' only; leave it out",
        ),
        ({"layout": "tips", "tip": 0}, "tip: found 0; expected a number above 0; correct the value"),
        ({"layout": "counter", "jitter": -1}, "jitter: found -1; expected a number of at least 0; correct the value"),
        (
            {"layout": "tips", "start": "soon"},
            (
                "start: found 'soon'; expected a month, a date or a date and time such as 2031-05-04T06:00; "
                "write it in ISO 8601"
            ),
        ),
        ({"layout": "tips", "unit": None}, "unit: found no such key; expected it to be given; add it"),
    ],
)
def test_keys_that_cannot_be(source: dict[str, Any], message: str) -> None:
    """A key that does not belong to the layout, or is out of range, is one line."""
    given = {"unit": "mm", "interval": "1h", **source}
    if given["unit"] is None:
        del given["unit"]
    assert problem(**given) == f"[[rainfall]] no. 1 {message}"


def test_a_default_that_is_written_out_is_no_fault() -> None:
    """What a layout does not take may stand there as it is by default."""
    table = RainfallTable(file="r.csv", layout="tips", unit="mm", interval="1h", stamp="end", gaps="refuse", jitter=0)
    assert (table.stamp, table.gaps) == ("end", "refuse")


def test_a_source_without_its_step() -> None:
    """Tips and counters need an interval like other records."""
    for layout in ("tips", "counter"):
        with pytest.raises(ValidationError, match="interval, such as '1h'"):
            RainfallTable(file="r.csv", unit="mm", layout=layout)


def test_keys_are_the_options_of_the_reader() -> None:
    """Whatever a source can say in the job file, the reader of rainfall takes under the same name."""
    keys = set(RainfallTable.model_fields) - {"file", "files"}
    assert keys == set(inspect.signature(read_rainfall).parameters) - {"files"}
