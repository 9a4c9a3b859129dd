"""The job file: what may stand in it, checked as a whole before anything is read."""

from basinrain.jobfile.reading import parse_job, read_job
from basinrain.jobfile.tables import Job

__all__ = ["Job", "parse_job", "read_job"]
