"""What a window must have besides depths before it is completed, and what is said where donors are scarce."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from windows import hourly, network, with_status

from basinrain.errors import DataError
from basinrain.infill import InfillOptions, complete, relations_of
from basinrain.rainfall import RainRecord, Status

NAN = float("nan")


def not_infilled(record: RainRecord, options: InfillOptions, **known: object) -> str:
    """Return the reason why the one gap of B stays."""
    bare = replace(network(len(record.gauges)), **known)  # type: ignore[arg-type]
    (note,) = [note for note in complete(record, bare, options).notes if note.code == "not-infilled"]
    assert note.gauge == "B"
    return note.text.split(": ")[-1]


def test_normals_and_elevations_are_asked_for_together() -> None:
    """B has no normal, A and C no elevation; D, which never reports and is not in service, may lack both."""
    record = with_status(hourly([1, 2], [NAN, 2], [3, 1], [NAN, NAN]), "D", slice(None), Status.NOT_INSTALLED)
    known = replace(network(4, [[900], [NAN], [800], [NAN]]), elevation=np.array([NAN, 200.0, NAN, NAN]))
    options = InfillOptions(method="ten-percent-rule", scale="step", elevation_limit=100)
    with pytest.raises(DataError) as caught:
        complete(record, known, options)
    assert [(p.gauge, p.found) for p in caught.value.problems] == [
        ("B", "no normal for the year"),
        ("A", "no elevation"),
        ("C", "no elevation"),
    ]
    assert "for the ten-percent-rule method" in str(caught.value)


def test_elevations_are_not_needed_without_a_gap() -> None:
    """Nothing is infilled, so nothing is asked."""
    completed = complete(hourly([1, 2], [3, 4]), network(2), InfillOptions(elevation_limit=100))
    assert completed.notes == ()


def test_the_limits_of_donors_are_named() -> None:
    """Only A lies within 1 km and 50 m of B's elevation."""
    record = hourly([1, 2], [NAN, 2], [3, 1], [4, 4])
    options = InfillOptions(scale="step", radius=1000, elevation_limit=50)
    elevation = np.array([310.0, 300.0, 351.0, 300.0])
    assert not_infilled(record, options, elevation=elevation) == (
        "fewer than 2 other gauges within 1 km and within 50 m of its elevation reported at the step."
    )


def test_quadrants_are_named() -> None:
    """All gauges stand on one line to the east of A; seen from B, A is west and C and D are east."""
    record = hourly([NAN, 1], [NAN, 2], [3, 1], [4, 4])
    options = InfillOptions(method="four-quadrant", scale="step")
    completed = complete(record, network(4), options)
    assert {note.text.split(": ")[-1] for note in completed.notes if note.code == "not-infilled"} == {
        "fewer than 2 other gauges in different quadrants reported at the step."
    }


def test_correlations_are_named() -> None:
    """Two hours make no relation."""
    options = InfillOptions(method="correlation-weighting")
    assert not_infilled(hourly([1, 2], [NAN, NAN], [3, 1]), options) == (
        "fewer than 2 other gauges with a known correlation above 0 have values of their own at every step of the "
        "storm; a correlation needs 30 days, or longer steps, in common, and B has 0 at most with any other."
    )


@pytest.mark.parametrize(
    ("alike", "words"),
    [
        (20, "A has 20 at most with any other."),
        (30, "A has as many with 1 only."),
    ],
)
def test_a_record_too_short_for_correlations_says_so(alike: int, words: str) -> None:
    """A has some days in common with B, and none with C, which the method would need too."""
    days = np.random.default_rng(3).gamma(1.0, 5.0, (40, 3))
    days[alike:, 1] = days[:, 2] = NAN
    relations = relations_of(days, network(3))
    options = InfillOptions(method="regression", scale="step")
    completed = complete(hourly([NAN, 1], [2, 1], [3, 1]), network(3), options, relations=relations)
    (note,) = [note for note in completed.notes if note.code == "not-infilled"]
    assert note.text.endswith(
        f"reported at the step; a correlation needs 30 days, or longer steps, in common, and {words}"
    )


def test_a_correlation_that_is_known_needs_no_word() -> None:
    """A goes against B and C, so neither donates, long as the record is."""
    days = np.column_stack([np.arange(40.0), 40 - np.arange(40.0), 40 - np.arange(40.0)])
    options = InfillOptions(method="regression", scale="step")
    record = hourly([NAN, 1], [2, 1], [3, 1])
    completed = complete(record, network(3), options, relations=relations_of(days, network(3)))
    assert completed.notes[-1].text.endswith("with a known correlation above 0 reported at the step.")


def test_elevation_decides_who_donates() -> None:
    """C, 60 m above B, is left out for D: B is the mean of A's 1 and D's 4 mm."""
    record = hourly([1, 2], [NAN, 2], [3, 1], [4, 4])
    known = replace(network(4), elevation=np.array([310.0, 300.0, 360.0, 300.0]))
    options = InfillOptions(method="station-average", scale="step", nearest=2, elevation_limit=50)
    assert complete(record, known, options).record.depth[0, 1] == 2.5
