"""Records in another unit than the declared one."""

from __future__ import annotations

import pytest
from screening.drawn_records import found, rain_of, record_of

from basinrain.screening import apply_edits


@pytest.mark.parametrize(("factor", "words"), [(25.4, "25.4"), (0.1, "1/10"), (1 / 25.4, "1/25.4"), (10.0, "10")])
def test_a_whole_record_in_another_unit_is_named_with_its_factor(factor: float, words: str) -> None:
    """One of five gauges has so many times the others' depths; the edit brings them back."""
    clean = rain_of(400, 5)
    depths = clean.copy()
    depths[:, 3] *= factor
    record = record_of(depths)
    (finding,) = found("unit-mixup", record)
    assert (finding.gauge, finding.whole_record) == ("D", True)
    assert f"near {words}," in finding.evidence
    assert finding.edit is not None
    (mended,), _ = apply_edits([record], [finding.edit])
    assert mended.depth[:, 3] == pytest.approx(clean[:, 3])


def test_a_stretch_in_another_unit_is_found_with_its_months() -> None:
    """From May to October of the second year one gauge is written in tenths."""
    depths = rain_of(3 * 365, 5)
    first, stop = 365 + 120, 365 + 304
    depths[first:stop, 0] *= 10
    (finding,) = found("unit-mixup", record_of(depths))
    assert (str(finding.start)[:7], str(finding.end)[:7]) == ("2032-05", "2032-11")
    assert finding.edit is not None
    assert finding.edit.value == pytest.approx(0.1)


def test_a_wet_place_is_none() -> None:
    """A gauge on a ridge with three times the others' rain, throughout, is climate and not a unit."""
    depths = rain_of(3 * 365, 5)
    depths[:, 2] *= 3
    assert found("unit-mixup", record_of(depths)) == []


def test_neighbours_that_differ_as_much_tell_nothing() -> None:
    """Between gauges with 10, 1, 3 and 40 times some depth nobody knows a unit by the ratio."""
    depths = rain_of(400, 4) * [10.0, 1.0, 3.0, 40.0]
    assert found("unit-mixup", record_of(depths)) == []
