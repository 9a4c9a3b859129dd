"""Networks, records and a plain double loop for the tests of the leave-one-out comparison."""

from __future__ import annotations

import json
import os
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
import pandas as pd
import pytest

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Candidate, candidates_of
from basinrain.rainfall import RainRecord

DATA = Path(__file__).parent / "data"

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


class OpenData(NamedTuple):
    """An open record with planar positions, normals that are the gauges' own means, and its reference results."""

    network: GaugeNetwork
    depth: Floats
    months: Ints
    reference: dict[str, dict[str, float]]
    gauges: pd.DataFrame


def open_data(name: str) -> OpenData:
    """Read one of the open records; the Platte's only where its folder is named, else the test is skipped."""
    if name == "co_platte" and "BASINRAIN_CO_PLATTE" not in os.environ:
        pytest.skip("BASINRAIN_CO_PLATTE does not name the folder of the Platte data, which has another licence")
    folder = Path(os.environ["BASINRAIN_CO_PLATTE"]) if name == "co_platte" else DATA / name
    gauges = pd.read_csv(folder / "gauges.csv", dtype={"id": str}).set_index("id")
    rain = pd.read_csv(folder / "rain.csv", index_col=0)
    depth = rain[list(gauges.index)].to_numpy(dtype=float)
    network = GaugeNetwork(
        ids=tuple(gauges.index),
        x=gauges["x"].to_numpy(),
        y=gauges["y"].to_numpy(),
        crs="local",
        normals=np.nanmean(depth, axis=0)[:, None],
    )
    months = pd.DatetimeIndex(pd.to_datetime(rain.index)).month.to_numpy(dtype=np.int64)
    return OpenData(network, depth, months, json.loads((folder / "reference.json").read_text())["loo"], gauges)


def small_network(n: int = 7, *, seed: int = 3, monthly: bool = False) -> GaugeNetwork:
    """Return gauges scattered over 30 km with elevations and normals, their ids not in the order of the columns."""
    rng = np.random.default_rng(seed)
    return GaugeNetwork(
        ids=tuple(f"G{k}" for k in rng.permutation(n)),
        x=rng.uniform(0, 30e3, n),
        y=rng.uniform(0, 30e3, n),
        crs="local",
        elevation=rng.uniform(0, 900, n),
        normals=rng.uniform(40, 160, (n, 12 if monthly else 1)),
    )


def small_depths(n_steps: int, n: int = 7, *, seed: int = 4, missing: float = 0.3) -> Floats:
    """Return depths that the gauges share in part, a third of them dry, with holes."""
    rng = np.random.default_rng(seed)
    depth = rng.gamma(0.6, 9.0, (n_steps, 1)) * rng.gamma(3.0, 0.4, (n_steps, n)) * (rng.random((n_steps, n)) > 0.3)
    depth[rng.random((n_steps, n)) < missing] = np.nan
    return np.asarray(depth)


def daily_record(network: GaugeNetwork, depth: Floats, *, start: str = "2021-01-01") -> RainRecord:
    """Return these depths as a record of days."""
    ends = np.datetime64(start, "s") + np.arange(1, len(depth) + 1) * np.timedelta64(86400, "s")
    return RainRecord.from_depths(network.ids, ends - np.timedelta64(86400, "s"), ends, depth, step="1d")


def plain_estimates(
    network: GaugeNetwork,
    depth: Floats,
    options: InfillOptions,
    months: Ints | None = None,
    **further: Any,  # noqa: ANN401 - as the estimator takes it
) -> Floats:
    """Return every estimate by asking for the weights of one gauge at one step, one after the other."""
    result = np.full(depth.shape, np.nan)
    for t, row in enumerate(depth):
        month = None if months is None else int(months[t]) or None
        for g in np.flatnonzero(~np.isnan(row)):
            others = ~np.isnan(row)
            others[g] = False
            weights = options.weights(network, int(g), others, month=month, **further)
            donors = np.flatnonzero(weights)
            if len(donors):
                result[t, g] = sum(weights[d] * row[d] for d in donors)
    return result


def every_candidate(**options: Any) -> list[Candidate]:  # noqa: ANN401 - options of any kind
    """Return every registered method as a candidate."""
    return list(candidates_of(InfillOptions(**options)))
