"""The tables and keys of a job file, declared once.

The Python API, the command line's ``--set``, the messages about wrong keys and the JSON Schema in ``docs/`` all come
from these models.
"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, ValidationInfo, field_validator, model_validator
from pydantic_core import PydanticCustomError

from basinrain import averaging, infill, layouts
from basinrain.jobfile.design_tables import DesignTable
from basinrain.jobfile.fields import (
    LEAVE_ONE_OUT,
    Count,
    DepthUnit,
    LengthUnit,
    Moment,
    NameList,
    Positive,
    Table,
    as_list,
    clock_time,
    names,
    one_of,
)
from basinrain.jobfile.series_tables import SeriesTable, StormsTable
from basinrain.units import AREA_UNITS

__all__ = [
    "ArithmeticTable",
    "AveragingTable",
    "BasinsJob",
    "BasinsTable",
    "BufferTable",
    "DesignJob",
    "EditTable",
    "GaugesTable",
    "IdwTable",
    "InfillTable",
    "Job",
    "JobTable",
    "RainfallTable",
    "ScreeningTable",
    "StepTable",
    "StormTable",
]


class JobTable(Table):
    """``[job]``: the name of the work, the units of its results, where they go."""

    name: str
    depth_unit: Annotated[str, one_of(("mm", "in"))] = "mm"
    area_unit: Annotated[str, one_of(("km2", "mi2", "ha", "acre"))] = "km2"
    output: str = "output"
    plane: str | None = None


class GaugesTable(Table):
    """``[gauges]``: the file of gauges and how to read it."""

    file: str
    layer: str | None = None
    crs: str | None = None
    length_unit: LengthUnit = "m"
    elevation_unit: LengthUnit = "m"
    normal_unit: DepthUnit = "mm"
    normal_period: str = ""
    colocated: Annotated[str, one_of(("refuse", "mean"))] = "refuse"
    catch_factor: dict[str, Positive | tuple[Positive, ...]] = Field(default={})
    exclude: tuple[str, ...] = ()
    columns: dict[str, str | list[str]] = Field(default={})


class RainfallTable(Table):
    """``[[rainfall]]``: one source of depths."""

    file: str | None = None
    files: tuple[str, ...] = ()
    layout: Annotated[str, one_of(layouts.LAYOUTS)] = "wide"
    unit: Annotated[DepthUnit | None, Field(validate_default=True)] = None
    interval: Annotated[str | None, Field(validate_default=True)] = None
    stamp: Annotated[str, one_of(("end", "start"))] = "end"
    timezone: str | None = None
    read_hour: Annotated[str | int | None, BeforeValidator(clock_time)] = None
    date_means: Annotated[str, one_of(("calendar-day", "ends", "starts"))] | None = None
    missing: tuple[str | float, ...] = ()
    trace: tuple[str, ...] = ("T",)
    flags: dict[str, tuple[str, ...]] = Field(default={})
    accumulated: str | None = None
    gaps: Annotated[str, one_of(("refuse", "missing"))] = "refuse"
    time_format: str | None = None
    tip: Positive | None = None
    start: Moment | None = None
    end: Moment | None = None
    rollover: Positive | None = None
    jitter: Annotated[float, Field(ge=0)] = 0.0
    reset: Annotated[str | int | None, BeforeValidator(clock_time)] = None
    columns: dict[str, str] = Field(default={})

    @field_validator("unit")
    @classmethod
    def _unit(cls, unit: str | None, info: ValidationInfo) -> str | None:
        layout = info.data.get("layout")
        if layout in layouts.GHCN and unit not in {None, layouts.GHCN_UNIT}:
            raise PydanticCustomError(
                "given_by_format",
                "{expected}",
                {"expected": f"'{layouts.GHCN_UNIT}', which the format prescribes", "remedy": "leave it out"},
            )
        if layout is not None and layout not in layouts.GHCN and unit is None:
            raise PydanticCustomError("missing", "it to be given")
        return unit

    @field_validator("interval")
    @classmethod
    def _interval(cls, interval: str | None, info: ValidationInfo) -> str | None:
        if info.data.get("layout") not in layouts.GHCN:
            return interval
        if interval not in {None, "1d"}:
            raise PydanticCustomError(
                "given_by_format",
                "{expected}",
                {"expected": "'1d', which the format prescribes", "remedy": "leave it out"},
            )
        return "1d"

    @field_validator(*layouts.TAKEN_BY)
    @classmethod
    def _taken(cls, value: object, info: ValidationInfo) -> object:
        key = str(info.field_name)
        expected = layouts.misplaced(key, str(info.data.get("layout", "")))
        if expected and value != cls.model_fields[key].default:
            raise PydanticCustomError("misplaced", "{expected}", {"expected": expected, "remedy": "leave it out"})
        return value

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


class StepTable(Table):
    """``[step]``: the common step of the job."""

    common: str | None = None


class BasinsTable(Table):
    """``[basins]``: the file of watershed polygons and how to read it."""

    file: str
    layer: str | None = None
    id: str | None = None
    repeated: Annotated[str, one_of(("refuse", "merge"))] = "refuse"
    crs: str | None = None
    length_unit: LengthUnit = "m"
    area: str | None = None
    area_unit: Annotated[str, one_of(AREA_UNITS)] = "km2"
    lowest: str | None = None
    highest: str | None = None
    elevation_unit: LengthUnit = "m"


class StormTable(Table):
    """``[[storm]]``: one window of the record."""

    name: str
    start: Moment | None = None
    end: Moment | None = None
    pattern: str = "mean"


class ScreeningTable(Table):
    """``[screening]``: what is done about findings, and what the checks are told."""

    reject: NameList = ()
    accept: NameList = ()
    envelope: str | None = None
    unheated: NameList = ()
    cold_months: tuple[Annotated[int, Field(ge=1, le=12)], ...] = ()


class EditTable(Table):
    """``[[edit]]``: one change of the record, by whom and why."""

    gauge: str
    start: Annotated[Moment | None, Field(alias="from")] = None
    end: Annotated[Moment | None, Field(alias="to")] = None
    action: Annotated[str, one_of(("reject", "set", "shift", "scale"))]
    value: float | str | None = None
    reason: str
    by: str
    date: Moment


class InfillTable(Table):
    """``[infill]``: how gaps are filled."""

    method: Annotated[str, one_of((*infill.METHODS, LEAVE_ONE_OUT))] = "inverse-distance"
    scale: Annotated[str, one_of(("step", "day", "storm"))] | None = None
    longest_gap: Positive = 31.0
    nearest: Count | Literal["all"] | None = None
    radius: Positive | None = None
    min_donors: Count | None = None
    elevation_limit: Positive | None = None
    power: Positive | None = None
    normals: Annotated[str, one_of(("given", "record"))] = "given"


class IdwTable(Table):
    """``[averaging] idw``: options of the gridded inverse distance."""

    power: Positive = 2.0
    cell: Positive | None = None
    max_gauges: Count | None = None
    radius: Positive | None = None
    allow_uncovered: bool = False


class BufferTable(Table):
    """``[averaging] arithmetic.gauges``: gauges within a distance of the basin."""

    buffer: Annotated[float, Field(ge=0)]


class ArithmeticTable(Table):
    """``[averaging] arithmetic``: which gauges the arithmetic mean takes."""

    gauges: Literal["inside", "all"] | BufferTable = "inside"


class AveragingTable(Table):
    """``[averaging]``: the methods that are run and compared."""

    methods: Annotated[
        tuple[Annotated[str, one_of(averaging.METHODS)], ...], BeforeValidator(names), Field(min_length=1)
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


class BasinsJob(Table):
    """What every job has, whether it has gauges or not; see :class:`Job` and :class:`DesignJob`."""

    job: JobTable
    basins: BasinsTable
    folder: Annotated[Path, Field(exclude=True)] = Path()

    def path(self, name: str) -> Path:
        """Return the path of a file that the job names; an absolute ``name`` is that path itself."""
        return self.folder / name

    @property
    def input_names(self) -> tuple[str, ...]:
        """Every input file of the job as it is named, in the job's order."""
        return (self.basins.file,)

    @property
    def inputs(self) -> tuple[Path, ...]:
        """The paths of every input file of the job."""
        return tuple(self.path(name) for name in self.input_names)


class Job(BasinsJob):
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
    screening : ScreeningTable
        ``[screening]``: findings that are accepted or rejected, and what the checks are told.
    edit : tuple of EditTable
        ``[[edit]]``: changes of the record, each with its reason.
    storm : tuple of StormTable
        ``[[storm]]``: windows of the record; without one the whole record is the storm.
    infill : InfillTable
        ``[infill]``: how gaps are filled.
    averaging : AveragingTable
        ``[averaging]``: the methods that are run and compared, and their options.
    series : SeriesTable
        ``[series]``: what is done with the whole record.
    storms : StormsTable or None
        ``[storms]``: storms that are found in the record, run beside those of ``[[storm]]``.
    design : DesignTable or None
        ``[design]``: the depths that are wanted, and how they fall in time.
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
    rainfall: Annotated[tuple[RainfallTable, ...], BeforeValidator(as_list), Field(min_length=1)]
    step: StepTable = StepTable()
    basins: BasinsTable
    screening: ScreeningTable = ScreeningTable()
    edit: Annotated[tuple[EditTable, ...], BeforeValidator(as_list)] = ()
    storm: Annotated[tuple[StormTable, ...], BeforeValidator(as_list)] = ()
    infill: InfillTable = InfillTable()
    averaging: AveragingTable = AveragingTable()
    series: SeriesTable = SeriesTable()
    storms: StormsTable | None = None
    design: DesignTable | None = None

    @property
    def input_names(self) -> tuple[str, ...]:
        """Every input file of the job as it is named, in the job's order."""
        rain = (name for source in self.rainfall for name in source.paths)
        envelope = () if self.screening.envelope is None else (self.screening.envelope,)
        design = () if self.design is None else self.design.input_names
        return (self.gauges.file, *rain, self.basins.file, *envelope, *design)


class DesignJob(BasinsJob):
    """A job of design storms that reads no gauges.

    Parameters
    ----------
    job : JobTable
        ``[job]``: name, units of the results, output folder, working plane.
    basins : BasinsTable
        ``[basins]``: the file of watershed polygons.
    averaging : AveragingTable
        ``[averaging]``: options of the averaging methods.
    design : DesignTable
        ``[design]``: the depths that are wanted, and how they fall in time.
    folder : Path
        Where relative paths start, the job file's own folder; not a key of the file.

    Examples
    --------
    See :func:`~basinrain.jobfile.parse_design_job`, which makes one.
    """

    averaging: AveragingTable = AveragingTable()
    design: DesignTable

    @property
    def input_names(self) -> tuple[str, ...]:
        """Every input file of the job as it is named, in the job's order."""
        return (self.basins.file, *self.design.input_names)
