"""The tables and keys of a job file, declared once.

The Python API, the command line's ``--set``, the messages about wrong keys and the JSON Schema in ``docs/`` all come
from these models.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from datetime import date, datetime, time
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field, model_validator
from pydantic_core import PydanticCustomError

from basinrain import averaging, infill
from basinrain.errors import nearest_name
from basinrain.units import AREA_UNITS, DEPTH_UNITS, LENGTH_UNITS

__all__ = [
    "ArithmeticTable",
    "AveragingTable",
    "BasinsTable",
    "BufferTable",
    "GaugesTable",
    "IdwTable",
    "InfillTable",
    "Job",
    "JobTable",
    "RainfallTable",
    "StepTable",
    "StormTable",
    "is_month",
]


def _one_of(known: Iterable[str]) -> AfterValidator:
    names = tuple(known)

    def check(value: str) -> str:
        if value not in names:
            raise PydanticCustomError(
                "one_of",
                "{expected}",
                {"expected": "one of: " + ", ".join(names), "remedy": nearest_name(value, names)},
            )
        return value

    return AfterValidator(check)


def _moment(value: object) -> object:
    """Bring a TOML date, date-time or text to ISO 8601 text; a bare date stays bare, since it names the whole day."""
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, date):
        return value.isoformat()
    return value


def is_month(text: str) -> bool:
    """Return whether a time names a whole month: ``"2031-05"``."""
    return re.fullmatch(r"\d{4}-\d{2}", text) is not None


def _iso(value: str) -> str:
    try:
        datetime.fromisoformat(f"{value}-01" if is_month(value) else value)
    except ValueError:
        raise PydanticCustomError(
            "iso",
            "{expected}",
            {
                "expected": "a month, a date or a date and time such as 2031-05-04T06:00",
                "remedy": "write it in ISO 8601",
            },
        ) from None
    return value


def _clock_time(value: object) -> object:
    if isinstance(value, time):
        return value.strftime("%H:%M")
    return value


def _as_list(value: object) -> object:
    return [value] if isinstance(value, Mapping) else value


def _names(value: object) -> object:
    return [value] if isinstance(value, str) else value


DepthUnit = Annotated[str, _one_of(DEPTH_UNITS)]
LengthUnit = Annotated[str, _one_of(LENGTH_UNITS)]
Moment = Annotated[str, BeforeValidator(_moment), AfterValidator(_iso)]
NameList = Annotated[tuple[str, ...], BeforeValidator(_names)]
AveragingName = Annotated[str, _one_of(averaging.METHODS)]
Positive = Annotated[float, Field(gt=0)]
Count = Annotated[int, Field(ge=1)]


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class JobTable(_Table):
    """``[job]``: the name of the work, the units of its results, where they go."""

    name: str
    depth_unit: Annotated[str, _one_of(("mm", "in"))] = "mm"
    area_unit: Annotated[str, _one_of(("km2", "mi2", "ha", "acre"))] = "km2"
    output: str = "output"
    plane: str | None = None


class GaugesTable(_Table):
    """``[gauges]``: the file of gauges and how to read it."""

    file: str
    layer: str | None = None
    crs: str | None = None
    length_unit: LengthUnit = "m"
    elevation_unit: LengthUnit = "m"
    normal_unit: DepthUnit = "mm"
    normal_period: str = ""
    colocated: Annotated[str, _one_of(("refuse", "mean"))] = "refuse"
    catch_factor: dict[str, Positive | tuple[Positive, ...]] = {}
    exclude: tuple[str, ...] = ()
    columns: dict[str, str | list[str]] = {}


class RainfallTable(_Table):
    """``[[rainfall]]``: one source of depths."""

    file: str | None = None
    files: tuple[str, ...] = ()
    layout: Annotated[str, _one_of(("wide", "long", "totals"))] = "wide"
    unit: DepthUnit
    interval: str | None = None
    stamp: Annotated[str, _one_of(("end", "start"))] = "end"
    timezone: str | None = None
    read_hour: Annotated[str | int | None, BeforeValidator(_clock_time)] = None
    date_means: Annotated[str, _one_of(("calendar-day", "ends", "starts"))] | None = None
    missing: tuple[str | float, ...] = ()
    trace: tuple[str, ...] = ("T",)
    flags: dict[str, tuple[str, ...]] = {}
    accumulated: str | None = None
    gaps: Annotated[str, _one_of(("refuse", "missing"))] = "refuse"
    time_format: str | None = None
    columns: dict[str, str] = {}

    @model_validator(mode="after")
    def _whole(self) -> RainfallTable:
        if (self.file is None) == (not self.files):
            raise PydanticCustomError(
                "file_or_files", "{expected}", {"expected": "either file or files", "remedy": "give one of the two"}
            )
        if self.layout != "totals" and self.interval is None:
            raise PydanticCustomError(
                "no_interval",
                "{expected}",
                {"expected": "interval, such as '1h', '5min' or '1d'", "remedy": "state the step of the file"},
            )
        return self

    @property
    def paths(self) -> tuple[str, ...]:
        """The source's files, whether one was given or several."""
        return (self.file,) if self.file is not None else self.files


class StepTable(_Table):
    """``[step]``: the common step of the job."""

    common: str | None = None


class BasinsTable(_Table):
    """``[basins]``: the file of watershed polygons and how to read it."""

    file: str
    layer: str | None = None
    id: str | None = None
    repeated: Annotated[str, _one_of(("refuse", "merge"))] = "refuse"
    crs: str | None = None
    length_unit: LengthUnit = "m"
    area: str | None = None
    area_unit: Annotated[str, _one_of(AREA_UNITS)] = "km2"
    lowest: str | None = None
    highest: str | None = None
    elevation_unit: LengthUnit = "m"


class StormTable(_Table):
    """``[[storm]]``: one window of the record."""

    name: str
    start: Moment | None = None
    end: Moment | None = None
    pattern: str = "mean"


class InfillTable(_Table):
    """``[infill]``: how gaps are filled."""

    method: Annotated[str, _one_of(infill.METHODS)] = "inverse-distance"
    scale: Annotated[str, _one_of(("step", "day", "storm"))] | None = None
    longest_gap: Positive = 31.0
    nearest: Count | Literal["all"] | None = None
    radius: Positive | None = None
    min_donors: Count = 2
    power: Positive = 2.0


class IdwTable(_Table):
    """``[averaging] idw``: options of the gridded inverse distance."""

    power: Positive = 2.0
    cell: Positive | None = None
    max_gauges: Count | None = None
    radius: Positive | None = None
    allow_uncovered: bool = False


class BufferTable(_Table):
    """``[averaging] arithmetic.gauges``: gauges within a distance of the basin."""

    buffer: Annotated[float, Field(ge=0)]


class ArithmeticTable(_Table):
    """``[averaging] arithmetic``: which gauges the arithmetic mean takes."""

    gauges: Literal["inside", "all"] | BufferTable = "inside"


class AveragingTable(_Table):
    """``[averaging]``: the methods that are run and compared."""

    methods: Annotated[
        tuple[Annotated[str, _one_of(averaging.METHODS)], ...], BeforeValidator(_names), Field(min_length=1)
    ] = (
        "arithmetic",
        "thiessen",
        "idw",
    )
    idw: IdwTable = IdwTable()
    arithmetic: ArithmeticTable = ArithmeticTable()

    def options(self, method: str) -> dict[str, Any]:
        """Return the keyword arguments with which ``method`` is prepared."""
        table = getattr(self, method.replace("-", "_"), None)
        return {} if table is None else table.model_dump(exclude_none=True)


class Job(_Table):
    """A whole job, as resolved: what the file says, what ``--set`` changed, and every default.

    It cannot be changed; :func:`~basinrain.jobfile.parse_job` and :func:`~basinrain.jobfile.read_job` make one, and
    raise :class:`~basinrain.errors.JobError` with every problem of its keys and values.

    Parameters
    ----------
    job : JobTable
        ``[job]``: name, units of the results, output folder, working plane.
    gauges : GaugesTable
        ``[gauges]``: the file of gauges.
    rainfall : tuple of RainfallTable
        ``[[rainfall]]``: the sources of depths, one at least.
    step : StepTable
        ``[step]``: the common step; by default that of the sources.
    basins : BasinsTable
        ``[basins]``: the file of watershed polygons.
    storm : tuple of StormTable
        ``[[storm]]``: windows of the record; without one the whole record is the storm.
    infill : InfillTable
        ``[infill]``: how gaps are filled.
    averaging : AveragingTable
        ``[averaging]``: the methods that are run and compared, and their options.
    folder : Path
        Where relative paths start, the job file's own folder; not a key of the file.

    Examples
    --------
    >>> from basinrain.jobfile import parse_job
    >>> job = parse_job(
    ...     {
    ...         "job": {"name": "Two gauges", "depth_unit": "in"},
    ...         "gauges": {"file": "gauges.csv"},
    ...         "rainfall": {"file": "rain.csv", "unit": "0.01 in", "interval": "1h"},
    ...         "basins": {"file": "basins.geojson"},
    ...     },
    ...     folder="jobs",
    ... )
    >>> job.job.depth_unit, job.job.area_unit, job.infill.method, job.storm
    ('in', 'km2', 'inverse-distance', ())
    >>> [path.as_posix() for path in job.inputs]
    ['jobs/gauges.csv', 'jobs/rain.csv', 'jobs/basins.geojson']
    """

    job: JobTable
    gauges: GaugesTable
    rainfall: Annotated[tuple[RainfallTable, ...], BeforeValidator(_as_list), Field(min_length=1)]
    step: StepTable = StepTable()
    basins: BasinsTable
    storm: Annotated[tuple[StormTable, ...], BeforeValidator(_as_list)] = ()
    infill: InfillTable = InfillTable()
    averaging: AveragingTable = AveragingTable()
    folder: Annotated[Path, Field(exclude=True)] = Path()

    def path(self, name: str) -> Path:
        """Return the path of a file that the job names; an absolute ``name`` is that path itself."""
        return self.folder / name

    @property
    def inputs(self) -> tuple[Path, ...]:
        """Every input file of the job, in the order in which the job names them."""
        names = [self.gauges.file, *(name for source in self.rainfall for name in source.paths), self.basins.file]
        return tuple(self.path(name) for name in names)
