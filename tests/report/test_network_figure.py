from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from report.markup import svg_texts
from report.series_run import four_days, four_years, make_series_run, read_by_chunks

from basinrain.report import network_figure
from basinrain.report.network_figure import network_picture
from basinrain.series.network_changes import RETURNS, SILENT, NetworkChange


def test_gauges_are_counted_at_every_step() -> None:
    """Three in service, of which B is out on the third day."""
    in_service, reporting = network_figure._counts(four_days().record)
    assert in_service.tolist() == [3, 3, 3, 3]
    assert reporting.tolist() == [3, 3, 2, 3]


def test_counting_in_blocks_changes_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    """The same of four years in blocks of two steps."""
    record = four_years().record
    whole = network_figure._counts(record)
    monkeypatch.setattr(network_figure, "_BLOCK", 7)
    np.testing.assert_array_equal(network_figure._counts(record), whole)


def test_only_what_occurs_is_in_the_legend() -> None:
    """C opened, B fell silent and came back, none closed."""
    picture = network_picture(four_years())
    assert picture is not None
    texts = svg_texts(picture.svg)
    assert {"in service", "reporting", "comes into service", "falls silent", "reports again"} <= set(texts)
    assert "goes out of service" not in texts
    assert "comes into service: 1" in picture.svg
    assert "In service 2 to 3 gauges, reporting 1 to 3." in picture.svg


def test_a_record_in_chunks_shows_what_the_changes_tell() -> None:
    """From the first change on, and the caption says what was not counted."""
    picture = network_picture(read_by_chunks(four_years()))
    assert picture is not None
    assert "in service, not silent for long, from the first change" in svg_texts(picture.svg)
    assert "how many reported at every step was not counted" in picture.caption


def test_a_network_that_changes_all_the_time_stays_small() -> None:
    """Of a hundred thousand changes the paper shows a few hundred."""
    run = four_years()
    times = run.starts[0] + np.arange(100_000) * np.timedelta64(1200, "s")
    changes = tuple(
        NetworkChange(time=when, gauge=f"G{k % 99}", change=(SILENT, RETURNS)[k % 2], gauges=50 + k % 2)
        for k, when in enumerate(times)
    )
    for many in (replace(run, changes=changes), read_by_chunks(replace(run, changes=changes))):
        picture = network_picture(many)
        assert picture is not None
        assert len(picture.svg) < 200_000


def test_nothing_to_draw(tmp_path: Path) -> None:
    """One step, or a record in chunks in which nothing changed."""
    assert network_picture(make_series_run(tmp_path, [[1, 2, 3]], gaps=["reweight"])) is None
    assert network_picture(read_by_chunks(four_days())) is None


def test_a_repeat_is_identical() -> None:
    """The same run gives the same bytes."""
    assert network_picture(four_years()) == network_picture(replace(four_years()))
