"""The hyetographs of one design storm, as files and figures take them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.exceedance import Frequency
from basinrain.designstorm.measures import duration_text, duration_words
from basinrain.errors import DataError, Problems

__all__ = ["DesignHyetograph"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, eq=False, kw_only=True)
class DesignHyetograph:
    """One design storm over the basins above a point of interest.

    Parameters
    ----------
    point : str
        The point of interest.
    frequency : Frequency
        How often its depth is exceeded.
    minutes : int
        The duration, a whole number of steps.
    pattern : str
        The temporal pattern, as the job calls it.
    step : int
        The step in minutes.
    basins : tuple of str
        Ids, the columns of ``depth``.
    depth : array of float, shape (n_steps, n_basins)
        mm a step, 0 or more; no NaN, since a design storm has no gaps.

    Raises
    ------
    DataError
        The step does not divide the duration, a basin comes twice or none at all, or the depths have another shape, a
        NaN or a negative number; all that is wrong.

    Examples
    --------
    >>> storm = DesignHyetograph(
    ...     point="bridge",
    ...     frequency=Frequency.of_aep(0.01),
    ...     minutes=120,
    ...     pattern="triangular",
    ...     step=60,
    ...     basins=("upper",),
    ...     depth=np.array([[25.0], [15.0]]),
    ... )
    >>> storm.name
    'bridge, AEP 0.01 (1 in 100), 2 h, triangular'
    >>> storm.elapsed, storm.totals
    (array([ 60, 120]), array([40.]))
    """

    point: str
    frequency: Frequency
    minutes: int
    pattern: str
    step: int
    basins: tuple[str, ...]
    depth: Floats

    def __post_init__(self) -> None:
        problems = Problems()
        object.__setattr__(self, "depth", np.asarray(self.depth, dtype=float))
        if self.step < 1 or self.minutes < self.step or self.minutes % self.step:
            problems.add(
                item=f"hyetograph {self.point}, {self.pattern}",
                found=f"a step of {self.step} min in a duration of {self.minutes} min",
                expected="a step of whole minutes that divides the duration",
            )
            problems.raise_as(DataError)
        item = f"hyetograph {self.name}"
        if not self.basins or len(set(self.basins)) < len(self.basins):
            problems.add(item=item, found=f"basins {', '.join(self.basins) or 'none'}", expected="each basin once")
        shape = self.n_steps, len(self.basins)
        if self.depth.shape != shape:
            problems.add(item=item, found=f"depths of shape {self.depth.shape}", expected=f"steps and basins, {shape}")
        elif not (good := np.isfinite(self.depth) & (self.depth >= 0)).all():
            t, b = np.argwhere(~good)[0].tolist()
            problems.add(
                item=item,
                found=f"{self.depth[t, b]:g} mm in step {t + 1} of basin {self.basins[b]}"
                + (f", and {n} more like it" if (n := int((~good).sum()) - 1) else ""),
                expected="depths of 0 or more",
                basin=self.basins[b],
            )
        problems.raise_as(DataError)

    @property
    def n_steps(self) -> int:
        """Steps of the storm."""
        return self.minutes // self.step

    @property
    def elapsed(self) -> npt.NDArray[np.int64]:
        """Minutes from the start of the storm to the end of every step, shape (n_steps,)."""
        return self.step * np.arange(1, self.n_steps + 1, dtype=np.int64)

    @property
    def duration(self) -> str:
        """The duration as every table has it, such as ``"6h"``."""
        return duration_words(self.minutes)

    @property
    def totals(self) -> Floats:
        """Depth of the whole storm, mm, shape (n_basins,)."""
        return np.asarray(self.depth.sum(axis=0))

    @property
    def name(self) -> str:
        """What tells it from the others, in words."""
        return f"{self.point}, {self.frequency.label}, {duration_text(self.minutes)}, {self.pattern}"
