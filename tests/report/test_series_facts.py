from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from report.series_run import four_days, make_series_run

from basinrain.report import series_facts
from basinrain.report.words import NARROW_SPACE
from basinrain.series.flags import Flag
from basinrain.writing import write_run
from basinrain.writing.series_files import FORMATS


def test_the_run_in_short() -> None:
    """Span, step, basins, gauges, policies, infill and what was observed."""
    facts = {name: text.replace(NARROW_SPACE, " ") for name, text in series_facts.record_facts(four_days())}
    assert facts == {
        "Record": "2027-01-01 00:00 to 2027-01-05 00:00, the record's clock",
        "Step": "1 day; 4 steps",
        "Basins": "2 basins, and their union; 100.0 km²",
        "Gauges": "3, of which 2 inside the basins",
        "Averages": "thiessen",
        "Policies for gaps": "infill, reweight",
        "Infill": "station-average at the scale of the day",
        "Observed": "89.4 % of the weight in basin union, 78.8 % to 100.0 % over the basins, by thiessen ('infill')",
        "Units": "depths in mm",
    }


def test_nothing_is_said_of_infill_where_nothing_is_infilled(tmp_path: Path) -> None:
    """By reweighting alone."""
    run = make_series_run(tmp_path, [[1, 2, 3]], gaps=["reweight"])
    assert "Infill" not in dict(series_facts.record_facts(run))
    assert "station-average" not in " ".join(dict(series_facts.policy_facts(run)).values())


def test_policies_in_words() -> None:
    """Those of the job, and what holds for all."""
    facts = dict(series_facts.policy_facts(four_days()))
    assert list(facts) == ["infill", "reweight", "By every policy", "What is weighed"]
    assert facts["reweight"].startswith("Nothing is infilled.")
    assert facts["By every policy"].endswith("A step at which no gauge has a depth is missing.")
    assert facts["What is weighed"] == "Depths: weights are given to the depths themselves."


def test_ratios_to_normals_in_words() -> None:
    """The mean ratio is multiplied by the basin's normal."""
    run = four_days()
    facts = dict(series_facts.policy_facts(replace(run, setup=replace(run.setup, ratios=True))))
    assert facts["What is weighed"].startswith(
        "Ratios: weights are given to the ratios of depths to the gauges' normals"
    )


def test_every_mark_has_words() -> None:
    """As many as there are flags, by the words of the files."""
    assert [word for word, _ in series_facts.flag_facts()] == [flag.word for flag in Flag]


def test_a_coarser_step_is_told(tmp_path: Path) -> None:
    """Two days out of days."""
    run = make_series_run(tmp_path, [[1, 2, 3]] * 4, gaps=["reweight"], series='step = "2d"')
    (_, text), *_ = series_facts.ways_facts(run)
    assert text.startswith("Series stand at a step of 2 days, each the sum of 2 steps of the record")


@pytest.mark.parametrize("formats", [["csv"], ["csv-per-basin"]])
def test_the_files_are_those_that_are_written(tmp_path: Path, formats: list[str]) -> None:
    """Every file or folder of the output but the page itself, and no other."""
    run = make_series_run(tmp_path / "job", [[1, 2, 3]] * 4, gaps=["reweight"], series=f"formats = {formats}")
    written = {path.name for path in write_run(run, tmp_path / "out").iterdir()} - {"report.html"}
    assert {row[0].rstrip("/") for row in series_facts.files_table(run).rows} == written


def test_every_format_has_its_file() -> None:
    """The words of the job and the names of the files."""
    run = four_days()
    settings = {**run.settings, "series": {**run.settings["series"], "formats": list(FORMATS)}}
    rows = series_facts.files_table(replace(run, settings=settings)).rows
    assert [row[0].rstrip("/") for row in rows[: len(FORMATS)]] == [form.name for form in FORMATS.values()]
