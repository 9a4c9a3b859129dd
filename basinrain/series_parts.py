"""A job's inputs whose record is read in parts, since the whole would not fit into the memory that the job allows."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from functools import partial
from typing import Final, NamedTuple, cast

import numpy as np
import numpy.typing as npt

from basinrain import reading
from basinrain.basins import Basins
from basinrain.catch import correct_catch
from basinrain.errors import DataError, JobError, Problem, Problems, ReadError, nearest_name
from basinrain.gauges import GaugeNetwork, refuse_colocated
from basinrain.infill import METHODS
from basinrain.infill_choice import infill_options
from basinrain.inputs import Inputs, attempt, catch_factors, edits_of, read_basins_of, read_gauges_of
from basinrain.job_parts import Report
from basinrain.jobfile import Job
from basinrain.jobfile.fields import LEAVE_ONE_OUT
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.stream import RecordStream, open_stream
from basinrain.reading.stream_gaps import LongGaps, long_gaps
from basinrain.reading.stream_size import bytes_to_read
from basinrain.screening import Edit, Screening, apply_edits
from basinrain.screening.edits import edit_row
from basinrain.series.chunks import Chunk, LoadChunk, chunk_borders, chunk_steps_within
from basinrain.series.policies import REWEIGHT
from basinrain.series_inputs import SeriesInputs

__all__ = ["PartedRecord", "needs_parts", "parted_inputs"]

Bools = npt.NDArray[np.bool_]
Ints = npt.NDArray[np.int64]

_GIB: Final = 1 << 30
_LOOKED: Final = 4096
"""Steps that are read at a time to look for a value."""
_MEMORY: Final = "give more [series] memory, so that the record is read whole"


def needs_parts(job: Job) -> bool:
    """Return whether a job's record would take more memory to read whole than ``[series] memory``."""
    wanted = sum(bytes_to_read(job.path(name)) for source in job.rainfall for name in source.paths)
    return wanted > job.series.memory * _GIB


class _Kind(NamedTuple):
    """An edit as far as it is known before the record's clock is."""

    action: str
    item: str


@dataclass(frozen=True, eq=False)
class _Change:
    """What a job does to every part of its record: edits, then catch factors."""

    edits: tuple[Edit, ...]
    factors: Mapping[str, npt.NDArray[np.float64]]

    def __call__(self, record: RainRecord) -> RainRecord:
        met = [edit for edit in (_within(edit, record) for edit in self.edits) if edit is not None]
        if met:
            (record,), _ = apply_edits([record], met)
        return correct_catch(record, self.factors)


def _within(edit: Edit, record: RainRecord) -> Edit | None:
    """Return an edit cut to a part of the record; None where it has nothing to change there."""
    if not len(record):
        return None
    start = record.starts[0] if np.isnat(edit.start) else max(edit.start, record.starts[0])
    end = record.ends[-1] if np.isnat(edit.end) else min(edit.end, record.ends[-1])
    inside = (record.ends > start) & (record.starts < end)
    column = record.gauges.index(edit.gauge)
    # A value may be set where the file has none; but a gauge that is not in service has no values.
    changeable = (
        record.status[:, column] != Status.NOT_INSTALLED if edit.action == "set" else record.reporting[:, column]
    )
    if not changeable[inside].any():
        return None
    return replace(edit, start=start, end=end)


@dataclass(frozen=True, eq=False)
class PartedRecord:
    """The chunks of a record that is read from its files chunk by chunk.

    Parameters
    ----------
    stream
        The record.
    gaps
        Its long gaps; None where none matters.
    borders : array of int, shape (n_chunks + 1,)
        Where chunks begin.
    """

    stream: RecordStream
    gaps: LongGaps | None
    borders: Ints

    @property
    def n_steps(self) -> int:
        """Steps of the whole record."""
        return len(self.stream)

    def task(self, k: int, /) -> LoadChunk:
        """Return what reads chunk ``k`` where it is called."""
        first, stop = int(self.borders[k]), int(self.borders[k + 1])
        return partial(_read, self.stream, None if self.gaps is None else self.gaps.part(first, stop), first, stop)


def _read(stream: RecordStream, gaps: LongGaps | None, first: int, stop: int) -> Chunk:
    return stream.read(first, stop), None if gaps is None else gaps.mask(first, stop)


def parted_inputs(job: Job, say: Report) -> SeriesInputs:
    """Go through a job's files once and return its inputs, the depths still in the files.

    The record is not screened, which needs all of it.

    Parameters
    ----------
    job
        The job.
    say
        Called with a few words before each part of the work.

    Raises
    ------
    BasinRainError
        A file is at fault, or the job asks for what needs the whole record; every problem found is listed.
    """
    say("reading")
    problems = Problems()
    network = attempt(problems, partial(read_gauges_of, job))
    basins = attempt(problems, partial(read_basins_of, job))
    attempt(problems, partial(infill_options, job))
    problems.raise_as(ReadError)
    _refuse_what_needs_all(job)
    stream = open_stream(
        [
            {**table.model_dump(exclude={"file", "files"}), "files": [job.path(name) for name in table.paths]}
            for table in job.rainfall
        ],
        cast("GaugeNetwork", network),
        common=job.step.common,
        exclude=job.gauges.exclude,
        edits=[_Kind(table.action, f"[[edit]] {k} (gauge {table.gauge})") for k, table in enumerate(job.edit, 1)],
        names=[table.paths[0] for table in job.rainfall],
    )
    edits = edits_of(job, stream.zone, [source.gauges for source in stream.sources])
    _require_in_record(edits, stream)
    _require_values(edits, stream)
    network, (polygons, basin_notes) = stream.network, cast("tuple[Basins, tuple[Note, ...]]", basins)
    network, polygons, plane, ground_notes = reading.settle(network, polygons, plane=job.job.plane)
    refuse_colocated(network)
    stream = stream.changed_by(_Change(edits, catch_factors(job, network)))
    say("looking for gaps")
    n_series = len(job.series.gaps) * len(job.averaging.methods)
    steps = chunk_steps_within(
        job.series.memory * _GIB, n_gauges=len(network), n_basins=len(polygons), n_series=n_series
    )
    borders = chunk_borders(len(stream), steps_per_day=1, chunk_steps=steps)
    gaps = long_gaps(stream, infill_options(job).longest_gap, borders)
    _refuse_silent(gaps, stream)
    nothing = stream.read(0, 0)
    given = Inputs(
        network,
        raw=nothing,
        record=nothing,
        basins=polygons,
        plane=plane,
        screening=Screening(),
        edits=edits,
        edit_rows=tuple(edit_row(edit) for edit in edits),
        notes=(*basin_notes, *stream.notes, *gaps.notes, *ground_notes, *_not_screened(gaps)),
    )
    return SeriesInputs(
        given=given,
        starts=stream.starts,
        ends=stream.ends,
        chunks=lambda borders: PartedRecord(stream, gaps, borders),
        absent=partial(_absent, stream),
        silent=gaps.mask,
        part=stream.read,
        held=None,
    )


def _absent(stream: RecordStream, first: int, stop: int) -> Bools:
    """Return which gauges are not in service, shape (stop - first, n_gauges)."""
    return np.asarray(~stream.network.in_service(stream.starts[first:stop], stream.ends[first:stop]))


def _refuse_what_needs_all(job: Job) -> None:
    problems = Problems()
    infills = set(job.series.gaps) != {REWEIGHT}
    if infills and job.infill.method == LEAVE_ONE_OUT:
        problems.add(
            item="[infill] method",
            found=f"'{LEAVE_ONE_OUT}'",
            expected="a method by name where a record is read in parts",
            remedy=f"take the one that 'basinrain infill' finds for some years of it, or {_MEMORY}",
        )
    elif infills and METHODS[job.infill.method].needs_relations:
        problems.add(
            item="[infill] method",
            found=f"'{job.infill.method}', which rests on correlations in the whole record",
            expected="a method that does not, where a record is read in parts",
            remedy=f"choose another, or {_MEMORY}",
        )
    for item, found in (
        ("[infill] normals", job.infill.normals == "record"),
        ("[screening] reject", bool(job.screening.reject)),
        ("[gauges] colocated", job.gauges.colocated == "mean"),
    ):
        if found:
            problems.add(
                item=item,
                found="it",
                expected="none where a record is read in parts",
                remedy=f"give normals in the gauge file, edits for what is rejected, one of the gauges; or {_MEMORY}",
            )
    problems.raise_as(JobError)


def _require_in_record(edits: tuple[Edit, ...], stream: RecordStream) -> None:
    problems = Problems()
    starts, ends = stream.starts, stream.ends
    for edit in edits:
        if edit.gauge not in stream.gauges:
            problems.add(
                item=edit.item,
                found="no such gauge",
                expected="the id of a gauge",
                remedy=nearest_name(edit.gauge, stream.gauges),
                gauge=edit.gauge,
            )
        elif edit.start >= ends[-1] or edit.end <= starts[0]:
            problems.add(
                item=edit.item,
                found=f"{edit.start} to {edit.end}",
                expected=f"times in the record, {starts[0]} to {ends[-1]}",
                remedy="correct from or to",
                gauge=edit.gauge,
            )
        # The steps may lie on either side of a border, where each part would see only its own.
        elif edit.action == "set" and (n := np.count_nonzero(~(starts < edit.start) & ~(ends > edit.end))) > 1:
            problems.add(
                item=edit.item,
                found=f"{n} steps of the gauge in {edit.start} to {edit.end}",
                expected="one step to set",
                remedy="narrow it to one, and give every step its own edit",
                gauge=edit.gauge,
            )
    problems.raise_as(JobError)


def _require_values(edits: tuple[Edit, ...], stream: RecordStream) -> None:
    """Refuse edits of stretches in which the gauge has no value at all, as of a record that is read whole."""
    problems = Problems()
    starts, ends = stream.starts, stream.ends
    for edit in edits:
        if edit.action == "set":
            continue  # it may give a missing step its value
        column = stream.gauges.index(edit.gauge)
        first = 0 if np.isnat(edit.start) else int(np.searchsorted(ends, edit.start, side="right"))
        stop = len(ends) if np.isnat(edit.end) else int(np.searchsorted(starts, edit.end, side="left"))
        blocks = (stream.read(at, min(at + _LOOKED, stop)) for at in range(first, stop, _LOOKED))
        if not any(block.reporting[:, column].any() for block in blocks):
            problems.add(
                item=edit.item,
                found=f"no value of the gauge, {edit.start} to {edit.end}",
                expected="a stretch with values",
                remedy="correct from or to, or remove the edit",
                gauge=edit.gauge,
            )
    problems.raise_as(JobError)


def _refuse_silent(gaps: LongGaps, stream: RecordStream) -> None:
    if len(gaps.never) == len(stream.gauges):
        raise DataError(
            Problem(
                item="series",
                found="no gauge with a value in its time of service",
                expected="a gauge that reports at some step",
                remedy="correct the files, what counts as missing, or from and to of the gauges",
            )
        )


def _not_screened(gaps: LongGaps) -> Iterator[Note]:
    yield Note(
        code="not-screened",
        text="The record was read in parts and not screened: run 'basinrain screen' on parts of it, and take out what "
        "is wrong with [[edit]].",
    )
    if gaps.never:
        yield Note(code="never-reports", text=f"Gauges without a value in the whole record: {', '.join(gaps.never)}.")
