"""The time axis of figures."""

from datetime import timedelta

import pytest
from matplotlib.figure import Figure

from basinrain.report.time_axis import date_axis


@pytest.mark.parametrize("most", [5, 6, 9])
@pytest.mark.parametrize(
    "length",
    [timedelta(days=1000), timedelta(days=1090), timedelta(hours=66), timedelta(hours=71), timedelta(minutes=170)],
)
def test_any_length_has_a_few_dates_and_no_warning(length: timedelta, most: int) -> None:
    """Axes of nearly three years, days or hours have at least two dates and no more than asked for (and one)."""
    start = 22330.3125  # 2031-02-20T07:30, in days since 1970
    axes = Figure().subplots()
    axes.set_xlim(start, start + length / timedelta(days=1))
    date_axis(axes.xaxis, most=most)
    assert 2 <= len(axes.xaxis.get_majorticklocs()) <= most + 1
