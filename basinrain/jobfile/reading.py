"""Reading a job: TOML, the changes of the command line, and the check of the whole."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping, Sequence
from itertools import pairwise
from pathlib import Path
from typing import Any, TypeVar

from pydantic import ValidationError

from basinrain.errors import JobError, Problem, ReadError, SettingError
from basinrain.jobfile.problems import plainest, problem_of
from basinrain.jobfile.tables import BasinsJob, DesignJob, Job

__all__ = ["parse_design_job", "parse_job", "read_design_job", "read_job"]

_OF_GAUGES = frozenset(Job.model_fields) - frozenset(DesignJob.model_fields)
"""The tables that only a job with gauges has."""

_J = TypeVar("_J", bound=BasinsJob)


def read_job(path: str | Path, settings: Sequence[str] = ()) -> Job:
    """Read and check a job file.

    Parameters
    ----------
    path
        The TOML file.
    settings
        Changes in the words of the command line, ``"infill.method=normal-ratio"``; a value is TOML where it can be,
        else text. A table that may repeat is counted from 1: ``"rainfall.2.unit=in"``; the number may be left out where
        there is one.

    Returns
    -------
    Job
        With every default resolved and the file's folder as the start of relative paths. None of the files
        that it names is opened.

    Raises
    ------
    ReadError
        The file is missing, a folder, not text, or not TOML.
    JobError
        A key or a value is not known, or one is missing; all of them together, with the line where it stands.
    SettingError
        One of ``settings`` cannot be placed.
    """
    content, text = _content(path)
    return parse_job(content, folder=Path(path).resolve().parent, settings=settings, file=str(path), text=text)


def read_design_job(path: str | Path, settings: Sequence[str] = ()) -> Job | DesignJob:
    """Read and check the file of a job of design storms, which may do without gauges.

    Parameters, and what is raised, are those of :func:`read_job`.

    Returns
    -------
    Job or DesignJob
        As :func:`parse_design_job`.
    """
    content, text = _content(path)
    return parse_design_job(content, folder=Path(path).resolve().parent, settings=settings, file=str(path), text=text)


def _content(path: str | Path) -> tuple[dict[str, Any], str]:
    """Return what a job file holds, as tables and as text."""
    place = Path(path)
    try:
        text = place.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        found = "bytes that are not UTF-8 text" if isinstance(error, UnicodeDecodeError) else _os_words(error)
        raise ReadError(
            Problem(item="job file", found=found, expected="a TOML file", remedy="check the path", file=str(path))
        ) from None
    try:
        return tomllib.loads(text.replace("\r\n", "\n")), text
    except tomllib.TOMLDecodeError as error:
        raise ReadError(_not_toml(str(error), text, str(path))) from None


def _not_toml(message: str, text: str, file: str) -> Problem:
    match = re.search(r"\(at line (\d+)", message)
    line = int(match.group(1)) if match else None
    written = text.splitlines()[line - 1].strip() if line is not None else ""
    remedy = "correct the line"
    if re.search(r"=\s*\d{4}-\d\d-\d\d[T ]\d\d:\d\d\b(?!:)", written):
        remedy = "a time in TOML has seconds: write 2031-05-03T18:00:00, or put it in quotes"
    found = f"'{written}': {message.partition(' (at ')[0].lower()}" if written else message.lower()
    return Problem(item="job file", found=found, expected="TOML", remedy=remedy, file=file, line=line)


def _os_words(error: OSError) -> str:
    return (error.strerror or str(error)).lower()


def parse_job(
    content: Mapping[str, Any],
    *,
    folder: str | Path = ".",
    settings: Sequence[str] = (),
    file: str = "",
    text: str = "",
) -> Job:
    """Check a job given as nested tables, and resolve its defaults.

    Parameters
    ----------
    content
        The tables, as a TOML reader gives them.
    folder
        Where relative paths start.
    settings
        As for :func:`read_job`.
    file, text
        Name and text of the file, for the place of a problem.

    Returns
    -------
    Job
        With every default resolved. No file is opened; ``content`` is left as it is.

    Raises
    ------
    JobError
        A key or a value is not known, or one is missing; all of them together.
    SettingError
        One of ``settings`` is not ``TABLE.KEY=VALUE`` or cannot be placed.

    Examples
    --------
    >>> job = parse_job(
    ...     {
    ...         "job": {"name": "Two gauges"},
    ...         "gauges": {"file": "gauges.csv"},
    ...         "rainfall": {"file": "rain.csv", "unit": "mm", "interval": "1h"},
    ...         "basins": {"file": "basins.geojson"},
    ...     },
    ...     settings=["infill.power=3"],
    ... )
    >>> job.infill.power, job.averaging.methods, job.rainfall[0].stamp
    (3.0, ('arithmetic', 'thiessen', 'idw'), 'end')
    >>> parse_job({"job": {"name": "x", "deph_unit": "mm"}, "gauges": {}, "rainfall": [], "basins": {"file": "b"}})
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [job] deph_unit: found a key that is not known; expected one of: name, depth_unit, \
area_unit, output, plane; did you mean 'depth_unit'?
    [gauges] file: found no such key; expected it to be given; add it
    [[rainfall]]: found no table; expected at least one; add it
    """
    return _parsed(_tables(content, settings), Job, folder, settings=settings, file=file, text=text)


def parse_design_job(
    content: Mapping[str, Any],
    *,
    folder: str | Path = ".",
    settings: Sequence[str] = (),
    file: str = "",
    text: str = "",
) -> Job | DesignJob:
    """Check a job of design storms given as nested tables, and resolve its defaults.

    Parameters, and what is raised, are those of :func:`parse_job`.

    Returns
    -------
    Job or DesignJob
        A whole job where it has a table about gauges or their record, else one that does without.

    Examples
    --------
    >>> job = parse_design_job(
    ...     {
    ...         "job": {"name": "Culvert"},
    ...         "basins": {"file": "basins.geojson"},
    ...         "design": {
    ...             "aep": 0.1,
    ...             "durations": "60min",
    ...             "step": "10min",
    ...             "depths": {"from": "table", "file": "depths.csv"},
    ...             "pattern": {"shape": "alternating-block"},
    ...         },
    ...     }
    ... )
    >>> type(job).__name__, job.design.durations, job.design.pattern[0].label, job.input_names
    ('DesignJob', ('1h',), 'alternating-block', ('basins.geojson', 'depths.csv'))
    """
    tables = _tables(content, settings)
    if _OF_GAUGES & tables.keys():
        return _parsed(tables, Job, folder, settings=settings, file=file, text=text)
    return _parsed(tables, DesignJob, folder, settings=settings, file=file, text=text)


def _tables(content: Mapping[str, Any], settings: Sequence[str]) -> dict[str, Any]:
    tables: dict[str, Any] = _plain(content)
    for setting in settings:
        _apply(tables, setting)
    return tables


def _parsed(
    tables: Mapping[str, Any], kind: type[_J], folder: str | Path, *, settings: Sequence[str], file: str, text: str
) -> _J:
    try:
        return kind.model_validate({**tables, "folder": Path(folder)})
    except ValidationError as error:
        # What a setting brought in does not stand in the file.
        changed = [_setting_words(setting) for setting in settings]
        raise JobError(
            [
                problem_of(details, "", "", kind)
                if _is_set(details["loc"], changed)
                else problem_of(details, file, text, kind)
                for details in plainest(error.errors())
            ]
        ) from None


def _setting_words(setting: str) -> list[str]:
    return [word.strip() for word in setting.partition("=")[0].split(".")]


def _is_set(loc: Sequence[str | int], changed: Sequence[Sequence[str]]) -> bool:
    where = [part for part in loc if isinstance(part, str)]
    keys = [[word for word in words if not word.isdigit()] for words in changed]
    return any(where[: len(key)] == key for key in keys)


def _plain(value: Any) -> Any:  # noqa: ANN401 - TOML values
    if isinstance(value, Mapping):
        return {key: _plain(item) for key, item in value.items()}
    return [_plain(item) for item in value] if isinstance(value, list | tuple) else value


def _apply(tables: dict[str, Any], setting: str) -> None:
    """Put one ``key=value`` of the command line into the tables."""
    _, equals, text = setting.partition("=")
    words = _setting_words(setting)
    if not equals or len(words) < 2 or not all(words):
        raise SettingError(
            Problem(
                item="--set",
                found=f"'{setting}'",
                expected="TABLE.KEY=VALUE",
                remedy="write infill.method=normal-ratio",
            )
        )
    try:
        value = tomllib.loads(f"value = {text.strip()}")["value"]
    except tomllib.TOMLDecodeError:
        value = text.strip()
    place: Any = tables
    for word, following in pairwise(words):
        place = _enter(place, word, setting)
        if isinstance(place, list) and len(place) == 1 and not following.isdigit():
            place = place[0]
    if isinstance(place, list):
        raise SettingError(
            Problem(
                item=f"--set {setting}",
                found=f"{len(place)} such tables",
                expected="the number of one of them, counted from 1",
                remedy=f"write {'.'.join(words[:-1])}.1.{words[-1]}=...",
            )
        )
    if not isinstance(place, dict):
        raise _inside_plain(words[-1], words[-2], setting)
    place[words[-1]] = value


def _enter(place: Any, word: str, setting: str) -> Any:  # noqa: ANN401 - TOML values
    """Return what stands under one word of a setting; a table that is not there is made."""
    if isinstance(place, list):
        if word.isdigit() and 1 <= int(word) <= len(place):
            return place[int(word) - 1]
        raise SettingError(
            Problem(
                item=f"--set {setting}",
                found=f"'{word}'",
                expected=f"the number of a table that the job has, 1 to {len(place)}",
                remedy="correct the number; a table is added in the file",
            )
        )
    if not isinstance(place, dict):
        raise _inside_plain(word, "the key before it", setting)
    # A table that may repeat and was written once, in single brackets, is its own number 1.
    return place if word == "1" else place.setdefault(word, {})


def _inside_plain(word: str, key: str, setting: str) -> SettingError:
    return SettingError(
        Problem(
            item=f"--set {setting}",
            found=f"'{word}' inside a plain value of {key}",
            expected="a table there",
            remedy=f"give the whole value as a table, {{{word}=...}}",
        )
    )
