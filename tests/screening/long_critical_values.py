"""Critical values for long series, simulated: ``python -m screening.long_critical_values``, from ``tests``.

They are the rows of ``basinrain/screening/critical_values.csv`` beyond the 100 values at which printed tables end.
"""

from __future__ import annotations

import math
import sys
from typing import Final

import numpy as np
import numpy.typing as npt

SERIES: Final = 400_000
LENGTHS: Final = (150, 200, 300)
TESTS: Final = ("snht", "buishand-range", "buishand-q", "pettitt")
"""Not von Neumann's: as (2 - N) √n its value for 100 holds."""
SEED: Final = 23
_AT_ONCE: Final = 20_000

Floats = npt.NDArray[np.float64]


def many(test: str, series: Floats) -> Floats:
    """Return the statistic of many series (m, n) at once, derived apart from the package's own code."""
    n = series.shape[1]
    k = np.arange(1, n)
    deviation = series - series.mean(axis=1, keepdims=True)
    squares = (deviation**2).sum(axis=1)
    sums = np.cumsum(deviation, axis=1)[:, :-1]
    if test == "snht":
        # Between-group sum of squares over the total one, times n - 1.
        return np.asarray((sums**2 * n / (k * (n - k))).max(axis=1) * (n - 1) / squares)
    if test.startswith("buishand"):
        low, high = np.minimum(sums.min(axis=1), 0), np.maximum(sums.max(axis=1), 0)
        return np.asarray((high - low if test == "buishand-range" else np.maximum(high, -low)) / np.sqrt(squares))
    if test == "pettitt":
        ranks = series.argsort(axis=1).argsort(axis=1) + 1
        return np.asarray(np.abs(2 * np.cumsum(ranks, axis=1)[:, :-1] - k * (n + 1)).max(axis=1), dtype=float)
    return np.asarray((np.diff(series, axis=1) ** 2).sum(axis=1) / squares)


def simulated(n: int, series: int = SERIES) -> dict[str, tuple[float, float]]:
    """Return by test the values that 5 % and 1 % of normal series of n values reach; all tests take the same series."""
    rng = np.random.default_rng([SEED, n])
    parts: dict[str, list[Floats]] = {test: [] for test in TESTS}
    for _ in range(series // _AT_ONCE):
        drawn = rng.standard_normal((_AT_ONCE, n))
        for test in TESTS:
            parts[test].append(many(test, drawn))
    quantiles = {test: np.quantile(np.concatenate(found), [0.95, 0.99]) for test, found in parts.items()}
    return {test: (float(five), float(one)) for test, (five, one) in quantiles.items()}


def table() -> str:
    """Return the rows as the table of the package has them: test, n, 5 %, 1 %."""
    rows = {(test, n): values for n in LENGTHS for test, values in simulated(n).items()}
    return "\n".join(f"{test},{n},{_text(test, five)},{_text(test, one)}" for (test, n), (five, one) in rows.items())


def _text(test: str, value: float) -> str:
    # Pettitt's K is a whole number.
    return f"{math.ceil(value)}" if test == "pettitt" else f"{value:.3f}"


if __name__ == "__main__":
    sys.stdout.write(table() + "\n")
