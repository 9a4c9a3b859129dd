"""What the open records teach about normals; the figures stand in docs/verification.md."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from leave_one_out_data import OpenData, daily_record, open_data

from basinrain.infill import InfillOptions
from basinrain.infill.leave_one_out import ErrorSums, compare_infill, leave_one_out_errors

MEAN = InfillOptions(method="station-average", nearest="all", min_donors=1)
NORMAL_RATIO = InfillOptions(method="normal-ratio", nearest="all", min_donors=1)

UPPER_WAHIAWA, MANOA = "USC00518838", "USC00516128"


def without(data: OpenData, gauge: str, options: InfillOptions) -> ErrorSums:
    keep = np.array(data.network.ids) != gauge
    return leave_one_out_errors(data.depth[:, keep], data.network.subset(keep), options)


def monthly(data: OpenData) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    """Return the mean of every gauge's own values of each month, shape (n_gauges, 12)."""
    return np.column_stack([np.nanmean(data.depth[data.months == month], axis=0) for month in range(1, 13)])


def test_a_normal_of_a_gauge_that_is_mostly_missing() -> None:
    """Upper Wahiawa: 342 days, 88 % missing. Its yearly normal happens to be right, its monthly ones are noise.

    On its days each neighbour had 0.81 to 1.17 of its own mean; on its 11 days of December 0.91 to 2.95. The "normals"
    of the months, 0.5 to 16.2 mm a day, are those of 11 to 51 days.
    """
    data = open_data("oahu")
    g = data.network.position(UPPER_WAHIAWA)
    its = ~np.isnan(data.depth[:, g])
    assert its.sum() == 342
    assert round(1 - its.mean(), 2) == 0.88
    others = np.delete(data.depth, g, axis=1)
    share = np.nanmean(others[its], axis=0) / np.nanmean(others, axis=0)
    assert (round(share.min(), 2), round(share.max(), 2)) == (0.81, 1.17)
    december = data.months == 12
    share = np.nanmean(others[its & december], axis=0) / np.nanmean(others[december], axis=0)
    assert (round(share.min(), 2), round(share.max(), 2)) == (0.91, 2.95)
    days = [int((its & (data.months == month)).sum()) for month in range(1, 13)]
    assert (min(days), max(days)) == (11, 51)
    its_months = monthly(data)[g]
    assert (round(its_months.min(), 1), round(its_months.max(), 1)) == (0.5, 16.2)


def test_normal_ratio_against_mean_on_oahu() -> None:
    """RMSE 12.6 against 9.6 mm, but MAE 3.6 against 4.1; it is Manoa that does it, not Upper Wahiawa.

    Manoa's normal is 9 times Waikiki's, so every cell over Waikiki is blown up ninefold: without Manoa 7.7 against 7.5,
    without Upper Wahiawa 12.8 against 9.7.
    """
    data = open_data("oahu")
    ratio, mean = (leave_one_out_errors(data.depth, data.network, options) for options in (NORMAL_RATIO, MEAN))
    assert (round(ratio.rmse, 1), round(mean.rmse, 1)) == (12.6, 9.6)
    assert (round(ratio.mae, 1), round(mean.mae, 1)) == (3.6, 4.1)
    for gauge, expected in ((UPPER_WAHIAWA, (12.8, 9.7)), (MANOA, (7.7, 7.5))):
        assert tuple(round(without(data, gauge, options).rmse, 1) for options in (NORMAL_RATIO, MEAN)) == expected
    assert data.network.normals is not None
    normals = data.network.normals[:, 0]
    assert round(normals.max() / normals.min(), 1) == 9.0
    assert data.network.ids[int(normals.argmax())] == MANOA
    assert round(ratio.squared[data.network.position(MANOA)] / ratio.squared.sum(), 2) == 0.72


@pytest.mark.open_data
def test_high_and_low_gauges_of_the_platte() -> None:
    """38 gauges above 2,700 m over 49 below 1,800 m, means of the gauges' own means: 1.74; January 5.56, July 0.92."""
    data = open_data("co_platte")
    height = data.gauges["elev_m"].to_numpy()
    high, low = height > 2700, height < 1800
    assert (high.sum(), low.sum()) == (38, 49)
    own = np.nanmean(data.depth, axis=0)
    assert round(own[high].mean() / own[low].mean(), 2) == 1.74
    months = monthly(data)
    ratio = months[high].mean(axis=0) / months[low].mean(axis=0)
    assert (round(ratio[0], 2), round(ratio[6], 2)) == (5.56, 0.92)
    assert (ratio.argmin(), round(ratio.min(), 2)) == (5, 0.66)


@pytest.mark.open_data
def test_monthly_normals_lower_the_error_on_the_platte() -> None:
    """Normal ratio, five nearest: MAE 11.40 mm by the year's normals, 10.09 by the months'; RMSE 17.35 and 15.38."""
    data = open_data("co_platte")
    options = InfillOptions(method="normal-ratio", nearest=5, min_donors=1)
    year = leave_one_out_errors(data.depth, data.network, options)
    by_month = replace(data.network, normals=monthly(data))
    month = leave_one_out_errors(data.depth, by_month, options, months=data.months)
    assert (round(year.mae, 2), round(month.mae, 2)) == (11.40, 10.09)
    assert (round(year.rmse, 2), round(month.rmse, 2)) == (17.35, 15.38)


def test_comparison_on_oahu() -> None:
    """All eleven candidates on 10,108 wet gauge-days: regression has the least RMSE, and flattens the storms."""
    data = open_data("oahu")
    record = daily_record(data.network, data.depth, start="2010-01-01")
    found = compare_infill(record, data.network, options=InfillOptions())
    assert len(found.candidates) == 11
    assert found.score("station-average").n == 10_108
    assert found.chosen == found.best == "regression"
    stated = {"station-average": 12.80, "normal-ratio": 16.55, "correlation-weighting": 12.46, "regression": 11.88}
    assert {label: round(found.score(label).rmse, 2) for label in stated} == stated
    assert round(found.score("regression").top20_ratio, 2) == 0.66
    assert "chosen-flattens-storms" in {note.code for note in found.notes}
    assert all(one.scale == other.scale for one, other in pairwise(found.scores))
