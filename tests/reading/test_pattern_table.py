"""A temporal pattern of the user's own: what its columns may be, and every way in which a file is no pattern."""

from __future__ import annotations

from pathlib import Path

import pytest

from basinrain.errors import JobError, ReadError
from basinrain.reading.pattern_table import read_pattern_table


def table(tmp_path: Path, text: str) -> Path:
    path = tmp_path / "pattern.csv"
    path.write_text(text, encoding="utf-8")
    return path


def problems_of(path: Path, *, percent: bool = False) -> list[str]:
    with pytest.raises(ReadError) as caught:
        read_pattern_table(path, percent=percent)
    return str(caught.value).replace(str(path), "F").splitlines()


def test_fractions_and_percent_say_the_same(tmp_path: Path) -> None:
    """A curve that has 60 % of the depth in the first quarter, in either way of writing, and with a decimal comma."""
    plain = read_pattern_table(table(tmp_path, "time,share\n0,0\n0.25,0.6\n1,1\n"))
    percent = read_pattern_table(table(tmp_path, "Time;Cumulative\n0;0\n25;60,0\n100;100\n"), percent=True)
    for curve in (plain, percent):
        assert (curve.time.tolist(), curve.share.tolist()) == ([0.0, 0.25, 1.0], [0.0, 0.6, 1.0])


def test_columns_may_be_named(tmp_path: Path) -> None:
    """What the user names wins over the names of the trade; other columns are passed over."""
    path = table(tmp_path, "note,time,share,of depth\nstart,0,0,0\nhalf,0.5,0.5,0.9\nend,1,1,1\n")
    assert read_pattern_table(path, columns={"share": "of depth"}).share.tolist() == [0.0, 0.9, 1.0]
    with pytest.raises(ReadError, match=r"columns\.share: found no column 'depht'; expected a column of the file; did"):
        read_pattern_table(path, columns={"share": "depht"})
    with pytest.raises(
        JobError, match=r"columns: found 'shares'; expected one of: time, share; did you mean 'share'\?"
    ):
        read_pattern_table(path, columns={"shares": "of depth"})


def test_percent_is_declared_never_guessed(tmp_path: Path) -> None:
    """A curve to 100 needs the declaration, a curve to 1 must not have it."""
    assert problems_of(table(tmp_path, "time,share\n0,0\n100,100\n")) == [
        f"F:3: column {column}: the pattern: found that it ends at 100; expected 1; declare percent = true"
        for column in ("time", "share")
    ]
    assert problems_of(table(tmp_path, "time,share\n0,0\n1,1\n"), percent=True) == [
        f"F:3: column {column}: the pattern: found that it ends at 1; expected 100; remove percent = true"
        for column in ("time", "share")
    ]


def test_every_fault_is_listed_with_its_line(tmp_path: Path) -> None:
    """Starts, ends, falls, times that stand still, and cells that are no numbers, all at once."""
    path = table(tmp_path, "time,share\n0.1,0.05\n0.3,0.5\n0.3,0.4\n0.5,\n0.4,x\n0.7,0.6\n0.9,0.98\n")
    assert problems_of(path) == [
        "F:2: column time: the pattern: found that it starts at 0.1; expected 0; give the whole curve, from 0 to 1",
        "F:8: column time: the pattern: found that it ends at 0.9; expected 1; give the whole curve, from 0 to 1",
        (
            "F:4: column time: the pattern: found that it stands still, from 0.3 to 0.3; expected a later time in "
            "every row"
        ),
        "F:6: column time: the pattern: found that it falls, from 0.5 to 0.4; expected a later time in every row",
        "F:5: column share: the pattern: found nothing; expected a number from 0 to 1",
        "F:6: column share: the pattern: found 'x'; expected a number from 0 to 1",
        "F:2: column share: the pattern: found that it starts at 0.05; expected 0; give the whole curve, from 0 to 1",
        "F:8: column share: the pattern: found that it ends at 0.98; expected 1; give the whole curve, from 0 to 1",
        (
            "F:4: column share: the pattern: found that it falls, from 0.5 to 0.4; expected cumulative shares, none "
            "less than before"
        ),
    ]


def test_a_flat_stretch_is_a_pause(tmp_path: Path) -> None:
    """Shares may stand still, since rain may pause."""
    assert read_pattern_table(table(tmp_path, "time,share\n0,0\n0.2,0.5\n0.8,0.5\n1,1\n")).share[2] == 0.5


def test_missing_columns_and_rows(tmp_path: Path) -> None:
    """Both columns are needed, and two rows at least."""
    assert problems_of(table(tmp_path, "hour,share\n0,0\n1,1\n")) == [
        (
            "F: the header: found no column for the time among: hour, share; expected one of: time, time_share, "
            "time_fraction, t; name it in columns.time"
        )
    ]
    assert problems_of(table(tmp_path, "time,share\n0,0\n")) == [
        f"F:2: column {column}: the pattern: found that it ends at 0; expected 1; give the whole curve, from 0 to 1"
        for column in ("time", "share")
    ]
