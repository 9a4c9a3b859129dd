"""A table of the report, as text, before any markup."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import groupby
from typing import TYPE_CHECKING, Any, Final

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Row", "Table", "lines"]

_LONGEST_GROUP: Final = 20

Row = tuple[str, ...]
"""The cells of one line."""


@dataclass(frozen=True, kw_only=True)
class Table:
    """A table with a caption.

    Parameters
    ----------
    caption
        What it shows, with the units.
    heads
        One head a column.
    align
        One letter a column: ``"t"`` for text, ``"n"`` for numbers.
    rows
        The body. The first cell of a line names the line.
    over
        A line of heads above the heads, each with the number of columns that it spans; they span all columns together.
    foot
        Sums, printed below the body.
    notes
        Sentences printed below the table.
    lead
        What stands below the caption, before the heads.
    widths
        Per cent of the page that each column takes; as its content asks where there are none.

    Examples
    --------
    >>> table = Table(
    ...     caption="Depth in mm", heads=("basin", "depth"), align="tn", rows=(("Upper", "3.0"), ("Upper", "4.0"))
    ... )
    >>> [len(group) for group in table.groups]
    [2]
    """

    caption: str
    heads: Row
    align: str
    rows: Sequence[Row]
    over: tuple[tuple[str, int], ...] = ()
    foot: Sequence[Row] = ()
    notes: tuple[str, ...] = ()
    lead: str = ""
    widths: tuple[int, ...] = ()

    def __post_init__(self) -> None:
        widths = {len(self.heads), len(self.align), *map(len, self.rows), *map(len, self.foot)}
        if self.widths:
            widths.add(len(self.widths))
        if self.over:
            widths.add(sum(span for _, span in self.over))
        if len(widths) != 1:
            raise ValueError(f"table '{self.caption}' has lines of {sorted(widths)} cells")

    @property
    def grouped(self) -> bool:
        """Whether neighbouring lines have the same first cell, which then stands once for all of them.

        Not in groups so long that a page may begin in the middle of one.
        """
        return 1 < max((len(group) for group in self.groups), default=0) <= _LONGEST_GROUP

    @property
    def groups(self) -> list[list[Row]]:
        """The lines of the body, those with the same first cell together."""
        return [list(rows) for _, rows in groupby(self.rows, key=lambda row: row[0])]


def lines(frame: pd.DataFrame) -> list[Any]:
    """Return the lines of a data frame, each with its columns as attributes.

    Examples
    --------
    >>> import pandas as pd
    >>> [line.depth for line in lines(pd.DataFrame({"depth": [1.5, 2.5]}))]
    [1.5, 2.5]
    """
    return list(frame.itertuples(index=False))
