"""``basinrain storm``: run the job, write the results, show the main figures."""

from __future__ import annotations

import numpy as np
from rich.table import Table

from basinrain.basin_depths import spread_across_methods
from basinrain.cli.running import console, show_warnings
from basinrain.report.words import depth_decimals, number_text
from basinrain.results import StormRun
from basinrain.tables import share_infilled
from basinrain.units import area_factor, depth_factor

__all__ = ["show"]


def show(run: StormRun) -> None:
    """Print the basin means of every storm, the choice of infill and the warnings."""
    page = console()
    digits = depth_decimals(run.depth_unit)
    for result in run.storms:
        page.print(f"{result.storm.name}: basin means in {run.depth_unit}")
        table = Table(show_edge=False, pad_edge=False)
        table.add_column("basin")
        for heading in (f"area {run.area_unit}", *run.methods, "spread", "spread %", "infilled %"):
            table.add_column(heading, justify="right")
        mm = depth_factor(run.depth_unit)
        shares = [share_infilled(result, method) for method in run.methods]
        for b, basin in enumerate(run.basins.ids):
            totals = [float(result.depths[method].total[b]) for method in run.methods]
            _, _, apart, percent = spread_across_methods(totals)
            table.add_row(
                basin,
                number_text(run.basins.areas[b] / area_factor(run.area_unit), 1),
                *(number_text(total / mm, digits) for total in totals),
                number_text(apart / mm, digits),
                number_text(percent, 1),
                number_text(100 * max((float(s[b]) for s in shares if not np.isnan(s[b])), default=np.nan), 0),
            )
        page.print(table)
        page.print()
    if run.comparison is not None:
        page.print(f"Infill: {run.comparison.reason}", soft_wrap=True)
    show_warnings(page, run.warnings)
