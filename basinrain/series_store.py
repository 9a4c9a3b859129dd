"""The series of a run while it is computed: chunk by chunk, in memory or in a folder from which a run goes on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import numpy as np
import numpy.typing as npt

from basinrain.series.engine import SeriesPart
from basinrain.series_folder import KINDS, Series, SeriesFolder, StoreLayout

__all__ = ["SeriesStore"]


class SeriesStore:
    """Arrays of all series, (n_steps, n_basins), that are put together chunk by chunk.

    In a folder each array is an ordinary ``.npy`` file. A chunk is finished when all its values are written and a mark
    with their checksums is in place; a run that was killed at any moment goes on from its finished chunks, once their
    values have been read and their checksums found true. Values are written, never mapped: a full disk is an error
    where it happens, and what is finished stays.

    Make one with :meth:`open`, and close it, or use it in a ``with`` statement.

    Examples
    --------
    >>> from tempfile import mkdtemp
    >>> folder, shape = Path(mkdtemp()), {"n_steps": 3, "n_basins": 1, "series": [("reweight", "idw")]}
    >>> part = SeriesPart(np.array([[1.0], [2.0]]), np.ones((2, 1), np.float32), np.zeros((2, 1), np.uint8))
    >>> with SeriesStore.open(folder, key="a job", borders=[0, 2, 3], **shape) as store:
    ...     store.put(0, {("reweight", "idw"): part})
    >>> with SeriesStore.open(folder, key="a job", borders=[0, 2, 3], **shape) as store:  # goes on
    ...     store.missing_chunks
    (1,)
    >>> with SeriesStore.open(folder, key="another job", borders=[0, 2, 3], **shape) as store:
    ...     store.missing_chunks
    (0, 1)
    """

    def __init__(self, place: _Memory | SeriesFolder) -> None:
        self._place = place
        self._layout = place.layout

    @classmethod
    def open(
        cls,
        folder: Path | None,
        *,
        key: str,
        n_steps: int,
        n_basins: int,
        series: Sequence[Series],
        borders: Sequence[int] | npt.NDArray[np.int64],
    ) -> Self:
        """Return a store, with the finished chunks of an earlier run of the same key where the folder has some.

        Parameters
        ----------
        folder
            Where the arrays are; made where it is not there. None: in memory.
        key
            Stands for everything that decides the results: the job, what its files held, versions. A store of another
            key, shape or border in the folder, or one that cannot be read, is begun anew.
        n_steps, n_basins
            The shape of every array.
        series
            The policies and methods, in the order in which they are kept.
        borders
            Where the chunks begin, and ``n_steps`` last.

        Returns
        -------
        SeriesStore

        Raises
        ------
        WriteError
            The folder is in use by another run, holds files that are not a store's, cannot be written, or the disk has
            too little room for the chunks that are missing.
        """
        layout = StoreLayout(key, n_steps, n_basins, tuple(series), tuple(int(border) for border in borders))
        return cls(_Memory(layout) if folder is None else SeriesFolder(folder, layout))

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    @property
    def borders(self) -> tuple[int, ...]:
        """The first step of every chunk, and the number of steps last."""
        return self._layout.borders

    @property
    def n_steps(self) -> int:
        """Steps of every series."""
        return self._layout.n_steps

    @property
    def series(self) -> tuple[Series, ...]:
        """Policy and method of every series."""
        return self._layout.series

    @property
    def missing_chunks(self) -> tuple[int, ...]:
        """The chunks that are not finished, rising."""
        return tuple(k for k in range(self._layout.n_chunks) if k not in self._place.done)

    def is_done(self, k: int) -> bool:
        """Whether a chunk is finished."""
        return k in self._place.done

    def put(self, k: int, parts: Mapping[Series, SeriesPart]) -> None:
        """Keep a chunk; when this returns it is finished, and if it fails the chunk is missing as before.

        Parameters
        ----------
        k
            The chunk.
        parts
            Every series of the store, with the chunk's steps.

        Raises
        ------
        WriteError
            It cannot be written: the disk is full, or the folder is gone.
        ValueError
            The parts are not those of this store and chunk.
        """
        shape = (self._layout.rows(k), self._layout.n_basins)
        found = {name: {getattr(part, kind).shape for kind in KINDS} for name, part in parts.items()}
        if found != {name: {shape} for name in self._layout.series}:
            message = f"chunk {k}: found {found}; expected {shape} of each of {self._layout.series}"
            raise ValueError(message)
        self._place.put(k, parts)

    def depth(self, gaps: str, method: str) -> npt.NDArray[np.float64]:
        """Return basin means in mm, (n_steps, n_basins), NaN where there is none.

        In a folder they are mapped read-only: what is not looked at takes no memory.

        Raises
        ------
        ValueError
            A chunk is missing.
        WriteError
            The folder is gone.
        """
        return self._array(gaps, method, "depth")

    def observed_share(self, gaps: str, method: str) -> npt.NDArray[np.float32]:
        """Return the share of the weight that is on reporting gauges, (n_steps, n_basins); as :meth:`depth`."""
        return self._array(gaps, method, "observed_share")

    def flags(self, gaps: str, method: str) -> npt.NDArray[np.uint8]:
        """Return the marks of every mean, (n_steps, n_basins); as :meth:`depth`."""
        return self._array(gaps, method, "flags")

    def _array(self, gaps: str, method: str, kind: str) -> npt.NDArray[Any]:
        if missing := self.missing_chunks:
            message = f"{len(missing)} of {self._layout.n_chunks} chunks are missing"
            raise ValueError(message)
        return self._place.array(self._layout.series.index((gaps, method)), kind)

    def close(self) -> None:
        """Let go of the folder; what is finished stays in it."""
        self._place.close()

    def remove(self) -> None:
        """Close the store and delete its files, and the folder where nothing else is in it."""
        self._place.close(remove=True)


class _Memory:
    """Arrays in memory, and what is finished of them."""

    def __init__(self, layout: StoreLayout) -> None:
        self.layout = layout
        self.done: set[int] = set()
        self._arrays = [{kind: layout.empty(kind) for kind in KINDS} for _ in layout.series]

    def put(self, k: int, parts: Mapping[Series, SeriesPart]) -> None:
        rows = slice(*self.layout.borders[k : k + 2])
        for arrays, name in zip(self._arrays, self.layout.series, strict=True):
            for kind in KINDS:
                arrays[kind][rows] = getattr(parts[name], kind)
        self.done.add(k)

    def array(self, n: int, kind: str) -> npt.NDArray[Any]:
        view = self._arrays[n][kind].view()
        view.flags.writeable = False
        return view

    def close(self, *, remove: bool = False) -> None:
        if remove:
            self._arrays.clear()
