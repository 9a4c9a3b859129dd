"""What can be done about gaps in a series."""

from __future__ import annotations

from typing import Final

__all__ = ["GAPS", "INFILL", "INFILL_THEN_REWEIGHT", "REWEIGHT"]

INFILL: Final = "infill"
"""Every gap of a gauge in service is infilled, however long; the gauges in service keep their weights."""

REWEIGHT: Final = "reweight"
"""Nothing is infilled; at every step the gauges that report share the basin."""

INFILL_THEN_REWEIGHT: Final = "infill-then-reweight"
"""Gaps up to the longest that may be infilled are; while a gauge is out for longer the others share the basin."""

GAPS: Final = (INFILL, REWEIGHT, INFILL_THEN_REWEIGHT)
