"""Leave-one-out errors of one method, summed piece by piece."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill.leave_one_out.estimator import Estimator
from basinrain.infill.options import InfillOptions

__all__ = ["ErrorSums", "leave_one_out_errors"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, kw_only=True, eq=False)
class ErrorSums:
    """Sums of leave-one-out errors by gauge; an error is estimated minus observed.

    Parameters
    ----------
    n : array of int, shape (n_gauges,)
        Number of estimates.
    total, absolute, squared : array of float, shape (n_gauges,)
        Sums of the errors (mm), of their absolute values (mm) and of their squares (mm²).

    Examples
    --------
    >>> sums = ErrorSums(
    ...     n=np.array([2, 0]),
    ...     total=np.array([1.0, 0.0]),
    ...     absolute=np.array([7.0, 0.0]),
    ...     squared=np.array([25.0, 0.0]),
    ... )
    >>> sums.bias, sums.mae, round(sums.rmse, 4)
    (0.5, 3.5, 3.5355)
    """

    n: npt.NDArray[np.int64]
    total: Floats
    absolute: Floats
    squared: Floats

    @property
    def bias(self) -> float:
        """Mean error over all gauges in mm; NaN without an estimate."""
        return self._mean(self.total)

    @property
    def mae(self) -> float:
        """Mean absolute error over all gauges in mm; NaN without an estimate."""
        return self._mean(self.absolute)

    @property
    def rmse(self) -> float:
        """Root of the mean square error over all gauges in mm; NaN without an estimate."""
        return float(np.sqrt(self._mean(self.squared)))

    def _mean(self, sums: Floats) -> float:
        count = int(self.n.sum())
        return float(sums.sum() / count) if count else float("nan")


def leave_one_out_errors(
    depth: Floats,
    network: GaugeNetwork,
    options: InfillOptions,
    *,
    months: npt.NDArray[np.int64] | None = None,
    distances: Floats | None = None,
    **further: Any,  # noqa: ANN401 - handed to the method as it is
) -> ErrorSums:
    """Return the errors of estimating every value from the other gauges of its step.

    Every value with enough donors counts, dry ones too. Memory beyond ``depth`` is bounded, however long it is.

    Parameters
    ----------
    depth : array of float, shape (n_steps, n_gauges)
        mm; NaN where there is no value. Its columns are the network's gauges.
    network : GaugeNetwork
        With normals where the method needs them.
    options : InfillOptions
        Method and numbers; scale and longest gap play no part.
    months : array of int, shape (n_steps,), optional
        1 to 12, 0 without times; used by methods that need normals where these are monthly. Not given: the year's.
    distances : array of float, shape (n_gauges, n_gauges), optional
        m; taken from the network where not given.
    further
        What the method's weights depend on besides: ``relations`` between gauges, ``ratios`` of normals from the
        record.

    Returns
    -------
    ErrorSums

    Raises
    ------
    DataError
        Normals are missing or not above 0 at a gauge that takes part.

    Examples
    --------
    Of three gauges in line each is the mean of the other two: 3 - 1, 2 - 2 and 1 - 3.

    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> depth = np.array([[1.0, 2.0, 3.0], [np.nan, 5.0, 5.0]])  # with one donor left nothing is estimated
    >>> errors = leave_one_out_errors(depth, network, InfillOptions(method="station-average"))
    >>> errors.n, errors.total, errors.mae
    (array([1, 1, 1]), array([ 1.5,  0. , -1.5]), 1.0)
    """
    n = len(network)
    count, total, absolute, squared = np.zeros(n, dtype=np.int64), np.zeros(n), np.zeros(n), np.zeros(n)
    reporting = np.asarray(~np.isnan(depth[:1]).all(axis=0))
    reporting[~reporting] = (~np.isnan(depth[:, ~reporting])).any(axis=0)
    estimator = Estimator(network, options, distances=distances, reporting=reporting, **further)
    for piece in estimator.pieces(depth, months):
        error = np.subtract(piece.estimated, piece.observed, out=piece.estimated)
        np.copyto(error, 0.0, where=~piece.valid)
        count += piece.valid.sum(axis=0)
        total += error.sum(axis=0)
        squared += np.einsum("tg,tg->g", error, error)
        absolute += np.abs(error, out=error).sum(axis=0)
    return ErrorSums(n=count, total=total, absolute=absolute, squared=squared)
