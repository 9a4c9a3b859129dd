"""Warnings that a reviewer of a long series would raise: drawn from the results of a run.

The limits are conventions of this package, chosen to make a reader look, not to pass or fail a result.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Final

import numpy as np
import numpy.typing as npt

from basinrain.notes import Note
from basinrain.series.dominance import Dominance
from basinrain.series.engine import SeriesSetup
from basinrain.series.long_term import LeftOut
from basinrain.series.network_changes import NetworkChange
from basinrain.series.policies import REWEIGHT
from basinrain.series.summary import SeriesSummary
from basinrain.tables import time_text

__all__ = ["series_cautions"]

_POLICY_PERCENT: Final = 5.0
_GAUGE_PERCENT: Final = 10.0
_OBSERVED: Final = 0.75
_DOMINANT: Final = 0.5
_LISTED: Final = 5

Times = npt.NDArray[np.datetime64]
Summaries = Mapping[tuple[str, str], SeriesSummary]


def series_cautions(
    setup: SeriesSetup,
    summaries: Summaries,
    left_out: Sequence[LeftOut],
    changes: Sequence[NetworkChange],
    dominant: Sequence[Dominance],
    *,
    usual: Mapping[str, npt.NDArray[np.float64]],
    ends: Times,
    zone: str,
) -> Iterator[Note]:
    """Yield warnings about series: network changed, policies apart, single gauges that decide, steps without a number.

    Parameters
    ----------
    setup, summaries, left_out, changes, dominant
        Parts of a run.
    usual : mapping to array of float, shape (n_basins, n_gauges)
        Weights with all gauges that were ever in service, by method.
    ends : array of datetime64, shape (n_steps,)
        Ends of the record's steps.
    zone
        Its clock.
    """
    if changes:
        gauges = sorted({change.gauge for change in changes})
        named = ", ".join(gauges[:_LISTED]) + (f" and {len(gauges) - _LISTED} more" if len(gauges) > _LISTED else "")
        times = len({change.time for change in changes})
        yield Note(
            code="network-changed",
            text=f"The network changed at {times} time{'s' if times > 1 else ''} during the record ({named} came, went "
            f"or fell silent for long; network_changes.csv): means before and after are not of the same gauges.",
        )
    yield from _policies_apart(setup, summaries)
    yield from _decided_by_one(setup, left_out)
    yield from _one_gauge(setup, usual)
    yield from _dominated(dominant, ends, zone)
    yield from _without_number(setup, summaries)
    yield from _without_totals(summaries)


def _policies_apart(setup: SeriesSetup, summaries: Summaries) -> Iterator[Note]:
    first = setup.gaps[0]
    for gaps in setup.gaps[1:]:
        for method in setup.methods:
            one, other = summaries[first, method].terms, summaries[gaps, method].terms
            percent = np.nan_to_num(other.percent_above(one))
            b = int(np.argmax(np.abs(percent)))
            if abs(percent[b]) > _POLICY_PERCENT:
                yield Note(
                    code="policies-apart",
                    text=f"By '{gaps}' the long-term mean of basin {setup.basins.ids[b]} is {abs(percent[b]):.1f} % "
                    f"{'above' if percent[b] > 0 else 'below'} that by '{first}' ({method}): how gaps are treated "
                    "decides as much as the rain.",
                    basin=setup.basins.ids[b],
                    method=method,
                )


def _decided_by_one(setup: SeriesSetup, left_out: Sequence[LeftOut]) -> Iterator[Note]:
    for gaps, method in setup.series:
        told = []
        for found in left_out:
            if (found.gaps, found.method) != (gaps, method):
                continue
            percent = np.nan_to_num(found.percent)
            b = int(np.argmax(np.abs(percent)))
            if abs(percent[b]) > _GAUGE_PERCENT:
                told.append((-abs(percent[b]), found.gauge, f"{percent[b]:+.1f} % in basin {setup.basins.ids[b]}"))
        told.sort()
        if told:
            named = ", ".join(f"{gauge} ({words})" for _, gauge, words in told[:_LISTED])
            more = f" and {len(told) - _LISTED} more" if len(told) > _LISTED else ""
            yield Note(
                code="mean-on-one-gauge",
                text=f"Without a single gauge the long-term mean by '{gaps}' ({method}) is another: {named}{more}.",
                method=method,
            )


def _one_gauge(setup: SeriesSetup, usual: Mapping[str, npt.NDArray[np.float64]]) -> Iterator[Note]:
    for method, weights in usual.items():
        known = np.nan_to_num(weights)
        over = np.flatnonzero(known.max(axis=1) > _DOMINANT)
        over = over[np.argsort(-known[over].max(axis=1), kind="stable")]
        if len(over):
            named = ", ".join(
                f"{setup.basins.ids[b]} ({setup.network.ids[int(known[b].argmax())]}, {100 * known[b].max():.1f} %)"
                for b in over[:_LISTED]
            )
            more = f" and {len(over) - _LISTED} more" if len(over) > _LISTED else ""
            yield Note(
                code="dominant-gauge",
                text=f"Even while all gauges are there one has over half of the weight ({method}) in: {named}{more}.",
                method=method,
            )


def _dominated(dominant: Sequence[Dominance], ends: Times, zone: str) -> Iterator[Note]:
    by_series: dict[tuple[str, str], list[Dominance]] = {}
    for found in dominant:
        by_series.setdefault((found.gaps, found.method), []).append(found)
    for (gaps, method), several in by_series.items():
        worst = max(several, key=lambda one: (one.weight, -one.step))
        rest = len(several) - 1
        more = f"; {rest} more of the largest depths rest on one gauge in the same way" if rest else ""
        yield Note(
            code="one-gauge-largest",
            text=f"One of the largest depths of basin {worst.basin}, in the step ending "
            f"{time_text(ends[worst.step], zone)}, has {100 * worst.weight:.1f} % of its weight on gauge "
            f"{worst.gauge}, which has {100 * worst.usual:.1f} % while all are there ('{gaps}', {method}){more}.",
            basin=worst.basin,
            gauge=worst.gauge,
            method=method,
        )


def _without_number(setup: SeriesSetup, summaries: Summaries) -> Iterator[Note]:
    # What is the same for several series is said once.
    missing: dict[tuple[int, int, int, int], list[tuple[str, str]]] = {}
    observed: dict[tuple[int, str], list[tuple[str, str]]] = {}
    for gaps, method in setup.series:
        terms = summaries[gaps, method].terms
        lacking = np.flatnonzero(terms.missing)
        if len(lacking):
            b = int(lacking[np.argmax(terms.missing[lacking])])
            alike = (len(lacking), b, int(terms.missing[b]), int((terms.steps + terms.missing)[0]))
            missing.setdefault(alike, []).append((gaps, method))
        share = np.where(np.isnan(terms.observed_share), 1.0, terms.observed_share)
        b = int(np.argmin(share))
        if share[b] < _OBSERVED:
            observed.setdefault((b, f"{100 * share[b]:.0f} %"), []).append((gaps, method))
    for (lacking_series, b, steps, n), series in missing.items():
        yield Note(
            code="steps-missing",
            text=f"{lacking_series} of {len(setup.basins)} series by {_series_text(series)} "
            f"{'has' if lacking_series == 1 else 'have'} steps without a number, which are missing, not zero; most in "
            f"basin {setup.basins.ids[b]}, {steps:,} of {n:,}.",
            basin=setup.basins.ids[b],
            method=_only_method(series),
        )
    for (b, percent), series in observed.items():
        rest = "reweighted" if {gaps for gaps, _ in series} == {REWEIGHT} else "infilled or reweighted"
        by = "'{}', {}".format(*series[0]) if len(series) == 1 else f"by {_series_text(series)}"
        yield Note(
            code="little-observed",
            text=f"In basin {setup.basins.ids[b]} {percent} of the weight was observed over the record "
            f"({by}); the rest was {rest}.",
            basin=setup.basins.ids[b],
            method=_only_method(series),
        )


def _series_text(series: Sequence[tuple[str, str]]) -> str:
    """Return the names of series, policies of the same methods together: "'infill', 'reweight' (thiessen, idw)"."""
    methods: dict[str, list[str]] = {}
    for gaps, method in series:
        methods.setdefault(gaps, []).append(method)
    policies: dict[tuple[str, ...], list[str]] = {}
    for gaps, names in methods.items():
        policies.setdefault(tuple(names), []).append(f"'{gaps}'")
    return "; ".join(f"{', '.join(gaps)} ({', '.join(names)})" for names, gaps in policies.items())


def _only_method(series: Sequence[tuple[str, str]]) -> str:
    methods = {method for _, method in series}
    return methods.pop() if len(methods) == 1 else ""


def _without_totals(summaries: Summaries) -> Iterator[Note]:
    found = next(iter(summaries.values()))
    kinds = {"month": found.months, "year": found.years, "water year": found.water_years}
    without = [kind for kind, totals in kinds.items() if not totals.names]
    if without:
        yield Note(
            code="totals-left-out",
            text=f"No totals by {', '.join(without)}: steps of more than a day lie in two of these periods.",
            level="info",
        )
