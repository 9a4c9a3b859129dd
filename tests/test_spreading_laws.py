"""Totals are kept by everything that spreads: readings of any length, from files of any layout, at any common step."""

from __future__ import annotations

import math
import tempfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt
import pytest
from ghcnfiles import month
from hypothesis import given
from hypothesis import strategies as st
from strategies import networks

from basinrain.gauges import GaugeNetwork
from basinrain.infill import InfillOptions, complete
from basinrain.rainfall import RainRecord
from basinrain.reading.rainfall import read_rainfall
from basinrain.reading.step import bring_to_step

N_DAYS = 5
HOUR = np.timedelta64(3600, "s")
DAY = 24 * HOUR
FIRST = np.datetime64("2031-05-29T00:00:00")


class Reading(NamedTuple):
    """What a gauge caught over ``length`` of its own steps, mm; None where it is not known."""

    length: int
    depth: float | None


class Source(NamedTuple):
    """A file's gauges with their readings, the time at which the first of them begins, and the file's step."""

    layout: str
    start: np.datetime64
    step: np.timedelta64
    readings: dict[str, list[Reading]]

    @property
    def n_steps(self) -> int:
        """How many steps the readings fill."""
        return sum(reading.length for reading in next(iter(self.readings.values())))

    def known(self, gauge: str) -> list[tuple[np.datetime64, np.datetime64, float | None]]:
        """Return begin, end and depth of the readings of a gauge."""
        ends = self.start + np.cumsum([reading.length for reading in self.readings[gauge]]) * self.step
        return [(e - r.length * self.step, e, r.depth) for e, r in zip(ends, self.readings[gauge], strict=True)]


def readings(rng: np.random.Generator, n_steps: int, longest: int, gaps: float) -> list[Reading]:
    """Return readings that fill ``n_steps``; one over several steps follows a known one, as a mark alone demands it."""
    found: list[Reading] = []
    left = n_steps
    while left:
        follows = bool(found) and found[-1].depth is not None
        length = int(rng.integers(1, min(longest, left) + 1)) if follows else 1
        tenths = int(rng.integers(1, 10 ** rng.integers(1, 5))) * int(rng.random() < 0.6)
        found.append(Reading(length, None if length == 1 and rng.random() < gaps else min(tenths, 9000) / 10))
        left -= length
    return found


@st.composite
def sources(draw: st.DrawFn, gauges: GaugeNetwork) -> list[Source]:
    """Draw a source of hourly recorders and sources of daily gauges, each with a layout and a reading hour."""
    ids = list(gauges.ids)
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    gaps = draw(st.sampled_from([0.0, 0.02, 0.3]))
    split = draw(st.integers(1, len(ids)))
    begin = draw(st.integers(-3, 3))
    longest = draw(st.sampled_from([1, 5, 30]))
    recorders = {gauge: readings(rng, N_DAYS * 24, longest, gaps) for gauge in ids[:split]}
    found = [Source(draw(st.sampled_from(["wide", "long"])), FIRST + begin * HOUR, HOUR, recorders)]
    while split < len(ids):
        stop = draw(st.integers(split + 1, len(ids)))
        hour = draw(st.sampled_from([0, 6, 7, 18]))
        layout = draw(st.sampled_from(["wide", "long", "ghcn-dly", "ghcn-csv"]))
        longest = draw(st.sampled_from([1, 3]))
        daily = {gauge: readings(rng, N_DAYS, longest, gaps) for gauge in ids[split:stop]}
        found.append(Source(layout, FIRST + hour * HOUR, DAY, daily))
        split = stop
    return found


def station(gauge: str) -> str:
    """Return an id of the length that GHCN-Daily has."""
    return f"ORX{gauge:0>8}"


def cells(source: Source, gauge: str) -> list[str]:
    """Return a cell for every step: the reading at its last one, marked where it is over several."""
    texts = []
    for length, depth in source.readings[gauge]:
        value = "" if depth is None else f"{depth:.1f}" + ("A" if length > 1 else "")
        texts += [""] * (length - 1) + [value]
    return texts


def stamps(source: Source) -> list[str]:
    """Return the dates at which the days begin, or the times at which the hours end."""
    ends = source.start + np.arange(1, source.n_steps + 1) * source.step
    return [str(end - DAY)[:10] for end in ends] if source.step == DAY else [str(end) for end in ends]


def as_wide(source: Source) -> list[str]:
    columns = [cells(source, gauge) for gauge in source.readings]
    return [
        ",".join(["time", *source.readings]),
        *(",".join(row) for row in zip(stamps(source), *columns, strict=True)),
    ]


def as_long(source: Source) -> list[str]:
    lines = ["gauge,time,depth,steps"]
    for gauge, mine in source.readings.items():
        last = np.cumsum([reading.length for reading in mine]) - 1
        times = stamps(source)
        lines += [
            f"{gauge},{times[t]},{'' if depth is None else f'{depth:.1f}'},{length if depth is not None else ''}"
            for t, (length, depth) in zip(last, mine, strict=True)
        ]
    return lines


def elements(source: Source, gauge: str) -> list[tuple[str, str, str]]:
    """Return date, element and value of the readings of a daily gauge; every other period says its days."""
    found = []
    last = np.cumsum([reading.length for reading in source.readings[gauge]]) - 1
    for k, (t, (length, depth)) in enumerate(zip(last, source.readings[gauge], strict=True)):
        date = stamps(source)[t].replace("-", "")
        value = "-9999" if depth is None else f"{round(10 * depth)}"
        found.append((date, "PRCP" if length == 1 else "MDPR", value))
        if length > 1 and k % 2:
            found.append((date, "DAPR", str(length)))
    return found


def as_ghcn_csv(source: Source) -> list[str]:
    return [
        f"{station(gauge)},{date},{element},{value},,,X,"
        for gauge in source.readings
        for date, element, value in elements(source, gauge)
    ]


def as_ghcn_dly(source: Source) -> list[str]:
    lines = []
    for gauge in source.readings:
        slots: dict[tuple[str, str], dict[int, str]] = {}
        for date, element, value in elements(source, gauge):
            slots.setdefault((element, date[:6]), {})[int(date[6:])] = value if value == "-9999" else f"{value}  X"
        lines += [month(element, mine, station=station(gauge), when=when) for (element, when), mine in slots.items()]
    return lines


WRITERS: dict[str, Callable[[Source], list[str]]] = {
    "wide": as_wide,
    "long": as_long,
    "ghcn-csv": as_ghcn_csv,
    "ghcn-dly": as_ghcn_dly,
}


def record_of(source: Source, folder: Path) -> RainRecord:
    """Write a source and read it, its gauges under their own ids."""
    path = folder / "rain.txt"
    path.write_text("\n".join(WRITERS[source.layout](source)) + "\n", encoding="utf-8")
    options: dict[str, Any] = {}
    hour = int((source.start - FIRST) / HOUR)
    if source.step == DAY and hour:
        options = {"read_hour": hour, "date_means": "starts"}
    if not source.layout.startswith("ghcn"):
        options |= {"unit": "mm", "interval": "1d" if source.step == DAY else "1h", "gaps": "missing"}
    if source.layout == "wide":
        options["accumulated"] = "A"
    record = read_rainfall([path], layout=source.layout, **options)  # type: ignore[arg-type]
    if not source.layout.startswith("ghcn"):
        return record
    names = {station(gauge): gauge for gauge in source.readings}
    return replace(
        record,
        gauges=tuple(names[gauge] for gauge in record.gauges),
        totals=tuple(replace(total, gauge=names[total.gauge]) for total in record.totals),
        recorders=frozenset(names[gauge] for gauge in record.recorders),
    )


def pieces(source: Source, gauge: str, bounds: npt.NDArray[np.datetime64]) -> list[tuple[int, int, float]]:
    """Return first step, stop and sum of the shortest runs of steps that hold whole readings, all of them known."""
    found = []
    place = {bound: k for k, bound in enumerate(bounds.tolist())}
    begun: np.datetime64 | None = source.start if source.start.tolist() in place else None
    sums: list[float | None] = []
    for _, end, depth in source.known(gauge):
        sums.append(depth)
        if end.tolist() in place:
            known = [d for d in sums if d is not None]
            if begun is not None and len(known) == len(sums):
                found.append((place[begun.tolist()], place[end.tolist()], math.fsum(known)))
            begun, sums = end, []
    return found


def check_kept(record: RainRecord, drawn: list[Source]) -> int:
    """Assert that every gauge has its readings' sums; return how many sums were compared."""
    bounds = np.r_[record.starts[:1], record.ends]
    compared = 0
    for source in drawn:
        for gauge in source.readings:
            depth = record.depth[:, record.gauges.index(gauge)]
            for first, stop, total in pieces(source, gauge, bounds):
                assert (depth[first:stop] >= 0).all()
                assert math.fsum(depth[first:stop]) == pytest.approx(total, rel=1e-9, abs=1e-12)
                compared += 1
    return compared


@given(gauges=networks(at_least=1, at_most=5), common=st.sampled_from(["30min", "1h", "3h", "6h"]), data=st.data())
def test_every_reading_is_kept_to_a_billionth(gauges: GaugeNetwork, common: str, data: st.DataObject) -> None:
    """Days read at any hour, accumulations and hours have their sums at any common step, before and after infilling."""
    drawn = data.draw(sources(gauges))
    if common in {"3h", "6h"}:
        # Days that are read at 07:00 fit no such steps.
        drawn = [
            s._replace(start=FIRST + 6 * HOUR) if s.step == DAY and s.start == FIRST + 7 * HOUR else s for s in drawn
        ]
    with tempfile.TemporaryDirectory() as folder:
        records = [record_of(source, Path(folder)) for source in drawn]
    record, _ = bring_to_step(records, gauges, common=common)
    compared = check_kept(record, drawn)
    if common in {"30min", "1h"}:
        # Every reading begins and ends with a step, so that each that is known is compared by itself.
        everything = [reading for source in drawn for mine in source.readings.values() for reading in mine]
        assert compared == sum(reading.depth is not None for reading in everything)
    phase = data.draw(st.sampled_from([0, 7 * 3600]))
    options = InfillOptions(method="inverse-distance", scale="day" if phase else "storm", min_donors=1)
    completed = complete(replace(record, day_phase=phase), gauges, options)
    assert check_kept(completed.record, drawn) == compared
    for estimate in completed.estimates:
        depth = completed.record.depth[estimate.first : estimate.stop, gauges.position(estimate.gauge)]
        assert math.fsum(depth) == pytest.approx(estimate.depth, rel=1e-9, abs=1e-12)
