"""The tables of design storms: how often in both series, what is blank and why, and what was not asked."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from design_jobs import DEPTHS, TWO_POINTS, US_REDUCTION, design_tables, write_design_job
from record_jobs import daily_record, write_record_job

from basinrain.design_job import run_design
from basinrain.errors import JobError
from basinrain.results_design import DesignRun

PARTIAL = design_tables()["design"]["depths"] | {"series": "partial-duration"}
NAMES = (
    "design_depths",
    "design_storms",
    "design_hyetographs",
    "point_depths",
    "point_weights",
    "reductions_compared",
    "storm_rarity",
    "record_fits",
    "annual_maxima",
)


def run(folder: Path, **changes: Any) -> DesignRun:  # noqa: ANN401 - values of a job
    return run_design(write_design_job(folder, unit="km", **changes))


def test_return_periods_of_a_partial_duration_series_are_no_probabilities(tmp_path: Path) -> None:
    """Every table says which series years are counted in, and leaves the probability blank."""
    found = run(tmp_path, design__depths=PARTIAL)
    for name in NAMES[:4]:
        table = getattr(found, name)
        assert table["aep"].isna().all(), name
        assert table["return_period"].unique().tolist() == [10], name
        assert table["return_period_in"].unique().tolist() == ["partial-duration"], name


def test_probabilities_of_a_partial_duration_series_are_brought_over_if_the_job_says_so(tmp_path: Path) -> None:
    """AEP 0.1 is T = -1 / ln 0.9 = 9.49 years of it (Langbein 1949): under the depth of 10 years, and said."""
    asked = {"design__return_periods": None, "design__aep": 0.1}
    found = run(tmp_path / "yes", design__depths=PARTIAL | {"convert": True}, **asked)
    years = -1 / np.log(0.9)
    (row,) = found.design_depths.to_dict("records")
    assert (row["aep"], row["return_period"], row["return_period_in"]) == (0.1, 10, "annual-maximum")
    # The reduced variate of a partial duration series is ln T.
    assert row["point_depth"] == pytest.approx(40 + 20 * np.log(years / 2) / np.log(5), rel=1e-9)
    assert "series-converted" in {note.code for note in found.notes}
    with pytest.raises(JobError, match=r"\[design\] aep: found annual exceedance probabilities beside depths of a "):
        run(tmp_path / "no", design__depths=PARTIAL, **asked)


def test_probabilities_have_no_more_digits_than_they_were_asked_with(tmp_path: Path) -> None:
    """AEP 0.3 is 0.3 in every table, not what two divisions leave of it."""
    found = run(tmp_path, design__return_periods=None, design__aep=[0.3, 0.1])
    for name in NAMES[:4]:
        assert sorted(getattr(found, name)["aep"].unique().tolist()) == [0.1, 0.3], name


def test_depths_of_points_are_those_of_the_source(tmp_path: Path) -> None:
    """As in the file, before uplift and reduction; a point without weight in any area is left out."""
    text = TWO_POINTS + "".join(f"far,70000,5000,6h,{years},{depth}\n" for years, depth in ((2, 45), (10, 65)))
    found = run(
        tmp_path,
        depths=text,
        design__depths=design_tables()["design"]["depths"] | {"crs": "local"},
        design__uplift={"factor": 1.5, "source": "invented", "horizon": "2080"},
        design__areal_reduction=US_REDUCTION,
    )
    assert found.point_depths[["depth_point", "depth"]].to_numpy().tolist() == [["west", 60], ["east", 80]]
    weights = found.point_weights.set_index(["area_of", "depth_point"])["weight"].to_dict()
    assert weights == pytest.approx(
        {
            ("union", "west"): 0.5,
            ("union", "east"): 0.5,
            ("nw", "west"): 1,
            ("ne", "east"): 1,
            ("sw", "west"): 1,
            ("se", "east"): 1,
        }
    )
    assert found.point_weights["method"].unique().tolist() == ["thiessen"]


def test_reductions_side_by_side(tmp_path: Path) -> None:
    """The job's own first; one for elsewhere is headed so; one that has no answer has the reason and no number."""
    table = "duration,return_period,depth\n5min,10,9\n6h,10,60\n"
    found = run(
        tmp_path,
        depths=table,
        design__durations=["5min", "6h"],
        design__step="5min",
        design__areal_reduction={"method": "none", "compare": ["leclerc-schaake", "keers-wescott"]},
    )
    rows = found.reductions_compared.set_index(["duration", "method"])
    assert rows.index.tolist() == [
        (duration, method) for duration in ("5min", "6h") for method in ("none", "leclerc-schaake", "keers-wescott")
    ]
    assert rows["standing"].tolist() == ["of the design", "for comparison", "outside its region"] * 2
    assert rows.loc[("6h", "none"), "factor"] == 1
    assert (rows["factor"].isna() == (rows["reason"] != "")).all()
    # 100 km2 in 6 h by the formula of Leclerc and Schaake (1972), A in square miles and d in hours.
    area = 1e8 / 1609.344**2
    wanted = 1 - np.exp(-1.1 * 6**0.25) + np.exp(-1.1 * 6**0.25 - 0.01 * area)
    assert rows.loc[("6h", "leclerc-schaake"), "factor"] == pytest.approx(wanted, rel=1e-9)
    (none,) = found.reductions_compared.query("duration == '5min' and method == 'leclerc-schaake'").to_dict("records")
    assert np.isnan(none["factor"])
    assert "expected" in none["reason"]


def test_tables_of_what_was_not_asked_have_no_row(tmp_path: Path) -> None:
    """They have their columns all the same, and are not written."""
    found = run(tmp_path)
    for name in NAMES:
        table = getattr(found, name)
        assert len(table.columns) > 3
        assert bool(len(table)) == (name in NAMES[:5]), name
    written = {path.name for path in found.write(tmp_path / "written").iterdir()}
    assert written == {*(f"{name}.csv" for name in NAMES[:5]), "record.json", "report.html"}


def test_peaks_end_where_the_greatest_step_does(tmp_path: Path) -> None:
    """A triangle of 60 mm in 6 h with its peak at three quarters is greatest from 4 h to 5 h."""
    found = run(tmp_path, design__pattern=[{"shape": "triangular", "peak": "late"}])
    for row in found.design_storms.to_dict("records"):
        # Up to 4 h the share is (4 / 6)^2 / 0.75, from 4.5 h on 1 - (1 - t)^2 / 0.25.
        share = (1 - (1 / 6) ** 2 / 0.25) - (4 / 6) ** 2 / 0.75
        assert row["peak_depth"] == pytest.approx(60 * share, rel=1e-9)
        assert row["peak_intensity"] == pytest.approx(60 * share, rel=1e-9)
        assert (row["peak_ends_min"], row["step_min"]) == (300, 60)


def test_depths_from_the_record_in_inches(tmp_path: Path) -> None:
    """Fits and maxima are in the job's unit; the shape and the share have none."""
    mm = run_design(write_record_job(tmp_path / "mm", daily_record()))
    inches = run_design(
        write_record_job(tmp_path / "in", daily_record(), job={"name": "Two halves", "depth_unit": "in"})
    )
    for name, columns in (
        ("record_fits", ["location", "scale", "fitted", "depth", "lower_90", "upper_90"]),
        ("annual_maxima", ["depth"]),
        ("design_depths", ["point_depth", "areal_depth"]),
    ):
        one, other = getattr(mm, name), getattr(inches, name)
        np.testing.assert_allclose(other[columns], one[columns] / 25.4, rtol=1e-9)
        assert other["depth_unit"].unique().tolist() == ["in"]
    np.testing.assert_allclose(inches.record_fits["shape"], mm.record_fits["shape"], rtol=1e-9)
    assert set(mm.record_fits["distribution"]) == {"gumbel", "gev"}
    assert mm.record_fits.loc[mm.record_fits["taken"], "distribution"].unique().tolist() == ["gumbel"]


def test_the_caution_says_whether_climate_is_in_it(tmp_path: Path) -> None:
    """With an uplift its factor, horizon and source; without one that there is none. Depths: no table is needed."""
    without = run(tmp_path / "without", depths=DEPTHS)
    assert without.caution.endswith(
        "Climate change is not included: the depths are those of the source, and the job gives no uplift."
    )
    uplift = {"factor": 1.2, "source": "invented note", "horizon": "2070-2099"}
    lifted = run(tmp_path / "with", design__uplift=uplift)
    assert lifted.caution.endswith("Depths were multiplied by 1.2 for the climate of 2070-2099 (invented note).")
    assert lifted.formats == ("csv",)
