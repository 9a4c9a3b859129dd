"""Storm windows, what times a basin total, and how a gauge's total came about."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
from strips import BASINS, NAN, NETWORK, hourly

from basinrain.errors import JobError, MethodError
from basinrain.infill import Completed, InfillOptions, complete
from basinrain.storms import Storm, borrowed_times, hyetograph_shape, status_of_total, storm_window


def test_storm_window_takes_whole_steps_and_says_so() -> None:
    """A window that cuts a step takes it whole."""
    record = hourly([[1, 1, 1]] * 6)
    storm, notes = storm_window(
        record, "Q", start=np.datetime64("2031-05-04T01:30"), end=np.datetime64("2031-05-04T03:00")
    )
    assert (storm.first, storm.stop) == (1, 3)
    assert [note.code for note in notes] == ["window-widened"]
    assert "2031-05-04T01:00 to 2031-05-04T03:00" in notes[0].text


@pytest.mark.parametrize(
    ("start", "end", "message"),
    [
        (
            "2031-05-04T03",
            "2031-05-04T01",
            "storm Q: found 2031-05-04T03:00 to 2031-05-04T01:00; expected an end after",
        ),
        ("2031-05-03T23", "2031-05-04T03", "expected a window inside the record, 2031-05-04T00:00 to 2031-05-04T06:00"),
        ("2031-05-04T03", "2031-05-04T07", "expected a window inside the record"),
    ],
)
def test_impossible_windows_are_refused(start: str, end: str, message: str) -> None:
    """A storm that ends before it starts, or reaches out of the record, is refused."""
    with pytest.raises(JobError, match=message):
        storm_window(hourly([[1, 1, 1]] * 6), "Q", start=np.datetime64(start), end=np.datetime64(end))


def test_unknown_pattern_names_the_nearest() -> None:
    """A pattern that is no gauge of the record is refused."""
    with pytest.raises(JobError, match="did you mean 'nearest-recorder'"):
        storm_window(hourly([[1, 1, 1]]), "Q", pattern="nearest-recoder")


def shapes(depth: list[list[float]], pattern: str) -> list[tuple[str, npt.NDArray[np.float64] | None]]:
    record = hourly(depth)
    completed = complete(record, NETWORK, InfillOptions(scale="step", min_donors=1))
    storm = Storm("Q", 0, len(depth), record.starts[0], record.ends[-1], pattern)
    return hyetograph_shape(completed, storm, NETWORK, BASINS)


def test_patterns_of_the_hyetograph() -> None:
    """The mean keeps its own times; a gauge lends its shares; the nearest recorder is complete, wet and nearest."""
    depth = [[0.0, 0.0, 1.0], [6.0, 0.0, 1.0], [2.0, 0.0, 2.0]]
    assert shapes(depth, "mean") == [("mean", None)]
    name, share = shapes(depth, "C")[0]
    assert share is not None
    assert (name, share.tolist()) == ("C", [0.25, 0.25, 0.5])
    # B, at the basin's centre, is dry: A and C are equally near, the id decides.
    name, share = shapes(depth, "nearest-recorder")[0]
    assert share is not None
    assert (name, share.tolist()) == ("A", [0, 0.75, 0.25])
    with pytest.raises(MethodError, match="storm Q pattern: found no rain at gauge B in the storm"):
        shapes(depth, "B")
    with pytest.raises(MethodError, match="no recording gauge with the whole storm and rain in it"):
        shapes([[0.0, 0.0, NAN], [0.0, NAN, 1.0]], "nearest-recorder")


@pytest.mark.parametrize("pattern", ["A", "nearest-recorder"])
def test_a_dry_storm_keeps_its_own_times_although_a_gauge_is_silent(pattern: str) -> None:
    """No rain anywhere, and one gauge without a total: there is nothing to time, and nothing to refuse."""
    record = hourly([[0.0, NAN, 0.0], [0.0, NAN, 0.0]])
    storm = Storm("Q", 0, 2, record.starts[0], record.ends[-1], pattern)
    assert hyetograph_shape(Completed(record, (), ()), storm, NETWORK, BASINS) == [("mean", None)]


def test_status_of_a_total_in_words() -> None:
    """Each way a gauge's total can come about has its word."""
    completed = complete(
        hourly([[1, NAN, NAN], [1, 2, NAN]]),
        NETWORK,
        InfillOptions(method="station-average", scale="step", min_donors=1),
    )
    assert [status_of_total(completed.record, g) for g in range(3)] == ["observed", "partly infilled", "infilled"]
    alone = complete(hourly([[1, NAN, NAN]]), NETWORK, InfillOptions(min_donors=2))
    assert status_of_total(alone.record, 1) == "missing"


def test_a_pattern_that_the_gauge_did_not_record_is_said() -> None:
    """A gauge whose steps were infilled lends other gauges' times; how many steps is said. The mean needs no remark."""
    record = hourly([[1.0, NAN, 2.0], [3.0, 4.0, 2.0], [0.0, NAN, 1.0]])
    completed = complete(record, NETWORK, InfillOptions(method="station-average", scale="step"))
    for pattern, said in (("B", ["2 of 3 steps"]), ("A", []), ("mean", [])):
        storm = Storm("Q", 0, 3, record.starts[0], record.ends[-1], pattern)
        notes = list(borrowed_times(storm, completed))
        assert [text for note, text in zip(notes, said, strict=True) if text in note.text] == said
