"""What becomes of days that are missing, and the pattern of the nearest wet recorder, by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from windows import hourly, network

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, RecordFiller
from basinrain.infill.span_filling import Fate
from basinrain.rainfall import RainRecord

NAN = float("nan")


def test_what_became_of_every_span() -> None:
    """Days of two half days: estimated, there by half, without donors, missing for too long; then half a day alone."""
    missing = [NAN] * 9
    missing[2] = 9.0
    record = hourly([4.0, 4, 1, 1, NAN, 9, 3, 3, 1], missing, [2.0] * 8 + [1.0], hours=12)
    long = np.zeros((9, 3), dtype=bool)
    long[6:8, 1] = True
    options = InfillOptions(method="station-average", scale="day")
    filled = RecordFiller(network(3), options).fill(record, long, trace=True)
    assert filled.spans is not None
    mine = filled.spans.of_gauge(1)
    assert [Fate(fate) for fate in mine.fate] == [Fate.SPREAD, Fate.UNKNOWN, Fate.SPREAD]
    assert (mine.first.tolist(), mine.stop.tolist()) == ([0, 4, 8], [2, 6, 9])
    assert mine.total == pytest.approx([6, NAN, 1], nan_ok=True)
    # Half of the second day is there, so that is infilled step by step.
    assert filled.depth[:, 1] == pytest.approx([3, 3, 9, 1.5, NAN, NAN, NAN, NAN, 1], nan_ok=True)


def test_a_day_missing_in_part_for_too_long() -> None:
    """Three of four quarters are missing, one of them as part of a long gap: no total is made up for the day."""
    record = hourly([1.0] * 4, [NAN, NAN, 1.0, NAN], [3.0] * 4, hours=6)
    long = np.zeros((4, 3), dtype=bool)
    long[:2, 1] = True
    options = InfillOptions(method="station-average", scale="day")
    filled = RecordFiller(network(3), options).fill(record, long, trace=True)
    assert filled.spans is not None
    assert filled.spans.fate.tolist() == [Fate.LONG]
    assert np.isnan(filled.depth[:, 1]).tolist() == [True, True, False, True]


def test_a_total_below_what_was_observed() -> None:
    """B saw 9 mm in a quarter of its day while the others had 4 and 8: the missing steps are infilled one by one."""
    record = hourly([1.0] * 4, [9.0, NAN, NAN, NAN], [2.0] * 4, hours=6)
    filled = RecordFiller(network(3), InfillOptions(method="station-average", scale="day")).fill(record, trace=True)
    assert filled.depth[:, 1].tolist() == [9, 1.5, 1.5, 1.5]
    assert filled.spans is not None
    assert filled.spans.fate.tolist() == [Fate.RAISED]


def many_gauges(n: int) -> tuple[GaugeNetwork, list[list[float]]]:
    """Return gauges in a row and a dry day of four steps at each; the first has nothing."""
    net = GaugeNetwork(
        ids=tuple(f"G{k:03d}" for k in range(n)), x=np.arange(n, dtype=float) * 1e3, y=np.zeros(n), crs="local"
    )
    return net, [[NAN] * 4, *([0.0] * 4 for _ in range(n - 1))]


@pytest.mark.parametrize("wet", [3, 70, 98])
def test_the_nearest_wet_recorder_however_far(wet: int) -> None:
    """All donate, one of a hundred gauges is wet, and its times are the pattern."""
    net, columns = many_gauges(100)
    columns[wet] = [0.0, 3.0, 0.0, 1.0]
    step = np.timedelta64(6, "h")
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 5) * step
    record = RainRecord.from_depths(net.ids, ends - step, ends, np.array(columns).T, step="6h")
    options = InfillOptions(method="station-average", scale="day", nearest="all")
    filled = RecordFiller(net, options).fill(record, trace=True)
    assert filled.depth[:, 0] == pytest.approx(np.array([0.0, 3.0, 0.0, 1.0]) / 99)
    assert filled.depth[:, 0].sum() == pytest.approx(4 / 99, rel=1e-15)


def test_rain_must_have_fallen_in_the_missing_steps() -> None:
    """B has the first quarter of its day. A and C, the nearest, were wet in that alone; D gives the pattern."""
    record = hourly([4.0, 0, 0, 0], [1.0, NAN, NAN, NAN], [8.0, 0, 0, 0], [0.0, 0, 6.0, 2.0], hours=6)
    filled = RecordFiller(network(4), InfillOptions(method="station-average", scale="day")).fill(record, trace=True)
    total = (4 + 8 + 8) / 3
    assert filled.depth[:, 1] == pytest.approx([1, 0, (total - 1) * 0.75, (total - 1) * 0.25])
    dry = replace(record, depth=np.where(np.arange(4) == 3, 0.0, record.depth))
    even = RecordFiller(network(4), InfillOptions(method="station-average", scale="day")).fill(dry, trace=True)
    assert even.depth[:, 1] == pytest.approx([1, 1, 1, 1])
    assert even.spans is not None
    assert even.spans.fate.tolist() == [Fate.EVEN_NONE_WET]
