"""Hypothesis strategies for small records with gaps of every kind, and for how they are infilled."""

from __future__ import annotations

from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st
from strategies import networks

from basinrain.gauges import GaugeNetwork
from basinrain.infill import Completed, InfillOptions, Relations, complete, relations_of
from basinrain.rainfall import KnownTotal, RainRecord, Status


class Case(NamedTuple):
    """A record with gaps, its network, and the days before it, from which the relations come."""

    record: RainRecord
    network: GaugeNetwork
    days: npt.NDArray[np.float64]

    @property
    def relations(self) -> Relations:
        """The relations of those days, of which every twelfth is in the same month."""
        return relations_of(self.days, self.network, np.arange(len(self.days)) % 12 + 1)

    def completed(self, options: InfillOptions) -> Completed:
        """Return the completed record."""
        return complete(self.record, self.network, options, relations=self.relations)


def options_of(method: str, given: dict[str, Any]) -> InfillOptions:
    """Return options without those that the method does not take."""
    return InfillOptions(**{"method": "inverse-distance-ratios", **given}).with_method(method)


@st.composite
def gappy(draw: st.DrawFn) -> Case:
    """Draw a network with monthly normals, and a record with gaps, spread values and gauges that come and go."""
    bare = draw(networks(at_least=2, at_most=6))
    n = len(bare)
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    normals = rng.integers(20, 200, (n, 12)) if draw(st.booleans()) else rng.integers(190, 212, (n, 12))
    elevation = rng.integers(0, 4, n).astype(float) * 100
    network = replace(bare, normals=normals.astype(float), elevation=elevation)
    days = rng.gamma(0.5, 8, (40, 1)) * rng.gamma(2, 0.5, (40, n))
    days[:, rng.random(n) < 0.1] = 3.0  # never varies
    days[rng.random((40, n)) < 0.1] = np.nan
    n_steps = draw(st.integers(1, 14))
    step = np.timedelta64(draw(st.sampled_from([3600, 6 * 3600, 86400])), "s")
    ends = np.datetime64("2031-04-29T00", "s") + np.arange(1, n_steps + 1) * step
    depth = rng.integers(0, 80, (n_steps, n)) * 0.5 * (rng.random((n_steps, n)) < draw(st.sampled_from([0.2, 0.8])))
    depth[rng.random((n_steps, n)) < draw(st.sampled_from([0.1, 0.4, 0.7]))] = np.nan
    depth[:, rng.random(n) < 0.2] = np.nan
    record = RainRecord.from_depths(network.ids, ends - step, ends, depth, step="some")
    status = record.status.copy()
    absent = (np.arange(n_steps)[:, None] < rng.integers(0, n_steps + 1, n)) & (rng.random(n) < 0.25) & np.isnan(depth)
    status[absent] = Status.NOT_INSTALLED
    spread = rng.random(n) < 0.2
    status[(status == Status.OBSERVED) & spread] = Status.SPREAD
    recorders = frozenset(np.array(network.ids)[~spread])
    totals = []
    for g in np.flatnonzero(spread).tolist():
        length, early = int(rng.integers(1, 5)), int(rng.integers(0, 3))
        for first in range(-early, n_steps, length):
            held = slice(max(first, 0), first + length)
            # What a total holds before the first and after the last step of the window is not in the depths.
            outside = 3.0 * (rng.random() < 0.5) if first < 0 or first + length > n_steps else 0.0
            if first + length > 0 and np.isin(status[held, g], [Status.SPREAD, Status.ZERO]).all():
                bounds = ends[0] + (first - 1) * step, ends[0] + (first + length - 1) * step
                totals.append(KnownTotal(network.ids[g], *bounds, float(depth[held, g].sum()) + outside))
    phase = draw(st.sampled_from([0, 9 * 3600]))
    record = replace(record, status=status, recorders=recorders, day_phase=phase, totals=tuple(totals))
    return Case(record, network, days)


@st.composite
def settings_of(draw: st.DrawFn) -> dict[str, Any]:
    """Options apart from the method."""
    min_donors = draw(st.integers(1, 3))
    return {
        "scale": draw(st.sampled_from([None, "step", "day", "storm"])),
        "min_donors": min_donors,
        "nearest": draw(st.sampled_from([None, "all", min_donors, min_donors + 1])),
        "radius": draw(st.sampled_from([None, 8e3, 20e3])),
        "longest_gap": draw(st.sampled_from([0.5, 2, 31])),
        "power": draw(st.sampled_from([None, 0.5, 1, 3])),
        "elevation_limit": draw(st.sampled_from([None, None, 100, 200])),
    }
