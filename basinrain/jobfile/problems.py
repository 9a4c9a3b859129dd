"""What pydantic finds wrong with a job, in the words of the job file."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any

from pydantic import BaseModel
from pydantic_core import ErrorDetails

from basinrain.errors import Problem, nearest_name

__all__ = ["plainest", "problem_of"]

_REPEATED = frozenset({"edit", "rainfall", "storm", "design.point", "design.pattern", "design.depths.raster"})

_WITHIN = frozenset({"design.depths", "design.uplift", "design.areal_reduction", "design.rarity", *_REPEATED})
"""Tables within a table that have a heading of their own."""

_MESSAGES: Mapping[str, tuple[str, str]] = {
    "string_type": ("text in quotes", "correct the value"),
    "float_type": ("a number", "correct the value"),
    "float_parsing": ("a number", "correct the value"),
    "int_type": ("a whole number", "correct the value"),
    "int_parsing": ("a whole number", "correct the value"),
    "int_from_float": ("a whole number", "correct the value"),
    "bool_type": ("true or false", "correct the value"),
    "bool_parsing": ("true or false", "correct the value"),
    "tuple_type": ("a list in square brackets", "correct the value"),
    "list_type": ("a list in square brackets", "correct the value"),
    "dict_type": ("a table", "correct the value"),
    "model_type": ("a table", "correct the value"),
    "finite_number": ("a finite number", "correct the value"),
}


_OTHER_SHAPES = frozenset({"tuple_type", "list_type", "dict_type", "model_type", "string_type"})


def plainest(found: Sequence[ErrorDetails]) -> list[ErrorDetails]:
    """Return one finding for every place of the job.

    Where a value may have several shapes, each shape has its complaint; the one that fits the shape given is kept.
    """
    places: dict[tuple[str | int, ...], list[ErrorDetails]] = {}
    for details in found:
        places.setdefault(tuple(_place(details)), []).append(details)
    return [min(several, key=lambda details: details["type"] in _OTHER_SHAPES) for several in places.values()]


def _place(details: ErrorDetails) -> list[str | int]:
    return [part for part in details["loc"] if isinstance(part, int) or not _internal(part)]


def problem_of(details: ErrorDetails, file: str, text: str, job: type[BaseModel]) -> Problem:
    """Return one finding as a :class:`~basinrain.errors.Problem`, with the line where it stands in ``text``.

    ``job`` is the model of the whole job that was checked.
    """
    loc = _place(details)
    kind = details["type"]
    context = details.get("ctx", {})
    item, line = _item(loc), _line(loc, text)
    found = f"'{details['input']}'" if isinstance(details["input"], str) else f"{details['input']!r}"
    if kind == "extra_forbidden":
        known = _keys_at(job, loc[:-1])
        return Problem(
            item=item,
            found="a key that is not known",
            expected="one of: " + ", ".join(known),
            remedy=nearest_name(str(loc[-1]), known) if _is_near(str(loc[-1]), known) else "remove it",
            file=file,
            line=line,
        )
    if kind == "missing" and isinstance(loc[-1], int):
        item, line, found = _item(loc[:-1]), _line(loc[:-1], text), f"{details['input']!r}"
        expected = f"a list of at least {loc[-1] + 1}"
        return Problem(item=item, found=found, expected=expected, remedy="add what is missing", file=file, line=line)
    if kind == "missing":
        _, number, rest = _split(loc)
        table = not rest and number is None
        return Problem(
            item=item,
            found="no such table" if table else "no such key",
            expected="it to be given",
            remedy="add it",
            file=file,
            line=_line(loc[:-1], text),
        )
    if kind == "too_short" and loc[-1] in {"rainfall", "pattern"}:
        return Problem(item=item, found="no table", expected="at least one", remedy="add it", file=file)
    if kind == "too_short":
        return Problem(
            item=item, found="an empty list", expected="at least one", remedy="name one", file=file, line=line
        )
    if kind == "too_long":
        expected = f"a list of {context['max_length']}"
        return Problem(item=item, found=found, expected=expected, remedy="remove the rest", file=file, line=line)
    if kind == "tuple_type" and _split(loc)[0] in _REPEATED and not _split(loc)[2]:
        return Problem(item=item, found=found, expected=f"a table {item}", remedy="write it so", file=file, line=line)
    if kind in {"file_or_files", "no_interval"}:
        found = "both or neither" if kind == "file_or_files" else "no interval"
    expected, remedy = _MESSAGES.get(kind, (details["msg"].lower(), "correct the value"))
    bounds = {"gt": "above", "ge": "of at least", "lt": "below", "le": "of at most"}
    for name in bounds.keys() & context.keys():
        expected = f"a number {bounds[name]} {context[name]:g}"
    if "expected" in context:
        expected, remedy = str(context["expected"]), str(context.get("remedy", remedy))
    return Problem(item=item, found=found, expected=expected, remedy=remedy, file=file, line=line)


def _internal(part: str) -> bool:
    """Pydantic names the branch of a union in the location; the user never wrote it."""
    return bool(re.match(r"^((str|float|int|bool|BufferTable)$|function-|literal\[|list\[|tuple\[|constrained-)", part))


def _is_near(name: str, known: Sequence[str]) -> bool:
    return nearest_name(name, known).startswith("did you mean")


def _item(loc: Sequence[str | int]) -> str:
    if not loc:
        return "job"
    head, number, rest = _split(loc)
    counted = "" if number is None else f" no. {number + 1}"
    head = f"[[{head}]]{counted}" if head in _REPEATED else f"[{head}]"
    words = "".join(f" no. {part + 1}" if isinstance(part, int) else f".{part}" for part in rest)
    return f"{head} {words.removeprefix('.').strip()}".strip()


def _split(loc: Sequence[str | int]) -> tuple[str, int | None, list[str | int]]:
    """Return the heading of the table that a location is in, its number where it repeats, and the rest."""
    head, rest = str(loc[0]), list(loc[1:])
    while rest and f"{head}.{rest[0]}" in _WITHIN:
        head = f"{head}.{rest.pop(0)}"
    number = rest.pop(0) if head in _REPEATED and rest and isinstance(rest[0], int) else None
    return head, number if isinstance(number, int) else None, rest


def _keys_at(job: type[BaseModel], loc: Sequence[str | int]) -> list[str]:
    """Return the keys that the model at a location accepts."""
    model = job
    for part in loc:
        if isinstance(part, int):
            continue
        found = _model_in(model.model_fields[part].annotation)  # only plain keys hold tables, never one with an alias
        if found is None:
            return []
        model = found
    return [info.alias or name for name, info in model.model_fields.items() if not info.exclude]


def _model_in(annotation: Any) -> type[BaseModel] | None:  # noqa: ANN401 - any type form
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for part in getattr(annotation, "__args__", ()):
        found = _model_in(part)
        if found is not None:
            return found
    return None


def _line(loc: Sequence[str | int], text: str) -> int | None:
    """Return the line on which a key of a table stands, as far as plain TOML shows it."""
    if not text or not loc:
        return None
    table, counted, rest = _split(loc)
    keys = [part for part in rest if isinstance(part, str)]
    line = _line_in(table, counted or 0, keys[0] if keys else "", text)
    while line is None and "." in table:
        # A table within a table may be written as a key of it.
        table, _, key = table.rpartition(".")
        line = _line_in(table, 0, key, text)
    return line


def _line_in(table: str, number: int, key: str, text: str) -> int | None:
    """Return the line of a key under the heading of a table, or of the heading where the key is not there."""
    seen, here, header = -1, False, None
    for k, raw in enumerate(text.splitlines(), start=1):
        line = raw.strip()
        match = re.match(r"^\[{1,2}\s*([\w.\-]+)\s*\]{1,2}", line)
        if match:
            here = match.group(1) == table
            seen += here
            header = k if here and seen == number else header
            here = here and seen == number
        elif here and key and re.match(rf"^[\"']?{re.escape(key)}[\"']?\s*[=.]", line):
            return k
    return header
