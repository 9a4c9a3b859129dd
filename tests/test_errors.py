"""Problems print as one line each, are counted as they are, and advice names what may have been meant."""

from __future__ import annotations

import pickle

import pytest

from basinrain import errors
from basinrain.errors import BasinRainError, DataError, Problem, Problems, ReadError, nearest_name, unknown


def collected(number: int, *, limit: int = 50) -> Problems:
    problems = Problems(file="rain.csv", limit=limit)
    for k in range(number):
        problems.add(item=f"gauge G{k}", found="no depth", line=k + 2)
    return problems


def raised(problems: Problems, kind: type[BasinRainError] = ReadError) -> BasinRainError:
    with pytest.raises(kind, match="found") as caught:
        problems.raise_as(kind)
    return caught.value


@pytest.mark.parametrize(
    ("problem", "text"),
    [
        (Problem(item="gauge A", found="no depth"), "gauge A: found no depth"),
        (Problem(item="gauge A", found="", expected="a depth"), "gauge A: expected a depth"),
        (
            Problem(item="gauge A", found="-1", expected="0 or more", remedy="correct it", file="r.csv", line=3),
            "r.csv:3: gauge A: found -1; expected 0 or more; correct it",
        ),
        (Problem(item="gauge A", found="-1", line=3, column="A"), "line 3: column A: gauge A: found -1"),
        (Problem(item="gauge A", found="-1", file="r.csv", column="A"), "r.csv: column A: gauge A: found -1"),
        (
            Problem(item="unit", found="'x'", expected="one of: mm, in", remedy="one of: mm, in"),
            "unit: found 'x'; expected one of: mm, in",
        ),
        (Problem(item="cell", found="'a\nb\t c'"), "cell: found 'a b c'"),
    ],
)
def test_a_problem_is_one_line(problem: Problem, text: str) -> None:
    """Place, item, what was found, expected and advised, each said once and only where it is known."""
    assert str(problem) == text


def test_an_error_lists_its_problems_one_a_line() -> None:
    """Several problems are several lines in their order, and stay there for programs."""
    one, two = Problem(item="a", found="1", gauge="A"), Problem(item="b", found="2")
    error = DataError([one, two])
    assert str(error).splitlines() == ["a: found 1", "b: found 2"]
    assert (error.problems, error.problems[0].gauge, error.unlisted) == ((one, two), "A", 0)


def test_problems_beyond_the_limit_are_counted() -> None:
    """Five problems with room for three: three lines, then how many more; six would be three more."""
    assert str(raised(collected(5, limit=3))).splitlines() == [
        "rain.csv:2: gauge G0: found no depth",
        "rain.csv:3: gauge G1: found no depth",
        "rain.csv:4: gauge G2: found no depth",
        "2 more problems: found but not listed",
    ]
    assert len(collected(5, limit=3)) == 5
    assert raised(collected(3, limit=3)).unlisted == 0
    assert str(raised(collected(4, limit=3))).splitlines()[-1] == "1 more problem: found but not listed"


def test_nothing_is_raised_without_a_problem() -> None:
    """An empty collection raises nothing; one problem is enough for the kind of error that was asked for."""
    Problems().raise_as(ReadError)
    assert type(raised(collected(1), DataError)) is DataError


def test_taking_over_an_error_keeps_the_true_count() -> None:
    """1 of its own, 4 from an error that lists 3 of them, 2 from another: 7, of which 3 are kept and 4 counted."""
    problems = collected(1, limit=3)
    problems.extend(raised(collected(4, limit=3)))
    problems.extend(raised(collected(2)))
    assert len(problems) == 7
    error = raised(problems)
    assert [problem.item for problem in error.problems] == ["gauge G0", "gauge G0", "gauge G1"]
    assert error.unlisted == 4
    problems.add(item="one more", found="this")
    assert (len(problems), raised(problems).unlisted) == (8, 5)


def test_a_problem_of_another_file_names_that_file() -> None:
    """The collector's file is the default; an empty name leaves it out."""
    problems = Problems(file="a.csv")
    problems.add(item="x", found="1")
    problems.add(item="x", found="1", file="b.csv")
    problems.add(item="x", found="1", file="")
    assert str(raised(problems)).splitlines() == ["a.csv: x: found 1", "b.csv: x: found 1", "x: found 1"]


@pytest.mark.parametrize(
    ("name", "known", "advice"),
    [
        ("thiesen", ["arithmetic", "thiessen", "idw"], "did you mean 'thiessen'?"),
        ("IN", ["mm", "in"], "did you mean 'in'?"),
        ("w03", ["W03", "W13"], "did you mean 'W03'?"),
        ("quill", ["Reed", "Quill"], "did you mean 'Quill'?"),
        ("furlong", ["mm", "in"], "one of: mm, in"),
        ("", ["mm", "in"], "one of: mm, in"),
        ("mm", [], "nothing is accepted here"),
    ],
)
def test_the_nearest_name(name: str, known: list[str], advice: str) -> None:
    """A near name is written as it is known, whatever the case; without one all are listed."""
    assert nearest_name(name, iter(known)) == advice


def test_only_unknown_names_are_reported() -> None:
    """A name that is known is no problem; another is one, in whatever the known ones come."""
    problems = Problems(file="job.toml")
    problems.check_known("shape", "b", {"a": 1, "b": 2})
    assert len(problems) == 0
    problems.check_known("shape", "c", iter(["aa", "bb"]))
    with pytest.raises(DataError, match=r"^job\.toml: shape: found 'c'; expected one of: aa, bb$"):
        problems.raise_as(DataError)


def test_what_is_no_text_is_no_known_name() -> None:
    """A number given for a name is shown as it is, on its line."""
    assert str(unknown("unit", 3, iter(["mm", "in"]), line=4)) == "line 4: unit: found '3'; expected one of: mm, in"


def test_problems_made_already_are_kept_to_the_limit() -> None:
    """Those beyond it are counted, and one that names its own file keeps it."""
    problems = Problems(file="job.toml", limit=1)
    problems.include(Problem(item="a", found="b", file="other.csv"))
    problems.include(Problem(item="c", found="d"))
    with pytest.raises(DataError, match=r"^other\.csv: a: found b\n1 more problem: found but not listed$"):
        problems.raise_as(DataError)


def test_every_error_is_one_of_ours() -> None:
    """One `except BasinRainError` catches every expected failure; a wrong setting is a fault of the job."""
    kinds = [getattr(errors, name) for name in errors.__all__ if name.endswith("Error")]
    assert len(kinds) == 7
    assert all(issubclass(kind, BasinRainError) for kind in kinds)
    assert issubclass(errors.SettingError, errors.JobError)


@pytest.mark.parametrize("kind", [getattr(errors, name) for name in errors.__all__ if name.endswith("Error")])
def test_an_error_arrives_whole_from_another_process(kind: type[BasinRainError]) -> None:
    """Sent and received it has its kind, its problems, what it does not list, and its text."""
    sent = kind([Problem(item="gauge A", found="one", gauge="A"), Problem(item="gauge B", found="two")], unlisted=3)
    received = pickle.loads(pickle.dumps(sent))  # noqa: S301 - made here
    assert (type(received), received.problems, received.unlisted) == (kind, sent.problems, 3)
    assert str(received) == str(sent)
