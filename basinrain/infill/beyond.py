"""Estimates far above all that their donors had."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

import numpy as np

from basinrain.infill.completed import Estimate
from basinrain.infill.gaps import steps_in_words
from basinrain.infill.normals import normals_of
from basinrain.infill.spans import EXACT, month_of
from basinrain.infill.window import Window
from basinrain.notes import Note

__all__ = ["BEYOND", "beyond_donors"]

BEYOND: Final = 2.0
"""An estimate of more than this many times the greatest depth of its donors is doubted."""


def beyond_donors(window: Window, g: int, estimates: Sequence[Estimate]) -> tuple[Note, ...]:
    """Return a warning where a gauge was given far more than any of its donors had.

    Parameters
    ----------
    window
        The window.
    g
        The gauge's column.
    estimates
        Its estimates.

    Returns
    -------
    tuple of Note
        One ``infill-beyond-donors``, of the greatest estimate over twice the greatest depth of its donors, with the
        number of others; or none. Only methods whose weights may sum to more than 1 can get there, by normals or slopes
        that differ as much. Between gauges so near that they donate to each other normals seldom do: at a wet mountain
        gauge they reach about 1.7 times in the month where it is most (common practice), while a normal in another unit
        or with a wrong digit is off by more.

    Examples
    --------
    X's normal was typed with a zero too many.

    >>> from basinrain.gauges import GaugeNetwork
    >>> from basinrain.infill import InfillOptions, complete
    >>> from basinrain.rainfall import RainRecord
    >>> normals = np.array([[9000.0], [900.0], [1000.0]])
    >>> network = GaugeNetwork(ids=("X", "A", "B"), x=[0.0, 1e3, 2e3], y=[0.0] * 3, crs="local", normals=normals)
    >>> ends = np.array(["2031-05-05"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(network.ids, ends - 86400, ends, [[np.nan, 30.0, 20.0]], step="1d")
    >>> notes = complete(record, network, InfillOptions(method="normal-ratio")).notes
    >>> print(next(note for note in notes if note.code == "infill-beyond-donors"))
    Gauge X: 240.0 mm were infilled over 1 of 1 steps (2031-05-04T00:00 to 2031-05-05T00:00), 8 times what its \
greatest donor had, A with 30.0 mm; most of it is from A, of whose normal its own is 10 times. Check both normals.
    """
    if window.options.chosen_method.sums_to_one:
        return ()
    column = {gauge: k for k, gauge in enumerate(window.record.gauges)}
    # Estimates of one pattern share one mapping. A weighted sum is never above its weights' sum times the greatest.
    sums = {id(e.donors): sum(e.donors.values()) for e in {id(e.donors): e for e in estimates}.values()}
    far: list[tuple[float, Estimate, Mapping[str, float]]] = []
    for estimate in estimates:
        if sums[id(estimate.donors)] <= BEYOND:
            continue
        depth = {d: float(window.own[estimate.first : estimate.stop, column[d]].sum()) for d in estimate.donors}
        if estimate.depth > BEYOND * max(depth.values()) * (1 + EXACT):
            far.append((estimate.depth, estimate, depth))
    if not far:
        return ()
    most, estimate, depths = max(far, key=lambda found: found[0])
    greatest = max(depths, key=depths.__getitem__)
    gauge, more = estimate.gauge, len(far) - 1
    steps = steps_in_words(window.record, np.arange(estimate.first, estimate.stop))
    times = most / depths[greatest]
    if window.options.chosen_method.needs_normals:
        source = max(depths, key=lambda donor: estimate.donors[donor] * depths[donor])
        ratio = _normal_ratio(window, g, column[source], estimate)
        why = f"most of it is from {source}, of whose normal its own is {ratio:.3g} times. Check both normals"
    else:
        why = f"its donors' weights sum to {sums[id(estimate.donors)]:.3g}"
    also = f" {more:,} more of its estimates {'is' if more == 1 else 'are'} as far above their donors." if more else ""
    return (
        Note(
            code="infill-beyond-donors",
            text=f"Gauge {gauge}: {most:.1f} mm were infilled over {steps}, {times:.3g} times what its "
            f"greatest donor had, {greatest} with {depths[greatest]:.1f} mm; {why}.{also}",
            gauge=gauge,
            method=window.options.method,
        ),
    )


def _normal_ratio(window: Window, g: int, donor: int, estimate: Estimate) -> float:
    """Return the ratio of the gauge's normal to a donor's, of the month that the estimate used."""
    times = window.record.starts[[estimate.first]], window.record.ends[[estimate.stop - 1]]
    month = int(month_of(*times)[0]) or None
    if window.ratios is not None:
        return float(window.ratios.of(window.network, g, month)[donor])
    normals = normals_of(window.network, month)
    return float(normals[g] / normals[donor])
