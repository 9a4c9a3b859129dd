"""Numbers and units as people read them in the report: 0.1 mm, 0.01 in, weights with 3 decimals; a gap is a dash."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from decimal import ROUND_HALF_UP, Decimal
from typing import Final

import numpy as np
import numpy.typing as npt
from markupsafe import Markup

from basinrain.tables import time_text

__all__ = [
    "DASH",
    "NARROW_SPACE",
    "area_text",
    "counted",
    "depth_decimals",
    "depth_text",
    "depth_texts",
    "error_text",
    "inline",
    "number_text",
    "percent_text",
    "round_to_sum",
    "short_names",
    "step_text",
    "unbroken",
    "unit_text",
    "unit_word",
    "volume_text",
    "weight_text",
    "when_text",
    "zone_text",
]

DASH: Final = "–"
"""Stands wherever there is no number; never zero."""

NARROW_SPACE: Final = "\u202f"
"""Parts thousands and stands before a per cent sign; lines do not break at it."""

_UNITS: Final = {"m2": "m²", "km2": "km²", "ft2": "ft²", "mi2": "mi²", "m3": "m³"}
_STEP_WORDS: Final = {"min": "min", "h": "h", "d": "day", "mo": "month"}
_CONTROL: Final = re.compile(r"[\x00-\x1f\x7f-\x9f\ud800-\udfff\ufffe\uffff]+")


def depth_decimals(unit: str) -> int:
    """Return the decimals of a printed depth: 2 for inches, else 1."""
    return 2 if unit == "in" else 1


def number_text(value: float, decimals: int, *, grouped: bool = False) -> str:
    """Return a number with fixed decimals, halves away from zero as the trade rounds; a dash for NaN.

    Examples
    --------
    >>> number_text(1.25, 1), number_text(-0.01, 1), number_text(-2.0, 1), number_text(float("nan"), 1)
    ('1.3', '0.0', '−2.0', '–')
    >>> number_text(3312700.4, 0, grouped=True).split(NARROW_SPACE)
    ['3', '312', '700']
    """
    if math.isnan(value):
        return DASH
    rounded = _half_up(value, decimals)
    text = f"{rounded:,f}" if grouped else f"{rounded:f}"
    if not text.strip("-0.,"):
        text = text.lstrip("-")
    return text.replace(",", NARROW_SPACE).replace("-", "−")


def _half_up(value: float, decimals: int) -> Decimal:
    """Round a half up, also one that binary fractions miss by a little: 25.25 is 25.3."""
    return Decimal(f"{value:.{decimals + 6}f}").quantize(Decimal(1).scaleb(-decimals), ROUND_HALF_UP)


def depth_text(depth: float, unit: str) -> str:
    """Return a depth that is given in ``unit``.

    Examples
    --------
    >>> depth_text(33.127, "mm"), depth_text(1.1244, "in"), depth_text(float("nan"), "mm")
    ('33.1', '1.12', '–')
    """
    return number_text(depth, depth_decimals(unit))


def error_text(error: float, unit: str) -> str:
    """Return an error of many depths, given in ``unit``, with one decimal more than a depth.

    Examples
    --------
    >>> error_text(11.404, "mm"), error_text(0.4489, "in"), error_text(float("nan"), "mm")
    ('11.40', '0.449', '–')
    """
    return number_text(error, depth_decimals(unit) + 1)


def depth_texts(depths: npt.ArrayLike, unit: str) -> list[str]:
    """Return the depths of a series, rounded so that what is printed sums to the printed total.

    Examples
    --------
    >>> depth_texts([0.24, 0.24, 0.0, 0.24], "mm")  # the total is 0.72
    ['0.3', '0.2', '0.0', '0.2']
    """
    decimals = depth_decimals(unit)
    return [number_text(float(v), decimals) for v in round_to_sum(depths, decimals)]


def round_to_sum(values: npt.ArrayLike, decimals: int) -> npt.NDArray[np.float64]:
    """Round a series so that the rounded values sum to its rounded total.

    Every value is rounded down, and the units that the total still lacks go to the values that lost most (largest
    remainder; of equal ones the first). No value moves by a whole unit of the last decimal, and zero stays zero.

    Parameters
    ----------
    values : array of float, shape (n,)
        A series with a NaN has no total: its values are rounded one by one.
    decimals : int
        Decimals kept.

    Returns
    -------
    array of float, shape (n,)

    Examples
    --------
    >>> round_to_sum([1.04, 1.04, 1.04, 0.0], 1)  # the total is 3.12, which prints as 3.1
    array([1.1, 1. , 1. , 0. ])
    >>> round_to_sum([0.25, float("nan")], 1)
    array([0.3, nan])
    >>> round_to_sum([], 1)
    array([], dtype=float64)
    """
    array = np.asarray(values, dtype=float)
    if array.size == 0 or np.isnan(array).any():
        return np.array([v if math.isnan(v) else float(_half_up(v, decimals)) for v in array.tolist()])
    # Rounded at the 6th further decimal, so that 0.7 * 10 is 7 and not a little more.
    scaled = np.round(array * 10.0**decimals, 6)
    units = np.floor(scaled)
    total = int(_half_up(float(array.sum()), decimals).scaleb(decimals))
    lacking = total - int(units.sum())
    order = np.argsort(-(scaled - units), kind="stable")
    # Beyond one unit for each value only where the sum of many values and of their rounded-down parts drift apart.
    everyone, some = divmod(lacking, len(array))
    units += everyone
    units[order[:some]] += 1
    return np.round(units / 10.0**decimals, decimals)


def weight_text(weight: float) -> str:
    """Return a weight with 3 decimals.

    Examples
    --------
    >>> weight_text(0.42549), weight_text(0.0), weight_text(float("nan"))
    ('0.425', '0.000', '–')
    """
    return number_text(weight, 3)


def percent_text(share: float) -> str:
    """Return a share of 1 in per cent, 1 decimal.

    Examples
    --------
    >>> percent_text(0.0724).replace(NARROW_SPACE, " "), percent_text(float("nan"))
    ('7.2 %', '–')
    """
    return DASH if math.isnan(share) else f"{number_text(100 * share, 1)}{NARROW_SPACE}%"


def area_text(area: float) -> str:
    """Return an area with about four digits.

    Examples
    --------
    >>> area_text(512.37), area_text(43.218), area_text(1.23456)
    ('512.4', '43.22', '1.235')
    """
    return number_text(area, 1 if area >= 100 else 2 if area >= 10 else 3, grouped=True)


def volume_text(volume: float) -> str:
    """Return a volume in whole units from 1000 on, with 1 decimal below.

    Examples
    --------
    >>> volume_text(812.34), volume_text(float("nan"))
    ('812.3', '–')
    """
    return number_text(volume, 0 if abs(volume) >= 1000 else 1, grouped=True)


def unbroken(text: str) -> Markup:
    """Return a text for a table that is never broken at the end of a line, such as a time.

    Examples
    --------
    >>> unbroken("2031-05-04 06:00")
    Markup('<span class="unbroken">2031-05-04 06:00</span>')
    """
    return Markup('<span class="unbroken">{}</span>').format(text)


def unit_text(unit: str) -> str:
    """Return a unit as it is printed.

    Examples
    --------
    >>> unit_text("km2"), unit_text("mm")
    ('km²', 'mm')
    """
    return _UNITS.get(unit, unit)


def unit_word(unit: str) -> str:
    """Return a unit as it reads in a sentence.

    Examples
    --------
    >>> unit_word("in"), unit_word("mm"), unit_word("km2")
    ('inches', 'mm', 'km²')
    """
    return "inches" if unit == "in" else unit_text(unit)


def when_text(when: np.datetime64) -> str:
    """Return a time of the record's clock to the minute, or the second where that counts; a dash for no time.

    Examples
    --------
    >>> when_text(np.datetime64("2031-05-04T06:00")), when_text(np.datetime64("NaT"))
    ('2031-05-04 06:00', '–')
    """
    if np.isnat(when):
        return DASH
    return time_text(when, "").replace("T", " ")


def zone_text(zone: str) -> str:
    """Return how a record's clock is called.

    Examples
    --------
    >>> zone_text("+09:00"), zone_text("+00:00"), zone_text("")
    ('UTC+09:00', 'UTC', "the record's clock")
    """
    if not zone:
        return "the record's clock"
    return "UTC" if zone == "+00:00" else f"UTC{zone}".replace("-", "−")


def step_text(step: str) -> str:
    """Return a step in words.

    Examples
    --------
    >>> step_text("1h"), step_text("15min"), step_text("1d"), step_text("storm")
    ('1 h', '15 min', '1 day', 'storm')
    """
    match = re.fullmatch(r"(\d+)([a-z]+)", step)
    if match is None:
        return step
    count, word = match.groups()
    return f"{count} {_STEP_WORDS.get(word, word)}"


def counted(count: int, one: str, many: str = "") -> str:
    """Return a count with its noun.

    Examples
    --------
    >>> counted(1, "gauge"), counted(3, "gauge"), counted(2, "gauge has", "gauges have")
    ('1 gauge', '3 gauges', '2 gauges have')
    """
    return f"{count} {one if count == 1 else many or one + 's'}"


def inline(text: str, longest: int = 0) -> str:
    """Return a name from a file fit for one line: no control characters, at most ``longest`` letters if given.

    Examples
    --------
    >>> inline("Upper" + chr(7) + "Mill"), inline("Somewhere far away", 10)
    ('Upper Mill', 'Somewhere…')
    """
    clean = _CONTROL.sub(" ", text).strip()
    return clean if not longest or len(clean) <= longest else clean[: longest - 1].rstrip() + "…"


def short_names(names: Sequence[str], longest: int) -> list[str]:
    """Return names of at most ``longest`` letters, cut so that what tells them apart is kept where it can be.

    Examples
    --------
    >>> short_names(["Mill", "Upper Mill Gauge 1", "Upper Mill Gauge 2"], 12)
    ['Mill', 'Upper…auge 1', 'Upper…auge 2']
    >>> short_names(["Upper Mill Gauge", "Lower Mill Gauge"], 12)
    ['Upper Mill…', 'Lower Mill…']
    """
    clean = [inline(name) for name in names]
    cut = [inline(name, longest) for name in clean]
    alike = {text for text in cut if cut.count(text) > 1}
    half = longest // 2
    return [
        name[: longest - half - 1].rstrip() + "…" + name[len(name) - half :].lstrip()
        if text in alike and len(name) > longest
        else text
        for name, text in zip(clean, cut, strict=True)
    ]
