"""Whether a method of areal reduction is for the region that the design is for."""

from __future__ import annotations

from basinrain.designstorm.areal_reduction.reduction import ArealReduction
from basinrain.designstorm.areal_reduction.registry import REDUCTIONS
from basinrain.errors import JobError, Problem

__all__ = ["check_jurisdiction", "outside_region"]


def outside_region(method: ArealReduction, jurisdiction: str | None) -> bool:
    """Return whether a design is outside the region that a method was derived for, or does not say where it is.

    Parameters
    ----------
    method
        One of a user's own factors is at home wherever the user says.
    jurisdiction
        The region in the job's words, however its letters are cased; None where the job names none.

    Returns
    -------
    bool

    Examples
    --------
    >>> uk = REDUCTIONS["keers-wescott"]
    >>> outside_region(uk, "United Kingdom"), outside_region(uk, "Australia"), outside_region(uk, None)
    (False, True, True)
    >>> outside_region(REDUCTIONS["table"], None)
    False
    """
    return bool(method.jurisdiction) and _plain(jurisdiction) not in method.jurisdiction


def check_jurisdiction(method: ArealReduction, jurisdiction: str | None) -> None:
    """Refuse a method for a region that it was not derived for.

    Parameters
    ----------
    method
        The method that a job is to use; one of a user's own factors is never refused.
    jurisdiction
        The region in the job's words; None where the job names none.

    Raises
    ------
    JobError
        The job names no region, or one that is not the method's; the methods for the region are named.

    Examples
    --------
    >>> check_jurisdiction(REDUCTIONS["keers-wescott"], "uk")
    >>> check_jurisdiction(REDUCTIONS["keers-wescott"], "Australia")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: [design] jurisdiction: found 'Australia' beside [design.areal_reduction] method = \
'keers-wescott'; expected the region that it is for, the United Kingdom ('united kingdom', 'great britain' or 'uk'); \
write 'united kingdom' for a place within it; for Australia: \
arr-2019, exponential, table; [design.areal_reduction] compare shows others beside it
    """
    if not outside_region(method, jurisdiction):
        return
    words = [f"'{word}'" for word in method.jurisdiction]
    if jurisdiction is None:
        found, remedy = "none", "say where the design is for"
    else:
        found = f"'{jurisdiction}'"
        fitting = [name for name, other in REDUCTIONS.items() if not outside_region(other, jurisdiction)]
        remedy = f"write {words[0]} for a place within it; for {jurisdiction}: {', '.join(fitting)}"
    raise JobError(
        Problem(
            item="[design] jurisdiction",
            found=f"{found} beside [design.areal_reduction] method = '{method.name}'",
            expected=f"the region that it is for, {method.region_words} ({', '.join(words[:-1])} or {words[-1]})",
            remedy=f"{remedy}; [design.areal_reduction] compare shows others beside it",
        )
    )


def _plain(jurisdiction: str | None) -> str:
    return " ".join((jurisdiction or "").split()).lower()
