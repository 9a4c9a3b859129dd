"""How much of the largest depths hangs on one gauge."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.rainfall import RainRecord
from basinrain.series.engine import SeriesEngine, SeriesSetup

__all__ = ["Dominance", "dominances"]

Bools = npt.NDArray[np.bool_]
Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


@dataclass(frozen=True, kw_only=True)
class Dominance:
    """A large depth in which one gauge has over half of the weight, which it has not while all are there.

    Parameters
    ----------
    gaps, method, basin
        The series.
    step
        The step of the record.
    gauge, weight, usual
        The gauge, its weight with the gauges that have a depth at the step, and its weight with all gauges.
    """

    gaps: str
    method: str
    basin: str
    step: int
    gauge: str
    weight: float
    usual: float


def dominances(
    setup: SeriesSetup,
    largest: Mapping[tuple[str, str], Ints],
    usual: Mapping[str, Floats],
    load: Callable[[int], tuple[RainRecord, Bools | None, int]],
    *,
    above: float = 0.5,
) -> tuple[Dominance, ...]:
    """Return the largest depths of every series in which one gauge has more than a share of the weight.

    A gauge that has more than the share while all gauges are there is not told of.

    Parameters
    ----------
    setup
        What the series rest on.
    largest : mapping to array of int, shape (n, n_basins)
        Steps to look at, by policy and method; -1 for none.
    usual : mapping to array of float, shape (n_basins, n_gauges)
        The weights with all gauges, by method.
    load
        Given a step, the whole rainfall day of the record that holds it, its long gaps, and the step's place in it.
    above
        The share.

    Examples
    --------
    A has three quarters of the square while B is silent.

    >>> import shapely
    >>> from basinrain.basins import Basins
    >>> from basinrain.gauges import GaugeNetwork
    >>> from basinrain.infill import InfillOptions
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[2.5, 7.5, 12.5], y=[5.0] * 3, crs="local")
    >>> ends = np.array(["2031-05-05"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(network.ids, ends - 86400, ends, [[80.0, np.nan, 20.0]], step="1d")
    >>> setup = SeriesSetup(
    ...     network=network,
    ...     basins=Basins(ids=("square",), polygons=[shapely.box(0, 0, 10, 10)], crs="local"),
    ...     methods={"thiessen": {}},
    ...     gaps=("reweight",),
    ...     infill=InfillOptions(scale="step"),
    ... )
    >>> usual = {"thiessen": np.array([[0.5, 0.5, 0.0]])}
    >>> found = dominances(setup, {("reweight", "thiessen"): np.array([[0]])}, usual, lambda step: (record, None, 0))
    >>> [(one.gauge, round(one.weight, 3)) for one in found]
    [('A', 0.75)]
    """
    engine = SeriesEngine(setup)
    wanted = sorted({int(step) for steps in largest.values() for step in steps.ravel() if step >= 0})
    found: list[Dominance] = []
    for step in wanted:
        chunk, long, place = load(step)
        for gaps, has_depth in engine.with_depth(chunk, long).items():
            for method in setup.methods:
                steps = largest.get((gaps, method))
                basins = [] if steps is None else np.flatnonzero((steps == step).any(axis=0)).tolist()
                if basins:
                    found += _of_step(engine, has_depth[place], usual[method], gaps, method, step, basins, above)
    return tuple(found)


def _of_step(  # noqa: PLR0917 - one step of one series
    engine: SeriesEngine,
    present: Bools,
    usual: Floats,
    gaps: str,
    method: str,
    step: int,
    basins: Sequence[int],
    above: float,
) -> list[Dominance]:
    weights = engine.weights(method, present)
    ids, gauges = engine.setup.basins.ids, engine.setup.network.ids
    found = []
    for b in basins:
        g = int(np.nanargmax(weights[b])) if not np.isnan(weights[b]).all() else -1
        if g >= 0 and weights[b, g] > above and not usual[b, g] > above:
            found.append(
                Dominance(
                    gaps=gaps,
                    method=method,
                    basin=ids[b],
                    step=step,
                    gauge=gauges[g],
                    weight=float(weights[b, g]),
                    usual=float(usual[b, g]),
                )
            )
    return found
