"""A rain record larger than memory, read from its files some steps at a time."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Final, Protocol

import numpy as np
import numpy.typing as npt

from basinrain.clocks import one_clock
from basinrain.errors import JobError, Problems, ReadError
from basinrain.gauges import GaugeNetwork
from basinrain.intervals import DAY, Interval, parse_interval
from basinrain.notes import Note
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.common_grid import common_grid
from basinrain.reading.grid import ABSENT, Grid, place, relation
from basinrain.reading.membership import check_membership
from basinrain.reading.merging import Unused, merge_sources, take_out_of_service
from basinrain.reading.options import option_problems
from basinrain.reading.source_rules import SourceRules, source_rules
from basinrain.reading.stream_source import StreamSource, survey_source

__all__ = ["RecordStream", "open_stream"]

_LAYOUTS: Final = ("wide", "long")
_WHOLE: Final = "give more [series] memory, so that the record is read whole"


class _Edit(Protocol):
    """What is asked of an edit here."""

    @property
    def action(self) -> str: ...

    @property
    def item(self) -> str: ...


@dataclass(frozen=True, eq=False)
class RecordStream:
    """The record of all sources at the common step, its depths still in the files; it holds no open file.

    Parameters
    ----------
    sources
        The sources.
    network
        The gauges.
    grid
        The common steps.
    first, n_steps
        The grid number of the first step, and how many there are.
    zone, day_phase
        As of a record.
    notes
        What the reading had to remark.
    change
        What is done to every part that is read; None for nothing.
    """

    sources: tuple[StreamSource, ...]
    network: GaugeNetwork
    grid: Grid
    first: int
    n_steps: int
    zone: str
    day_phase: int = 0
    notes: tuple[Note, ...] = ()
    change: Callable[[RainRecord], RainRecord] | None = None

    def __len__(self) -> int:
        return self.n_steps

    @property
    def gauges(self) -> tuple[str, ...]:
        """The columns of every part: the network's gauges."""
        return self.network.ids

    @property
    def step(self) -> str:
        """The step in words."""
        return self.grid.interval.label

    @property
    def starts(self) -> npt.NDArray[np.datetime64]:
        """The starts of all steps."""
        return self.grid.bounds(self.first + np.arange(self.n_steps))

    @property
    def ends(self) -> npt.NDArray[np.datetime64]:
        """The ends of all steps."""
        return self.grid.bounds(self.first + np.arange(1, self.n_steps + 1))

    def changed_by(self, change: Callable[[RainRecord], RainRecord]) -> RecordStream:
        """Return the stream with ``change`` done to every part that is read.

        Parameters
        ----------
        change
            A function that can be pickled. It sees some steps at a time, so that what it does to a step must not depend
            on others; gauges and times must stay as they are.
        """
        return replace(self, change=change)

    def read(self, first: int, stop: int) -> RainRecord:
        r"""Return the record of the steps ``first`` to ``stop`` (exclusive).

        Parameters
        ----------
        first, stop
            Positions of steps, as in a slice: what lies beyond the record is not there.

        Returns
        -------
        RainRecord
            What :func:`basinrain.reading.bring_to_step` gives for the whole of the files, in these steps. It has no
            notes.

        Raises
        ------
        ReadError
            Cells that cannot be understood, a file that is gone or has changed; all together.
        DataError
            A gauge has values in two sources at one time.

        Examples
        --------
        >>> import tempfile
        >>> from pathlib import Path
        >>> path = Path(tempfile.mkdtemp()) / "rain.csv"
        >>> _ = path.write_text("time,A,B\n2031-05-04 01:00,0,T\n2031-05-04 02:00,1.5,\n2031-05-04 03:00,2,0\n")
        >>> network = GaugeNetwork(ids=("B", "A"), x=[0.0, 9.0], y=[0.0, 0.0], crs="local")
        >>> stream = open_stream([{"files": path, "unit": "mm", "interval": "1h"}], network)
        >>> len(stream), stream.read(1, 9).depth
        (3, array([[nan, 1.5],
               [0. , 2. ]]))
        """
        return self.read_noting(first, stop)[0]

    def read_noting(self, first: int, stop: int) -> tuple[RainRecord, list[Unused]]:
        """Return the record of some steps, and the values in them that lie outside the gauges' time of service."""
        low, high, _ = slice(first, stop).indices(self.n_steps)
        numbers = self.first + np.arange(low, max(low, high) + 1)
        bounds = self.grid.bounds(numbers)
        sources = [part for source in self.sources if (part := source.within(bounds[0], bounds[-1])) is not None]
        placed = [place(source, self.grid) for source in sources]
        whole = len(placed) == 1 and len(placed[0].depth) == len(numbers) - 1
        if whole and sources[0].gauges == self.network.ids:
            depth, status = placed[0].depth, placed[0].status
        else:
            depth, status = merge_sources(sources, placed, self.network.ids, int(numbers[0]), bounds)
        status[status == ABSENT] = Status.MISSING
        unused = take_out_of_service(self.network, depth, status, bounds, [])
        record = RainRecord(
            self.network.ids,
            bounds[:-1],
            bounds[1:],
            depth,
            status,
            step=self.step,
            zone=self.zone,
            day_phase=self.day_phase,
        )
        return record if self.change is None else self.change(record), unused


def open_stream(
    sources: Sequence[Mapping[str, Any]],
    network: GaugeNetwork,
    *,
    common: str | None = None,
    exclude: Collection[str] = (),
    edits: Sequence[_Edit] = (),
    names: Sequence[str] = (),
) -> RecordStream:
    """Go through the files of all sources once, and return the record that they make, to be read in parts.

    Text is read once from end to end, of Parquet and NetCDF only the times; what is remembered is where rows stand.

    Parameters
    ----------
    sources
        The options of :func:`basinrain.reading.read_rainfall` for every source, its paths by ``files``.
    network
        The gauges; each must be in one source at least, and the sources no other gauges.
    common
        The common step; the finest source's where none is given.
    exclude
        Ids of gauges that are left out, as if the files did not have them.
    edits
        The job's changes of the record. They are not carried out here (:meth:`RecordStream.changed_by`); those that
        cannot be carried out part by part are refused.
    names
        What messages call each source besides its number, such as its file.

    Returns
    -------
    RecordStream

    Raises
    ------
    JobError
        What cannot be read in parts, all of it together: layouts other than wide and long, steps longer than the common
        one, accumulated values, edits that shift values, and edits that set a value at a step shorter than the common
        one; options that cannot be.
    ReadError
        The times or rows of a file are not as the options say; all problems of all sources together. Cells are read
        later.
    DataError
        Gauges of the network that are in no source, or the reverse; sources with a zone beside others without; steps
        off the bounds of the common one.

    Examples
    --------
    >>> network = GaugeNetwork(ids=("A",), x=[0.0], y=[0.0], crs="local")
    >>> open_stream([{"files": "tips.csv", "layout": "tips", "unit": "mm", "interval": "1h", "tip": 0.2}], network)
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: source 1 layout: found 'tips'; expected wide or long where a record is read in parts; \
give more [series] memory, so that the record is read whole
    """
    rules = _rules(sources, common, edits, names)
    problems = Problems()
    surveyed: dict[int, StreamSource] = {}
    for number, rule in enumerate(rules, 1):
        try:
            source = survey_source(rule, exclude)
        except ReadError as error:
            problems.extend(error)
        else:
            if source is not None:
                surveyed[number] = source
    problems.raise_as(ReadError)
    check_membership(list(surveyed.values()), network)
    labels = {number: _label(number, source.interval.label, names) for number, source in surveyed.items()}
    zone = one_clock({number: source.zone for number, source in surveyed.items()}, labels)
    timed = [source.in_clock(zone, labels[number]) for number, source in surveyed.items()]
    grid = common_grid([source.axis() for source in timed], common)
    begins = np.concatenate([source.axis().starts[[0, -1]] for source in timed])
    numbers, _ = grid.numbers(begins)
    first, last = int(numbers.min()), int(numbers.max())
    day_phase = grid.phase % DAY if grid.interval.whole_days else 0
    return RecordStream(tuple(timed), network, grid, first, last - first + 1, zone, day_phase)


def _label(number: int, step: str, names: Sequence[str]) -> str:
    beside = f", {names[number - 1]}" if names else ""
    return f"source {number} ({step}{beside})"


def _rules(
    sources: Sequence[Mapping[str, Any]], common: str | None, edits: Sequence[_Edit], names: Sequence[str]
) -> list[SourceRules]:
    """Return the rules of all sources; what cannot be read in parts is refused."""
    problems = Problems()
    rules: list[SourceRules] = []
    for number, source in enumerate(sources, 1):
        with option_problems(problems):
            rules.append(source_rules(**source))
            _refuse_layout(number, rules[-1], problems, names)
    if not sources:
        problems.add(item="rainfall", found="no source", expected="at least one")
    step: Interval | None = None
    with option_problems(problems):
        step = parse_interval(common, item="[step] common") if common is not None else None
    if len(rules) < len(sources) or not sources or (common is not None and step is None):
        problems.raise_as(JobError)
    steps = [rule.interval for rule in rules if rule.stamps is not None]
    if step is None and steps:
        step = min(steps, key=lambda interval: interval.seconds or np.inf)
    if step is not None:
        _refuse_steps(rules, step, problems, names)
    _refuse_edits(edits, problems, summed=any(interval != step for interval in steps))
    problems.raise_as(JobError)
    return rules


def _refuse_edits(edits: Sequence[_Edit], problems: Problems, *, summed: bool) -> None:
    for edit in edits:
        if edit.action == "shift":
            problems.add(
                item=edit.item,
                found="a shift",
                expected="no value moved in time where a record is read in parts, as it may cross their borders",
                remedy=f"correct the times in the file, or {_WHOLE}",
            )
        elif edit.action == "set" and summed:
            problems.add(
                item=edit.item,
                found="a value to set beside sources that are summed to a longer step",
                expected="the common step to be the sources' where a record is read in parts",
                remedy=f"correct the value in the file, or {_WHOLE}",
            )


def _named(number: int, names: Sequence[str]) -> str:
    return f"source {number}" + (f" ({names[number - 1]})" if names else "")


def _refuse_layout(number: int, rules: SourceRules, problems: Problems, names: Sequence[str]) -> None:
    name = _named(number, names)
    if rules.layout not in _LAYOUTS:
        problems.add(
            item=f"{name} layout",
            found=f"'{rules.layout}'",
            expected="wide or long where a record is read in parts",
            remedy=_WHOLE,
        )
    marks = [mark for mark, status in rules.depths.marks.items() if status is Status.ACCUMULATED]
    if marks:
        problems.add(
            item=f"{name} accumulated",
            found=f"'{marks[0]}'",
            expected="no accumulated values where a record is read in parts, as one may reach over their borders",
            remedy=f"declare the mark missing in flags, or {_WHOLE}",
        )


def _refuse_steps(rules: Sequence[SourceRules], step: Interval, problems: Problems, names: Sequence[str]) -> None:
    for number, rule in enumerate(rules, 1):
        if rule.stamps is not None and rule.layout in _LAYOUTS and relation(rule.interval, step) != "finer":
            problems.add(
                item=f"{_named(number, names)} interval",
                found=f"steps of {rule.interval.label} beside the common step {step.label}",
                expected="steps that the common one is a multiple of, where a record is read in parts",
                remedy=f"set [step] common = '{rule.interval.label}', leave the source out, or {_WHOLE}",
            )
