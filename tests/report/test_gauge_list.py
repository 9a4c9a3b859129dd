from __future__ import annotations

from dataclasses import replace

from report.small_run import make_run

from basinrain.report.gauge_list import network_table, totals_tables
from basinrain.results import StormRun


def test_positions_elevations_basins_and_normals(run: StormRun) -> None:
    """A lies in west at (3, 3) km, D's height is not known, E lies outside."""
    rows = {row[0]: row for row in network_table(run).rows}
    assert rows["A"] == ("A", "A", "3.00", "3.00", "100", "west", "900.0")
    assert rows["D"][4] == "–"
    assert rows["E"][5] == "outside"
    assert network_table(run).heads[-1] == "normal of the year 1991-2020, mm"


def test_heights_are_in_the_jobs_unit(run: StormRun) -> None:
    """A job with heights in feet prints feet: 100 m are 328 ft."""
    feet = replace(run, settings={"gauges": {"elevation_unit": "ft"}})
    table = network_table(feet)
    assert table.heads[4] == "elevation, ft"
    assert table.rows[0][4] == "328"


def test_totals_with_status_and_steps(run: StormRun) -> None:
    """Each kind of gauge in its words; a missing total is a dash."""
    rows = {row[0]: row[1:] for row in totals_tables(run)[0].rows}
    assert rows["A"] == ("12.0", "observed", "6 of 6")
    assert rows["B"] == ("12.0", "partly infilled", "5 of 6")
    assert rows["C"] == ("15.0", "infilled", "0 of 6")
    assert rows["F"] == ("–", "missing", "0 of 6")


def test_three_storms_abreast_and_the_rest_in_the_file() -> None:
    """Seven storms make two tables of three, and the last says where the seventh is."""
    tables = totals_tables(make_run(storms=tuple(f"S{k}" for k in range(7))))
    assert [len(table.over) - 1 for table in tables] == [3, 3]
    assert tables[-1].notes[-1] == "1 more storm is in gauge_totals.csv."
