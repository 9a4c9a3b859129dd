"""Relations between gauges, against numpy, scipy and scikit-learn pair by pair."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import scipy.stats
from related import line
from sklearn.linear_model import LinearRegression

from basinrain.errors import DataError
from basinrain.infill import NormalRatios, normals_from_record, relations_of, relations_of_record
from basinrain.infill.relations import relations_without_parts
from basinrain.rainfall import RainRecord

NAN = float("nan")


def gappy(n_cases: int = 200, n: int = 5, seed: int = 1) -> tuple[np.ndarray, np.ndarray]:
    """Depths with a common part, dry days and gaps, and months."""
    rng = np.random.default_rng(seed)
    depths = rng.gamma(0.4, 10, (n_cases, 1)) * rng.gamma(2, 0.5, (n_cases, n)) * (rng.random((n_cases, 1)) < 0.6)
    depths[rng.random((n_cases, n)) < 0.3] = NAN
    return depths, rng.integers(1, 13, n_cases)


def test_correlation_of_every_pair_is_scipys() -> None:
    """Over the cases that both have, dry ones too."""
    depths, _ = gappy()
    found = relations_of(depths, line(5))
    for i, j in np.ndindex(5, 5):
        both = ~np.isnan(depths[:, [i, j]]).any(axis=1)
        assert found.common[i, j] == both.sum()
        expected = 1.0 if i == j else scipy.stats.pearsonr(depths[both, i], depths[both, j]).statistic
        assert found.correlation[i, j] == pytest.approx(expected)


def test_slope_of_every_pair_is_scikit_learns() -> None:
    """The least squares line through the origin of gauge i on gauge j."""
    depths, _ = gappy()
    found = relations_of(depths, line(5))
    for i, j in np.ndindex(5, 5):
        both = ~np.isnan(depths[:, [i, j]]).any(axis=1)
        fit = LinearRegression(fit_intercept=False).fit(depths[both, j][:, None], depths[both, i])
        assert found.slope[i, j] == pytest.approx(fit.coef_[0])


@pytest.mark.parametrize("columns", [1, 12])
def test_relations_of_ratios_are_those_of_depths_over_normals(columns: int) -> None:
    """Divided case by case by the month's normal, or the year's."""
    depths, months = gappy()
    normals = np.random.default_rng(2).integers(20, 200, (5, columns)).astype(float)
    found = relations_of(depths, line(5, normals), months)
    divided = depths / normals[:, months - 1 if columns == 12 else np.zeros_like(months)].T
    expected = relations_of(divided, line(5))
    assert found.ratio_correlation == pytest.approx(expected.correlation)
    assert found.ratio_slope == pytest.approx(expected.slope)
    assert found.correlation == pytest.approx(relations_of(depths, line(5)).correlation)


def test_cases_without_a_month_take_the_years_normals() -> None:
    """Which leaves the slope of depths times N_j / N_i."""
    depths, _ = gappy()
    normals = np.arange(1.0, 61.0).reshape(5, 12)
    found = relations_of(depths, line(5, normals))
    year = normals.sum(axis=1)
    assert found.ratio_slope == pytest.approx(found.slope * year[None, :] / year[:, None])
    assert found.ratio_correlation == pytest.approx(found.correlation)


def test_a_normal_that_is_missing_leaves_out_its_gauge() -> None:
    """And a month's that is 0 leaves out that month, of ratios only."""
    depths, months = gappy()
    normals = np.full((5, 12), 50.0)
    normals[1], normals[2, 0] = NAN, 0.0
    found = relations_of(depths, line(5, normals), months)
    assert found.ratio_slope is not None
    assert np.isnan(found.ratio_slope[1]).all()
    assert np.isnan(found.ratio_slope[:, 1]).all()
    without = depths.copy()
    without[months == 1, 2] = NAN
    assert found.ratio_slope[2, 0] == pytest.approx(relations_of(without, line(5)).slope[2, 0])
    assert found.common[2, 0] == relations_of(depths, line(5)).common[2, 0]


def test_ratios_by_normals_from_the_record() -> None:
    """Every pair by its own means of the month, by a plain loop; a month without one is left out."""
    depths, months = gappy()
    rng = np.random.default_rng(5)
    means = rng.integers(20, 200, (12, 5, 5)).astype(float)
    means[3, 0, 1] = NAN
    means[4, 2, 3] = 0.0
    ratios = NormalRatios(line(5).ids, np.full((12, 5, 5), 10), means)
    found = relations_of(depths, line(5), months, ratios=ratios)
    assert found.ratio_slope is not None
    assert found.ratio_correlation is not None
    for i, j in np.ndindex(5, 5):
        if i == j:
            continue
        x, y = [], []
        for t, m in enumerate(months - 1):
            pair = means[m, i, j], means[m, j, i]
            if not np.isnan(depths[t, [i, j]]).any() and pair[0] > 0 and pair[1] > 0:
                y.append(depths[t, i] / pair[0])
                x.append(depths[t, j] / pair[1])
        assert found.ratio_slope[i, j] == pytest.approx(np.dot(x, y) / np.dot(x, x))
        assert found.ratio_correlation[i, j] == pytest.approx(np.corrcoef(x, y)[0, 1])


def test_thirty_common_cases() -> None:
    """29 are too few, 30 are enough."""
    rain = np.abs(np.sin(np.arange(30.0)))
    depths = np.column_stack([rain, 2 * rain])
    assert relations_of(depths, line(2)).slope[1, 0] == pytest.approx(2)
    depths[7, 0] = NAN
    few = relations_of(depths, line(2))
    assert few.common[0, 1] == 29
    assert np.isnan([few.slope[1, 0], few.correlation[1, 0]]).all()
    assert few.correlation[1, 1] == pytest.approx(1)


def test_gauges_that_do_not_vary() -> None:
    """B caught 3 mm every time, C nothing: no correlation, and on C no slope."""
    rain = np.abs(np.sin(np.arange(40.0)))
    found = relations_of(np.column_stack([rain, np.full(40, 0.3), np.zeros(40)]), line(3))
    assert np.isnan(found.correlation[0, 1:]).all()
    assert np.isnan(found.slope[:, 2]).all()
    assert found.slope[2, 0] == 0
    assert found.slope[0, 1] == pytest.approx(rain.mean() / 0.3)


def test_a_gauge_that_varies_only_where_the_other_is_silent() -> None:
    """In the common cases A is constant: what it does elsewhere is no correlation."""
    depths = np.column_stack([np.full(80, 5.0), np.abs(np.sin(np.arange(80.0)))])
    depths[40:, 0] = np.arange(40)
    depths[40:, 1] = NAN
    found = relations_of(depths, line(2))
    assert np.isnan(found.correlation[0, 1])
    assert found.correlation[0, 0] == pytest.approx(1)


def test_no_correlation_is_zero_whatever_rounding_makes_of_it() -> None:
    """Depths that are exactly uncorrelated: 0 in both orders, so that nobody becomes a donor by rounding."""
    one = np.tile([0.1, 0.1, 0.7, 0.7], 10)
    other = np.tile([0.3, 0.9, 0.3, 0.9], 10)
    assert relations_of(np.column_stack([one, other]), line(2)).correlation[0, 1] == 0


def test_large_depths_do_not_spoil_the_correlation() -> None:
    """Monthly totals of around 1000 mm that vary by a millimetre or so."""
    rng = np.random.default_rng(8)
    depths = 1000 + rng.random((60, 2))
    found = relations_of(depths, line(2)).correlation[0, 1]
    assert found == pytest.approx(scipy.stats.pearsonr(depths[:, 0], depths[:, 1]).statistic, abs=1e-6)


def test_the_record_is_taken_by_rainfall_days() -> None:
    """Six-hourly depths whose days are as 1 to 3, however their hours are."""
    rng = np.random.default_rng(4)
    a = rng.gamma(0.5, 5, (31, 4))
    b = rng.permuted(3 * a, axis=1)
    ends = np.datetime64("2031-05-01T00", "s") + np.arange(1, 125) * np.timedelta64(6, "h")
    depths = np.column_stack([a.ravel(), b.ravel()])
    record = RainRecord.from_depths(("X", "A"), ends - np.timedelta64(6, "h"), ends, depths, step="6h")
    found = relations_of_record(record, line(2))
    assert (found.common == 31).all()
    assert found.slope[1, 0] == pytest.approx(3)
    assert relations_of(depths, line(2)).slope[1, 0] < 2.5


def test_the_record_with_its_own_normals() -> None:
    """Twelve years of months in which B has double A's rain: on ratios the slope is 1 in every month."""
    ends = np.array([f"{2020 + k // 12}-{k % 12 + 1:02d}-01" for k in range(1, 145)], dtype="datetime64[s]")
    starts = np.concatenate([[np.datetime64("2020-01-01", "s")], ends[:-1]])
    rain = 50 + 40 * np.sin(np.arange(144.0))
    record = RainRecord.from_depths(("X", "A"), starts, ends, np.column_stack([rain, 2 * rain]), step="1mo")
    ratios, _ = normals_from_record(record, line(2))
    found = relations_of_record(record, line(2), ratios=ratios)
    assert found.ratio_slope == pytest.approx(np.ones((2, 2)))
    assert found.slope[1, 0] == pytest.approx(2)


def test_no_cases() -> None:
    """Nothing is known of anybody."""
    found = relations_of(np.empty((0, 2)), line(2))
    assert (found.common == 0).all()
    assert np.isnan(found.slope).all()


def test_arrays_that_do_not_fit() -> None:
    """Columns, months and normals of other gauges are three problems of one error."""
    ratios = NormalRatios(("Z",), np.zeros((12, 1, 1), dtype=np.int64), np.zeros((12, 1, 1)))
    with pytest.raises(DataError) as caught:
        relations_of(np.ones((3, 2)), line(3), [1, 13, 2], ratios=ratios)
    assert str(caught.value).splitlines() == [
        "depths: found an array of shape (3, 2); expected 3 columns, one a gauge",
        "months: found other values; expected a month from 1 to 12, or 0, for every case",
        "normals from the record: found other gauges than the network's, or another order; expected X, A, B",
    ]


def test_relations_belong_to_their_network() -> None:
    """Asked of a network in another order they are refused."""
    found = relations_of(np.ones((2, 2)), line(2))
    turned = replace(line(2), ids=("A", "X"), names=("A", "X"))
    with pytest.raises(DataError, match="found other gauges than the network's, or another order; expected A, X"):
        found.of(turned)


@pytest.mark.parametrize("normals", ["none", "yearly", "monthly", "record"])
def test_relations_without_a_part_are_those_of_the_other_cases(normals: str) -> None:
    """To 1e-12, whatever the normals, each part's own normals from the record; an empty part takes nothing away."""
    depths, months = gappy(600)
    rng = np.random.default_rng(3)
    part = np.array([0, 1, 3])[rng.integers(0, 3, 600)]
    columns = {"yearly": 1, "monthly": 12}.get(normals)
    network = line(5, None if columns is None else rng.integers(20, 200, (5, columns)).astype(float))
    ratios: list[NormalRatios | None] = [None] * 4
    if normals == "record":
        tables = [rng.integers(20, 200, (12, 5, 5)).astype(float) for _ in ratios]
        ratios = [NormalRatios(network.ids, np.full((12, 5, 5), 10), means) for means in tables]
    found = relations_without_parts(depths, network, months, part, ratios=ratios)
    assert len(found) == 4
    for k, mine in enumerate(found):
        rest = part != k
        expected = relations_of(depths[rest], network, months[rest], ratios=ratios[k])
        assert np.array_equal(mine.common, expected.common)
        for name in ("correlation", "slope", "ratio_correlation", "ratio_slope"):
            one, other = getattr(mine, name), getattr(expected, name)
            assert (one is None) == (other is None) == (normals == "none" and name.startswith("ratio"))
            if one is not None:
                np.testing.assert_allclose(one, other, rtol=1e-12, atol=1e-12)


def test_one_part_with_all_the_rain_leaves_the_others_exact() -> None:
    """Without a part of a million mm the slope is that of the rest to the last digit: nothing is subtracted."""
    depths = np.column_stack([np.arange(1.0, 81.0), 2 * np.arange(1.0, 81.0)])
    depths[40:] *= [1e6, 3e6]
    found = relations_without_parts(depths, line(2), np.zeros(80), np.arange(80) // 40, ratios=(None, None))
    assert found[1].slope[1, 0] == 2.0
    assert found[1].correlation[1, 0] == 1.0
