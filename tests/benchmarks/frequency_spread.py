"""How far estimates of the 100-year depth stray: thousands of short records drawn from a known distribution.

``python tests/benchmarks/frequency_spread.py`` prints the numbers of docs/frequency.md; it takes about a minute.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.extreme_values import DISTRIBUTIONS, ExtremeValues
from basinrain.designstorm.l_moments import l_moments
from basinrain.designstorm.record_depths import RecordDepths, record_depths

Floats = npt.NDArray[np.float64]

LENGTHS: Final = (20, 30, 50)
HUNDRED: Final = Frequency(100.0, "annual-maximum")
TRUTHS: Final = {"Gumbel": 0.0, "GEV, shape -0.1": -0.1, "GEV, shape -0.2": -0.2}
"""Shapes; location 30 mm and scale 10 mm in all."""


class Spread(NamedTuple):
    """Estimates of the 100-year depth in percent of the true one, their bias and root mean square error."""

    truth: str
    years: int
    fitted: str
    low: float
    middle: float
    high: float
    bias: float
    error: float


class Cover(NamedTuple):
    """How often the 90 % interval holds the true 100-year depth, and its median width; all in percent."""

    truth: str
    years: int
    fitted: str
    held: float
    below: float
    above: float
    width: float


def truth_of(shape: float) -> tuple[ExtremeValues, float]:
    """Return a distribution and its 100-year depth."""
    parts = (np.array(part) for part in (30.0, 10.0, shape))
    known = ExtremeValues(**dict(zip(("location", "scale", "shape"), parts, strict=True)))
    return known, float(known.quantiles(np.array([HUNDRED.variate]))[0])


def records(known: ExtremeValues, years: int, number: int, *, seed: int) -> Floats:
    """Return that many records of annual maxima, shape (years, number)."""
    chance = np.random.default_rng([seed, years]).random((years, number))
    return known.quantiles(-np.log(-np.log(chance)).ravel()).reshape(years, number)


def spreads(*, number: int = 20_000, seed: int = 7) -> list[Spread]:
    """Return the spread of estimates for every truth, length and fit."""
    found = []
    for truth, shape in TRUTHS.items():
        known, depth = truth_of(shape)
        for years in LENGTHS:
            moments = l_moments(records(known, years, number, seed=seed))
            for fitted, fit in DISTRIBUTIONS.items():
                share = 100 * fit(moments).quantiles(np.array([HUNDRED.variate]))[:, 0] / depth
                low, middle, high = (float(part) for part in np.percentile(share, [5, 50, 95]))
                bias, error = float(share.mean()) - 100, float(np.sqrt(np.mean((share - 100) ** 2)))
                found.append(Spread(truth, years, fitted, low, middle, high, bias, error))
    return found


def depths_of(maxima: Floats) -> RecordDepths:
    """Return the depths of many records, each taken as an area of one duration."""
    years, number = maxima.shape
    return record_depths(
        np.maximum(maxima, 0.0)[:, None, :],
        np.arange(2001, 2001 + years),
        np.array([60.0]),
        [f"R{k}" for k in range(number)],
        frequencies=[HUNDRED],
        beyond_record=True,
    )


def covers(*, number: int = 2_000, seed: int = 8) -> list[Cover]:
    """Return how often intervals hold the truth, for every truth, length and fit."""
    found = []
    for truth, shape in TRUTHS.items():
        known, depth = truth_of(shape)
        for years in LENGTHS:
            result = depths_of(records(known, years, number, seed=seed))
            for fitted, fit in result.fits.items():
                lower, upper = fit.lower[:, 0, 0], fit.upper[:, 0, 0]
                below, above = 100 * float(np.mean(upper < depth)), 100 * float(np.mean(lower > depth))
                width = 100 * float(np.median(upper - lower)) / depth
                found.append(Cover(truth, years, fitted, 100 - below - above, below, above, width))
    return found


def plain_cover(*, years: int = 30, number: int = 2_000, resamples: int = 1_000, seed: int = 9) -> float:
    """Return how often resampling a Gumbel's maxima themselves, fitted by Gumbel, holds the true depth, in percent."""
    known, depth = truth_of(0.0)
    generator = np.random.default_rng(seed)
    held = 0
    for maxima in records(known, years, number, seed=seed).T:
        again = maxima[generator.integers(years, size=(years, resamples))]
        depths = DISTRIBUTIONS["gumbel"](l_moments(again)).quantiles(np.array([HUNDRED.variate]))
        lower, upper = np.quantile(depths, [0.05, 0.95])
        held += int(lower <= depth <= upper)
    return 100 * held / number


def lines_of(found: list[Spread] | list[Cover]) -> list[str]:
    """Return the rows of a table; whole percents, but a bias with one decimal and its sign."""
    return ["| " + " | ".join(map(_cell, row._fields, row)) + " |" for row in found]


def _cell(name: str, value: object) -> str:
    if not isinstance(value, float):
        return str(value)
    # Adding 0 takes the sign off a zero.
    return f"{round(value, 1) + 0.0:+.1f}" if name == "bias" else f"{value:.0f}"


if __name__ == "__main__":
    print("\n".join([*lines_of(spreads()), "", *lines_of(covers()), "", f"{plain_cover():.0f}"]))  # noqa: T201
