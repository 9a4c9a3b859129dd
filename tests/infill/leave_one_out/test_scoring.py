"""Scores against plain numpy on the pooled values."""

from __future__ import annotations

import numpy as np
import pytest
from leave_one_out_data import Floats

from basinrain.infill.leave_one_out import Score
from basinrain.infill.leave_one_out.scoring import ScoreSums


def expected(o: Floats, e: Floats, wet: float) -> dict[str, float]:
    top = [np.sort(values)[-20:].mean() for values in (e, o)]
    return {
        "n": len(o),
        "rmse": float(np.sqrt(((e - o) ** 2).mean())),
        "mae": float(np.abs(e - o).mean()),
        "bias": float((e - o).mean()),
        "correlation": float(np.corrcoef(o, e)[0, 1]),
        "hits": int(((o >= wet) & (e >= wet)).sum()),
        "misses": int(((o >= wet) & (e < wet)).sum()),
        "false_alarms": int(((o < wet) & (e >= wet)).sum()),
        "dry_hits": int(((o < wet) & (e < wet)).sum()),
        "top20_ratio": float(top[0] / top[1]),
    }


@pytest.mark.parametrize("chunk", [1, 7, 300])
def test_by_gauge_and_pooled(chunk: int) -> None:
    """However the cases are cut into chunks; what is not valid may be NaN."""
    rng = np.random.default_rng(1)
    observed, estimated = rng.gamma(0.5, 8.0, (2, 300, 3))
    valid = rng.random((300, 3)) < [0.9, 0.5, 0.04]
    observed[~valid & (rng.random((300, 3)) < 0.5)] = np.nan
    estimated[~valid] = np.nan
    sums = ScoreSums(3, wet=1.0)
    for first in range(0, 300, chunk):
        rows = slice(first, first + chunk)
        sums.add(observed[rows], estimated[rows], valid[rows])
    scores = sums.scores("a", ("A", "B", "C"), "day")
    assert [score.gauge for score in scores] == ["", "A", "B", "C"]
    assert 0 < scores[3].n < 20
    for score, columns in zip(scores, (slice(None), slice(1), slice(1, 2), slice(2, 3)), strict=True):
        here = valid[:, columns]
        wanted = expected(observed[:, columns][here], estimated[:, columns][here], 1.0)
        found = {name: getattr(score, name) for name in wanted}
        assert found == pytest.approx(wanted, rel=1e-12, abs=1e-12)


def one(observed: list[float], estimated: list[float]) -> Score:
    sums = ScoreSums(1, wet=0.2)
    shape = (len(observed), 1)
    sums.add(np.reshape(observed, shape), np.reshape(estimated, shape), np.ones(shape, dtype=bool))
    return sums.scores("a", ("A",), "step")[0]


def test_what_cannot_be_said() -> None:
    """Nothing of no case; no correlation of one case or of constant rain; no ratio where all was dry."""
    nothing = one([], [])
    assert nothing.n == 0
    assert np.isnan([nothing.rmse, nothing.mae, nothing.bias, nothing.correlation, nothing.top20_ratio]).all()
    assert np.isnan(one([3.0], [4.0]).correlation)
    assert np.isnan(one([3.1, 3.1, 3.1], [1.0, 2.0, 3.0]).correlation)
    assert np.isnan(one([1.0, 2.0, 3.0], [0.3, 0.3, 0.3]).correlation)
    dry = one([0.0, 0.0], [0.5, 0.0])
    assert np.isnan(dry.top20_ratio)
    assert (dry.false_alarms, dry.dry_hits) == (1, 1)


def test_the_edge_of_wet_is_wet() -> None:
    """0.2 mm made of tenths is not lost to rounding."""
    assert one([0.2], [0.1 + 0.1 - 1e-16]).hits == 1
