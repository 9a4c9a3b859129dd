"""Which gauges the sources of a job and its network have in common."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import replace
from typing import Protocol

from basinrain.errors import DataError, Problems, nearest_name
from basinrain.gauges import GaugeNetwork
from basinrain.rainfall import RainRecord

__all__ = ["HasGauges", "check_membership", "without_gauges"]


class HasGauges(Protocol):
    """A source's record, or what stands for one."""

    @property
    def gauges(self) -> tuple[str, ...]:
        """The gauges' ids."""


def without_gauges(records: Mapping[int, RainRecord], exclude: Collection[str]) -> dict[int, RainRecord]:
    """Return the records without some gauges; a record of none but these is left out.

    Parameters
    ----------
    records
        One a source, by its number.
    exclude
        Ids; those that a record does not have do not matter.

    Examples
    --------
    >>> import numpy as np
    >>> ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    >>> hour = np.timedelta64(3600, "s")
    >>> one = RainRecord.from_depths(("A", "B"), ends - hour, ends, [[1.0, 9.0]], step="1h")
    >>> two = RainRecord.from_depths(("B",), ends - hour, ends, [[9.0]], step="1h")
    >>> [record.gauges for record in without_gauges({1: one, 2: two}, {"B"}).values()]
    [('A',)]
    """
    left = {}
    for number, record in records.items():
        gauges = tuple(gauge for gauge in record.gauges if gauge not in exclude)
        if len(gauges) == len(record.gauges):
            left[number] = record
        elif gauges:
            totals = tuple(total for total in record.totals if total.gauge not in exclude)
            recorders = record.recorders - set(exclude)
            left[number] = replace(record.ordered(gauges), totals=totals, recorders=recorders)
    return left


def check_membership(records: Sequence[HasGauges], network: GaugeNetwork) -> None:
    """Refuse gauges with rain values and no position, and gauges of the network without rain values.

    Parameters
    ----------
    records
        One a source.
    network

    Raises
    ------
    DataError
        With all such gauges, and which other one may have been meant.

    Examples
    --------
    >>> import numpy as np
    >>> ends = np.array(["2031-05-04T01"], dtype="datetime64[s]")
    >>> record = RainRecord.from_depths(("R1",), ends - np.timedelta64(3600, "s"), ends, [[1.0]], step="1h")
    >>> check_membership([record], GaugeNetwork(ids=("R01",), x=[0.0], y=[0.0], crs="local"))
    Traceback (most recent call last):
        ...
    basinrain.errors.DataError: gauge R1: found rain values, but no such gauge in the network; expected a gauge with a \
position; add it to the gauges, or correct its id in the rainfall file; did you mean 'R01'?
    gauge R01: found no rain values in any source; expected a column or rows of its own, if only of missing values; \
add them, or exclude the gauge; did you mean 'R1'?
    """
    problems = Problems()
    rain = dict.fromkeys(gauge for record in records for gauge in record.gauges)
    known = set(network.ids)
    silent = [gauge for gauge in network.ids if gauge not in rain]
    strange = [gauge for gauge in rain if gauge not in known]
    for gauge in strange:
        problems.add(
            item=f"gauge {gauge}",
            found="rain values, but no such gauge in the network",
            expected="a gauge with a position",
            remedy="add it to the gauges, or correct its id in the rainfall file" + _meant(gauge, silent, network.ids),
            gauge=gauge,
        )
    for gauge in silent:
        problems.add(
            item=f"gauge {gauge}",
            found="no rain values in any source",
            expected="a column or rows of its own, if only of missing values",
            remedy="add them, or exclude the gauge" + _meant(gauge, strange),
            gauge=gauge,
        )
    problems.raise_as(DataError)


def _meant(name: str, *groups: Sequence[str]) -> str:
    """Return the advice that names a gauge of the first group that has a like one."""
    plain = _plain(name)
    for group in groups:
        same = [other for other in group if _plain(other) == plain]
        advice = nearest_name(same[0] if same else name, same or group)
        if advice.startswith("did you mean"):
            return f"; {advice}"
    return ""


def _plain(name: str) -> str:
    """Return an id without what differs from list to list: capitals, and zeros before a number."""
    return re.sub(r"(?<![0-9])0+(?=[0-9])", "", name.strip().casefold())
