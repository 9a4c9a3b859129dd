from __future__ import annotations

import pytest

from basinrain.report.table import Table


def test_lines_of_unequal_length_are_refused() -> None:
    """A cell too few would put numbers under the wrong head."""
    with pytest.raises(ValueError, match=r"table 'Depths' has lines of \[2, 3\] cells"):
        Table(caption="Depths", heads=("a", "b"), align="tn", rows=[("x", "1", "2")])


def test_heads_above_span_all_columns() -> None:
    """The upper heads cover the lower ones exactly."""
    with pytest.raises(ValueError, match=r"lines of \[2, 3\] cells"):
        Table(caption="Depths", heads=("a", "b"), align="tn", rows=[], over=(("", 1), ("depth", 2)))


def test_a_width_a_column() -> None:
    """Widths that do not fit the columns would move them all."""
    with pytest.raises(ValueError, match=r"lines of \[1, 2\] cells"):
        Table(caption="Depths", heads=("a", "b"), align="tn", rows=[], widths=(100,))


def test_only_short_groups_share_their_first_cell() -> None:
    """Single lines are no group; neither is a group that a page could cut."""
    single = Table(caption="c", heads=("a",), align="t", rows=[("x",), ("y",)])
    pair = Table(caption="c", heads=("a",), align="t", rows=[("x",), ("x",), ("y",)])
    long = Table(caption="c", heads=("a",), align="t", rows=[("x",)] * 50)
    assert [single.grouped, pair.grouped, long.grouped] == [False, True, False]
    assert [len(group) for group in pair.groups] == [2, 1]
