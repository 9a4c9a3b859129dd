"""Temporal patterns: where each is from, how sure that is, and what was remarked of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from basinrain.designstorm.design_storms import PatternChoice
from basinrain.designstorm.measures import duration_text
from basinrain.jobfile.design_tables import PatternTable, minutes_of
from basinrain.results_design import DesignRun

__all__ = ["PatternFacts", "pattern_facts"]

_MOST: Final = 12
_REMARKS: Final = 4


@dataclass(frozen=True)
class PatternFacts:
    """A pattern and what is to be known of it, each a name and a text."""

    name: str
    facts: tuple[tuple[str, str], ...]


def pattern_facts(run: DesignRun) -> list[PatternFacts]:
    """Return the patterns that the job names, each once, of many the first."""
    choices: dict[str, PatternChoice] = {}
    for storm in run.storms:
        choices.setdefault(storm.choice.label, storm.choice)
    tables = {table.label: table for table in run.asked.design.pattern}
    return [PatternFacts(label, tuple(_facts(run, choice, tables[label]))) for label, choice in choices.items()][:_MOST]


def _facts(run: DesignRun, choice: PatternChoice, table: PatternTable) -> list[tuple[str, str]]:
    pattern = choice.pattern
    lines = [("Shape", pattern.title + _options(choice, table))]
    if table.durations:
        minutes = sorted(minutes_of(word) for word in table.durations)
        lines.append(("Durations", ", ".join(duration_text(each) for each in minutes)))
    lines.append(("Source", pattern.source))
    if pattern.evidence:
        lines.append(("Evidence", pattern.evidence))
    remarks = _remarks(run, choice.label)
    if remarks:
        lines.append(("Remarks", " ".join(remarks)))
    return lines


def _options(choice: PatternChoice, table: PatternTable) -> str:
    """Return the options that were given, with what a file or a storm was taken for."""
    parts = [
        name if value is True else f"{name} {value}"
        for name, value in choice.options.items()
        if name != "ordinates" and value is not False
    ]
    if table.file is not None:
        parts.append(f"of {table.file}")
    if table.storm is not None:
        parts.append(f"'{table.storm}', over the largest of the areas")
    return f"; {', '.join(parts)}" if parts else ""


def _remarks(run: DesignRun, label: str) -> list[str]:
    """Return remarks with the durations that they are of, where that is not all; of many the first."""
    found: dict[str, set[int]] = {}
    every: set[int] = set()
    for storm in run.storms:
        if storm.choice.label == label:
            every.add(storm.minutes)
            for remark in storm.remarks:
                found.setdefault(remark, set()).add(storm.minutes)
    remarks = [
        remark if minutes == every else f"{', '.join(duration_text(each) for each in sorted(minutes))}: {remark}"
        for remark, minutes in found.items()
    ]
    more = len(remarks) - _REMARKS
    return remarks if more <= 0 else [*remarks[:_REMARKS], f"{more} more remarks are in record.json."]
