"""The comparison: every infill method estimates every gauge from the others, on the same cases for all."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import Final, NoReturn

import numpy as np
import numpy.typing as npt

from basinrain.errors import BasinRainError, DataError, MethodError, Problem, Problems
from basinrain.gauges import GaugeNetwork
from basinrain.infill.days import day_totals
from basinrain.infill.donors import require_elevations
from basinrain.infill.leave_one_out.bootstrap import differences_to_best, what_is_drawn
from basinrain.infill.leave_one_out.candidates import candidates_of
from basinrain.infill.leave_one_out.cases import Cases, cases_of, steps_of_cases
from basinrain.infill.leave_one_out.comparison import Candidate, Comparison, Difference, Score
from basinrain.infill.leave_one_out.cross_fit import CrossFit, Fitted
from basinrain.infill.leave_one_out.scoring import ScoreSums
from basinrain.infill.leave_one_out.wording import notes_of, reason_of
from basinrain.infill.options import InfillOptions
from basinrain.infill.record_normals import FEWEST_YEARS, NormalRatios
from basinrain.infill.relations import AT_LEAST
from basinrain.rainfall import RainRecord
from basinrain.units import depth_factor

__all__ = ["ENOUGH", "SEED", "compare_infill"]

SEED: Final = 1
"""Of the bootstrap, so that a repeat gives the same interval."""

ENOUGH: Final = 0.8
"""A method that can estimate a smaller part than this of what is usual is left out, lest it choose the cases."""

_KEPT: Final = 1 << 24
"""Estimates that are kept in memory; where there are more, they are made again when they are needed again."""

Floats = npt.NDArray[np.float64]
Progress = Callable[[str], None]


def compare_infill(
    record: RainRecord,
    network: GaugeNetwork,
    *,
    options: InfillOptions,
    ratios: NormalRatios | None = None,
    candidates: Sequence[Candidate] | None = None,
    seed: int = SEED,
    progress: Progress | None = None,
    depth_unit: str = "mm",
    instead: str = "name the infill method",
) -> Comparison:
    """Compare infill methods by leaving out one gauge at a time.

    Parameters
    ----------
    record : RainRecord
        The whole record, its columns in the network's order.
    network : GaugeNetwork
        The gauges, with normals and elevations where they are known.
    options : InfillOptions
        The job's: radius, elevation limit and, where given, numbers of donors and power go to all methods that take
        them.
    ratios : NormalRatios, optional
        Normals from the record, in place of the network's.
    candidates : sequence of Candidate, optional
        What to compare, from simple to complex; every registered method where not given.
    seed : int
        Of the bootstrap.
    progress : callable, optional
        Called with the label of each method before it is tried.
    depth_unit : str
        Of the depths that reason and notes name; numbers are in mm whatever it is.
    instead : str
        What an error advises to do where nothing can be compared.

    Returns
    -------
    Comparison
        The chosen method is the first, from simple to complex, that cannot be told from the best by root-mean-square
        error; with fewer than 5 cases, of which nothing can be told, the best itself.

    Raises
    ------
    DataError
        The columns are not the network's gauges, there is one gauge only, an elevation limit is given and a gauge that
        reports has no elevation, or no gauge can be estimated on a wet day.
    JobError
        The depth unit is not known.

    Notes
    -----
    A case is a gauge's total of a rainfall day, or its depth at a step where steps are longer. Days count on which the
    mean over the gauges that know their total is at least 1 mm (longer steps: above 0); and gauges which every
    candidate can estimate. A candidate that can estimate under 80 % of what those that rest on positions alone can, in
    the median, is skipped. The estimate is the weighted sum of the totals of donors that know theirs; no infilled value
    takes part. Where steps are shorter than a day, the steps of these days that every candidate can estimate are scored
    beside, dry ones too.

    Correlations, slopes and normals from the record are learned anew for each fifth of the record from the other four,
    so that no method has seen what it is scored on.

    Examples
    --------
    B is always the mean of A and C; no gauge alone gives it.

    >>> rng = np.random.default_rng(7)
    >>> a, c = rng.gamma(0.5, 20.0, (2, 200))
    >>> ends = np.datetime64("2031-01-01", "s") + np.arange(1, 201) * np.timedelta64(86400, "s")
    >>> network = GaugeNetwork(ids=("A", "B", "C"), x=[0.0, 1e3, 2e3], y=[0.0, 0.0, 0.0], crs="local")
    >>> depths = np.column_stack([a, (a + c) / 2, c])
    >>> record = RainRecord.from_depths(network.ids, ends - np.timedelta64(86400, "s"), ends, depths, step="1d")
    >>> comparison = compare_infill(record, network, options=InfillOptions())
    >>> comparison.score("station-average", gauge="B").rmse < 1e-9 < comparison.score("nearest-gauge", gauge="B").rmse
    True
    >>> comparison.skipped["normal-ratio"]
    'it needs normals, and the gauges have none'
    """
    depth_factor(depth_unit)  # An unknown one is refused before the work is done.
    _check(record, network, instead)
    days = day_totals(record)
    cases, finer = cases_of(record, days)
    fit = CrossFit(record, network, days, ratios)
    given = candidates_of(options) if candidates is None else tuple(candidates)
    if any(candidate.options.elevation_limit is not None for candidate in given):
        require_elevations(network, fit.reporting)
    runners, skipped, able = _able(given, fit, cases, progress or (lambda _: None), instead)
    result = _scored(runners, cases, network)
    if not len(result.compared):
        _no_case(
            cases,
            skipped,
            instead,
            days=len(days.ends),
            by=f" by each of {', '.join(runner.label for runner in runners)}",
        )
    scores = list(result.scores)
    if finer:
        scores += _scored(runners, steps_of_cases(record, days, cases), network).scores
    labels = tuple(runner.label for runner in runners)
    compared, n = _only(cases, result.compared), int(result.count.sum())
    drawn = what_is_drawn(compared.week, result.count)
    differences = _differences(runners, cases, result, drawn, compared.week, seed=seed)
    # Where nothing can be told apart, being simple is no merit: there the error decides.
    chosen = next(k for k, d in enumerate(differences) if (not d.distinguishable if drawn else d.candidate == d.best))
    observed, estimated = _cases_of_one(runners[chosen], cases, result)
    return Comparison(
        candidates=labels,
        skipped=MappingProxyType(skipped),
        scale=cases.scale,
        gauges=record.gauges,
        ends=compared.ends,
        storms=compared.storms,
        observed=observed,
        estimated=estimated,
        scores=tuple(scores),
        differences=differences,
        drawn=drawn,
        best=differences[0].best,
        chosen=labels[chosen],
        chosen_options=runners[chosen].options,
        reason=reason_of(scores, differences, labels[chosen], compared, n, drawn, depth_unit=depth_unit),
        notes=notes_of(
            compared,
            network,
            chosen=next(score for score in scores if score.candidate == labels[chosen]),
            n=n,
            drawn=drawn,
            left_out=able - n,
            learned=any(runner.options.chosen_method.needs_relations for runner in runners),
            normals=any(runner.options.chosen_method.needs_normals for runner in runners),
            from_record=ratios is not None,
            normals_see_all=fit.normals_see_all,
            depth_unit=depth_unit,
        ),
    )


@dataclass(frozen=True, eq=False)
class _Runner:
    """A candidate that can take part."""

    label: str
    options: InfillOptions
    fitted: Fitted
    kept: dict[tuple[Cases, int], Floats] = field(default_factory=dict)

    def estimates(self, cases: Cases, chunk: slice, depth: Floats, *, keep: bool = False) -> Floats:
        """Return the estimates of some cases; the same ones, asked for again, come out of memory where it was kept."""
        found = self.kept.get((cases, chunk.start))
        if found is None:
            found = self.fitted.estimates(depth, cases.months[chunk], cases.part[chunk])
            if keep:
                self.kept[cases, chunk.start] = found
        return found


@dataclass(frozen=True, eq=False)
class _Scored:
    """Scores, and for each time with a case the squared errors by candidate, the count, and the gauges compared."""

    scores: list[Score]
    squared: Floats
    count: Floats
    compared: npt.NDArray[np.int64]
    common: npt.NDArray[np.bool_]


def _check(record: RainRecord, network: GaugeNetwork, instead: str) -> None:
    problems = Problems()
    if record.gauges != network.ids:
        problems.add(
            item="rain record",
            found="columns that are not the network's gauges in their order",
            expected=", ".join(network.ids),
            remedy="bring them in order first",
        )
    if len(network) < 2:
        problems.add(
            item="leave-one-out comparison",
            found=f"{len(network)} gauge{'' if len(network) == 1 else 's'}",
            expected="two gauges or more, since each is estimated from the others",
            remedy=f"give further gauges, or {instead}",
        )
    problems.raise_as(DataError)


def _able(
    given: tuple[Candidate, ...], fit: CrossFit, cases: Cases, progress: Progress, instead: str
) -> tuple[list[_Runner], dict[str, str], int]:
    """Return the candidates that can estimate enough, why others are skipped, and how many values the ablest can.

    Enough is measured on the median of the candidates that rest on positions alone. Not on the most able one, the
    nearest gauge: a single donor is nearly always there, and in a gappy network nothing else would be compared. Nor on
    all: a record that teaches little would let the methods that learn from it choose the cases.
    """
    skipped: dict[str, str] = {}
    distances = fit.network.distances()
    keep = len(given) * len(cases) * len(fit.network) <= _KEPT
    runners: list[_Runner] = []
    counts: list[int] = []
    for candidate in given:
        progress(candidate.label)
        method = candidate.options.chosen_method
        if method.needs_normals and fit.ratios is None and fit.network.normals is None:
            skipped[candidate.label] = "it needs normals, and the gauges have none"
            continue
        try:
            runner = _Runner(candidate.label, candidate.options, Fitted(candidate.options, fit, distances))
            count = 0
            for chunk in cases.chunks():
                estimates = runner.estimates(cases, chunk, cases.depth(chunk), keep=keep)
                count += int((~np.isnan(estimates)).sum())
        except (DataError, MethodError) as error:
            skipped[candidate.label] = _in_short(error)
            continue
        runners.append(runner)
        counts.append(count)
    most = max(counts, default=0)
    if not most:
        _no_case(cases, skipped, instead, days=len(fit.days.ends))
    able = [(runner.options.chosen_method, count) for runner, count in zip(runners, counts, strict=True) if count]
    by_position = [count for method, count in able if not (method.needs_normals or method.needs_relations)]
    usual = int(np.median(by_position or [count for _, count in able]))
    kept = []
    for runner, count in zip(runners, counts, strict=True):
        if count >= ENOUGH * usual:
            kept.append(runner)
        else:
            skipped[runner.label] = _too_few(runner.options, count, usual, fit)
    return kept, skipped, most


def _too_few(options: InfillOptions, count: int, usual: int, fit: CrossFit) -> str:
    """Return why a method that can estimate too few values is skipped."""
    method = options.chosen_method
    values = f"{count:,} value{'' if count == 1 else 's'}" if count else "no value"
    why = [f"it can estimate {values}, under {100 * ENOUGH:.0f} % of the {usual:,} that are usual for this record"]
    if options.donors_required > 1:
        why.append(f"it needs {options.donors_required} donors")
    if method.needs_normals and fit.ratios is not None:
        why.append(f"normals from the record need {FEWEST_YEARS} years in common")
    if method.needs_relations:
        n = len(fit.days.ends)
        why.append(
            f"relations need {AT_LEAST} days or longer steps in common, besides the fifth of the record estimated, and "
            f"the record has {n:,}"
        )
    return "; ".join(why)


def _no_case(cases: Cases, skipped: dict[str, str], instead: str, *, days: int, by: str = "") -> NoReturn:
    what = cases.noun
    none = "no whole rainfall day" if what == "day" and not days else f"no wet {what}"
    why = "".join(f"; {label}: {reason}" for label, reason in skipped.items())
    on = f"any of {len(cases):,} wet {what}s" if len(cases) > 1 else f"the one wet {what}"
    found = f"no gauge that could be estimated from others{by} on {on}{why}"
    raise DataError(
        Problem(
            item="leave-one-out comparison",
            found=found if len(cases) else none,
            expected=f"wet {what}s on which several gauges have values",
            remedy="give a longer record, "
            + ("loosen radius, elevation_limit or min_donors, " if len(cases) else "")
            + f"or {instead}",
        )
    )


def _in_short(error: BasinRainError) -> str:
    """Return an error in one line: its first problems, and how many there are besides."""
    shown = [str(problem) for problem in error.problems[:2]]
    more = len(error.problems) + error.unlisted - len(shown)
    return "; ".join([*shown, *([f"and {more} more"] if more else [])])


def _scored(runners: list[_Runner], cases: Cases, network: GaugeNetwork) -> _Scored:
    """Score all candidates on the values that each of them can estimate."""
    sums = [ScoreSums(len(network), wet=cases.wet) for _ in runners]
    squared = np.zeros((len(runners), len(cases)))
    common = np.zeros((len(cases), len(network)), dtype=bool)
    for chunk in cases.chunks():
        depth = cases.depth(chunk)
        estimates = [runner.estimates(cases, chunk, depth) for runner in runners]
        valid = common[chunk]
        np.logical_and.reduce([~np.isnan(estimate) for estimate in estimates], axis=0, out=valid)
        for k, estimate in enumerate(estimates):
            sums[k].add(depth, estimate, valid)
            squared[k, chunk] = np.square(np.where(valid, estimate - depth, 0.0)).sum(axis=1)
    by_candidate = [
        one.scores(runner.label, network.ids, cases.scale) for one, runner in zip(sums, runners, strict=True)
    ]
    compared = np.flatnonzero(common.any(axis=1))
    return _Scored(
        scores=[scores[g] for g in range(len(network) + 1) for scores in by_candidate],
        squared=squared[:, compared],
        count=common[compared].sum(axis=1).astype(float),
        compared=compared,
        common=common[compared],
    )


def _differences(
    runners: list[_Runner], cases: Cases, result: _Scored, drawn: str, week: npt.NDArray[np.int64] | None, *, seed: int
) -> tuple[Difference, ...]:
    labels = tuple(runner.label for runner in runners)
    squared, count = result.squared, result.count
    if drawn == "case":
        # At fewer than five times: few enough to be estimated again, each by itself.
        pairs = [_cases_of_one(runner, cases, result) for runner in runners]
        squared = np.stack([np.square(estimated - observed)[result.common] for observed, estimated in pairs])
        count = np.ones(squared.shape[1])
    group = (week if drawn == "week" else np.arange(len(count))) if drawn else None
    return differences_to_best(labels, squared, count, group, seed=seed)


def _only(cases: Cases, rows: npt.NDArray[np.int64]) -> Cases:
    """Return the cases of some times."""
    return replace(
        cases,
        ends=cases.ends[rows],
        months=cases.months[rows],
        part=cases.part[rows],
        week=None if cases.week is None else cases.week[rows],
        depth=lambda chunk: cases.depth(slice(None))[rows[chunk]],
        storms=tuple(cases.storms[row] for row in rows) if cases.storms else (),
    )


def _cases_of_one(runner: _Runner, cases: Cases, result: _Scored) -> tuple[Floats, Floats]:
    """Return observed and estimated depths, NaN where they were not compared."""
    observed, estimated = [], []
    for chunk in cases.chunks():
        depth = cases.depth(chunk)
        observed.append(depth)
        estimated.append(runner.estimates(cases, chunk, depth))
    pair = (np.concatenate(part)[result.compared] for part in (observed, estimated))
    first, second = (np.where(result.common, part, np.nan) for part in pair)
    return first, second
