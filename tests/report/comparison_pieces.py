"""A small leave-one-out comparison whose numbers are seeded: methods, gauges and cases as many as wanted."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import Comparison, Difference, Score
from basinrain.notes import Note

Floats = npt.NDArray[np.float64]

METHODS = (
    "nearest-gauge",
    "station-average",
    "inverse-distance (power 1)",
    "inverse-distance (power 2)",
    "four-quadrant",
    "correlation-weighting",
)
"""From simple to complex, as tables list them."""


def make_network(ids: Sequence[str] = ("A", "B", "C", "D", "E", "F"), *, seed: int = 3) -> GaugeNetwork:
    """Return gauges strewn over 30 by 20 km."""
    rng = np.random.default_rng(seed)
    x, y = rng.uniform(0, 30e3, len(ids)), rng.uniform(0, 20e3, len(ids))
    return GaugeNetwork(ids=tuple(ids), x=x, y=y, crs="local")


def make_comparison(
    ids: Sequence[str] = ("A", "B", "C", "D", "E", "F"),
    *,
    cases: int = 40,
    methods: Sequence[str] = METHODS,
    chosen: str = "station-average",
    scale: str = "day",
    skipped: dict[str, str] | None = None,
    seed: int = 7,
) -> Comparison:
    """Return a comparison on seeded depths, whose scores are those of its own estimates."""
    rng = np.random.default_rng(seed)
    common = rng.gamma(2.0, 6.0, (cases, 1))
    observed = common * rng.lognormal(0, 0.25, (cases, len(ids)))
    observed[rng.random(observed.shape) < 0.1] = 0.0
    observed[rng.random(observed.shape) < 0.05] = np.nan
    spread = {method: 0.2 + 0.04 * abs(k - 3) for k, method in enumerate(methods)}
    estimates = {m: common * rng.lognormal(0.02, s, (cases, len(ids))) for m, s in spread.items()}
    for estimate in estimates.values():
        estimate[np.isnan(observed)] = np.nan
    scores = [
        _score(method, gauge, kind, observed[:, columns], estimates[method][:, columns])
        for kind in ((scale, "step") if scale == "day" else (scale,))
        for gauge, columns in (("", slice(None)), *((name, slice(k, k + 1)) for k, name in enumerate(ids)))
        for method in methods
    ]
    pooled = {s.candidate: s.rmse for s in scores if not s.gauge and s.scale == scale}
    best = min(pooled, key=pooled.__getitem__)
    least = pooled[best]
    differences = tuple(
        Difference(
            candidate=m,
            best=best,
            difference=pooled[m] - least,
            low=0.0 if m == best else pooled[m] - least - 0.4,
            high=0.0 if m == best else pooled[m] - least + 0.4,
            distinguishable=m != best and pooled[m] - least > 0.4,
        )
        for m in methods
    )
    ends = np.datetime64("2031-01-01T08", "s") + np.arange(1, cases + 1) * np.timedelta64(86400, "s")
    return Comparison(
        candidates=tuple(methods),
        skipped={"normal-ratio": "no normals are given"} if skipped is None else skipped,
        scale=scale,
        gauges=tuple(ids),
        ends=ends,
        observed=observed,
        estimated=estimates[chosen],
        scores=tuple(scores),
        differences=differences,
        drawn="week",
        best=best,
        chosen=chosen,
        chosen_options=InfillOptions(method="station-average"),
        reason=f"{chosen} is taken: it is the simplest that cannot be told from the best, {best}.",
        notes=(Note(code="gauge-sites", text="Gauge sites are not the basin.", level="info"),),
    )


def _score(method: str, gauge: str, scale: str, observed: Floats, estimated: Floats) -> Score:
    known = ~np.isnan(observed)
    x, y = observed[known], estimated[known]
    error = y - x
    wet_x, wet_y = x >= 1, y >= 1
    top = min(20, len(x))
    return Score(
        candidate=method,
        gauge=gauge,
        scale=scale,
        n=len(x),
        rmse=float(np.sqrt((error**2).mean())) if len(x) else np.nan,
        mae=float(np.abs(error).mean()) if len(x) else np.nan,
        bias=float(error.mean()) if len(x) else np.nan,
        correlation=float(np.corrcoef(x, y)[0, 1]) if len(x) > 1 else np.nan,
        hits=int((wet_x & wet_y).sum()),
        misses=int((wet_x & ~wet_y).sum()),
        false_alarms=int((~wet_x & wet_y).sum()),
        dry_hits=int((~wet_x & ~wet_y).sum()),
        top20_ratio=float(np.sort(y)[-top:].mean() / np.sort(x)[-top:].mean()) if top else np.nan,
    )
