"""The job file: what may stand in it, checked as a whole before anything is read."""

from basinrain.jobfile.reading import parse_design_job, parse_job, read_design_job, read_job
from basinrain.jobfile.tables import DesignJob, Job

__all__ = ["DesignJob", "Job", "parse_design_job", "parse_job", "read_design_job", "read_job"]
