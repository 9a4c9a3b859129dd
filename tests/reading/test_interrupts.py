"""Ctrl-C while pandas reads text."""

from __future__ import annotations

import io

import pandas as pd
import pytest

from basinrain.reading.interrupts import interrupts_seen


def test_a_stop_while_reading_is_a_stop() -> None:
    """What the parser makes of Ctrl-C between two parts of its input is Ctrl-C again."""
    hidden = pd.errors.ParserError("Error tokenizing data. C error: Calling read(nbytes) on source failed. Try ...")
    with pytest.raises(KeyboardInterrupt), interrupts_seen():
        raise hidden


def test_other_faults_stay_what_they_are() -> None:
    """Text that is no table is no Ctrl-C."""
    with pytest.raises(pd.errors.ParserError, match="Expected 2 fields in line 3, saw 3"), interrupts_seen():
        pd.read_csv(io.StringIO("a,b\n1,2\n1,2,3\n"))
