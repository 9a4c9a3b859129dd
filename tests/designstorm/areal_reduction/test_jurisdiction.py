"""Whether a method is for the region of the design."""

from __future__ import annotations

import pytest

from basinrain.designstorm.areal_reduction import REDUCTIONS, areal_reduction, check_jurisdiction, outside_region
from basinrain.errors import JobError

HOME = [
    ("leclerc-schaake", "United States"),
    ("leclerc-schaake", "usa"),
    ("leclerc-schaake", "US"),
    ("keers-wescott", "united  kingdom "),
    ("keers-wescott", "UK"),
    ("arr-2019", "AUSTRALIA"),
    ("arr-2019", "AU"),
]


@pytest.mark.parametrize(("name", "jurisdiction"), HOME)
def test_at_home(name: str, jurisdiction: str) -> None:
    """A region's name or short form, however cased and spaced, is the method's own; to the two others it is not."""
    check_jurisdiction(areal_reduction(name), jurisdiction)
    at_home = {other for other, method in REDUCTIONS.items() if not outside_region(method, jurisdiction)}
    assert at_home == {name, "exponential", "table"}


@pytest.mark.parametrize("name", ["exponential", "table"])
@pytest.mark.parametrize("jurisdiction", ["Italy", "", None])
def test_factors_of_the_user_s_own_are_at_home_anywhere(name: str, jurisdiction: str | None) -> None:
    """Coefficients and tables that the user gives are for where the user says, named or not."""
    check_jurisdiction(areal_reduction(name), jurisdiction)
    assert not outside_region(areal_reduction(name), jurisdiction)


def test_no_jurisdiction_is_refused() -> None:
    """A method of a region is not used where the job does not say where the design is for."""
    assert outside_region(areal_reduction("arr-2019"), None)
    with pytest.raises(JobError) as refused:
        check_jurisdiction(areal_reduction("arr-2019"), None)
    assert str(refused.value) == (
        "[design] jurisdiction: found none beside [design.areal_reduction] method = 'arr-2019'; expected the region"
        " that it is for, Australia ('australia' or 'au'); say where the design is for; [design.areal_reduction]"
        " compare shows others beside it"
    )


def test_another_jurisdiction_is_refused() -> None:
    """The message names both regions and the methods that are for the job's."""
    with pytest.raises(JobError) as refused:
        check_jurisdiction(areal_reduction("leclerc-schaake"), "Australia")
    assert str(refused.value) == (
        "[design] jurisdiction: found 'Australia' beside [design.areal_reduction] method = 'leclerc-schaake'; expected"
        " the region that it is for, the United States ('united states', 'united states of america', 'us' or 'usa');"
        " write 'united states' for a place within it; for Australia: arr-2019, exponential, table;"
        " [design.areal_reduction] compare shows others beside it"
    )
    with pytest.raises(JobError, match=r"found 'Italy' .*; for Italy: exponential, table; "):
        check_jurisdiction(areal_reduction("keers-wescott"), "Italy")
