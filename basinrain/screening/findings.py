"""What screening finds: one finding a gauge and stretch, with its evidence and what may be done about it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final, Literal

import numpy as np

from basinrain.screening.wording import DepthUnit

if TYPE_CHECKING:
    from basinrain.screening.double_mass import DoubleMass
    from basinrain.screening.edits import Edit
    from basinrain.screening.homogeneity import Homogeneity

__all__ = ["SEVERITIES", "Finding", "Screening", "ScreeningOptions", "Severity", "State"]

Severity = Literal["remark", "doubtful", "erroneous"]
State = Literal["open", "accepted", "rejected"]

SEVERITIES: Final[tuple[Severity, ...]] = ("remark", "doubtful", "erroneous")
"""How much a finding weighs, the least first: worth knowing; may be wrong; cannot be right."""

_NEVER: Final = np.datetime64("NaT", "s")


@dataclass(frozen=True, kw_only=True)
class Finding:
    """One thing about the record that a careful reader would look at before using it. Nothing is changed by it.

    Parameters
    ----------
    check
        The registry's name of the check that found it: ``"stuck-values"``.
    gauge
        The gauge's id; empty for the network as a whole.
    start, end
        The stretch ``(start, end]`` in the record's clock; NaT in both for the whole record.
    severity
        ``"remark"``, ``"doubtful"`` or ``"erroneous"``.
    evidence
        The numbers in a sentence or two; depths in the unit of the options.
    action
        What is suggested, one sentence.
    others
        Other gauges concerned, in id order: the ones that the evidence rests on, or the twin of a copied record.
    edit
        The edit of the job that would carry the action out, where one can.
    state
        ``"open"`` until the job accepts the value or rejects it, by itself or with a stretch that holds it.

    Examples
    --------
    >>> finding = Finding(
    ...     check="stuck-values",
    ...     gauge="W03",
    ...     start=np.datetime64("2031-05-04T06:00:00"),
    ...     end=np.datetime64("2031-05-04T20:00:00"),
    ...     severity="doubtful",
    ...     evidence="0.4 mm stands at 14 steps on end.",
    ...     action="Reject the stretch.",
    ... )
    >>> finding.key
    'stuck-values W03 2031-05-04T06:00'
    """

    check: str
    gauge: str
    start: np.datetime64 = _NEVER
    end: np.datetime64 = _NEVER
    severity: Severity = "doubtful"
    evidence: str
    action: str
    others: tuple[str, ...] = ()
    edit: Edit | None = None
    state: State = "open"

    @property
    def whole_record(self) -> bool:
        """Whether it concerns the gauge's whole record."""
        return bool(np.isnat(self.start))

    @property
    def key(self) -> str:
        """What a job names to accept or reject it: check, gauge and start to the minute, whole or a leading part."""
        when = "" if self.whole_record else str(np.datetime_as_string(self.start, unit="m"))
        return " ".join(word for word in (self.check, self.gauge, when) if word)


@dataclass(frozen=True, kw_only=True)
class ScreeningOptions:
    """What the user says about the record before it is screened.

    Parameters
    ----------
    envelope
        Greatest depths that are held possible in the region, as ``(hours, mm)``; none where not given.
    unheated
        Ids of gauges without heating, whose catch of snow is late or lost.
    cold_months
        Months, 1 to 12, in which precipitation may be snow.
    depth_unit
        The unit in which evidence and actions say depths, ``"mm"`` or ``"in"``.

    Examples
    --------
    >>> ScreeningOptions(envelope=((1.0, 90.0), (24.0, 310.0))).cold_months
    ()
    """

    envelope: tuple[tuple[float, float], ...] | None = None
    unheated: tuple[str, ...] = ()
    cold_months: tuple[int, ...] = ()
    depth_unit: DepthUnit = "mm"


@dataclass(frozen=True, kw_only=True)
class Screening:
    """What screening found in one record.

    Parameters
    ----------
    findings
        In the registry's order of checks, then by gauge id and start.
    double_mass, homogeneity
        One a gauge that has years enough, in the network's order, of the record without what is rejected.
    checks_run
        Names of the checks that ran, in the registry's order.
    checks_skipped
        Why a check could not be made, by its name; for which gauges not, where it was made for others.

    Examples
    --------
    >>> Screening(checks_run=("stuck-values",)).findings
    ()
    """

    findings: tuple[Finding, ...] = ()
    double_mass: tuple[DoubleMass, ...] = ()
    homogeneity: tuple[Homogeneity, ...] = ()
    checks_run: tuple[str, ...] = ()
    checks_skipped: Mapping[str, str] = field(default_factory=dict)
