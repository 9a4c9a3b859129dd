"""What the runs of all commands share: the job resolved, and what every result carries."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from importlib.metadata import version
from pathlib import Path
from typing import Any

from basinrain.basins import Basins
from basinrain.errors import JobError, Problem
from basinrain.ground import Plane
from basinrain.infill.leave_one_out import Comparison
from basinrain.infill_choice import InfillChoice
from basinrain.inputs import Inputs, input_digests
from basinrain.jobfile import DesignJob, Job, read_job

__all__ = ["Report", "basin_fields", "choice_fact", "common_fields", "library_versions", "refuse_settings", "resolved"]

Report = Callable[[str], None]
"""Is called with a few words before each part of the work."""


def resolved(job: Job | str | Path, settings: Sequence[str]) -> Job:
    """Return a job that may be given by the path of its file; settings go with a path only."""
    if not isinstance(job, Job):
        return read_job(job, settings)
    refuse_settings(settings)
    return job


def refuse_settings(settings: Sequence[str]) -> None:
    """Refuse settings beside a job that is already resolved."""
    if settings:
        raise JobError(
            Problem(
                item="settings",
                found="settings beside a job that is already resolved",
                expected="settings with the path of a job file",
                remedy="give them to read_job",
            )
        )


def common_fields(job: Job, given: Inputs, infill: InfillChoice | None = None) -> dict[str, Any]:
    """Return what every run has that rests on a record."""
    fields = basin_fields(job, given.basins, given.plane)
    settings = fields["settings"]
    return {
        **fields,
        "settings": settings if infill is None else {**settings, "infill": infill.settings},
        "network": given.network,
        "record": given.record,
        "screening": given.screening,
        "edits": given.edits,
        "edit_rows": given.edit_rows,
    }


def basin_fields(
    job: Job | DesignJob, basins: Basins, plane: Plane, *, files: Sequence[str] | None = None
) -> dict[str, Any]:
    """Return what every run has, with gauges or without; ``files`` are those that were read, by default all."""
    return {
        "name": job.job.name,
        "settings": job.model_dump(mode="json", exclude_none=True, by_alias=True),
        "depth_unit": job.job.depth_unit,
        "area_unit": job.job.area_unit,
        "basins": basins,
        "plane": plane,
        "inputs": input_digests(job, files),
        "versions": library_versions(),
    }


def library_versions() -> dict[str, str]:
    """Return the versions of this package and of the libraries that compute."""
    return {name: version(name) for name in ("basinrain", "numpy", "scipy", "shapely", "pyproj", "pandas")}


def choice_fact(comparison: Comparison | None) -> dict[str, str]:
    """Return what a report states of how the infill method was chosen; nothing where it was named."""
    return {} if comparison is None else {"infill-method": comparison.reason}
