"""The kinds of value that a job's tables hold, and their base."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from datetime import date, datetime, time
from typing import Annotated, Any

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field
from pydantic_core import PydanticCustomError

from basinrain.errors import JobError, unknown
from basinrain.intervals import FORMS, parse_interval
from basinrain.units import DEPTH_UNITS, LENGTH_UNITS

__all__ = [
    "LEAVE_ONE_OUT",
    "Count",
    "DepthUnit",
    "Duration",
    "LengthUnit",
    "Moment",
    "NameList",
    "Positive",
    "Table",
    "as_list",
    "clock_time",
    "is_month",
    "names",
    "once",
    "one_of",
]


LEAVE_ONE_OUT = "leave-one-out"
"""Written for the infill method in a job that takes the one which the comparison finds."""


def one_of(known: Iterable[str]) -> AfterValidator:
    """Return what makes a text be one of some, naming the nearest where it is not."""
    choices = tuple(known)

    def check(value: str) -> str:
        if value not in choices:
            told = unknown("", value, choices)
            raise PydanticCustomError("one_of", "{expected}", {"expected": told.expected, "remedy": told.remedy})
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


def clock_time(value: object) -> object:
    """Bring a TOML time to text; anything else stays as it is."""
    if isinstance(value, time):
        return value.strftime("%H:%M")
    return value


def as_list(value: object) -> object:
    """Bring a table that was written once to a list of tables."""
    return [value] if isinstance(value, Mapping) else value


def names(value: object) -> object:
    """Bring a single name to a list of names."""
    return [value] if isinstance(value, str) else value


def once(values: tuple[Any, ...]) -> tuple[Any, ...]:
    """Refuse a list that holds one value twice."""
    if len(set(values)) < len(values):
        raise PydanticCustomError("repeated", "{expected}", {"expected": "each of them once"})
    return values


def _interval(word: str) -> str:
    try:
        return parse_interval(word).label
    except JobError:
        raise PydanticCustomError("interval", "{expected}", {"expected": FORMS}) from None


DepthUnit = Annotated[str, one_of(DEPTH_UNITS)]
LengthUnit = Annotated[str, one_of(LENGTH_UNITS)]
Moment = Annotated[str, BeforeValidator(_moment), AfterValidator(_iso)]
NameList = Annotated[tuple[str, ...], BeforeValidator(names)]
Duration = Annotated[str, AfterValidator(_interval)]
Positive = Annotated[float, Field(gt=0)]
Count = Annotated[int, Field(ge=1)]


class Table(BaseModel):
    """A table of a job: no key that is not known, no change once it is made."""

    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)
