"""The page of design storms."""
from __future__ import annotations

from basinrain.results_design import DesignRun

__all__ = ["render_design"]


def render_design(run: DesignRun) -> str:
    """Return the page."""
    return run.name
