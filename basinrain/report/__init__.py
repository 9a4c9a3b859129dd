"""The report room: figures, and the pages that hold them."""

from basinrain.report.comparison_page import render_comparison
from basinrain.report.design_page import render_design
from basinrain.report.page import render_report
from basinrain.report.screening_page import render_screening
from basinrain.report.series_page import render_series

__all__ = ["render_comparison", "render_design", "render_report", "render_screening", "render_series"]
