"""What the public checker of the CF conventions finds in a file."""

from __future__ import annotations

import json
import warnings
from pathlib import Path


def complaints(path: Path, out: Path) -> list[str]:
    """Return what the public checker of CF-1.11 finds, warnings included, with the tables that it brings."""
    with warnings.catch_warnings():
        # Those of the checker's own code, not of the file.
        warnings.simplefilter("ignore")
        from compliance_checker.runner import CheckSuite, ComplianceChecker

        CheckSuite.load_all_available_checkers()
        passed, broken = ComplianceChecker.run_checker(
            str(path), ["cf:1.11"], 0, "strict", output_filename=str(out), output_format="json"
        )
    report = json.loads(out.read_text())["cf:1.11"]
    found = [
        f"{priority}: {message}"
        for priority in ("high_priorities", "medium_priorities", "low_priorities")
        for result in report[priority]
        for message in result["msgs"]
        # A check that is passed in full may have a remark: that the calendar's reform is not crossed.
        if result["value"][0] < result["value"][1]
    ]
    assert not broken
    assert passed == (not found)
    # The report counts what it looked at: an empty file would have nothing to complain of.
    assert report["possible_points"] > 50
    return found
