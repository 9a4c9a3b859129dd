"""Clean rain over a small invented network, and the faults that are planted in it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cache

import numpy as np
import numpy.typing as npt
from scipy.signal import lfilter

from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord
from basinrain.screening import ScreeningOptions
from basinrain.screening.envelope import envelope_depth, world_depth

Floats = npt.NDArray[np.float64]
Generator = np.random.Generator

DAY = 86400
N_GAUGES = 12
REGION = ((1.0, 90.0), (24.0, 260.0), (72.0, 420.0), (720.0, 1100.0))
"""Hours and mm of an invented region's greatest depths, above all that falls in the clean records."""


@dataclass(frozen=True, eq=False)
class Planted:
    """A record with one fault: whose it is and where it stands, as steps ``first`` to ``stop`` (not included).

    ``options`` is what the user says of the record.
    """

    record: RainRecord
    network: GaugeNetwork
    gauge: str
    first: int
    stop: int
    options: ScreeningOptions = field(default_factory=ScreeningOptions)

    @property
    def start(self) -> np.datetime64:
        """Beginning of the fault."""
        return np.datetime64(self.record.starts[self.first])

    @property
    def end(self) -> np.datetime64:
        """End of the fault."""
        return np.datetime64(self.record.ends[self.stop - 1])


def drawn_network(rng: Generator, n: int = N_GAUGES) -> GaugeNetwork:
    """Return gauges at random over 60 km by 40 km, none nearer than 3 km to another."""
    places: list[tuple[float, float]] = []
    while len(places) < n:
        place = (float(rng.uniform(0, 60e3)), float(rng.uniform(0, 40e3)))
        if all((place[0] - x) ** 2 + (place[1] - y) ** 2 > 3e3**2 for x, y in places):
            places.append(place)
    x, y = np.array(places).T
    return GaugeNetwork(ids=tuple(f"P{k:02d}" for k in range(1, n + 1)), x=x, y=y, crs="local")


@dataclass(frozen=True)
class Weather:
    """A kind of rain: normal noise in space and time, cut at a threshold and bent upwards.

    ``reach`` (m) and ``memory`` (per step) say how noise is correlated, ``nugget`` how much of it is a gauge's alone,
    ``wet`` the share of wet steps, ``scale`` (mm) and ``power`` the size and skew of depths, ``speed`` (m a step) the
    eastward motion, ``resolution`` the gauges' (mm).
    """

    reach: float
    memory: float
    nugget: float
    wet: float
    scale: float
    power: float
    resolution: float
    speed: float = 0.0


FRONTS = Weather(reach=160e3, memory=0.45, nugget=0.03, wet=0.42, scale=4.5, power=1.7, resolution=0.1)
SHOWERS = Weather(reach=35e3, memory=0.25, nugget=0.08, wet=0.30, scale=8.0, power=1.9, resolution=0.1)
HOURS = Weather(reach=70e3, memory=0.88, nugget=0.05, wet=0.09, scale=2.4, power=1.7, resolution=0.2, speed=35e3)


def rain(rng: Generator, network: GaugeNetwork, weather: Weather, n: int, wetness: Floats) -> Floats:
    """Return depths in mm of ``n`` steps, shape (n, n_gauges), on average ``wetness`` times the weather's."""
    distances = network.distances()
    late = np.zeros(len(network), dtype=np.int64)
    if weather.speed:
        late = np.rint(network.x / weather.speed).astype(np.int64)
    covariance = (1 - weather.nugget) * np.exp(-distances / weather.reach) + weather.nugget * np.eye(len(network))
    more = int(late.max())
    noise = rng.standard_normal((n + more, len(network))) @ np.linalg.cholesky(covariance).T
    innovation = np.sqrt(1 - weather.memory**2)
    # The first step is the noise itself, then each is memory times the one before and innovation times the noise.
    field, _ = lfilter([innovation], [1, -weather.memory], noise, axis=0, zi=(1 - innovation) * noise[:1])
    field = np.stack([field[more - late[g] : more - late[g] + n, g] for g in range(len(network))], axis=1)
    above = np.maximum(field - np.sqrt(2) * _inverse_erf(1 - 2 * weather.wet), 0)
    depths: Floats = np.round(weather.scale * wetness * above**weather.power / weather.resolution) * weather.resolution
    return depths.round(3)


def _inverse_erf(x: float) -> float:
    from scipy.special import erfinv

    return float(erfinv(x))


def record_of(network: GaugeNetwork, depths: Floats, seconds: int) -> RainRecord:
    """Return the record of depths in steps from the first of January 2021."""
    ends = np.datetime64("2021-01-01T00:00:00", "s") + np.arange(1, len(depths) + 1) * np.timedelta64(seconds, "s")
    step = "1d" if seconds == DAY else "1h"
    return RainRecord.from_depths(network.ids, ends - np.timedelta64(seconds, "s"), ends, depths, step=step)


Fault = Callable[[Generator, Floats, int, int], tuple[int, int]]
"""Changes the depths of one gauge in place, given its column and the steps a day, and returns where."""


def _gaps(rng: Generator, depths: Floats, share: float, length: int) -> Floats:
    holed = depths.copy()
    for g in range(depths.shape[1]):
        for _ in range(rng.poisson(share * len(depths) / length)):
            first = int(rng.integers(len(depths)))
            holed[first : first + 1 + int(rng.exponential(length)), g] = np.nan
    return holed


@cache
def clean_days(seed: int, years: int = 5) -> tuple[GaugeNetwork, Floats]:
    """Return a network and clean daily depths: fronts from October to May, showers in summer, two percent missing."""
    rng = np.random.default_rng([seed, 1])
    network = drawn_network(rng)
    n = 365 * years + years // 4
    day = np.arange(n)
    month = (np.datetime64("2021-01-01") + day).astype("datetime64[M]").astype(np.int64) % 12 + 1
    summer = (month >= 6) & (month <= 9)
    wetness = rng.uniform(0.75, 1.35, len(network))
    # Mountains that make winters wet make summers less so.
    in_summer = wetness**0.7
    depths = np.where(
        summer[:, None],
        rain(rng, network, SHOWERS, n, in_summer),
        rain(rng, network, FRONTS, n, wetness),
    )
    return network, _gaps(rng, depths, 0.02, 6)


@cache
def clean_hours(seed: int, days: int = 365) -> tuple[GaugeNetwork, Floats]:
    """Return a network and clean hourly depths that move eastward, one percent missing."""
    rng = np.random.default_rng([seed, 2])
    network = drawn_network(rng)
    wetness = rng.uniform(0.75, 1.35, len(network))
    return network, _gaps(rng, rain(rng, network, HOURS, 24 * days, wetness), 0.01, 30)


@cache
def thirty_years(seed: int) -> tuple[GaugeNetwork, Floats]:
    """Return a network and thirty calendar years of clean days from 2021, none missing."""
    rng = np.random.default_rng([seed, 4])
    network = drawn_network(rng)
    n = int((np.datetime64("2051-01-01") - np.datetime64("2021-01-01")).astype(np.int64))
    return network, rain(rng, network, FRONTS, n, rng.uniform(0.75, 1.35, len(network)))


def _wet_places(depths: Floats, gauge: int, length: int, least: float) -> npt.NDArray[np.int64]:
    """Return where stretches begin with so much or more by the mean of the gauges, over which the gauge reports."""
    middle = np.nan_to_num(np.nanmean(depths, axis=1))
    through = np.concatenate([[0.0], np.cumsum(middle)])
    silent = np.concatenate([[0], np.cumsum(np.isnan(depths[:, gauge]))])
    return np.flatnonzero((through[length:] - through[:-length] >= least) & (silent[length:] == silent[:-length]))


def _decimal_point(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Make a wet day's depth ten times too great."""
    first = int(rng.choice(np.flatnonzero(depths[:, g] >= 8)))
    depths[first, g] *= 10
    return first, first + 1


def _impossible(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Give a step a depth that no rain reaches."""
    first = int(rng.integers(len(depths)))
    depths[first, g] = rng.uniform(450, 900) if per == 24 else rng.uniform(1900, 4000)
    return first, first + 1


def _implausible(limit: Callable[[float], float]) -> Fault:
    """Return the planting of 1.02 to 1.8 times the limit over one or three steps, the rain unevenly among them."""

    def plant(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
        length = int(rng.choice([1, 3]))
        first = int(rng.integers(len(depths) - length + 1))
        total = limit(length * 24 / per) * rng.uniform(1.02, 1.8)
        depths[first : first + length, g] = total * rng.dirichlet(np.full(length, 5.0))
        return first, first + length

    return plant


def _decimal_hour(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Make the depth of an hour with 4 mm or more ten times too great."""
    first = int(rng.choice(np.flatnonzero(depths[:, g] >= 4)))
    depths[first, g] *= 10
    return first, first + 1


def _cloudburst(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Add 40 to 120 mm to an hour, whatever the weather."""
    first = int(rng.choice(np.flatnonzero(np.isfinite(depths[:, g]))))
    depths[first, g] += rng.uniform(40, 120)
    return first, first + 1


def _zero_hours(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put zeros over a day on which all gauges but one have 1 mm or more and together 12 mm or more on average."""
    days = depths.reshape(-1, per, depths.shape[1]).sum(axis=1)
    told = np.isfinite(days[:, g]) & (np.isfinite(days).sum(axis=1) > days.shape[1] // 2)
    places = np.flatnonzero(told)
    kept = (np.sort(days[places], axis=1)[:, 1] >= 1) & (np.nanmean(days[places], axis=1) >= 12)
    first = int(rng.choice(places[kept])) * per
    depths[first : first + per, g] = 0
    return first, first + per


def _zero_day(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put a zero on a day on which every gauge has 1 mm or more and all together 15 mm or more on average."""
    places = _wet_places(depths, g, 1, 15.0)
    first = int(rng.choice(places[np.nanmin(depths[places], axis=1) >= 1]))
    depths[first, g] = 0
    return first, first + 1


def _zeros(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put zeros over 30 to 90 days with 50 mm or more at the gauges' mean."""
    length = int(rng.integers(30, 91)) * per
    first = int(rng.choice(_wet_places(depths, g, length, 50.0)))
    depths[first : first + length, g] = 0
    return first, first + length


def _stuck(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Repeat one of the gauge's own wet values over 8 to 30 days, or 18 to 72 hours, on end."""
    length = int(rng.integers(18, 73) if per == 24 else rng.integers(8, 31))
    first = int(rng.integers(len(depths) - length))
    wet = depths[depths[:, g] > 0, g]
    depths[first : first + length, g] = rng.choice(wet)
    return first, first + length


def _code(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put a code of a missing value over two to ten steps, in mm, tenths of mm or inches."""
    length = int(rng.integers(2, 11))
    first = int(rng.integers(len(depths) - length))
    depths[first : first + length, g] = float(rng.choice([999.0, 9999.0, 999.9, 777.0, 888.8])) * float(
        rng.choice([1.0, 0.1, 25.4])
    )
    return first, first + length


def _unit(factor: float, months: tuple[int, int]) -> Fault:
    def plant(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
        length = min(len(depths), 30 * int(rng.integers(months[0], months[1] + 1)) * per)
        first = int(rng.integers(len(depths) - length + 1))
        depths[first : first + length, g] *= factor
        return first, first + length

    return plant


def _shift(steps: tuple[int, ...], days: int) -> Fault:
    def plant(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
        length = min(len(depths), days * per)
        first = int(rng.integers(len(depths) - length + 1))
        by = int(rng.choice(steps))
        depths[first : first + length, g] = np.roll(depths[first : first + length, g], by)
        return first, first + length

    return plant


def _copied(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Copy thirty days, with eight wet steps or more, to a later time."""
    length = 30 * per
    wet = np.concatenate([[0], np.cumsum(depths[:, g] > 0)])
    silent = np.concatenate([[0], np.cumsum(np.isnan(depths[:, g]))])
    n = len(depths) - 2 * length
    full = np.flatnonzero(((wet[length:] - wet[:-length] >= 8) & (silent[length:] == silent[:-length]))[:n])
    origin = int(rng.choice(full))
    first = int(rng.integers(origin + length, len(depths) - length + 1))
    depths[first : first + length, g] = depths[origin : origin + length, g]
    return first, first + length


def _twin(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put sixty to 180 days of another gauge's record in the place of the gauge's own."""
    length = int(rng.integers(60, 181)) * per
    first = int(rng.integers(len(depths) - length))
    other = int(rng.choice([j for j in range(depths.shape[1]) if j != g]))
    depths[first : first + length, g] = depths[first : first + length, other]
    return first, first + length


def _accumulated(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Put zeros or gaps over two to six days with 20 mm or more at the gauges' mean, then their sum."""
    length = int(rng.integers(3, 8))
    places = _wet_places(depths[:-1], g, length - 1, 20.0)
    first = int(rng.choice(places[~np.isnan(depths[places + length - 1, g])]))
    total = depths[first : first + length, g].sum()
    depths[first : first + length - 1, g] = rng.choice([0.0, np.nan])
    depths[first + length - 1, g] = total
    return first, first + length


def _mondays(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Add Saturdays and Sundays to Monday's depth and make them zero."""
    # The first of January 2021 was a Friday.
    for saturday in range(1, len(depths) - 2, 7):
        depths[saturday + 2, g] += np.nan_to_num(depths[saturday : saturday + 2, g]).sum()
        depths[saturday : saturday + 2, g] = 0
    return 0, len(depths)


def _other_hours(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Move part of every day's rain, a third to two thirds on average, to the next date."""
    share = rng.uniform(1 / 3, 2 / 3)
    moved = np.nan_to_num(depths[:-1, g]) * share * rng.choice([0.0, 0.5, 1.0, 1.5], len(depths) - 1).clip(0, 1 / share)
    depths[:-1, g] -= moved
    depths[1:, g] += moved
    depths[:, g] = depths[:, g].round(1)
    return 0, len(depths)


def _complete(years: int) -> Fault:
    """Return the planting that leaves so many years complete, less up to 18 days, and takes 19 or more from others."""

    def plant(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
        year = (np.datetime64("2021-01-01") + np.arange(len(depths))).astype("datetime64[Y]").astype(np.int64)
        kept = rng.choice(np.unique(year), years, replace=False)
        for one in np.unique(year):
            days = np.flatnonzero(year == one)
            # 95 % of 365 or 366 days are all but 18.25 or 18.3.
            lost = int(rng.integers(0, 19) if one in kept else rng.choice([19, int(rng.integers(19, 366)), len(days)]))
            depths[rng.choice(days, lost, replace=False), g] = np.nan
        return 0, len(depths)

    return plant


def _nothing(rng: Generator, depths: Floats, g: int, per: int) -> tuple[int, int]:
    """Change nothing: the fault is what the user says of the gauge."""
    return 0, len(depths)


def _third_of_world(hours: float) -> float:
    return world_depth(hours) / 3


def _of_region(hours: float) -> float:
    return envelope_depth(REGION, hours)


def _no_words(gauge: str) -> ScreeningOptions:
    return ScreeningOptions()


def _regional(gauge: str) -> ScreeningOptions:
    return ScreeningOptions(envelope=REGION)


def _unheated(gauge: str) -> ScreeningOptions:
    return ScreeningOptions(unheated=(gauge,), cold_months=(12, 1, 2))


@dataclass(frozen=True)
class Kind:
    """One kind of fault: the check that should find it, what is planted, and in which records.

    ``says`` gives the user's options from the gauge; ``severity``, where given, is the one that the finding must have;
    ``evidence`` are words that must stand in it, ``{gauge}`` for the gauge.
    """

    name: str
    check: str
    plant: Fault
    scales: tuple[str, ...] = ("day", "hour")
    says: Callable[[str], ScreeningOptions] = _no_words
    severity: str = ""
    evidence: str = ""


KINDS = (
    Kind("impossible depth", "greatest-depths", _impossible),
    Kind("over a third of the world's", "greatest-depths", _implausible(_third_of_world), severity="doubtful"),
    Kind("over the region's", "greatest-depths", _implausible(_of_region), says=_regional, severity="doubtful"),
    Kind("decimal point", "spatial-outlier", _decimal_point, ("day",)),
    Kind("decimal point in an hour", "spatial-outlier", _decimal_hour, ("hour",)),
    Kind("40 to 120 mm too much in an hour", "spatial-outlier", _cloudburst, ("hour",)),
    Kind("zero among wet", "zero-among-wet", _zero_day, ("day",)),
    Kind("a day of zeros among wet", "zero-among-wet", _zero_hours, ("hour",)),
    Kind("zeros for 30 to 90 days", "zero-run", _zeros),
    Kind("stuck value", "stuck-values", _stuck),
    Kind("missing code", "missing-code", _code),
    Kind("inches as mm throughout", "unit-mixup", _unit(1 / 25.4, (999, 999))),
    Kind("tenths as mm for 3 to 12 months", "unit-mixup", _unit(10.0, (3, 12))),
    Kind("tenths as mm for 1 or 2 months", "unit-mixup", _unit(10.0, (1, 2))),
    Kind("25.4 times for 3 to 12 months", "unit-mixup", _unit(25.4, (3, 12))),
    Kind("25.4 times for 1 or 2 months", "unit-mixup", _unit(25.4, (1, 2))),
    Kind("2.54 times for 6 to 18 months", "unit-mixup", _unit(2.54, (6, 18)), ("day",)),
    Kind("a day late throughout", "shifted-record", _shift((-1, 1), 9999), ("day",)),
    Kind("a day late for a year", "shifted-record", _shift((-1, 1), 365), ("day",)),
    Kind("5 to 12 hours late throughout", "shifted-record", _shift((-12, -8, -5, 5, 8, 12), 9999), ("hour",)),
    Kind("a month copied", "duplicated-stretch", _copied),
    Kind("another gauge's record", "one-record-two-gauges", _twin),
    Kind("accumulation", "unflagged-accumulation", _accumulated, ("day",)),
    Kind("Monday readings", "unflagged-accumulation", _mondays, ("day",)),
    Kind("days that end at another hour", "reading-hours", _other_hours, ("day",)),
    Kind(
        "4 complete years of 30",
        "short-record",
        _complete(4),
        ("thirty years",),
        evidence="1 gauge has fewer than the 10 complete years that normals take (95 % of the days of each): "
        "{gauge} 4.",
    ),
    Kind(
        "12 complete years of 30",
        "short-record",
        _complete(12),
        ("thirty years",),
        evidence="1 gauge has fewer than the 30 complete years of a standard normal (95 % of the days of each): "
        "{gauge} 12.",
    ),
    Kind("unheated in cold months", "cold-season", _nothing, says=_unheated, severity="remark"),
)


def planted(kind: Kind, scale: str, seed: int) -> Planted:
    """Return one of twenty clean records with a fault of this kind at a place and gauge of the seed's choice.

    No threshold was chosen by these records.
    """
    rng = np.random.default_rng([seed, 3, sum(kind.name.encode())])
    source = {"day": clean_days, "hour": clean_hours, "thirty years": thirty_years}[scale]
    network, clean = source(100 + seed % 20)
    depths = clean.copy()
    g = int(rng.integers(len(network)))
    seconds = 3600 if scale == "hour" else DAY
    first, stop = kind.plant(rng, depths, g, DAY // seconds)
    gauge = network.ids[g]
    return Planted(record_of(network, depths, seconds), network, gauge, first, stop, kind.says(gauge))
