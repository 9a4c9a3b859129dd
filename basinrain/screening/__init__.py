"""Screening: findings with their evidence, and what the job says about them; nothing is ever changed by itself."""

from basinrain.screening.checks import CHECKS, Check
from basinrain.screening.edits import Edit, apply_edits, spread_edits
from basinrain.screening.findings import SEVERITIES, Finding, Screening, ScreeningOptions
from basinrain.screening.rejection import apply_rejections, settle_findings
from basinrain.screening.screen import screen

__all__ = [
    "CHECKS",
    "SEVERITIES",
    "Check",
    "Edit",
    "Finding",
    "Screening",
    "ScreeningOptions",
    "apply_edits",
    "apply_rejections",
    "screen",
    "settle_findings",
    "spread_edits",
]
