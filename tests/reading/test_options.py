"""Problems of options."""

import pytest

from basinrain.errors import JobError, Problem, Problems
from basinrain.reading.options import of_source, option_problems


def fail(*problems: Problem, unlisted: int = 0) -> None:
    raise JobError(problems, unlisted=unlisted)


def test_what_a_problem_says_itself_is_kept() -> None:
    """The file is filled in where there is none, the item replaced where one is given, and unlisted ones count."""
    problems = Problems()
    with option_problems(problems, file="rain.csv"):
        fail(Problem(item="a", found="1", file="own.csv"), Problem(item="b", found="2"), unlisted=3)
    with option_problems(problems, item="[x] c"):
        fail(Problem(item="c", found="3"))
    assert len(problems) == 6
    with pytest.raises(JobError, match="found") as caught:
        problems.raise_as(JobError)
    assert str(caught.value).splitlines() == [
        "own.csv: a: found 1",
        "rain.csv: b: found 2",
        "[x] c: found 3",
        "3 more problems: found but not listed",
    ]


def test_the_table_of_an_option() -> None:
    """Every problem of a source's options names its table and file, and those that are not listed still count."""
    with pytest.raises(JobError) as caught, of_source(3, "rain.csv"):
        fail(Problem(item="tip", found="0", file="/jobs/rain.csv"), Problem(item="unit", found="'m'"), unlisted=1)
    assert str(caught.value).splitlines() == [
        "[[rainfall]] no. 3 (rain.csv) tip: found 0",
        "[[rainfall]] no. 3 (rain.csv) unit: found 'm'",
        "1 more problem: found but not listed",
    ]
