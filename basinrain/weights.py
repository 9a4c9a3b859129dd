"""Weight tables: how much every gauge counts in every basin, whichever method made the weights.

A method of areal averaging is a table of weights ``W`` (basins × gauges). Everything else follows from the table by the
same few products: the basin mean of a step is ``W @ p``, its comparison with another method is a difference of two
tables, and what each gauge contributed is a product that sums to the mean exactly.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from basinrain.errors import DataError, Problem
from basinrain.notes import Note

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["WeightTable", "compare"]


@dataclass(frozen=True, eq=False)
class WeightTable:
    """Weights of gauges in basins by one method.

    Parameters
    ----------
    method : str
        The method's registered name.
    basins, gauges : tuple of str
        Ids of the rows and the columns.
    weights : array of float, shape (n_basins, n_gauges)
        A whole row of NaN says that the method has no number for that basin; a gauge without influence has weight 0.
    covered : array of float, shape (n_basins,), optional
        Share of each basin's area that the method reaches with these gauges; 1 where not given.
    notes : tuple of Note
        What the user must know about these weights.

    Raises
    ------
    DataError
        The array's shape does not fit the ids, or a row is NaN only in part.

    Examples
    --------
    >>> table = WeightTable("thiessen", ("all",), ("A", "B"), np.array([[0.75, 0.25]]))
    >>> table.apply(np.array([[10.0, 30.0], [0.0, np.nan]]))
    array([[15.],
           [nan]])
    >>> table.contributions(np.array([10.0, 30.0]))
    array([[7.5, 7.5]])
    >>> table.to_frame()  # doctest: +NORMALIZE_WHITESPACE
    gauge     A     B
    basin
    all    0.75  0.25
    """

    method: str
    basins: tuple[str, ...]
    gauges: tuple[str, ...]
    weights: npt.NDArray[np.float64]
    covered: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty(0), kw_only=True)
    notes: tuple[Note, ...] = field(default=(), kw_only=True)

    def __post_init__(self) -> None:
        shape = (len(self.basins), len(self.gauges))
        covered = np.asarray(self.covered, dtype=float) if len(self.covered) else np.ones(shape[0])
        object.__setattr__(self, "covered", covered)
        object.__setattr__(self, "weights", np.asarray(self.weights, dtype=float))
        if self.weights.shape != shape or covered.shape != shape[:1]:
            raise DataError(
                Problem(
                    item=f"weights by {self.method}",
                    found=f"an array of shape {self.weights.shape}",
                    expected=f"{shape}, basins by gauges",
                )
            )
        missing = np.isnan(self.weights)
        if (missing.any(axis=1) != missing.all(axis=1)).any():
            raise DataError(
                Problem(
                    item=f"weights by {self.method}",
                    found="a row that is missing in part",
                    expected="a whole row, or none of it",
                )
            )

    @property
    def answered(self) -> npt.NDArray[np.bool_]:
        """Whether the method has a number for each basin, shape (n_basins,)."""
        return np.asarray(~np.isnan(self.weights).any(axis=1))

    def apply(self, depths: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        """Return basin means of gauge depths.

        Parameters
        ----------
        depths : array of float, shape (n_gauges,) or (n_steps, n_gauges)
            mm. NaN at a gauge that has weight in a basin makes that basin's mean NaN: a missing depth is never zero.

        Returns
        -------
        array of float, shape (n_basins,) or (n_steps, n_basins)
        """
        missing = np.isnan(depths)
        if not missing.any():
            return np.asarray(depths @ self.weights.T, dtype=float)
        means = np.where(missing, 0.0, depths) @ self.weights.T
        needed = np.nan_to_num(self.weights) != 0
        means[(missing.astype(float) @ needed.T.astype(float)) > 0] = np.nan
        return np.asarray(means, dtype=float)

    def contributions(self, depths: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        """Return the depth that each gauge puts into each basin's mean; rows sum to the mean.

        Parameters
        ----------
        depths : array of float, shape (n_gauges,)
            mm; NaN where a gauge has no depth.

        Returns
        -------
        array of float, shape (n_basins, n_gauges)
            mm. A gauge without weight puts in 0 whatever its depth, NaN included; NaN at a gauge that has weight stays
            NaN, as does the row of a basin for which the method has no number.

        Examples
        --------
        >>> table = WeightTable("given", ("u", "v"), ("A", "B"), np.array([[1.0, 0.0], [0.5, 0.5]]))
        >>> table.contributions(np.array([8.0, np.nan]))
        array([[ 8.,  0.],
               [ 4., nan]])
        """
        return np.where(self.weights == 0, 0.0, self.weights * depths[None, :])

    def to_frame(self) -> pd.DataFrame:
        """Return the weights as a data frame, basins down, gauges across.

        Returns
        -------
        pandas.DataFrame
            A copy, shape (n_basins, n_gauges), its index named ``basin`` and its columns ``gauge``. A row of NaN says
            that the method has no number for that basin.

        Examples
        --------
        >>> table = WeightTable("given", ("u", "v"), ("A", "B"), np.array([[0.75, 0.25], [np.nan, np.nan]]))
        >>> table.to_frame().loc["u", "A"], bool(table.to_frame().loc["v"].isna().all())
        (np.float64(0.75), True)
        """
        import pandas as pd

        return pd.DataFrame(
            self.weights,
            index=pd.Index(self.basins, name="basin"),
            columns=pd.Index(self.gauges, name="gauge"),
        )


def compare(tables: Sequence[WeightTable], *, also: npt.NDArray[np.bool_] | None = None) -> pd.DataFrame:
    """Set the weights of several methods side by side, the largest differences first.

    Parameters
    ----------
    tables
        One or more, of the same basins and gauges, each by a method of its own.
    also : array of bool, shape (n_basins, n_gauges), optional
        Gauges to list though no method gives them weight, such as donors of infilled gauges.

    Returns
    -------
    pandas.DataFrame
        One row per basin and gauge that any method gives weight: columns ``basin``, ``gauge``, one per method, and
        ``difference``, the largest less the smallest weight. Basins in their order; within a basin by falling
        difference, then by gauge id. A method without a number for the basin is NaN and does not enter the difference,
        which is 0 where one method alone has a number; a basin for which none has is left out.

    Raises
    ------
    DataError
        The tables are not of the same basins and gauges in the same order.

    Examples
    --------
    >>> one = WeightTable("arithmetic", ("all",), ("A", "B", "C"), np.array([[0.5, 0.5, 0.0]]))
    >>> two = WeightTable("thiessen", ("all",), ("A", "B", "C"), np.array([[0.5, 0.4, 0.1]]))
    >>> compare([one, two]).round(3).to_dict("list")  # doctest: +NORMALIZE_WHITESPACE
    {'basin': ['all', 'all', 'all'], 'gauge': ['B', 'C', 'A'], 'arithmetic': [0.5, 0.0, 0.5],
     'thiessen': [0.4, 0.1, 0.5], 'difference': [0.1, 0.1, 0.0]}
    """
    import pandas as pd

    first = tables[0]
    if any((t.basins, t.gauges) != (first.basins, first.gauges) for t in tables):
        raise DataError(Problem(item="weight tables", found="different basins or gauges", expected="the same in all"))
    stacked = np.stack([table.weights for table in tables], axis=2)
    rows = []
    for b, basin in enumerate(first.basins):
        answered = stacked[b][:, ~np.isnan(stacked[b]).any(axis=0)]
        spread = np.ptp(answered, axis=1) if answered.shape[1] else np.zeros(len(first.gauges))
        used = (answered != 0).any(axis=1) | (False if also is None else also[b])
        # Rounded, so that differences equal but for the last bit are ordered by id.
        order = sorted(np.flatnonzero(used), key=lambda g: (-round(float(spread[g]), 12), first.gauges[g]))
        rows += [(basin, first.gauges[g], *stacked[b, g], spread[g]) for g in order]
    return pd.DataFrame(rows, columns=["basin", "gauge", *(table.method for table in tables), "difference"])
