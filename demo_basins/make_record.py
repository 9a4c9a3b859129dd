"""Make the demo record: twenty years of daily depths on the invented River Ormavel, with faults that are known.

Run ``python demo_basins/make_record.py`` to write the two data files into ``record`` beside this script again, byte for
byte the same, or name another folder. The network is that of ``make_demo.py``, and in October 2031 the days hold its
storm. What is wrong with the record is planted here and listed in the README.

As there, the seeded generator is only asked for uniform numbers and all that is written is rounded.
"""

from __future__ import annotations

import csv
import io
import math
import runpy
import sys
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

Values = npt.NDArray[np.float64]
Days = npt.NDArray[np.datetime64]

SEED: Final = 20120101
FIRST: Final = np.datetime64("2012-01-02")  # the first morning: the reading is of the 24 h before 08:00
LAST: Final = np.datetime64("2032-01-01")
SHAPE: Final = 0.72  # of the Weibull law of wet days' depths
TIP: Final = 0.2
OPENED: Final = {"R09": "2016-05-01"}
CLOSED: Final = {"R13": "2028-10-01"}
# A gauge that was gone by the storm of the first demo: name, km east and north, elevation in m, and the two gauges
# whose mean is its normals.
EARLIER: Final = ("R13", "Gantry Moss", (11.8, 11.9), 610, ("R05", "R08"))

# What share of the days is missing at a gauge, and the years in which its outages lie; the other years are whole.
GAPS: Final[dict[str, tuple[float, tuple[int, ...]]]] = {
    "R04": (0.024, (2013, 2020, 2031)),
    "R06": (0.043, (2014, 2019, 2025, 2031)),
    "R07": (0.031, (2017, 2026, 2029)),
    "R09": (0.052, (2021, 2027, 2030, 2031)),
    "D10": (0.022, (2012, 2024)),
    "R11": (0.020, (2013, 2020)),
    "R13": (0.028, (2016, 2022)),
    "R12": (0.058, (2014, 2018, 2025, 2030)),
}
MISSING_CODE: Final = "-999"
CODED: Final = ("R04", "R07", "R12")  # gauges whose logger writes the code; the others' cells are empty

MOVED: Final = ("R03", "2021-01-02", 1.25)  # to where it catches more
IN_TENTHS: Final = ("R05", "2018-09-02", "2019-01-01")
STUCK: Final = ("R11", "2015-03-09", "2015-03-15", 3.4)
ALL_ZERO: Final = ("R06", "2013-11-05", "2013-11-28")
A_DAY_LATE: Final = ("D10", "2022-10-01", "2023-03-31")
COPIED: Final = ("R01", "2024-03", "2025-03")
BORROWED: Final = ("R07", "R12", "2023-02-10", "2023-03-20")
FULL_SCALE: Final = ("R12", ("2020-01-17", "2020-02-03"), 3276.7)
WEEKEND: Final = ("D10", "2016-10-22", "2016-10-24")  # Saturday and Sunday not read, all of it on Monday
SLIPPED_POINT: Final = ("R08", "2024-08-09")
CLOUDBURST: Final = ("R02", "2030-07-29", 58.4)  # no fault: it fell


def bell(rng: np.random.Generator, *shape: int) -> Values:
    """Return numbers near enough to normal: sums of six uniform ones, of mean 0 and variance 1."""
    total: Values = (rng.random((6, *shape)).sum(axis=0) - 3) * math.sqrt(2)
    return total


def mornings() -> Days:
    """Return the dates of the readings."""
    return np.arange(FIRST, LAST + 1)


def span(first: str, last: str) -> slice:
    """Return the rows of the readings of two dates and all between."""
    return slice(int((np.datetime64(first) - FIRST).astype(int)), int((np.datetime64(last) - FIRST).astype(int)) + 1)


def wetness(rng: np.random.Generator, at: Values, month: npt.NDArray[np.int64]) -> Values:
    """Return how wet every day is at every gauge, shape (days, gauges): alike in winter, patchy in summer."""
    n, gauges = len(month), len(at)
    weather = bell(rng, n)
    # Wet and dry spells: what a day owes to the one before.
    for k in range(1, n):
        weather[k] = 0.42 * weather[k - 1] + math.sqrt(1 - 0.42**2) * weather[k]
    nodes = np.array([(x, y) for x in range(-10, 31, 8) for y in range(-6, 27, 8)], dtype=float)
    distance2 = ((at[:, None, :] - nodes) ** 2).sum(axis=2)
    reach = np.exp(-distance2 / (2 * 8.0**2))
    reach /= np.sqrt((reach**2).sum(axis=1, keepdims=True))
    patch = bell(rng, n, len(nodes)) @ reach.T
    own = bell(rng, n, gauges)
    summer = 0.5 - 0.5 * np.cos(2 * np.pi * (month - 1) / 12)
    share_patch, share_own = (0.08 + 0.16 * summer)[:, None], (0.015 + 0.045 * summer)[:, None]
    wet: Values = np.sqrt(share_patch) * patch + np.sqrt(share_own) * own
    wet += np.sqrt(1 - share_patch - share_own) * weather[:, None]
    return wet


def rain(rng: np.random.Generator, at: Values, elevation: Values, normals: Values) -> Values:
    """Return the true daily depths in mm, shape (days, gauges): by month near the normals, in whole tips."""
    # A reading of the first morning of a month is of the last day of the month before.
    day = mornings() - 1
    month = day.astype("datetime64[M]").astype(np.int64) % 12 + 1
    year = day.astype("datetime64[Y]").astype(np.int64) - 42
    wet_share = 0.27 + 0.16 * (0.5 + 0.5 * np.cos(2 * np.pi * (np.arange(12) - 9.6) / 12))
    days_of_month = np.array([31, 28.25, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])
    z = wetness(rng, at, month)
    depth = np.zeros(z.shape)
    for m in range(12):
        rows = np.flatnonzero(month == m + 1)
        # By rank, so that every gauge has its share of wet days and its normal, whatever the law of the wetness.
        rank = (np.argsort(np.argsort(z[rows], axis=0), axis=0) + 0.5) / len(rows)
        share = wet_share[m] * (1 + 0.15 * (elevation - 500) / 1000)
        mean = normals[:, m] / days_of_month[m] / share / math.gamma(1 + 1 / SHAPE)
        wet = np.maximum(rank - (1 - share), 0.0) / share
        depth[rows] = mean * (-np.log(1 - wet)) ** (1 / SHAPE)
    years = int(year.max()) + 1 - int(year.min())
    depth *= (0.9 + 0.2 * rng.random((years, 1)))[year - year.min()]
    depth *= (0.97 + 0.06 * rng.random((years, len(at))))[year - year.min()]
    tips: Values = np.round(depth / TIP) * TIP
    return tips


def storm_days(demo: dict[str, Any]) -> tuple[slice, Values]:
    """Return the rows of the first demo's whole days and its depths in them."""
    generator = np.random.default_rng(demo["SEED"])
    demo["basins"](generator)
    demo["normals"](generator)
    hourly = demo["rain"](generator)
    stops = range(24 + demo["READ_HOUR"], demo["HOURS"] + 1, 24)
    first = str((demo["START"] + np.timedelta64(stops[0] * 60, "m")).astype("datetime64[D]"))
    begin = span(first, first).start
    return slice(begin, begin + len(stops)), np.array([hourly[stop - 24 : stop].sum(axis=0) for stop in stops])


def earlier(demo: dict[str, Any], gauges: list[list[str]]) -> list[str]:
    """Return the row of the gauge list for the gauge that was closed."""
    gauge, name, place, elevation, (one, other) = EARLIER
    lon, lat = demo["to_lonlat"](np.array([place]))[0]
    rows = {row[0]: np.array(row[5:], dtype=float) for row in gauges[1:]}
    normals = np.floor((rows[one] + rows[other]) / 2)
    return [gauge, name, f"{lon:.5f}", f"{lat:.5f}", str(elevation), *(f"{normal:.0f}" for normal in normals)]


def plant(depth: Values, ids: list[str]) -> Values:
    """Return the depths with all that is wrong with them, except for what is missing."""
    depth = depth.copy()

    gauge, first, factor = MOVED
    rows = slice(span(first, first).start, None)
    depth[rows, ids.index(gauge)] = np.round(depth[rows, ids.index(gauge)] * factor / TIP) * TIP

    gauge, first, last = IN_TENTHS
    depth[span(first, last), ids.index(gauge)] *= 10

    gauge, first, last, value = STUCK
    depth[span(first, last), ids.index(gauge)] = value

    gauge, first, last = ALL_ZERO
    depth[span(first, last), ids.index(gauge)] = 0.0

    gauge, first, last = A_DAY_LATE
    late = depth[span(first, last), ids.index(gauge)]
    late[1:] = late[:-1].copy()
    late[0] = np.nan  # no reading of that date; the last day's is lost

    gauge, source, target = COPIED
    days = 31
    to, origin = (span(f"{month}-02", f"{month}-02").start for month in (target, source))
    depth[to : to + days, ids.index(gauge)] = depth[origin : origin + days, ids.index(gauge)]

    gauge, other, first, last = BORROWED
    depth[span(first, last), ids.index(gauge)] = depth[span(first, last), ids.index(other)]

    gauge, dates, value = FULL_SCALE
    for date in dates:
        depth[span(date, date), ids.index(gauge)] = value

    gauge, first, last = WEEKEND
    weekend = depth[span(first, last), ids.index(gauge)]
    weekend[-1] = weekend.sum()
    weekend[:-1] = 0.0

    gauge, date = SLIPPED_POINT
    depth[span(date, date), ids.index(gauge)] *= 10

    gauge, date, value = CLOUDBURST
    depth[span(date, date), ids.index(gauge)] = value
    return depth


def outages(rng: np.random.Generator, ids: list[str]) -> npt.NDArray[np.bool_]:
    """Return where readings are missing, shape (days, gauges): outages of 1 to 40 days, clear of what is planted."""
    day = mornings() - 1
    year = day.astype("datetime64[Y]").astype(np.int64) + 1970
    missing = np.zeros((len(day), len(ids)), dtype=bool)
    planted = np.zeros(missing.shape, dtype=bool)
    for gauge, first, last in (ALL_ZERO, A_DAY_LATE, STUCK[:3], (BORROWED[0], *BORROWED[2:]), WEEKEND):
        planted[span(first, last), ids.index(gauge)] = True
    for date in FULL_SCALE[1]:
        planted[span(date, date), ids.index(FULL_SCALE[0])] = True
    for gauge, (share, years) in GAPS.items():
        g = ids.index(gauge)
        wanted = round(share * len(day))
        within = np.flatnonzero(np.isin(year, years))
        while missing[:, g].sum() < wanted:
            start = int(within[int(rng.random() * len(within))])
            stop = start + 1 + int(40 * rng.random() ** 3)
            if stop <= within[-1] and (year[start:stop] == year[start]).all() and not planted[start:stop, g].any():
                missing[start:stop, g] = True
    # In October 2031 the gauges are silent that are so in the first demo, and no others.
    missing[span("2031-10-01", "2031-10-31")] = False
    for gauge, first, last in (
        ("R04", "2031-10-12", "2031-10-13"),
        ("R06", "2031-10-12", "2031-10-12"),
        ("R09", "2031-10-10", "2031-10-14"),
    ):
        missing[span(first, last), ids.index(gauge)] = True
    return missing


def table(rows: list[list[str]]) -> str:
    """Return rows as CSV text."""
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return text.getvalue()


def main(folder: Path) -> None:
    """Write the data files into ``folder``."""
    here = Path(__file__).parent
    demo = runpy.run_path(str(here / "make_demo.py"))
    gauges = [line.split(",") for line in (here / "gauges.csv").read_text(encoding="utf-8").splitlines()]
    at = np.array([*(gauge[2:4] for gauge in demo["GAUGES"]), EARLIER[2]], dtype=float)
    gauges.append(earlier(demo, gauges))
    ids = [row[0] for row in gauges[1:]]
    elevation = np.array([row[4] for row in gauges[1:]], dtype=float)
    normals = np.array([row[5:] for row in gauges[1:]], dtype=float)

    rng = np.random.default_rng(SEED)
    depth = rain(rng, at, elevation, normals)
    rows, storm = storm_days(demo)
    depth[rows, : storm.shape[1]] = storm
    depth = plant(depth, ids)
    missing = outages(rng, ids) | np.isnan(depth)
    in_service = np.ones(depth.shape, dtype=bool)
    for gauge, date in OPENED.items():
        in_service[: span(date, date).start + 1, ids.index(gauge)] = False
    for gauge, date in CLOSED.items():
        in_service[span(date, date).start + 1 :, ids.index(gauge)] = False

    cells = np.char.mod("%.1f", np.nan_to_num(depth)).astype(object)
    for g, gauge in enumerate(ids):
        cells[missing[:, g], g] = MISSING_CODE if gauge in CODED else ""
    cells[~in_service] = ""
    record = [["date", *ids], *([str(date), *row] for date, row in zip(mornings(), cells, strict=True))]
    head = [*gauges[0][:5], "opened", "closed", *gauges[0][5:]]
    listed = [head, *([*r[:5], OPENED.get(r[0], ""), CLOSED.get(r[0], ""), *r[5:]] for r in gauges[1:])]
    for name, text in (("gauges.csv", table(listed)), ("rain_daily.csv", table(record))):
        (folder / name).write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "record")
