"""The report room: figures, and the page that holds them."""

from basinrain.report.page import render_report

__all__ = ["render_report"]
