"""Records read in parts: equal to the whole, whatever the format and the borders; what cannot be is refused."""

from __future__ import annotations

import os
import pickle
import tempfile
from collections.abc import Callable
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rainfiles import written
from streamfiles import HOUR, WRITERS, hours, network_of, wide_csv, write

from basinrain.errors import DataError, JobError, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step
from basinrain.reading.stream import RecordStream, open_stream
from basinrain.screening import Edit

FORMS = sorted(WRITERS)


def whole(sources: list[dict[str, Any]], network: GaugeNetwork, **options: Any) -> RainRecord:  # noqa: ANN401
    """Return the record of all files, read at once."""
    return bring_to_step([read_rainfall(**{"layout": "wide"} | source) for source in sources], network, **options)[0]


def in_parts(stream: RecordStream, borders: list[int]) -> RainRecord:
    """Return the record of a stream read between borders, joined."""
    parts = [stream.read(first, stop) for first, stop in pairwise(borders)]
    return replace(
        parts[0],
        starts=np.concatenate([part.starts for part in parts]),
        ends=np.concatenate([part.ends for part in parts]),
        depth=np.concatenate([part.depth for part in parts]),
        status=np.concatenate([part.status for part in parts]),
    )


def assert_same(found: RainRecord, expected: RainRecord) -> None:
    """Compare records in every value and word."""
    assert (found.gauges, found.step, found.zone) == (expected.gauges, expected.step, expected.zone)
    assert (found.day_phase, found.recorders) == (expected.day_phase, expected.recorders)
    for name in ("starts", "ends", "depth", "status"):
        np.testing.assert_array_equal(getattr(found, name), getattr(expected, name))


@st.composite
def records(draw: st.DrawFn) -> tuple[np.ndarray[Any, Any], list[int]]:
    """Draw depths of 3 gauges in tenths of mm, NaN among them, and borders that split their steps."""
    n = draw(st.integers(2, 14))
    cell = st.one_of(st.just(np.nan), st.integers(0, 400).map(lambda tenths: tenths / 10))
    depth = np.array(draw(st.lists(st.tuples(cell, cell, cell), min_size=n, max_size=n)))
    inner = draw(st.lists(st.integers(1, n - 1), max_size=4, unique=True))
    return depth, [0, *sorted(inner), n]


@pytest.mark.parametrize("form", FORMS)
@settings(max_examples=25)
@given(case=records())
def test_any_split_gives_the_whole(form: str, case: tuple[np.ndarray[Any, Any], list[int]]) -> None:
    """Parts between any borders, put together, are the record that is read at once, from every format."""
    depth, borders = case
    network = network_of("C", "A", "B", opened=np.array(["NaT", "2031-05-04T02:00", "NaT"], dtype="datetime64[s]"))
    with tempfile.TemporaryDirectory() as folder:
        source = write(Path(folder), form, hours(len(depth)), "ABC", depth)
        stream = pickle.loads(pickle.dumps(open_stream([source], network)))  # noqa: S301 - just written
        expected = whole([source], network)
        assert len(stream) == len(expected)
        np.testing.assert_array_equal(stream.starts, expected.starts)
        np.testing.assert_array_equal(stream.ends, expected.ends)
        assert_same(in_parts(stream, borders), expected)


@settings(max_examples=40)
@given(case=records(), first=st.sampled_from(FORMS), second=st.sampled_from(FORMS))
def test_sources_side_by_side_and_files_in_a_row(
    case: tuple[np.ndarray[Any, Any], list[int]], first: str, second: str
) -> None:
    """Two files in time of one source, and a shorter source of another gauge, are one record."""
    depth, borders = case
    half = len(depth) // 2
    ends = hours(len(depth))
    with tempfile.TemporaryDirectory() as folder:
        early = write(Path(folder), first, ends[:half], "AB", depth[:half, :2], name="early_")
        late = write(Path(folder), first, ends[half:], "BA", depth[half:, :2], name="late_")
        one = {**early, "files": [*early["files"], *late["files"]]}
        two = write(Path(folder), second, ends[1:], "C", depth[1:, 2:], name="other_")
        network = network_of("B", "C", "A")
        expected = whole([one, two], network)
        assert_same(in_parts(open_stream([one, two], network), borders), expected)


@pytest.mark.parametrize("form", FORMS)
def test_finer_steps_are_summed(tmp_path: Path, form: str) -> None:
    """Half-hours are summed to the common hour as in the whole, the incomplete first and last ones missing."""
    ends = hours(7, "2031-05-04T01:00:00", minutes=30)
    depth = np.arange(14).reshape(7, 2) / 10
    source = {**write(tmp_path, form, ends, "AB", depth), "interval": "30min"}
    stream = open_stream([source], network_of("A", "B"), common="1h")
    assert_same(in_parts(stream, [0, 1, 3, len(stream)]), whole([source], network_of("A", "B"), common="1h"))
    # 01:30 and 02:00 carry 0.2 and 0.4 mm; 00:30 is not in the file
    np.testing.assert_allclose(stream.read(0, 2).depth[:, 0], [np.nan, 0.6])


def test_offsets_and_other_clocks(tmp_path: Path) -> None:
    """Sources in other clocks are brought to the first one's, in parts as in the whole."""
    one = wide_csv(tmp_path / "one.csv", hours(4), ["A"], np.ones((4, 1)))
    two = wide_csv(tmp_path / "two.csv", hours(4, "2031-05-03T23:00:00"), "B", np.arange(4.0)[:, None])
    sources = [{"files": one, "timezone": "+02:00", **HOUR}, {"files": two, "timezone": "UTC", **HOUR}]
    stream = open_stream(sources, network_of("A", "B"))
    assert stream.zone == "+02:00"
    assert_same(in_parts(stream, [0, 2, 4]), whole(sources, network_of("A", "B")))


def test_marks_codes_and_other_text(tmp_path: Path) -> None:
    """Flags, codes, decimal commas, quotes, blank rows and line ends count as in the whole, whatever the block."""
    lines = [
        "\ufefftime;A;B",
        "",
        "2031-05-04 01:00;1,5E;T",
        ";;",
        '2031-05-04 02:00;"-9,9"; 2,0 ',
        "2031-05-04 03:00;;0",
    ]
    path = written(tmp_path, "\r\n".join(lines))
    source = {"files": path, "flags": {"estimated": ["E"]}, "missing": [-9.9], **HOUR}
    stream = open_stream([source], network_of("A", "B"))
    found = in_parts(stream, [0, 1, 2, 3])
    assert_same(found, whole([source], network_of("A", "B")))
    assert [Status(code).label for code in found.status[:, 0]] == ["estimated", "missing", "missing"]


def test_excluded_gauges_are_left_out(tmp_path: Path) -> None:
    """Gauges left out need no position, and a source of none but these is none."""
    sources = [
        write(tmp_path, form, hours(3), ids, np.ones((3, len(ids))), name=f"{k}_")
        for k, (form, ids) in enumerate(
            [("wide text", ["A", "X"]), ("long text", ["X", "B"]), ("NetCDF", ["X", "C"]), ("wide Parquet", ["X"])]
        )
    ]
    network = network_of("A", "B", "C")
    stream = open_stream(sources, network, exclude=["X"])
    assert_same(in_parts(stream, [0, 2, 3]), whole(sources, network, exclude=["X"]))


def test_a_change_is_made_to_every_part(tmp_path: Path) -> None:
    """What is to be done to the record is done to each part, and beyond the ends there is nothing."""
    source = write(tmp_path, "wide text", hours(3), "A", np.array([[1.0], [2.0], [3.0]]))
    stream = open_stream([source], network_of("A")).changed_by(_doubled)
    assert stream.read(1, 99).depth.ravel().tolist() == [4.0, 6.0]
    assert len(stream.read(2, 2)) == 0


def _doubled(record: RainRecord) -> RainRecord:
    return replace(record, depth=2 * record.depth)


def test_what_cannot_be_read_in_parts() -> None:
    """All that needs the whole record is refused together, before any file is opened, with what to do instead."""
    why: dict[str, Any] = {"reason": "slow clock", "by": "J. M.", "date": "2031-06-01"}
    sources: list[dict[str, Any]] = [
        {"files": "a.csv", "layout": "tips", "unit": "mm", "interval": "1h", "tip": 0.2},
        {"files": "b.csv", "layout": "counter", "unit": "mm", "interval": "1h"},
        {"files": "c.dly", "layout": "ghcn-dly"},
        {"files": "d.csv", "accumulated": "A", **HOUR},
        {"files": "e.csv", "flags": {"accumulated": ["S"]}, **HOUR},
        {"files": "f.csv", "layout": "totals", "unit": "mm"},
        {"files": "g.csv", "unit": "mm", "interval": "1d"},
    ]
    edits = [
        Edit(gauge="A", action="shift", value="1h", number=1, **why),
        Edit(gauge="A", action="set", value=1.0, number=2, **why),
        Edit(gauge="A", action="scale", value=2.0, number=3, **why),
    ]
    with pytest.raises(JobError) as caught:
        open_stream(sources, network_of("A"), edits=edits, names=list("abcdefg"))
    assert [line.split("; expected")[0] for line in str(caught.value).splitlines()] == [
        "source 1 (a) layout: found 'tips'",
        "source 2 (b) layout: found 'counter'",
        "source 3 (c) layout: found 'ghcn-dly'",
        "source 4 (d) accumulated: found 'A'",
        "source 5 (e) accumulated: found 'S'",
        "source 6 (f) layout: found 'totals'",
        "source 7 (g) interval: found steps of 1d beside the common step 1h",
        "[[edit]] 1 (gauge A): found a shift",
        "[[edit]] 2 (gauge A): found a value to set beside sources that are summed to a longer step",
    ]
    assert all("memory" in line for line in str(caught.value).splitlines())
    with pytest.raises(JobError, match=r"rainfall: found no source; expected at least one\n\[step\] common: found 'x'"):
        open_stream([], network_of("A"), common="x")


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize(
    ("minutes", "message"),
    [
        ([60, 120, 150, 210, 270, 330, 390, 450, 510, 570, 600], "expected a whole number of steps of 1h from"),
        ([60, 120, 90, 180], "after a later time"),
        ([60, 120, 120, 180], "as in line"),
        ([60, 180, 300, 420], r"interval: found rows 2h apart; expected 1h, as declared; correct interval"),
        ([60, 120, 240, 300, 360, 420], r"found no row for 1 of the 1h steps, ending at 2031-05-04T03:00:00"),
    ],
)
def test_times_that_are_no_axis(tmp_path: Path, form: str, minutes: list[int], message: str) -> None:
    """Steps that change length, go back, come twice, are not the interval or are absent are refused by both readers."""
    ends = np.datetime64("2031-05-04T00:00:00") + np.array(minutes) * np.timedelta64(60, "s")
    source = write(tmp_path, form, ends, "AB", np.ones((len(ends), 2)))
    with pytest.raises(ReadError, match=message):
        open_stream([source], network_of("A", "B"))
    if "later" not in message or "long" not in form:  # whole, a long file may be in any order
        with pytest.raises(ReadError, match=message):
            read_rainfall(**source)


@pytest.mark.parametrize("form", ["wide text", "long text", "wide Parquet", "long Parquet"])
def test_local_times_that_exist_twice(tmp_path: Path, form: str) -> None:
    """The hour that the clocks show twice in autumn is refused by both readers, pointing to standard time."""
    source = {**write(tmp_path, form, hours(4, "2031-10-26T00:00:00"), "A", np.ones((4, 1)))}
    source["timezone"] = "Europe/Vienna"
    message = (
        r"2031-10-26T02:00:00', which the clocks of Europe/Vienna show twice; expected a time that exists once; give"
    )
    for reads in _both(source, "A"):
        with pytest.raises(ReadError, match=message):
            reads()


def _both(source: dict[str, Any], *ids: str) -> list[Callable[[], object]]:
    """Return the whole and the streamed reading of a source."""

    def streamed() -> object:
        stream = open_stream([source], network_of(*ids))
        return stream.read(0, len(stream))

    return [lambda: read_rainfall(**source), streamed]


@pytest.mark.parametrize("form", FORMS)
def test_gauges_of_files_and_network(tmp_path: Path, form: str) -> None:
    """A gauge of the network that is in no file, and one of a file that is not in the network, are named together."""
    source = write(tmp_path, form, hours(2), ["A", "B7"], np.ones((2, 2)))
    message = r"gauge B7: found rain values, but no such gauge.*\n(.*\n)*gauge B07: found no rain values in any source"
    for _ in range(1):
        with pytest.raises(DataError, match=message):
            open_stream([source], network_of("A", "B07"))
    with pytest.raises(DataError, match=message):
        whole([source], network_of("A", "B07"))


@pytest.mark.parametrize("form", FORMS)
def test_a_file_that_goes_or_changes(tmp_path: Path, form: str) -> None:
    """A file that is not what it was when its times were read is refused, and so is one that is gone."""
    source = write(tmp_path, form, hours(5), "A", np.ones((5, 1)))
    stream = open_stream([source], network_of("A"))
    path = source["files"][0]
    os.utime(path, ns=(0, 0))
    expected = "expected the same content until the run ends"
    with pytest.raises(ReadError, match=f"the file: found that it has changed since its times were read; {expected}"):
        stream.read(0, 2)
    path.unlink()
    with pytest.raises(ReadError, match=f"the file: found that it is gone; {expected}; put it back, and run again"):
        stream.read(0, 2)


@pytest.mark.parametrize("form", FORMS)
def test_a_depth_that_cannot_be(tmp_path: Path, form: str) -> None:
    """A faulty depth is told with its gauge, line and time by both readers, in parts when its part is read."""
    depth = np.ones((6, 2))
    depth[4, 1] = -3.0
    source = write(tmp_path, form, hours(6), "AB", depth)
    stream = open_stream([source], network_of("A", "B"))
    assert len(stream.read(0, 4)) == 4
    # line or row: the fifth time; a long file has two rows a time; text has a header
    line = (10 if "long" in form else 5) + ("text" in form)
    message = (
        rf":{line}: column (B|depth|rain): gauge B: found '-3(\.0)?'; expected a depth of 0 or more; correct the cell"
    )
    with pytest.raises(ReadError, match=message):
        stream.read(4, 6)
    with pytest.raises(ReadError, match=message):
        read_rainfall(**source)


def test_two_sources_with_one_gauge(tmp_path: Path) -> None:
    """Values of a gauge in two sources at one time are refused in the part that has them."""
    one = write(tmp_path, "wide text", hours(4), ["A"], np.ones((4, 1)), name="one_")
    two = write(tmp_path, "NetCDF", hours(2, "2031-05-04T04:00:00"), "A", np.ones((2, 1)), name="two_")
    stream = open_stream([one, two], network_of("A"))
    assert len(stream.read(0, 3)) == 3
    with pytest.raises(
        DataError, match=r"gauge A: found values in source 1 \(1h\) and in source 2 \(1h\) for 1 of the"
    ):
        stream.read(3, 5)
    for source in (one, two):
        source.pop("timezone")
    with pytest.raises(DataError, match=r"time zones: found no zone for source 1 \(1h\), \+00:00 for source 2 \(1h\)"):
        open_stream([one, two], network_of("A"))


def test_problems_of_all_files_together(tmp_path: Path) -> None:
    """What is wrong with several files of several sources is told in one list."""
    one = {"files": [written(tmp_path, "time,A\nnoon,1\n", "one.csv"), tmp_path / "none.csv"], **HOUR}
    two = {"files": [written(tmp_path, "PAR", "two.parquet"), written(tmp_path, "", "two.nc")], **HOUR}
    with pytest.raises(ReadError) as caught:
        open_stream([one, two], network_of("A"))
    assert [line.split(str(tmp_path) + "/")[1].split("; expected")[0] for line in str(caught.value).splitlines()] == [
        "one.csv:2: column time: found 'noon'",
        "none.csv: the file: found nothing of that name",
        "two.parquet: the file: found no Parquet file",
        "two.nc: the file: found nothing in it",
    ]
