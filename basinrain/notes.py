"""Notes: what the user must know about a result besides its numbers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["Note"]


@dataclass(frozen=True, kw_only=True)
class Note:
    """One remark that travels with the results to every output.

    Parameters
    ----------
    code
        A short fixed word for programs, in kebab case: ``"gap-over-peak"``.
    text
        One plain sentence for people, with the numbers that it rests on.
    level
        ``"warning"`` where the result may mislead if the remark is overlooked, else ``"info"``.
    storm, basin, gauge, method
        What it concerns; empty when it concerns the whole run.

    Examples
    --------
    >>> str(Note(code="one-gauge-inside", text="Only gauge W03 lies inside basin Upper.", basin="Upper"))
    'Only gauge W03 lies inside basin Upper.'
    """

    code: str
    text: str
    level: Literal["warning", "info"] = "warning"
    storm: str = ""
    basin: str = ""
    gauge: str = ""
    method: str = ""

    def __str__(self) -> str:
        return f"{self.storm}: {self.text}" if self.storm else self.text
