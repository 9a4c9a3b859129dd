"""The formulas of a design with their sources: between tabulated depths, from point to area, from the record."""

from __future__ import annotations

from typing import Final

from markupsafe import Markup

from basinrain.designstorm.areal_reduction import REDUCTIONS
from basinrain.designstorm.equations import EQUATIONS, EquationDepths
from basinrain.designstorm.exceedance import ANNUAL_MAXIMUM
from basinrain.designstorm.interval_factors import INTERVAL_FACTORS
from basinrain.jobfile.design_tables import NO_REDUCTION, ArealReductionTable
from basinrain.report.provenance import Formula
from basinrain.results_design import DesignRun

__all__ = ["chain_formulas", "record_formulas", "reduction_formula", "used_reduction"]

_BY_DURATION: Final = Formula(
    "Between durations",
    Markup("ln <i>P</i> is linear in ln <i>D</i>, <i>P</i> the depth and <i>D</i> the duration"),
    "common practice",
)
_VARIATE: Final = {
    True: Markup("<i>y</i> = −ln(−ln(1 − AEP)), the Gumbel reduced variate"),
    False: Markup("<i>y</i> = ln <i>T</i>, the Gumbel reduced variate with AEP = 1 − exp(−1/<i>T</i>)"),
}
_VARIATE_SOURCE: Final = {
    True: "common practice: depths that follow a Gumbel distribution lie on a line",
    False: "Langbein (1949), Transactions of the American Geophysical Union 30, for AEP by return period",
}
_FACTORS: Final = {
    "weiss": Markup("8<i>n</i> / (8<i>n</i> − 1), <i>n</i> the duration over the interval"),
    "hershfield": Markup("a rounded factor for each whole number of intervals from 1 to 24"),
}
_REDUCTIONS: Final = {
    "leclerc-schaake": Markup(
        "1 − exp(−1.1 <i>t</i><sup>0.25</sup>) + exp(−1.1 <i>t</i><sup>0.25</sup> − 0.01 <i>A</i>), "
        "<i>t</i> in hours, <i>A</i> in mi²"
    ),
    "keers-wescott": Markup(
        "1 − <i>b</i> <i>t</i><sup>−<i>a</i></sup>, <i>t</i> in hours, <i>a</i> and <i>b</i> by the area in km²: up "
        "to 20 <i>a</i> = 0.40 − 0.0208 ln(4.6 − ln <i>A</i>), to 500 <i>a</i> = 0.40 − 0.00382 (4.6 − ln "
        "<i>A</i>)², beyond <i>a</i> = 0.40 − 0.0208 ln(ln <i>A</i> − 4.6); up to 100 <i>b</i> = 0.0394 "
        "<i>A</i><sup>0.354</sup>, to 1000 <i>b</i> = 0.0627 <i>A</i><sup>0.254</sup>, beyond <i>b</i> = 0.1050 "
        "<i>A</i><sup>0.180</sup>"
    ),
    "arr-2019": Markup(
        "up to 12 h 1 − 0.287 (<i>A</i><sup>0.265</sup> − 0.439 lg <i>D</i>) <i>D</i><sup>−0.36</sup> + 0.00226 "
        "<i>A</i><sup>0.226</sup> <i>D</i><sup>0.125</sup> (0.3 + lg AEP) + 0.0141 <i>A</i><sup>0.213</sup> "
        "10<sup>−0.021 (<i>D</i> − 180)² / 1440</sup> (0.3 + lg AEP), <i>D</i> in minutes, <i>A</i> in km²; from 24 h "
        "on 1 − <i>a</i> (<i>A<sup>b</sup></i> − <i>c</i> lg <i>D</i>) <i>D</i><sup>−<i>d</i></sup> + <i>e</i> "
        "<i>A<sup>f</sup></i> <i>D<sup>g</sup></i> (0.3 + lg AEP) + <i>h</i> 10<sup><i>i A D</i> / 1440</sup> "
        "(0.3 + lg AEP) with the region's coefficients; linear in <i>D</i> between; at most 1"
    ),
    "table": Markup("linear in the logarithms of area and duration between the entries of the table"),
}


def chain_formulas(run: DesignRun) -> list[Formula]:
    """Return the formulas of interpolation, interval factor and uplift, those that are used."""
    design, source = run.asked.design, run.sourced.source
    annual = source.series == ANNUAL_MAXIMUM
    between = Formula(
        "Between frequencies", Markup("<i>P</i> is linear in {}").format(_VARIATE[annual]), _VARIATE_SOURCE[annual]
    )
    if run.from_record is not None:
        formulas = [_BY_DURATION]
    elif isinstance(source, EquationDepths):
        form = EQUATIONS[source.equation]
        units = f"i in {source.unit}, t in {source.duration_unit}"
        formulas = [Formula("Intensity", Markup("{}, {}").format(form.formula, units), form.source)]
        formulas += [between] if len(source.coefficients) > 1 else []
    else:
        formulas = [_BY_DURATION, between]
    if design.depths.interval_factor is not None:
        known = INTERVAL_FACTORS[design.depths.interval_factor]
        formulas.append(Formula("Interval factor", _FACTORS[known.name], _evidenced(known.source, known.evidence)))
    if design.uplift is not None:
        words = Markup("{}, for {}").format(f"{design.uplift.factor:g}", design.uplift.horizon)
        formulas.append(Formula("Uplift", words, design.uplift.source))
    return formulas


def reduction_formula(name: str, table: ArealReductionTable | None = None) -> Formula:
    """Return the formula of an areal reduction; with the job's own coefficients where they are in its table."""
    method = REDUCTIONS[name]
    if table is not None and name == "exponential":
        c1, c2, c3 = (f"{table.coefficients[key]:g}" for key in ("c1", "c2", "c3"))
        formula = Markup(
            "1 − (1 − exp(−{} <i>A</i>)) exp(−{} <i>t</i><sup>{}</sup>), <i>t</i> in hours, <i>A</i> in km²"
        ).format(c1, c2, c3)
        return Formula(name, formula, table.source)
    source = table.source if table is not None and name == "table" else method.source
    return Formula(name, _REDUCTIONS[name], _evidenced(source, method.evidence))


def record_formulas(run: DesignRun) -> list[Formula]:
    """Return the formulas by which depths come from the record; none where they do not."""
    if run.from_record is None:
        return []
    return [
        Formula(
            "Gumbel",
            Markup("<i>P</i> = ξ + α <i>y</i>, α = <i>l</i><sub>2</sub> / ln 2, ξ = <i>l</i><sub>1</sub> − 0.5772 α"),
            "Hosking and Wallis (1997), Regional Frequency Analysis, appendix",
        ),
        Formula(
            "GEV",
            Markup(
                "<i>P</i> = ξ + α (1 − exp(−<i>κ y</i>)) / <i>κ</i>; with <i>κ</i> below 0 the upper tail is heavier"
            ),
            "Hosking and Wallis (1997), appendix",
        ),
        Formula(
            "Reduced variate",
            Markup("<i>y</i> = −ln(−ln(1 − AEP)); <i>l</i><sub>1</sub>, <i>l</i><sub>2</sub> the L-moments"),
            "Hosking (1990), Journal of the Royal Statistical Society B 52, 105–124",
        ),
        Formula(
            "Plotting positions",
            Markup("(<i>i</i> − 0.44) / (<i>n</i> + 0.12)"),
            "Gringorten (1963), Journal of Geophysical Research 68, 813–814",
        ),
        Formula(
            "Correlation",
            Markup("of the ranked maxima with the fitted distribution's values at their plotting positions"),
            "Filliben (1975), Technometrics 17, 111–117; Vogel (1986), Water Resources Research 22, 587–590",
        ),
        Formula(
            "Shape test",
            Markup("<i>z</i> = <i>κ</i> (<i>n</i> / 0.5633)<sup>1/2</sup> is standard normal where Gumbel holds"),
            "Hosking, Wallis and Wood (1985), Technometrics 27, 251–261",
        ),
        Formula(
            "90 % interval",
            Markup("5 % to 95 % of the depths of samples drawn from the fit and fitted anew (parametric bootstrap)"),
            "common practice; it says nothing of what a wrong distribution adds",
        ),
    ]


def used_reduction(run: DesignRun) -> Formula | None:
    """Return the formula of the design's areal reduction; None where nothing is reduced."""
    table = run.asked.design.areal_reduction
    if table is None or table.method == NO_REDUCTION:
        return None
    return reduction_formula(table.method, table)


def _evidenced(source: str, evidence: str) -> str:
    return f"{source}; {evidence}" if evidence else source
