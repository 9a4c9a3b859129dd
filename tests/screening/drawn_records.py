"""Small records that can be written down: gauges on a line, a kilometre or so apart."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening import CHECKS, Finding, ScreeningOptions
from basinrain.screening.screened import Screened

SECONDS = {"10min": 600, "1h": 3600, "1d": 86400}


def line_of(n: int, apart: float = 5000.0) -> GaugeNetwork:
    """Return gauges A, B, C ... on a line."""
    return GaugeNetwork(
        ids=tuple("ABCDEFGHIJKL"[:n]), x=np.arange(float(n)) * np.float64(apart), y=np.zeros(n), crs="local"
    )


def record_of(depths: npt.ArrayLike, step: str = "1d", start: str = "2031-01-01") -> RainRecord:
    """Return the record of depths, shape (n_steps, n_gauges), of gauges A, B, C ... from a date on."""
    values = np.asarray(depths, dtype=float)
    length = np.timedelta64(SECONDS[step], "s")
    ends = np.datetime64(start, "s") + np.arange(1, len(values) + 1) * length
    return RainRecord.from_depths(tuple("ABCDEFGHIJKL"[: values.shape[1]]), ends - length, ends, values, step=step)


def found(
    check: str, record: RainRecord, network: GaugeNetwork | None = None, options: ScreeningOptions | None = None
) -> list[Finding]:
    """Return what one check finds; it must not lack anything."""
    place = line_of(len(record.gauges)) if network is None else network
    view = Screened(record, place, options or ScreeningOptions())
    assert CHECKS[check].lacks(view) == ""
    return list(CHECKS[check].run(view))


def rain_of(n_days: int, n_gauges: int, seed: int = 5) -> npt.NDArray[np.float64]:
    """Return days of rain that is nearly the same at all gauges: every third day or so, 0.1 mm to some 40 mm."""
    rng = np.random.default_rng(seed)
    day = np.where(rng.random(n_days) < 0.4, rng.gamma(0.8, 10.0, n_days), 0.0)
    return np.round(day[:, None] * rng.uniform(0.8, 1.25, (n_days, n_gauges)), 1)
