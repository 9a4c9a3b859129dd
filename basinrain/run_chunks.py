"""Runs the chunks of a record through the engine: here, or on threads, processes and machines."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Final

import numpy as np

from basinrain.blas import one_blas_thread
from basinrain.errors import JobError, Problem, nearest_name
from basinrain.series.chunks import ChunkSource
from basinrain.series.engine import SeriesEngine, SeriesPart, SeriesSetup
from basinrain.series_store import SeriesStore

__all__ = ["HERE", "PLACES", "ChunkProgress", "check_place", "run_chunks"]

HERE: Final = "here"
PLACES: Final = (HERE, "threads", "processes")
"""Where chunks are computed, besides the address of a scheduler."""

_ADDRESS: Final = re.compile(r"(?:tcp|tls)://[^\s/]+:\d+")

ChunkProgress = Callable[[int, int], None]
"""Is called with the steps that are done and the steps there are: at the start, and after every chunk."""


def check_place(on: str) -> None:
    """Refuse what is not a place where chunks can be computed.

    Raises
    ------
    JobError
        It is none of :data:`PLACES` and no address.

    Examples
    --------
    >>> check_place("processes")
    >>> check_place("tcp://10.0.0.5:8786")
    >>> check_place("proceses")  # doctest: +ELLIPSIS
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [series] on: found 'proceses'; expected here, ...; did you mean 'processes'?
    """
    if on in PLACES or _ADDRESS.fullmatch(on):
        return
    raise JobError(
        Problem(
            item="[series] on",
            found=f"'{on}'",
            expected=f"{', '.join(PLACES)} or an address such as tcp://10.0.0.5:8786",
            remedy=nearest_name(on, PLACES),
        )
    )


def run_chunks(
    setup: SeriesSetup,
    source: ChunkSource,
    store: SeriesStore,
    *,
    on: str = HERE,
    workers: int | None = None,
    progress: ChunkProgress | None = None,
) -> None:
    """Compute the chunks that a store misses, and put them into it.

    The bytes in the store do not depend on where chunks are computed, in which order, or how often the run was
    interrupted: borders are fixed, and products are held to one thread each (:func:`~basinrain.blas.one_blas_thread`).

    Parameters
    ----------
    setup
        What to compute.
    source
        The record, with the borders of the store.
    store
        Finished chunks in it are kept.
    on
        ``"here"``: one after the other in this process. ``"threads"`` or ``"processes"`` of this machine, or the
        address of a scheduler whose workers have this package: these need the extra ``basinrain[cluster]``, see
        ``docs/cluster.md``.
    workers
        How many chunks are computed at a time; by default the processors of this machine, or all threads of the
        scheduler's workers. Does not count here.
    progress
        Told of the steps that are done.

    Raises
    ------
    JobError
        ``on`` is no such place, its packages are not installed, its scheduler does not answer, or workers are lost.
        What was finished stays in the store.
    WriteError
        The store's folder cannot be written.
    ValueError
        Source and store have different borders, or there are no workers.

    Examples
    --------
    >>> import shapely
    >>> from basinrain.basins import Basins
    >>> from basinrain.gauges import GaugeNetwork
    >>> from basinrain.infill.options import InfillOptions
    >>> from basinrain.rainfall import RainRecord
    >>> from basinrain.series.chunks import RecordSource, chunk_borders
    >>> network = GaugeNetwork(ids=("A", "B"), x=[0.0, 10.0], y=[5.0, 5.0], crs="local")
    >>> basins = Basins(ids=("all",), polygons=[shapely.box(0, 0, 10, 10)], crs="local")
    >>> ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 4) * np.timedelta64(1, "D")
    >>> depths = [[4.0, 8.0], [3.0, np.nan], [np.nan, np.nan]]
    >>> record = RainRecord.from_depths(network.ids, ends - np.timedelta64(1, "D"), ends, depths, step="1d")
    >>> setup = SeriesSetup(
    ...     network=network, basins=basins, methods={"arithmetic": {}}, gaps=("reweight",), infill=InfillOptions()
    ... )
    >>> source = RecordSource(record, None, chunk_borders(3, steps_per_day=1, chunk_steps=2))
    >>> store = SeriesStore.open(
    ...     None, key="example", n_steps=3, n_basins=1, series=setup.series, borders=source.borders
    ... )
    >>> run_chunks(setup, source, store, progress=lambda done, of: print(done, "of", of))
    0 of 3
    2 of 3
    3 of 3
    >>> store.depth("reweight", "arithmetic").ravel()
    array([ 6.,  3., nan])
    """
    check_place(on)
    if not np.array_equal(source.borders, store.borders):
        message = f"the source has the borders {source.borders}, the store {store.borders}"
        raise ValueError(message)
    if workers is not None and workers < 1:
        message = f"found {workers} workers; expected 1 or more"
        raise ValueError(message)
    missing = store.missing_chunks
    steps = np.diff(store.borders)
    done = source.n_steps - int(steps[list(missing)].sum())
    tell = progress or (lambda *_: None)
    tell(done, source.n_steps)

    def take(k: int, parts: dict[tuple[str, str], SeriesPart]) -> None:
        nonlocal done
        store.put(k, parts)
        done += int(steps[k])
        tell(done, source.n_steps)

    if not missing:
        return
    if on == HERE:
        with one_blas_thread():
            engine = SeriesEngine(setup)
            for k in missing:
                take(k, engine.compute(*source.task(k)()))
        return
    from basinrain.cluster import run_on_cluster

    run_on_cluster(setup, source, missing, take, on=on, workers=workers)
