"""Which methods take part in a comparison."""

from __future__ import annotations

from basinrain.infill import METHODS, InfillOptions
from basinrain.infill.leave_one_out import candidates_of


def test_every_method_from_simple_to_complex() -> None:
    """All ten are there in their order, inverse distance with both its powers, each with its own number of donors."""
    candidates = candidates_of(InfillOptions())
    assert [candidate.label for candidate in candidates] == [
        "nearest-gauge",
        "station-average",
        "inverse-distance (power 1)",
        "inverse-distance (power 2)",
        "four-quadrant",
        "normal-ratio",
        "ten-percent-rule",
        "inverse-distance-ratios (power 2)",
        "correlation-weighting",
        "regression",
        "ratio-regression",
    ]
    assert {candidate.options.method for candidate in candidates} == set(METHODS)
    assert all(c.options.donors_wanted == c.options.chosen_method.nearest for c in candidates)


def test_the_jobs_numbers_go_to_those_who_take_them() -> None:
    """Radius and elevation limit to all; donors and power where the method has them; the job's power beside 1, 2."""
    job = InfillOptions(method="inverse-distance", power=1.5, nearest=6, min_donors=3, radius=9e3, elevation_limit=400)
    by_label = {candidate.label: candidate.options for candidate in candidates_of(job)}
    assert [label for label in by_label if label.startswith("inverse-distance (")] == [
        f"inverse-distance (power {power})" for power in ("1", "1.5", "2")
    ]
    assert by_label["inverse-distance-ratios (power 1.5)"].power == 1.5
    assert by_label["inverse-distance (power 1.5)"] == job
    assert all(o.radius == 9e3 and o.elevation_limit == 400 for o in by_label.values())
    assert by_label["normal-ratio"].nearest == 6
    assert by_label["nearest-gauge"].nearest is None
    assert by_label["four-quadrant"].min_donors == 3


def test_a_power_of_two_is_there_once() -> None:
    """The job's power may be one of the usual ones."""
    labels = [candidate.label for candidate in candidates_of(InfillOptions(power=2))]
    assert len(labels) == len(set(labels)) == 11
