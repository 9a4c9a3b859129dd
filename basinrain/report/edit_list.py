"""The edit log, always whole."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from basinrain.report.table import Row, Table
from basinrain.report.words import DASH, depth_text, unbroken, unit_word
from basinrain.units import depth_factor

__all__ = ["edit_table"]


def edit_table(rows: Sequence[Mapping[str, Any]], *, depth_unit: str) -> Table | None:
    """Return every change that the job makes to the record, with what it did; None where it makes none.

    Parameters
    ----------
    rows
        As :func:`basinrain.screening.apply_edits` gives them, depths in mm.
    depth_unit
        ``"mm"`` or ``"in"``.
    """
    if not rows:
        return None
    mm = depth_factor(depth_unit)
    lines: list[Row] = []
    for number, row in enumerate(rows, start=1):
        lines.append(
            (
                str(number),
                str(row["gauge"]),
                _time(row["from"]),
                _time(row["to"]),
                _action(row, depth_unit),
                str(row["reason"]),
                str(row["by"]),
                _time(row["date"]),
                DASH if row["steps_changed"] is None else str(row["steps_changed"]),
                _depth(row["depth_before"], mm, depth_unit),
                _depth(row["depth_after"], mm, depth_unit),
            )
        )
    return Table(
        caption=f"Edits of the job, all of them; depths in {unit_word(depth_unit)}",
        heads=("no.", "gauge", "from", "to", "action", "reason", "by", "date", "steps", "before", "after"),
        over=(("", 9), ("sum of depths", 2)),
        align="nttttttt" + "nnn",
        rows=lines,
        notes=(
            "Made on the record as read, before all else, in the order: reject, set and scale, shift.",
            f"{DASH} in the last column: no depth is left. The input files were not touched.",
        ),
    )


def _time(text: object) -> str:
    # Seconds only where they count.
    plain = str(text).replace("T", " ")
    return unbroken(plain.removesuffix(":00") if plain.count(":") > 1 else plain) if text else DASH


def _action(row: Mapping[str, Any], depth_unit: str) -> str:
    value = row["value"]
    match row["action"]:
        case "set":
            return f"set to {depth_text(float(value) / depth_factor(depth_unit), depth_unit)} {depth_unit}"
        case "scale":
            return f"scale by {float(value):.4g}"
        case "shift":
            return f"shift by {value}"
        case action:
            return str(action)


def _depth(value: float | None, mm: float, unit: str) -> str:
    return DASH if value is None else depth_text(value / mm, unit)
