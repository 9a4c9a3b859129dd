"""When the network changed."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from basinrain.series.network_changes import CLOSES, OPENS, RETURNS, SILENT, network_changes

DAY = np.timedelta64(86400, "s")
START = np.datetime64("2031-05-04", "s")


def masks(rows: list[str]) -> tuple[np.ndarray, np.ndarray]:
    """Return who is absent and who silent, of rows with ``-`` for absent, ``.`` for silent and ``x`` for there."""
    table = np.array([list(row) for row in rows])
    return table == "-", table == "."


def told(rows: list[str], blocks: list[tuple[int, int]]) -> list[tuple[int, str, str, int]]:
    absent, silent = masks(rows)
    gauges = tuple("ABC"[: len(rows[0])])
    starts = START + np.arange(len(rows)) * DAY
    found = network_changes(gauges, starts, blocks, lambda a, b: absent[a:b], lambda a, b: silent[a:b])
    return [(int((c.time - START) / DAY), c.gauge, c.change, c.gauges) for c in found]


def test_every_kind_of_change() -> None:
    """A falls silent, comes back and closes; B opens; both on one day count together."""
    rows = ["x-", ".-", "xx", "-x"]
    assert told(rows, [(0, 4)]) == [
        (1, "A", SILENT, 0),
        (2, "A", RETURNS, 2),
        (2, "B", OPENS, 2),
        (3, "A", CLOSES, 1),
    ]


def test_nothing_changes_where_all_are_there() -> None:
    """Without a change there is no row, and none in a record without steps."""
    assert told(["xx", "xx"], [(0, 2)]) == []
    assert told(["xx"], []) == []


@given(rows=st.lists(st.text("x.-", min_size=3, max_size=3), min_size=1, max_size=9), cut=st.integers(0, 9))
def test_blocks_do_not_matter(rows: list[str], cut: int) -> None:
    """Looked at in two blocks, the same changes are found."""
    cut = min(max(cut, 1), len(rows))
    blocks = [(0, cut), (cut, len(rows))] if cut < len(rows) else [(0, cut)]
    assert told(rows, blocks) == told(rows, [(0, len(rows))])
