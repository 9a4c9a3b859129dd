"""``basinrain infill``: compare the infill methods on the job's network, write them and the completed record."""

from __future__ import annotations

from rich.table import Table

from basinrain.cli.running import console, show_warnings
from basinrain.infill import InfillOptions
from basinrain.report.words import DASH, number_text
from basinrain.results import InfillRun
from basinrain.units import depth_factor

__all__ = ["show"]


def show(run: InfillRun) -> None:
    """Print the scores, the choice, and how much of the record was infilled."""
    page = console()
    comparison = run.comparison
    mm, digits = depth_factor(run.depth_unit), 3 if run.depth_unit == "in" else 2
    page.print(f"Infill methods compared, each gauge left out in turn; {run.depth_unit} by {comparison.scale}")
    table = Table(show_edge=False, pad_edge=False)
    table.add_column("method", no_wrap=True)
    for heading in ("RMSE", "worse by", "95 % interval", "MAE", "bias", "correlation", "cases"):
        table.add_column(heading, justify="right")
    for found in comparison.differences:
        score = comparison.score(found.candidate)
        interval = f"{number_text(found.low / mm, digits)} to {number_text(found.high / mm, digits)}"
        table.add_row(
            found.candidate,
            number_text(score.rmse / mm, digits),
            number_text(found.difference / mm, digits),
            "best" if found.candidate == comparison.best else interval if comparison.drawn else DASH,
            number_text(score.mae / mm, digits),
            number_text(score.bias / mm, digits),
            number_text(score.correlation, 3),
            str(score.n),
        )
    page.print(table)
    page.print()
    for label, reason in comparison.skipped.items():
        page.print(f"Not compared: {label}: {reason}", soft_wrap=True)
    page.print(comparison.reason, soft_wrap=True)
    own = _own(run)
    method = run.settings["infill"]["method"]
    its = "by it too" if own == comparison.chosen else f'by {own} (method = "{method}")'
    page.print(f"The comparison takes {comparison.chosen}; the job infills {its}.", soft_wrap=True)
    count = len(run.completed.estimates)
    done = f"{count:,} depth{'' if count == 1 else 's'} estimated by {own}" if count else "there was nothing to infill"
    page.print(f"The completed record: {done}.", soft_wrap=True)
    warned = {note.text for note in run.warnings}
    for note in comparison.notes:
        if note.text not in warned:
            page.print(f"Note: {note}", soft_wrap=True)
    show_warnings(page, run.warnings)


def _own(run: InfillRun) -> str:
    """Return what tables call the method that the record was completed by."""
    settings = run.settings["infill"]
    return InfillOptions(method=settings["method"], power=settings.get("power")).label
