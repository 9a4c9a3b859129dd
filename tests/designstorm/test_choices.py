"""Words that must be one of a few."""

from __future__ import annotations

from basinrain.designstorm.choices import report_unknown
from basinrain.errors import Problems


def test_only_unknown_words_are_reported() -> None:
    """A word that is known is no problem; another is one, in whatever the known ones come."""
    problems = Problems()
    report_unknown("shape", "b", {"a": 1, "b": 2}, problems)
    assert len(problems) == 0
    report_unknown("shape", "c", iter(["a", "b"]), problems)
    assert len(problems) == 1
