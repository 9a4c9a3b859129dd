"""Options of a source, before any file is opened."""

from __future__ import annotations

from typing import Any

import pytest

from basinrain.errors import JobError, Problems
from basinrain.intervals import DAY, Interval
from basinrain.layouts import GHCN, LAYOUTS, TAKEN_BY
from basinrain.reading.choices import check_choices, check_numbers, reading_hour, source_interval, time_of_day
from basinrain.reading.rainfall import read_rainfall

GIVEN: dict[str, Any] = {
    "tip": 0.2, "start": "2031-05-04", "end": "2031-05-04", "rollover": 100.0, "jitter": 0.1, "reset": "00:00",
    "stamp": "start",
    "read_hour": 8, "date_means": "ends", "missing": ["-9"], "trace": ["Tr"], "flags": {"estimated": ["E"]},
    "accumulated": "A", "gaps": "missing", "time_format": "%Y", "columns": {"time": "when"},
}  # fmt: skip


@pytest.mark.parametrize("layout", LAYOUTS)
@pytest.mark.parametrize("key", sorted(TAKEN_BY))
def test_keys_that_a_layout_does_not_take(layout: str, key: str) -> None:
    """A key of another layout is refused by name, before the file is looked for; one of the layout is not."""
    options = {"unit": None if layout in GHCN else "mm", key: GIVEN[key]}
    with pytest.raises(Exception, match=r"no_such_file\.csv") as caught:
        read_rainfall("no_such_file.csv", layout=layout, **options)  # type: ignore[arg-type]
    refused = [line for line in str(caught.value).splitlines() if f": {key}: " in line and "it with layout" in line]
    assert (len(refused) == 1) == (layout not in TAKEN_BY[key])
    assert all(line.endswith(" only; leave it out") for line in refused)


@pytest.mark.parametrize("layout", ["wide", "long", "totals", "counter", *GHCN])
@pytest.mark.parametrize("hour", ["24:30", 25, "25", "24:00", "08:60", -1, "8 am", ""])
def test_reading_hours_outside_the_day(layout: Any, hour: str | int) -> None:  # noqa: ANN401 - one of the literals
    """An hour that no clock shows is refused in one line, whatever the layout."""
    options: dict[str, Any] = {"read_hour": hour, "date_means": "ends"}
    options |= {} if layout in GHCN else {"unit": "mm"}
    options |= {} if layout in {"totals", *GHCN} else {"interval": "1d"}
    with pytest.raises(JobError) as caught:
        read_rainfall("rain.csv", layout=layout, **options)
    assert str(caught.value) == f"rain.csv: read_hour: found '{hour}'; expected a time of day, such as '08:00' or 8"


def test_reading_hours() -> None:
    """Hours are read with and without minutes, as text or number."""
    day = Interval("1d", DAY)
    assert [reading_hour(hour, "ends", day) for hour in ("08:00", 8, "8", "0:30", "23:59", 0)] == [
        28800, 28800, 28800, 1800, 86340, 0,
    ]  # fmt: skip
    assert reading_hour(None, None, day) is None


def test_times_of_day() -> None:
    """A time of day is said as text or as a whole hour; what is none names its key."""
    assert [time_of_day(value, item="reset") for value in ("00:00", 0, "9:30", "23")] == [0, 0, 34200, 82800]
    with pytest.raises(JobError, match=r"^reset: found 'at-reading'; expected a time of day, such as '08:00' or 8$"):
        time_of_day("at-reading", item="reset")


@pytest.mark.parametrize("layout", GHCN)
def test_what_a_published_format_prescribes(layout: str) -> None:
    """Unit and step of GHCN-Daily are those of its format; saying the same is no fault."""
    assert source_interval("24h", layout) == source_interval(None, layout) == Interval("1d", DAY)
    with pytest.raises(
        JobError, match=r"^interval: found '1h'; expected '1d', which the format prescribes; leave it out$"
    ):
        source_interval("1h", layout)
    problems = Problems()
    check_choices(layout, {"unit": "0.1 mm"}, problems)
    check_choices(layout, {"unit": None}, problems)
    assert len(problems) == 0
    check_choices(layout, {"unit": "mm"}, problems)
    with pytest.raises(
        JobError, match=r"^unit: found 'mm'; expected '0\.1 mm', which the format prescribes; leave it out$"
    ):
        problems.raise_as(JobError)


def test_a_unit_is_needed_elsewhere() -> None:
    """Only the published formats have a unit of their own."""
    with pytest.raises(JobError, match=r"rain\.csv: depth unit: found ''; expected one of: mm, cm"):
        read_rainfall("rain.csv", layout="tips", interval="5min")


def test_numbers_that_cannot_be() -> None:
    """Zero, negative, infinite and not-a-number are told together; None is not given."""
    problems = Problems()
    check_numbers(problems, above={"tip": float("nan"), "rollover": float("inf"), "x": None}, least={"jitter": -0.1})
    with pytest.raises(JobError) as caught:
        problems.raise_as(JobError)
    assert str(caught.value).splitlines() == [
        "tip: found nan; expected a number above 0",
        "rollover: found inf; expected a number above 0",
        "jitter: found -0.1; expected a number of at least 0",
    ]
