"""What a finding is called."""

from __future__ import annotations

import numpy as np

from basinrain.screening import SEVERITIES, Finding


def test_a_finding_is_named_by_check_gauge_and_start_to_the_minute() -> None:
    """The key is what a job writes; a finding on a whole record has no time in it."""
    start = np.datetime64("2031-05-04T06:00:30")
    finding = Finding(check="zero-run", gauge="W 03", start=start, end=start + 60, evidence="Dry.", action="Look.")
    assert finding.key == "zero-run W 03 2031-05-04T06:00"
    assert not finding.whole_record
    whole = Finding(check="zero-run", gauge="W 03", evidence="Dry.", action="Look.")
    assert whole.key == "zero-run W 03"
    assert whole.whole_record
    network = Finding(check="reading-hours", gauge="", evidence="Two sets.", action="State them.")
    assert network.key == "reading-hours"


def test_severities_rise() -> None:
    """A remark weighs least."""
    assert SEVERITIES == ("remark", "doubtful", "erroneous")
