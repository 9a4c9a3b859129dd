"""A series at a longer step, on another clock, says what its steps said: by hand, by another library, and by laws."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from small_series import SERIES, Kept, drawn, hours

from basinrain.errors import DataError, JobError
from basinrain.series import regrouping
from basinrain.series.regrouping import regroup

ONE = SERIES[0]
ALL = slice(None), slice(None)
NAN = np.nan


def kept(depth: list[Any], share: list[Any], flags: list[Any]) -> Kept:
    """Series of one basin."""
    column = [np.array(values, dtype=kind)[:, None] for values, kind in ((depth, "f8"), (share, "f4"), (flags, "u1"))]
    return Kept({ONE: (column[0], column[1], column[2])})


def text(times: npt.NDArray[np.datetime64]) -> list[str]:
    return [str(time) for time in times]


def test_five_minutes_to_a_quarter_of_an_hour() -> None:
    """0.2 + 0.4 + 0.1 = 0.7 mm, shares (1 + 1 + 0.4) / 3 = 0.8, marks 1 and 2 together; one value missing, none."""
    ends = np.datetime64("2031-05-04T06:00:00") + 300 * np.arange(1, 7)
    source = kept([0.2, 0.4, 0.1, 3.0, NAN, 1.0], [1, 1, 0.4, 1, NAN, 1], [0, 1, 2, 1, 16, 0])
    grouped = regroup(ends - 300, ends, step="15min")
    result = grouped.source(source)
    assert text(grouped.ends) == ["2031-05-04T06:15:00", "2031-05-04T06:30:00"]
    np.testing.assert_array_equal(result.depth(*ONE)[ALL].ravel(), [0.2 + 0.4 + 0.1, NAN])
    np.testing.assert_allclose(result.observed_share(*ONE)[ALL].ravel(), [0.8, NAN], rtol=1e-7)
    # Where there is no number, that is all that is said.
    np.testing.assert_array_equal(result.flags(*ONE)[ALL].ravel(), [3, 16])
    kinds = [rows[ALL].dtype for rows in (result.depth(*ONE), result.observed_share(*ONE), result.flags(*ONE))]
    assert kinds == [np.float64, np.float32, np.uint8]
    assert (result.n_steps, result.series, result.depth(*ONE).shape) == (2, (ONE,), (2, 1))


def test_steps_that_are_not_filled_at_the_ends_are_left_out_and_said() -> None:
    """Hours from 22:00 to 13:00 hold two steps of six hours."""
    starts, ends = hours(15, "2031-05-03T22:00:00")
    grouped = regroup(starts, ends, step="6h")
    assert text(grouped.starts) == ["2031-05-04T00:00:00", "2031-05-04T06:00:00"]
    (note,) = grouped.notes
    assert (note.code, note.level) == ("steps-left-out", "info")
    assert str(note) == (
        "2 steps at the beginning and 1 at the end of the record do not fill a step of 6h: "
        "they are left out of the series."
    )
    (one,) = regroup(starts[1:-1], ends[1:-1], step="6h").notes
    assert str(one) == "1 step at the beginning of the record does not fill a step of 6h: it is left out of the series."
    assert regroup(starts[2:-1], ends[2:-1], step="6h").notes == ()


def test_a_step_in_the_midst_that_the_record_does_not_have_is_missing() -> None:
    """Of three days one has 23 hours: its time is there, without a number."""
    starts, ends = hours(72)
    there = np.delete(np.arange(72), 30)
    whole = drawn(72, 2, (ONE,))
    depth, share, flags = whole.arrays[ONE]
    depth, share, flags = np.nan_to_num(depth), np.nan_to_num(share), flags & 15
    source = Kept({ONE: (depth[there], share[there], flags[there])})
    result = regroup(starts[there], ends[there], step="1d").source(source)
    sums = result.depth(*ONE)[ALL]
    assert np.isnan(sums[1]).all()
    np.testing.assert_allclose(sums[[0, 2]], depth.reshape(3, 24, 2).sum(axis=1)[[0, 2]], rtol=1e-14)
    assert np.isnan(result.observed_share(*ONE)[ALL][1]).all()
    np.testing.assert_array_equal(result.flags(*ONE)[ALL][1], [16, 16])


def test_hours_to_six_hours_to_days_are_hours_to_days() -> None:
    """Regrouping twice and once agree, to rounding."""
    starts, ends = hours(24 * 5)
    source = drawn(24 * 5, 3)
    once = regroup(starts, ends, step="1d")
    first = regroup(starts, ends, step="6h")
    second = regroup(first.starts, first.ends, step="1d")
    twice = second.source(first.source(source))
    np.testing.assert_array_equal(second.ends, once.ends)
    for one in SERIES:
        straight = once.source(source)
        np.testing.assert_allclose(twice.depth(*one)[ALL], straight.depth(*one)[ALL], rtol=1e-14)
        np.testing.assert_allclose(twice.observed_share(*one)[ALL], straight.observed_share(*one)[ALL], rtol=1e-6)
        np.testing.assert_array_equal(twice.flags(*one)[ALL], straight.flags(*one)[ALL])


@pytest.mark.parametrize(("step", "hour"), [("6h", 0), ("1d", 0), ("1d", 8)])
def test_sums_are_those_of_pandas(step: str, hour: int) -> None:
    """Resampling by pandas, closed and labelled on the right, gives the same sums at the same times."""
    starts, ends = hours(24 * 9 + 5, "2031-02-26T03:00:00")
    source = drawn(len(ends), 2)
    grouped = regroup(starts, ends, step=step, day_phase=hour * 3600)
    frame = pd.DataFrame(source.depth(*ONE), index=pd.DatetimeIndex(ends))
    sums = frame.resample(step.upper() if step == "1d" else step, closed="right", label="right", offset=f"{hour}h")
    expected = sums.sum(min_count=1)[sums.count().max(axis=1) >= 0].loc[pd.DatetimeIndex(grouped.ends)]
    missing = sums.apply(lambda values: values.isna().any()).loc[expected.index]
    np.testing.assert_allclose(
        grouped.source(source).depth(*ONE)[ALL], expected.mask(missing.astype(bool)).to_numpy(), rtol=1e-13
    )


@pytest.mark.parametrize(
    ("timezone", "zone", "first"),
    [
        ("UTC", "+00:00", "2031-07-04T06:00:00"),
        ("+05:30", "+05:30", "2031-07-04T11:30:00"),
        # Standard time, in July too: common practice for records that must not skip or repeat an hour.
        ("Europe/Vienna", "+01:00", "2031-07-04T07:00:00"),
    ],
)
def test_stamps_move_to_the_clock_that_is_asked_for(timezone: str, zone: str, first: str) -> None:
    """08:00 at +02:00 is 06:00 UTC; the values stay what they are."""
    starts, ends = hours(4, "2031-07-04T07:00:00")
    grouped = regroup(starts, ends, zone="+02:00", timezone=timezone)
    assert (grouped.zone, str(grouped.ends[0])) == (zone, first)
    source = drawn(4, 1)
    assert grouped.source(source) is source


def test_days_begin_at_midnight_of_the_clock_that_is_written() -> None:
    """A day in UTC is not the day at +02:00, where the record has no days of its own."""
    starts, ends = hours(72, "2031-05-04T00:00:00")
    grouped = regroup(starts, ends, step="1d", zone="+02:00", timezone="UTC")
    assert text(grouped.ends) == ["2031-05-05T00:00:00", "2031-05-06T00:00:00"]
    assert grouped.first.tolist() == [2, 26]


def test_rainfall_days_of_the_record_stay_where_they_are() -> None:
    """Days from 08:00 at +02:00 are days from 06:00 UTC, and hours below a day count from midnight all the same."""
    starts, ends = hours(72, "2031-05-04T08:00:00")
    eight = 8 * 3600
    grouped = regroup(starts, ends, step="1d", zone="+02:00", timezone="UTC", day_phase=eight)
    assert text(grouped.ends) == ["2031-05-05T06:00:00", "2031-05-06T06:00:00", "2031-05-07T06:00:00"]
    assert str(regroup(starts, ends, step="12h", day_phase=eight).starts[0]) == "2031-05-04T12:00:00"
    days = starts[::24], starts[::24] + 86_400
    weeks = regroup(*days, step="3d", zone="+02:00", timezone="UTC")
    assert text(weeks.starts) == ["2031-05-04T06:00:00"]


def test_several_days_count_from_the_first_whole_day() -> None:
    """From noon of the 4th, steps of two days begin on the 5th."""
    starts, ends = hours(12 + 4 * 24, "2031-05-04T12:00:00")
    grouped = regroup(starts, ends, step="2d")
    assert text(grouped.starts) == ["2031-05-05T00:00:00", "2031-05-07T00:00:00"]
    assert grouped.first.tolist() == [12, 60]


def test_the_record_s_own_step_is_left_alone() -> None:
    """Whatever hour it begins at, and months, too."""
    months = np.array(["2031-01", "2031-02", "2031-03"], dtype="datetime64[M]").astype("datetime64[s]")
    for starts, ends, step in (
        (*hours(3, "2031-05-04T00:30:00"), "60min"),
        (months[:-1], months[1:], "1mo"),
        (months[:-1], months[1:], None),
    ):
        grouped = regroup(starts, ends, step=step)
        np.testing.assert_array_equal(grouped.ends, ends)
        assert (grouped.parts, len(grouped), int(grouped.whole.sum())) == (1, len(ends), len(ends))


@pytest.mark.parametrize(
    ("step", "message"),
    [
        ("15min", "found '15min', shorter than the record's step of 1h; expected 1h or a multiple of it; depths are"),
        ("90min", "found '90min'; expected a multiple of the record's step of 1h"),
        ("5h", "found '5h'; expected a step that divides a day, or whole days; else it would begin"),
        ("36h", "found '36h'; expected a step that divides a day, or whole days"),
        ("1mo", "found '1mo'; expected a step of fixed length: minutes, hours or days"),
        ("hourly", "found 'hourly'; expected a number with min, h or d"),
        ("2d", "found '2d', of which the record fills none; expected a step that the record is longer than"),
    ],
)
def test_steps_that_cannot_be_written(step: str, message: str) -> None:
    """The message says what was asked for and what could be."""
    with pytest.raises(JobError, match=rf"\[series\] step: {message}"):
        regroup(*hours(40), step=step)


def test_bounds_that_cut_the_record_s_steps() -> None:
    """Hours at +00:30 do not make up six hours in UTC; the first that is cut is named."""
    with pytest.raises(
        JobError, match=r"'6h', whose bounds cut the record's step that begins at 2031-05-03T23:30:00\+"
    ):
        regroup(*hours(40), step="6h", zone="+00:30", timezone="UTC")


def test_what_is_wrong_with_clock_and_step_comes_together() -> None:
    """A clock that is not known, a zone that is none, and a step that is none."""
    with pytest.raises(JobError, match=r"(?s)timezone: found 'UTC', and a record whose clock.*step: found '7min'"):
        regroup(*hours(40), step="7min", timezone="UTC")
    with pytest.raises(JobError, match="timezone: found 'Europe/Wien'; expected 'UTC', an offset"):
        regroup(*hours(40), zone="+01:00", timezone="Europe/Wien")
    with pytest.raises(JobError, match=r"'America/Chicago', which was -21036 seconds off UTC .* whole minutes"):
        regroup(*hours(40, "1880-05-04T00:00:00"), zone="+01:00", timezone="America/Chicago")


def test_records_that_have_no_steps_in_time() -> None:
    """Storm totals without times, and no steps at all, are refused; steps of unlike length are never summed."""
    nothing = np.array(["NaT"], dtype="datetime64[s]")
    for times in (nothing, nothing[:0]):
        with pytest.raises(JobError, match="found a record without times"):
            regroup(times, times, step="1h")
    starts, ends = hours(3)
    ends[2] += 60
    with pytest.raises(
        JobError,
        match="'3h', and a record whose steps differ in length; expected no other step than the record's; leave it out",
    ):
        regroup(starts, ends, step="3h")


def test_a_source_of_another_record_is_refused() -> None:
    """39 steps are not the 40 that were grouped."""
    with pytest.raises(DataError, match="series: found 39 steps; expected 40"):
        regroup(*hours(40), step="2h").source(drawn(39, 1))


@given(
    n=st.integers(24, 90),
    offset=st.integers(0, 23),
    parts=st.sampled_from([2, 3, 4, 6, 8, 12, 24]),
    shift=st.integers(-12, 12),
    holes=st.sets(st.integers(0, 89), max_size=4),
    held=st.sampled_from([1, 5, 17, 1 << 20]),
)
def test_any_part_is_the_sum_in_order_of_time(
    *, n: int, offset: int, parts: int, shift: int, holes: set[int], held: int
) -> None:
    """Against a loop over clock hours, to the last digit, whatever is held at a time and whatever part is asked for."""
    starts, ends = hours(n, f"2031-05-04T{offset:02d}:00:00")
    there = np.array([at for at in range(n) if at not in holes])
    source = drawn(len(there), 2, (ONE,), seed=n)
    written = f"{'-' if shift < 0 else '+'}{abs(shift):02d}:00"
    sums: dict[int, list[Any]] = {}
    marks: dict[int, list[Any]] = {}
    for row, at in enumerate(there):
        window = (offset + int(at) + shift) // parts if parts < 24 else (offset + int(at) + shift) // 24
        sums.setdefault(window, []).append(source.depth(*ONE)[row])
        marks.setdefault(window, []).append(source.flags(*ONE)[row])
    full = [window for window, values in sums.items() if len(values) == parts]
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(regrouping, "_HELD", held)
        if not full:
            with pytest.raises(JobError, match="of which the record fills none"):
                regroup(starts[there], ends[there], step=f"{parts}h", zone="+00:00", timezone=written)
            return
        grouped = regroup(starts[there], ends[there], step=f"{parts}h", zone="+00:00", timezone=written)
        result = grouped.source(source)
        depth, flags = result.depth(*ONE)[ALL], result.flags(*ONE)[ALL]
        np.testing.assert_array_equal(result.depth(*ONE)[slice(1, 3), slice(1, 2)], depth[1:3, 1:2])
    expected = [sum(sums[w]) if w in full else np.full(2, NAN) for w in range(min(full), max(full) + 1)]
    np.testing.assert_array_equal(depth, expected)
    for row, window in enumerate(range(min(full), max(full) + 1)):
        together = np.bitwise_or.reduce(marks[window]) if window in full else np.full(2, 16)
        np.testing.assert_array_equal(flags[row], np.where(together & 16, 16, together))


class Watched:
    """Rows that remember how many of them were asked for at once."""

    def __init__(self, shape: tuple[int, int]) -> None:
        self.shape, self.most = shape, 0

    def __getitem__(self, part: tuple[slice, slice], /) -> npt.NDArray[Any]:
        rows, columns = (range(n)[one] for n, one in zip(self.shape, part, strict=True))
        self.most = max(self.most, len(rows) * len(columns))
        return np.ones((len(rows), len(columns)))


@pytest.mark.parametrize("basins", [3, 400])
def test_no_more_is_held_than_said(basins: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Ten days of minutes to days: no part that is read has more than the bound, one step of all basins excepted."""
    monkeypatch.setattr(regrouping, "_HELD", 1000)
    ends = np.datetime64("2031-05-04T00:00:00") + 60 * np.arange(1, 14_401)
    watched = Watched((14_400, basins))

    class Source(Kept):
        def depth(self, *_: str) -> Any:  # noqa: ANN401 - rows
            return watched

    source = Source({ONE: (np.empty((14_400, 0)),) * 3})
    sums = regroup(ends - 60, ends, step="1d").source(source).depth(*ONE)[ALL]
    np.testing.assert_array_equal(sums, np.full((10, basins), 1440.0))
    assert 400 <= watched.most <= 1000
