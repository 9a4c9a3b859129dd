"""How often breaks are found in daily records with gaps: ``python -m screening.break_rates``, from ``tests``."""

from __future__ import annotations

import sys
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening.consistency import DOUBLE_MASS_BREAK, INHOMOGENEOUS, consistency

PLANTINGS: Final = 200
N_GAUGES: Final = 8
NETWORK: Final = GaugeNetwork(
    ids=tuple("ABCDEFGH"), x=np.arange(float(N_GAUGES)) * 5e3, y=np.zeros(N_GAUGES), crs="local"
)
START: Final = np.datetime64("1991-01-01")
NOISE: Final = {0.22: 3, 0.45: 6}
"""Of a day, and the spread in % that it leaves in the ratio of a gauge's years to its neighbours'."""


@dataclass(frozen=True)
class Breaks:
    """What was found of breaks planted one at a time, by check."""

    found: dict[str, int]
    false: dict[str, int]
    made: dict[str, int]
    near: int
    years: float

    def share(self, check: str) -> float:
        """Of the plantings, the share that the check found."""
        return self.found[check] / PLANTINGS

    def alarms(self, check: str) -> float:
        """Of the other gauges, the share that it named."""
        return self.false[check] / (PLANTINGS * (N_GAUGES - 1))


def days_of(seed: int, noise: float, gaps: float) -> npt.NDArray[np.float64]:
    """Return thirty years of days that share their weather, each gauge with its factor, its noise and its outages.

    Outages begin at random and last five days on the average.
    """
    rng = np.random.default_rng([17, seed])
    n = int((np.datetime64("2021-01-01") - START).astype(int))
    weather = np.where(rng.random(n) < 0.4, rng.gamma(0.8, 9.0, n), 0.0)[:, None] * np.linspace(0.8, 1.3, N_GAUGES)
    depths = weather * rng.lognormal(-(noise**2) / 2, noise, (n, N_GAUGES))
    for column in depths.T:
        while np.isnan(column).mean() < gaps:
            first = int(rng.integers(n))
            column[first : first + rng.geometric(0.2)] = np.nan
    return np.asarray(depths)


def record_of(depths: npt.NDArray[np.float64]) -> RainRecord:
    """Return the record of days from 1991 on."""
    bounds = (START + np.arange(len(depths) + 1)).astype("datetime64[s]")
    return RainRecord.from_depths(NETWORK.ids, bounds[:-1], bounds[1:], depths, step="1d")


def planted_breaks(noise: float, factor: float, gaps: float) -> Breaks:
    """Plant breaks in one of eight gauges after the 8th to the 22nd year, and return what is found."""
    checks = (DOUBLE_MASS_BREAK, INHOMOGENEOUS)
    found, false, made = (dict.fromkeys(checks, 0) for _ in range(3))
    near, years = 0, 0
    for seed in range(PLANTINGS):
        rng = np.random.default_rng([7, seed])
        depths, target, last = days_of(seed, noise, gaps), int(rng.integers(N_GAUGES)), 1990 + int(rng.integers(8, 23))
        depths[int((np.datetime64(f"{last + 1}-01-01") - START).astype(int)) :, target] *= factor
        result = consistency(record_of(depths), NETWORK)
        for finding in result.findings:
            (found if finding.gauge == NETWORK.ids[target] else false)[finding.check] += 1
        curve = next((c for c in result.double_mass if c.gauge == NETWORK.ids[target]), None)
        if curve is not None:
            years += len(curve.years)
            near += curve.significant and abs((curve.break_after or 0) - last) <= 2
            made[DOUBLE_MASS_BREAK] += 1
        made[INHOMOGENEOUS] += any(t.gauge == NETWORK.ids[target] for t in result.homogeneity)
    return Breaks(found, false, made, near, years / max(1, made[DOUBLE_MASS_BREAK]))


def table() -> str:
    """Return the rates as the table of docs/verification.md."""
    heads = ["spread", "factor", "missing", "years that count", "found by the curve", "within 2 years of it"]
    heads += ["found by the tests", "tests could be made", "false alarms, curve / tests"]
    lines = [f"| {' | '.join(heads)} |", "|---" * len(heads) + "|"]
    for noise, spread in NOISE.items():
        for factor in (0.8, 0.9):
            for gaps in (0.0, 0.02, 0.05, 0.08):
                rate = planted_breaks(noise, factor, gaps)
                lines.append(
                    f"| {spread} % | {factor} | {100 * gaps:.0f} % | {rate.years:.1f} of 30 "
                    f"| {100 * rate.share(DOUBLE_MASS_BREAK):.1f} % | {100 * rate.near / PLANTINGS:.1f} % "
                    f"| {100 * rate.share(INHOMOGENEOUS):.1f} % | {100 * rate.made[INHOMOGENEOUS] / PLANTINGS:.1f} % "
                    f"| {100 * rate.alarms(DOUBLE_MASS_BREAK):.1f} % / {100 * rate.alarms(INHOMOGENEOUS):.1f} % |"
                )
    return "\n".join(lines)


if __name__ == "__main__":
    sys.stdout.write(table() + "\n")
