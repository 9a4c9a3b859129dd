from __future__ import annotations

import pytest

from basinrain.report.check_list import about, check_tables
from basinrain.screening import CHECKS, Finding, Screening


def test_checks_made_and_not_made() -> None:
    """Each with what it looks for; those made with their findings counted, those not with the reason."""
    finding = Finding(check="stuck-values", gauge="A", evidence="e", action="a")
    screening = Screening(
        findings=(finding, finding), checks_run=("missing-code", "stuck-values"), checks_skipped={"cold-season": "why"}
    )
    made, skipped = check_tables(screening)
    assert [(row[0], row[2]) for row in made.rows] == [("missing-code", "0"), ("stuck-values", "2")]
    assert all(row[1].endswith(".") for row in made.rows)
    assert [row[3] for row in made.rows] == [CHECKS[name].limits for name in ("missing-code", "stuck-values")]
    assert skipped.rows[0][::2] == ("cold-season", "why")
    assert check_tables(Screening()) == []


@pytest.mark.parametrize("name", ["double-mass-break", "inhomogeneous"])
def test_the_checks_of_consistency_are_described_too(name: str) -> None:
    """They are no part of the registry of single checks."""
    row = check_tables(Screening(checks_run=(name,)))[0].rows[0]
    assert len(row[1]) > 40
    assert "years" in row[3]


def test_every_check_says_what_it_looks_for() -> None:
    """A sentence each; nothing for a name that is not known."""
    assert all(about(name).endswith(".") for name in CHECKS)
    assert about("no-such-check") == ""
