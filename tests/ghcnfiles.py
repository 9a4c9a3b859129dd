"""Invented GHCN-Daily files for tests, put together column by column."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Literal

import numpy as np

from basinrain.errors import Problems, ReadError
from basinrain.intervals import DAY, Interval
from basinrain.rainfall import RainRecord, Status
from basinrain.reading.axis import join_blocks
from basinrain.reading.blocks import Block
from basinrain.reading.ghcn import read_ghcn
from basinrain.reading.stamps import StampRules

ONE = "ORX00000001"
TWO = "ORX00000002"
DAILY = StampRules(interval=Interval("1d", DAY))


def month(element: str, slots: Mapping[int, str], *, station: str = ONE, when: str = "203105") -> str:
    """Return a line; a slot is the value with its flags: ``"15"``, ``"0T"``, ``"15 X"``; days left out are -9999."""
    text = [f"{station}{when}{element}"]
    for day in range(1, 32):
        digits = slots.get(day, "-9999")
        value = digits.rstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZ? ")
        text.append(f"{value:>5}{digits[len(value) :]:<3}")
    return "".join(text)


def block_of(
    folder: Path, *lines: str, layout: Literal["ghcn-dly", "ghcn-csv"] = "ghcn-dly", stamps: StampRules = DAILY
) -> Block:
    """Return the block of a file with these lines, which must be without fault."""
    path = folder / "orx.dly"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    problems = Problems()
    block = read_ghcn(path, layout=layout, stamps=stamps, problems=problems)
    problems.raise_as(ReadError)
    assert block is not None
    return block


def faults_of(folder: Path, *lines: str, layout: Literal["ghcn-dly", "ghcn-csv"] = "ghcn-dly") -> list[str]:
    """Return the problems of a file with these lines, without the file's name."""
    path = folder / "orx.dly"
    path.write_text("\n".join(lines) + "\n", encoding="latin-1")
    problems = Problems()
    assert read_ghcn(path, layout=layout, stamps=DAILY, problems=problems) is None
    try:
        problems.raise_as(ReadError)
    except ReadError as error:
        return [line.removeprefix(f"{path}:").removeprefix(" ") for line in str(error).splitlines()]
    return []


def record_of(*blocks: Block) -> RainRecord:
    """Return the daily record of files."""
    return join_blocks(blocks, Interval("1d", DAY), zone="", gaps="missing")


def days(block: Block, gauge: int = 0) -> dict[int, tuple[float | None, str]]:
    """Return depth and status in words of a gauge by day of the month, for calendar days of one month."""
    numbers = (block.ends - np.timedelta64(1, "D")).astype("datetime64[D]").astype(object)
    return {
        date.day: (None if np.isnan(depth) else depth, Status(code).label)
        for date, depth, code in zip(numbers, block.depth[:, gauge].tolist(), block.status[:, gauge], strict=True)
    }
