"""Reweighting through one table a set of reporting gauges: which steps, which gauges, and what is remembered."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest
import shapely
from drawn import KM, basins_of, gauges_at

from basinrain.averaging import METHODS, idw_weights, reweighing
from basinrain.averaging.reporting import ReportingRuns
from basinrain.averaging.reweighing import reweigh_by_sets, steps_of_sets
from basinrain.errors import MethodError, Problem
from basinrain.weights import WeightTable

NAN = np.nan
SQUARE = shapely.box(0, 0, 10, 10)


class Even:
    """A method that gives each of three gauges the same weight in both basins, and refuses C alone."""

    def __init__(self) -> None:
        self.asked: list[str] = []

    def __call__(self, present: npt.NDArray[np.bool_]) -> WeightTable:
        """Return the table and remember who was asked for."""
        ids = "".join(np.array(["A", "B", "C"])[present])
        self.asked.append(ids)
        if ids == "C":
            raise MethodError(Problem(item="C", found="C alone", expected="another"))
        return WeightTable("even", ("u", "v"), ("A", "B", "C"), np.tile(present / present.sum(), (2, 1)))


DEPTH = np.array([[3.0, 6.0, 9.0], [3.0, NAN, 9.0], [NAN, NAN, 9.0], [NAN, NAN, NAN], [3.0, NAN, 5.0], [1.0, 2.0, 3.0]])
MEANS = [6.0, 6.0, NAN, NAN, 4.0, 2.0]


def runs_of(depth: npt.NDArray[np.float64]) -> ReportingRuns:
    return ReportingRuns.of(~np.isnan(depth))


def test_means_by_hand() -> None:
    """(3+6+9)/3 = 6, (3+9)/2 = 6, refused, none reports, (3+5)/2 = 4, (1+2+3)/3 = 2; no set is asked for twice."""
    even = Even()
    means = reweigh_by_sets(even, 2)(DEPTH, runs_of(DEPTH))
    np.testing.assert_array_equal(means, np.column_stack([MEANS, MEANS]))
    assert even.asked == ["ABC", "AC", "C"]


def test_what_stands_at_a_gauge_that_does_not_report_does_not_count() -> None:
    """A number at a gauge that does not report is left out as NaN is, and the record stays as it was."""
    runs = runs_of(DEPTH)
    with_numbers = np.where(np.isnan(DEPTH), 1e6, DEPTH)
    kept = with_numbers.copy()
    means = reweigh_by_sets(Even(), 2)(with_numbers, runs)
    np.testing.assert_array_equal(means[:, 0], MEANS)
    np.testing.assert_array_equal(with_numbers, kept)


@pytest.mark.parametrize("rows", [slice(0, 0), slice(2, 3), slice(3, 4), slice(2, 4)])
def test_no_step_or_no_number_at_any_step(rows: slice) -> None:
    """Without steps there are no rows; where every set is refused or empty all is NaN, in the basins' number."""
    depth = DEPTH[rows]
    means = reweigh_by_sets(Even(), 2)(depth, runs_of(depth))
    assert means.shape == (len(depth), 2)
    assert np.isnan(means).all()


def test_tables_are_remembered_from_call_to_call() -> None:
    """A second call asks for nothing that the first has asked for, refusals included, and gives the same bytes."""
    even = Even()
    reweigh = reweigh_by_sets(even, 2)
    first = reweigh(DEPTH, runs_of(DEPTH))
    asked = len(even.asked)
    assert reweigh(DEPTH, runs_of(DEPTH)).tobytes() == first.tobytes()
    assert len(even.asked) == asked


def test_what_is_remembered_is_bounded(monkeypatch: pytest.MonkeyPatch) -> None:
    """With room for two tables the one used longest ago is made anew; the numbers stay the same."""
    monkeypatch.setattr(reweighing, "KEPT_BYTES", 2400)
    even = Even()
    reweigh = reweigh_by_sets(even, 2)
    sets = {
        "ABC": DEPTH[[0]],
        "AC": DEPTH[[1]],
        "B": np.array([[NAN, 7.0, NAN]]),
    }
    for wanted in ("ABC", "AC", "ABC", "B", "ABC", "AC"):
        means = reweigh(sets[wanted], runs_of(sets[wanted]))
        assert means[0, 0] == np.nanmean(sets[wanted])
    assert even.asked == ["ABC", "AC", "B", "AC"]


def test_steps_of_sets() -> None:
    """Every step is in one set; steps that follow each other are a slice, so that they are not copied."""
    first, second, third, fourth = steps_of_sets(runs_of(DEPTH))
    assert isinstance(first, np.ndarray)
    assert first.tolist() == [0, 5]
    assert isinstance(second, np.ndarray)
    assert second.tolist() == [1, 4]
    assert (third, fourth) == (slice(2, 3), slice(3, 4))
    assert list(steps_of_sets(runs_of(DEPTH[:0]))) == []


def test_idw_within_a_radius_has_no_number_where_its_gauges_do_not_reach() -> None:
    """Two gauges reach all of a strip; each alone reaches its half, which is refused: NaN, unless that is allowed."""
    network = gauges_at((1, 0.5), (3, 0.5), unit=KM)
    basins = basins_of(KM, strip=shapely.box(0, 0, 4, 1))
    depth = np.array([[10.0, 20.0], [10.0, NAN], [NAN, 20.0], [NAN, NAN]])
    options = {"cell": 100.0, "radius": 1300.0}
    strict = METHODS["idw"].reweigher(network, basins, options)(depth, runs_of(depth))
    np.testing.assert_allclose(strict[:, 0], [15.0, NAN, NAN, NAN], rtol=1e-12)
    allowed = METHODS["idw"].reweigher(network, basins, {**options, "allow_uncovered": True})(depth, runs_of(depth))
    np.testing.assert_allclose(allowed[:, 0], [15.0, 10.0, 20.0, NAN], rtol=1e-12)


def test_idw_of_the_nearest_gauges_is_weighed_set_by_set() -> None:
    """With the nearest gauge alone, the next nearest takes over where it is silent, exactly as its own table says."""
    network = gauges_at((1, 1), (5, 1), (9, 4), unit=KM)
    basins = basins_of(KM, square=SQUARE)
    depth = np.array([[1.0, 2.0, 4.0], [NAN, 2.0, 4.0], [1.0, NAN, 4.0], [1.0, 2.0, NAN], [NAN, NAN, 4.0]])
    means = METHODS["idw"].reweigher(network, basins, {"cell": 500.0, "max_gauges": 1})(depth, runs_of(depth))
    for row, mean in zip(depth, means, strict=True):
        weights = idw_weights(network, basins, ~np.isnan(row), cell=500.0, max_gauges=1).weights
        np.testing.assert_allclose(mean, weights @ np.nan_to_num(row), rtol=1e-12)
    assert means[4, 0] == pytest.approx(4.0)
