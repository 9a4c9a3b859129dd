"""Storms of one series, with what fell before them."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from basinrain.series.found_storms import FoundStorms, find_storms

N = np.nan
HOUR = np.timedelta64(3600, "s")


def found(depth: npt.ArrayLike, step: np.timedelta64 = HOUR, **given: object) -> FoundStorms:
    values = np.array(depth, dtype=float)
    ends = np.datetime64("2031-05-04", "s") + np.arange(1, len(values) + 1) * step
    options: dict[str, Any] = {
        "basin": "all",
        "gaps": "reweight",
        "method": "thiessen",
        "count": 5,
        "dry_gap": 2 * HOUR,
        "wet_depth": 0.1,
        "rank": "total",
        "recession": 0.9,
        **given,
    }
    return find_storms(ends - step, ends, values, **options)


def test_the_largest_first_as_many_as_asked_for() -> None:
    """Three storms of 3, 9 and 5 mm; the two largest are taken; by the greatest hour they come the other way round."""
    depth = [3, 0, 0, 3, 3, 3, 0, 0, 5, 0, 0]
    storms = found(depth, count=2)
    assert [ranked.depth for ranked in storms.taken] == [9, 5]
    assert [ranked.depth for ranked in found(depth, count=2, rank=HOUR).taken] == [5, 3]
    assert storms.before is not None
    assert storms.before.present.shape == (2, 3)


def test_without_a_storm_nothing_is_known_of_what_fell_before() -> None:
    """A dry series has none."""
    storms = found([0, 0, 0])
    assert storms.taken == ()
    assert storms.before is None
    assert storms.index is None
    assert storms.notes == ()


def test_a_storm_with_a_missing_step_is_not_taken() -> None:
    """It stands apart, and is warned of."""
    storms = found([3, 0, 0, 0, 8, N, 8, 0, 0, 0], count=1)
    assert [ranked.depth for ranked in storms.taken] == [3]
    assert [ranked.present for ranked in storms.ranking.incomplete] == [16]
    assert "incomplete-storms" in [note.code for note in storms.notes if note.level == "warning"]


def test_steps_of_a_month_have_no_storms() -> None:
    """No storm is sought where steps are longer than a day, and a note says so."""
    storms = found([80, 60], step=np.timedelta64(30 * 86400, "s"))
    assert storms.taken == ()
    assert [note.code for note in storms.notes] == ["storms-not-sought"]


def test_the_gap_from_the_record() -> None:
    """With no dry gap given the test finds one, and is kept; with too few spells it says so."""
    rng = np.random.default_rng(5)
    depth = np.zeros(24 * 900)
    at = 0
    while at < len(depth) - 30:
        at += int(rng.exponential(60)) + 8
        depth[at : at + 3] = 2.0
        depth[at + 5 : at + 7] = 1.0
        at += 7
    storms = found(depth, dry_gap=None)
    assert storms.test is not None
    assert storms.dry_gap == storms.test.gap
    assert storms.dry_gap > HOUR
    short = found([1, 0, 0, 1], dry_gap=None)
    assert short.taken == ()
    (note,) = short.notes
    assert note.level == "warning"
    assert note.text.startswith("No storms were sought in the record, since no dry gap could be found: ")
