from __future__ import annotations

from pathlib import Path

import pytest
from report.design_run import bare, from_record, make_design, two_halves

from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.interval_factors import INTERVAL_FACTORS
from basinrain.report.design_formulas import chain_formulas, record_formulas, reduction_formula, used_reduction


@pytest.mark.parametrize("name", [name for name in REDUCTIONS if name != "exponential"])
def test_every_reduction_has_a_formula_with_source_and_evidence(name: str) -> None:
    """Whatever the registry has can be printed; what is from memory is said to be."""
    formula = reduction_formula(name)
    assert len(formula.formula) > 20
    assert REDUCTIONS[name].source.split(",")[0] in formula.source
    assert ("from memory" in formula.source) == ("from memory" in REDUCTIONS[name].evidence)


def test_the_jobs_own_coefficients_are_in_the_formula(tmp_path: Path) -> None:
    """With their source."""
    reduction = {
        "method": "exponential",
        "coefficients": {"c1": 0.0021, "c2": 0.53, "c3": 0.25},
        "source": "Quill study <1> (invented)",
    }
    formula = used_reduction(make_design(tmp_path, design__areal_reduction=reduction))
    assert formula is not None
    assert "exp(−0.0021 <i>A</i>)) exp(−0.53 <i>t</i><sup>0.25</sup>)" in formula.formula
    assert formula.source == "Quill study <1> (invented)"


def test_none_is_used_where_nothing_is_reduced() -> None:
    """Nor where the depths are areal."""
    assert used_reduction(bare()) is None
    assert used_reduction(from_record()) is None
    used = used_reduction(two_halves())
    assert used is not None
    assert used.method == "leclerc-schaake"


@pytest.mark.parametrize("name", list(INTERVAL_FACTORS))
def test_every_interval_factor_has_a_formula(tmp_path: Path, name: str) -> None:
    """With source and evidence."""
    run = make_design(tmp_path, design__depths__interval_factor=name, design__depths__observed_every="1h")
    names = [formula.method for formula in chain_formulas(run)]
    assert names == ["Between durations", "Between frequencies", "Interval factor", "Uplift"]
    assert INTERVAL_FACTORS[name].source[:20] in chain_formulas(run)[2].source


def test_an_equation_is_its_own_interpolation(tmp_path: Path) -> None:
    """One set of coefficients: nothing lies between frequencies; several: depths between them do."""
    depths = {
        "from": "equation",
        "equation": "bernard",
        "coefficients": [{"k": 30.0, "x": 0.2, "n": 0.6}],
        "return_periods": [2, 100],
        "valid": ["10min", "24h"],
        "unit": "mm/h",
        "duration_unit": "h",
        "series": "annual-maximum",
        "source": "invented",
        "date": "2031",
    }
    (intensity, *others) = chain_formulas(make_design(tmp_path / "one", design__depths=depths, design__uplift=None))
    assert intensity.method == "Intensity"
    assert intensity.formula == "i = k T^x / t^n, i in mm/h, t in h"
    assert "Bernard" in intensity.source
    assert others == []
    sets = {"coefficients": [{"k": 30.0, "n": 0.6}, {"k": 60.0, "n": 0.6}]}
    several = make_design(tmp_path / "two", design__depths=depths | sets)
    assert [f.method for f in chain_formulas(several)] == ["Intensity", "Between frequencies", "Uplift"]


def test_a_partial_duration_series_has_its_own_variate(tmp_path: Path) -> None:
    """The logarithm of the return period, by Langbein."""
    run = make_design(tmp_path, design__depths__series="partial-duration")
    assert "ln <i>T</i>" in chain_formulas(run)[1].formula
    assert "Langbein" in chain_formulas(run)[1].source
    assert "ln(−ln(1 − AEP))" in chain_formulas(two_halves())[1].formula


def test_formulas_of_the_record_are_of_a_record() -> None:
    """Both distributions, plotting positions, goodness and interval."""
    assert record_formulas(two_halves()) == []
    assert [f.method for f in record_formulas(from_record())] == [
        "Gumbel",
        "GEV",
        "Reduced variate",
        "Plotting positions",
        "Correlation",
        "Shape test",
        "90 % interval",
    ]
    assert [f.method for f in chain_formulas(from_record())] == ["Between durations"]
