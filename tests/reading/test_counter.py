"""Counters: rises, gaps, noise, rollovers, resets and faulty readings."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from rainfiles import labels, read, times, written

from basinrain.errors import JobError, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import KnownTotal, RainRecord, Status
from basinrain.reading.counter import counter_depths
from basinrain.reading.counter_rules import CounterRules
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step

NAN = np.nan


def readings(*columns: list[float], step: str = "1h") -> RainRecord:
    """Hourly readings of gauges A, B ... from 09:00 of 4 May 2031."""
    ends = np.datetime64("2031-05-04T09:00:00") + np.arange(len(columns[0])) * np.timedelta64(3600, "s")
    gauges = tuple("ABCDE"[: len(columns)])
    return RainRecord.from_depths(gauges, ends - 3600, ends, np.transpose(columns), step=step)


def depths(column: list[float], **rules: float) -> tuple[list[float], str, list[float]]:
    """Return one counter's depths, the first letters of its statuses, and the totals over several steps."""
    record = counter_depths(readings(column), CounterRules(**rules))  # type: ignore[arg-type]
    marks = "".join(Status(code).label[0] for code in record.status[:, 0])
    return record.depth[:, 0].tolist(), marks, [total.depth for total in record.totals]


def agree(found: tuple[list[float], str, list[float]], depth: list[float], marks: str, totals: list[float]) -> None:
    np.testing.assert_allclose(found[0], depth, rtol=1e-12)
    assert found[1] == marks
    assert found[2] == pytest.approx(totals, rel=1e-12)


def test_rises_are_depths(tmp_path: Path) -> None:
    """The depth of a step is the rise since the reading before; the first reading has none."""
    record = read(tmp_path, "time,A,B\n2031-05-04 09:00,10.2,0\n2031-05-04 10:00,10.2,0.1\n2031-05-04 11:00,12.4,0.1\n",
                  layout="counter", unit="in")  # fmt: skip
    assert times(record) == [("2031-05-04T09:00", "2031-05-04T10:00"), ("2031-05-04T10:00", "2031-05-04T11:00")]
    np.testing.assert_allclose(record.depth, [[0, 2.54], [55.88, 0]], rtol=1e-12)
    assert labels(record) == [["zero", "observed"], ["observed", "zero"]]
    assert (record.totals, record.step) == ((), "1h")


def test_rises_are_clean_numbers() -> None:
    """12.4 less 12.2 is 0.2 to the last digit, so that what is zero is zero."""
    assert depths([12.2, 12.4, 12.7])[0] == [0.2, 0.3]


def test_long_files(tmp_path: Path) -> None:
    """With a column of gauges and one of depths the file is long, in any order of rows, whatever they are called."""
    text = "time,depth,gauge\n2031-05-04 10:00,3,B\n2031-05-04 09:00,1,A\n2031-05-04 10:00,4,A\n2031-05-04 09:00,3,B\n"
    record = read(tmp_path, text, layout="counter")
    assert (record.gauges, record.depth.tolist()) == (("B", "A"), [[0.0, 3.0]])
    text = text.replace("depth", "pluvio").replace("gauge", "mast")
    record = read(tmp_path, text, layout="counter", columns={"depth": "pluvio", "gauge": "mast"})
    assert (record.gauges, record.depth.tolist()) == (("B", "A"), [[0.0, 3.0]])


def test_a_gap_is_an_accumulation(tmp_path: Path) -> None:
    """The rise over missing readings is a total of their steps and its own; no rise means that all were dry."""
    hours = ["10.0", "", "x", "13.0", "13.0", "", "13.0", "14.0", ""]
    text = "time,A\n" + "".join(f"2031-05-04 {9 + k:02d}:00,{cell}\n" for k, cell in enumerate(hours))
    record = read(tmp_path, text, layout="counter", missing=["x"])
    assert record.totals == (
        KnownTotal("A", np.datetime64("2031-05-04T09:00"), np.datetime64("2031-05-04T12:00"), 3.0),
    )
    np.testing.assert_array_equal(record.depth[:, 0], [NAN, NAN, NAN, 0, 0, 0, 1, NAN])
    assert [label for (label,) in labels(record)] == [
        "accumulated", "accumulated", "accumulated", "zero", "zero", "zero", "observed", "missing",
    ]  # fmt: skip


def test_a_counter_of_the_rain_since_midnight(tmp_path: Path) -> None:
    """Set to 0 just after the reading of midnight: the next reading is the first hour's rain, a dry one included."""
    text = "time,W01,W02\n"
    for hour, first, second in (
        ("04T22", 1.0, 0),
        ("04T23", 1.4, 0),
        ("05T00", 1.6, 0.2),
        ("05T01", 0.2, 0),
        ("05T02", 0.6, 0),
    ):
        text += f"2031-05-{hour}:00,{first},{second}\n"
    file = written(tmp_path, text)
    told = read_rainfall(file, layout="counter", unit="mm", interval="1h", reset="00:00")
    assert told.depth.T.tolist() == [[0.4, 0.2, 0.2, 0.4], [0.0, 0.2, 0.0, 0.0]]
    assert told.notes == ()
    untold = read_rainfall(file, layout="counter", unit="mm", interval="1h")
    assert np.isnan(untold.depth[:, 0]).tolist() == [False, False, True, False]
    with pytest.raises(JobError, match="reset: found '00:00'; expected it with layout 'counter' only"):
        read_rainfall(file, layout="wide", unit="mm", interval="1h", reset="00:00")
    with pytest.raises(JobError, match="reset: found 'midnight'; expected a time of day, such as '08:00' or 8"):
        read_rainfall(file, layout="counter", unit="mm", interval="1h", reset="midnight")


def test_files_that_follow_on_each_other(tmp_path: Path) -> None:
    """The depth between the last reading of one file and the first of the next is not lost."""
    files = [
        written(tmp_path, "time,A\n2031-05-04 11:00,3\n2031-05-04 12:00,3.5\n", "june.csv"),
        written(tmp_path, "time,A\n2031-05-04 09:00,0\n2031-05-04 10:00,1\n", "may.csv"),
    ]
    record = read_rainfall(files, layout="counter", unit="mm", interval="1h")
    assert record.depth[:, 0].tolist() == [1.0, 2.0, 0.5]


def test_rows_that_are_absent(tmp_path: Path) -> None:
    """Absent rows are refused, or missing readings where gaps says so."""
    text = "time,A\n2031-05-04 09:00,1\n2031-05-04 10:00,1\n2031-05-04 11:00,2\n2031-05-04 13:00,5\n"
    with pytest.raises(
        ReadError, match=r"time axis: found no row for 1 of the 1h steps, ending at 2031-05-04T12:00:00"
    ):
        read(tmp_path, text, layout="counter")
    record = read(tmp_path, text, layout="counter", gaps="missing")
    assert [total.depth for total in record.totals] == [3.0]
    assert labels(record) == [["zero"], ["observed"], ["accumulated"], ["accumulated"]]


def test_gauges_that_begin_late() -> None:
    """Before a gauge's first reading and after its last nothing is known."""
    record = counter_depths(readings([NAN, 1, 2, NAN], [5, 5, 5, 6]), CounterRules())
    np.testing.assert_array_equal(record.depth, [[NAN, 0], [1, 0], [NAN, 1]])
    assert labels(record) == [["missing", "zero"], ["observed", "zero"], ["missing", "observed"]]


def test_jitter_keeps_the_total() -> None:
    """Falls within the jitter and the rises back are zero: only new highs are rain."""
    column = [10.0, 10.1, 10.0, 9.9, 10.1, 10.3, 10.2, 10.6]
    agree(depths(column, jitter=0.2), [0.1, 0, 0, 0, 0.2, 0, 0.3], "ozzzozo", [])
    gap = [10.0, 10.1, NAN, 9.9, NAN, 10.4]
    agree(depths(gap, jitter=0.2), [0.1, 0, 0, NAN, NAN], "ozzaa", [0.3])


def test_readings_below_zero(tmp_path: Path) -> None:
    """After emptying, a weighing gauge may read a little below 0: within the jitter that is 0, beyond it an error."""
    text = "time,A\n2031-05-04 09:00,-0.1\n2031-05-04 10:00,0.5\n2031-05-04 11:00,0.9\n"
    np.testing.assert_allclose(read(tmp_path, text, layout="counter", jitter=0.1).depth[:, 0], [0.5, 0.4])
    with pytest.raises(
        ReadError, match=r"rain\.csv:2: column A: gauge A: found '-0\.1'; expected a depth of 0 or more"
    ):
        read(tmp_path, text, layout="counter", jitter=0.05)


def test_rollover() -> None:
    """Past the rollover value the wrapped rise counts, over a gap too; a reading at the value is one at 0."""
    agree(depths([97.0, 99.5, 1.0, 1.5], rollover=100), [2.5, 1.5, 0.5], "ooo", [])
    agree(depths([97.0, 99.5, NAN, 1.0, 1.5], rollover=100), [2.5, NAN, NAN, 0.5], "oaao", [1.5])
    agree(depths([99.5, 100.0, 0.0, 0.5], rollover=100), [0.5, 0, 0.5], "ozo", [])


def test_a_long_counter_with_rollovers() -> None:
    """Depths are those whose sum, wrapped at the rollover value, the counter shows, however long it runs."""
    fell = np.random.default_rng(3).integers(0, 3, 3000) * 0.2
    shown = np.mod(np.cumsum(fell), 250.0).round(1)
    found, _, totals = depths(shown.tolist(), rollover=250.0, jitter=0.1)
    np.testing.assert_allclose(found, fell[1:], atol=1e-9)
    assert ((np.diff(shown) < 0).sum(), totals) == (2, [])


def test_rollover_in_the_unit_of_the_file(tmp_path: Path) -> None:
    """Rollover and jitter are in the source's unit: 256 tips of 0.01 in."""
    text = "time,A\n2031-05-04 09:00,250\n2031-05-04 10:00,254\n2031-05-04 11:00,4\n2031-05-04 12:00,3\n"
    record = read(tmp_path, text, layout="counter", unit="0.01 in", rollover=256, jitter=1)
    np.testing.assert_allclose(record.depth[:, 0], [1.016, 6 * 0.254, 0], rtol=1e-12)


def test_falls_that_no_rollover_explains() -> None:
    """A fall that would make half the rollover value of rain, or more than ever fell, is a reset."""
    agree(depths([40.0, 41.0, 0.0, 0.5], rollover=100), [1, NAN, 0.5], "omo", [])
    agree(depths([4000.0, 4001.0, 10.0, 11.0], rollover=5000), [1, NAN, 1], "omo", [])  # 1009 mm in an hour


def test_reset() -> None:
    """What fell up to a reset is not known; over a gap, of none of its steps."""
    agree(depths([40.0, 41.0, 0.0, 0.0, 0.0, 0.0, 0.5]), [1, NAN, 0, 0, 0, 0.5], "omzzzo", [])
    agree(depths([40.0, 41.0, NAN, NAN, 0.2, 0.7]), [1, NAN, NAN, NAN, 0.5], "ommmo", [])
    agree(depths([350.0, 351.0, 20.0, 20.4]), [1, NAN, 0.4], "omo", [])  # a charge of antifreeze


def test_faulty_readings() -> None:
    """A reading that leaps down or up and back is missing, and what fell meanwhile is a total of the steps."""
    agree(depths([99.0, 100.0, 0.0, 100.4, 100.6]), [1, NAN, NAN, 0.2], "oaao", [0.4])
    agree(depths([99.0, 100.0, 0.0, 0.0, 100.4, 100.6]), [1, NAN, NAN, NAN, 0.2], "oaaao", [0.4])
    agree(depths([99.0, 100.0, *[0.0] * 9, 100.4, 100.6]), [1, *[NAN] * 10, 0.2], "o" + 10 * "a" + "o", [0.4])
    agree(depths([12.0, 12.2, 80.0, 12.4, 12.6]), [0.2, NAN, NAN, 0.2], "oaao", [0.2])
    agree(depths([12.0, 12.2, 80.0, 80.0, 12.2, 12.6]), [0.2, 0, 0, 0, 0.4], "ozzzo", [])
    agree(depths([900.0, 901.0, 1390.0, 901.5]), [1, NAN, NAN], "oaa", [0.5])


def test_readings_that_may_be_faulty() -> None:
    """A reset after heavy rain, and a fall that a few hours' rain makes good, cannot be told from faulty readings."""
    agree(depths([0.0, 0.0, 80.0, 0.0, 0.2, 0.2, 0.2]), [0, NAN, NAN, 0.2, 0, 0], "zmmozz", [])
    agree(depths([1.0, 1.0, 0.0, 1.0, 1.0]), [0, NAN, NAN, 0], "zmmz", [])
    agree(depths([1.0, 5.0, 2.0, 2.5]), [NAN, NAN, 0.5], "mmo", [])
    agree(depths([20.0, 21.0, 60.0, 20.9]), [1, 39, NAN], "oom", [])  # what leaps goes no lower than where it was


def test_a_reset_after_a_small_depth() -> None:
    """A day that begins anew after one tip keeps the tip, and the next day's: only the step of the reset is missing."""
    agree(depths([0.0, 0.2, 0.2, 0.0, 0.0, 0.0, 0.0, 0.2]), [0.2, 0, NAN, 0, 0, 0, 0.2], "ozmzzzo", [])


def test_readings_that_cannot_be() -> None:
    """Readings above the rollover value and rises beyond all records are told together, each with gauge and time."""
    with pytest.raises(ReadError) as caught:
        counter_depths(readings([1, 2, 101], [0, 600, 601]), CounterRules(rollover=100.0))
    assert [(problem.gauge, problem.time) for problem in caught.value.problems] == [
        ("A", "2031-05-04T11:00:00"),
        ("B", "2031-05-04T10:00:00"),
    ]
    with pytest.raises(
        ReadError, match=r"gauge A: found a reading of 101 mm at .*; expected none above rollover, 100 mm"
    ):
        counter_depths(readings([1, 2, 101]), CounterRules(rollover=100.0))
    with pytest.raises(
        ReadError, match=r"gauge A: found a rise of 600 mm until 2031-05-04T10:00:00; expected at most 491 mm, which"
    ):
        counter_depths(readings([0, 600, 601]), CounterRules())
    with pytest.raises(
        ReadError, match=r"found a rise of 600 mm until .*, and 1 more like it; expected at most 491 mm"
    ):
        counter_depths(readings([0, 600, 1200]), CounterRules())


@pytest.mark.parametrize(("n", "found"), [(1, "readings at one time, 2031-05-04T09:00:00"), (0, "none")])
def test_too_few_readings(n: int, found: str) -> None:
    """One reading gives no depth."""
    with pytest.raises(
        ReadError, match=rf"rain\.csv: the readings of the counter: found {found}; expected readings at two"
    ):
        counter_depths(readings([1.0]).window(0, n), CounterRules(), file="rain.csv")


def test_marks_of_readings(tmp_path: Path) -> None:
    """A depth between readings is estimated or adjusted where one of them is; a rejected reading is none."""
    rows = ["1,", "2,e", "3,", "4,", "5,x", "6,", "6,a"]
    text = "gauge,time,depth,flag\n" + "".join(f"A,2031-05-04 {9 + k:02d}:00,{row}\n" for k, row in enumerate(rows))
    flags = {"estimated": ["e"], "rejected": ["x"], "adjusted": ["a"]}
    record = read(tmp_path, text, layout="counter", flags=flags)
    assert [label for (label,) in labels(record)] == [
        "estimated", "estimated", "observed", "accumulated", "accumulated", "adjusted",
    ]  # fmt: skip
    assert (record.totals[0].depth, record.depth[-1, 0]) == (2.0, 0.0)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"rollover": 0}, r"rollover: found 0; expected a number above 0"),
        ({"jitter": -1}, r"jitter: found -1; expected a number of at least 0"),
        ({"rollover": 10, "jitter": 5}, r"jitter: found it as large as half of rollover or more; expected a smaller"),
        ({"tip": 0.2}, r"tip: found 0\.2; expected it with layout 'tips' only; leave it out"),
        ({"accumulated": "A"}, r"accumulated: found 'A'; expected it with layout 'wide', 'long' or 'totals' only"),
        ({"flags": {"trace": ["T"]}}, r"flags: found 'trace'; expected another meaning, as a counter has readings"),
    ],
)
def test_options_that_cannot_be(tmp_path: Path, options: dict[str, Any], message: str) -> None:
    """Each faulty option of a counter says what was found, what is expected and what to do."""
    with pytest.raises(JobError, match=rf"rain\.csv: {message}"):
        read(tmp_path, "time,A\n2031-05-04 01:00,1\n", layout="counter", **options)


def test_cells_that_cannot_be(tmp_path: Path) -> None:
    """A trace is no reading, and a column of steps belongs to depths."""
    with pytest.raises(ReadError, match=r"rain\.csv:2: column A: gauge A: found 'T'; expected a depth of 0 or more"):
        read(tmp_path, "time,A\n2031-05-04 01:00,T\n", layout="counter")
    text = "gauge,time,depth,steps\nA,2031-05-04 01:00,1,1\nA,2031-05-04 03:00,1,2\n"
    with pytest.raises(
        ReadError, match=r"rain\.csv: the header: found a column of steps, over which depths accumulate"
    ):
        read(tmp_path, text, layout="counter")


def test_a_gap_at_the_common_step(tmp_path: Path) -> None:
    """Half-hourly readings at the hour: gaps that reach over hours are spread over these, their totals kept."""
    cells = ["0", "1", "", "4", "4", "4", "", "", "", "10", "10", "2", "2.5"]
    stamps = np.datetime64("2031-05-04T09:00") + np.arange(13) * np.timedelta64(30, "m")
    text = "time,A\n" + "".join(f"{stamp},{cell}\n" for stamp, cell in zip(stamps, cells, strict=True))
    record = read(tmp_path, text, layout="counter", interval="30min")
    network = GaugeNetwork(ids=("A",), x=np.zeros(1), y=np.zeros(1), crs="local")
    common, notes = bring_to_step([record], network, common="1h")
    # 9-10: 1 + part of 3 known with 10-11 as 4; 11-12 and 12-13 have parts of the 6 that fell until 13:30.
    assert [end for _, end in times(common)] == [f"2031-05-04T{hour}:00" for hour in range(10, 16)]
    totals = [(str(total.start)[11:16], str(total.end)[11:16], total.depth) for total in common.totals]
    assert totals == [("09:00", "11:00", 4.0), ("11:00", "14:00", 6.0)]
    np.testing.assert_allclose(common.depth[:, 0], [2, 2, 2, 2, 2, NAN], rtol=1e-12)
    assert labels(common) == [["spread"]] * 5 + [["missing"]]
    assert [note.code for note in notes] == ["counter-reset", "spread-evenly"]


@given(
    tips=st.lists(st.integers(0, 20), min_size=1, max_size=40),
    gaps=st.sets(st.integers(1, 39)),
    noise=st.lists(st.integers(0, 2), min_size=41, max_size=41),
    tip=st.sampled_from([0.1, 0.2, 0.254]),
)
def test_the_total_is_kept(tips: list[int], gaps: set[int], noise: list[int], tip: float) -> None:
    """Without falls, all depths sum to the last reading less the first, gaps or none; with jitter, to the highest."""
    column = np.concatenate([[5.0], 5.0 + np.cumsum(tips) * tip])
    inner = [k for k in gaps if k < len(tips)]
    column[inner] = NAN
    found, marks, totals = depths(column.tolist())
    assert np.nansum(found) + sum(totals) == pytest.approx(column[-1] - column[0], abs=1e-7)
    assert set(marks) <= {"o", "z", "a"}
    noisy = column - np.array(noise[: len(column)]) * 0.05
    found, marks, totals = depths(noisy.tolist(), jitter=0.1)
    highest = np.fmax.accumulate(noisy)
    assert np.nansum(found) + sum(totals) == pytest.approx(highest[-1] - highest[0], abs=1e-7)
    assert (np.nan_to_num(found) >= 0).all()


@given(column=st.lists(st.one_of(st.integers(0, 30), st.just(NAN)), min_size=2, max_size=25))
def test_no_depth_is_invented(column: list[float]) -> None:
    """Whatever readings do, no step has more than the rise between its two readings, and a fall has no depth."""
    known = [k for k, reading in enumerate(column) if not np.isnan(reading)]
    try:
        found, marks, totals = depths(column)
    except ReadError as error:
        if not any(found in str(error) for found in ("readings that fall", "readings that only fall", "falls to 0")):
            raise
        return
    rises = np.diff([column[k] for k in known])
    single = {k: rise for k, before, rise in zip(known[1:], known, rises, strict=False) if k - before == 1}
    for step, depth in enumerate(found):
        assert np.isnan(depth) or depth == 0 or depth == single[step + 1]
    assert sum(totals) + np.nansum(found) <= rises[rises > 0].sum() + 1e-9
    assert all(marks[k - 1] == "m" for k, rise in zip(known[1:], rises, strict=True) if rise < 0)
