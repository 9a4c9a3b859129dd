"""The temporal patterns that a job's design asks for."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any, cast

from basinrain.designstorm.design_storms import PatternChoice
from basinrain.designstorm.patterns import PATTERNS, Ordinates
from basinrain.errors import JobError, Problems
from basinrain.inputs import attempt
from basinrain.jobfile import DesignJob, Job
from basinrain.jobfile.design_tables import DesignTable
from basinrain.reading.pattern_table import read_pattern_table

__all__ = ["pattern_choices"]


def pattern_choices(
    job: Job | DesignJob, design: DesignTable, observed: Callable[[str], Ordinates]
) -> tuple[PatternChoice, ...]:
    """Return every pattern of a design with its options, the files that patterns name read.

    Parameters
    ----------
    job, design
        The job and its table.
    observed
        Gives the ordinates of a storm of the record by its name.

    Raises
    ------
    JobError
        What a file or a storm has is no pattern; all of them.
    """
    problems = Problems()
    result = []
    for table in design.pattern:
        options: dict[str, Any] = {}
        for option in PATTERNS[table.shape].options:
            if option == "ordinates":
                read = (
                    partial(observed, table.storm)
                    if table.storm is not None
                    else partial(
                        read_pattern_table, job.path(table.file or ""), percent=table.percent, columns=table.columns
                    )
                )
                options[option] = attempt(problems, cast("Callable[[], Ordinates]", read))
            elif getattr(table, option) is not None:
                options[option] = getattr(table, option)
        result.append(PatternChoice(label=table.label, pattern=PATTERNS[table.shape], options=options))
    problems.raise_as(JobError)
    return tuple(result)
