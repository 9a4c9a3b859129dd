"""Normals of a gauge table."""

from pathlib import Path

import numpy as np
import pytest
from rainfiles import written

from basinrain.errors import Problems, ReadError
from basinrain.reading.gauges import read_gauges
from basinrain.reading.normals import normal_columns


@pytest.mark.parametrize(
    "names",
    [
        "jan,feb,mar,apr,may,jun,jul,aug,sep,oct,nov,dec",
        "January,February,March,April,May,June,July,August,September,October,November,December",
        ",".join(f"normal_{month:02d}" for month in range(1, 13)),
        ",".join(f"P{month:02d}" for month in range(1, 13)),
        ",".join(f"normal_{month}" for month in range(1, 13)),
        "dec,nov,oct,sep,aug,jul,jun,may,apr,mar,feb,jan",
    ],
)
def test_monthly_normals_by_name(tmp_path: Path, names: str) -> None:
    """Twelve columns of one scheme are the months, wherever they stand; an annual one is not used beside them."""
    numbers = list(range(1, 13))
    path = written(tmp_path, f"id,lon,lat,normal,{names}\nA,1,2,78,{','.join(map(str, numbers))}\nB,2,2,78{',' * 12}\n")
    expected = numbers[::-1] if names.startswith("dec") else numbers
    network = read_gauges(path)
    assert network.normals is not None
    np.testing.assert_array_equal(network.normals, [expected, [np.nan] * 12])


@pytest.mark.parametrize(("months", "problems"), [(5, 0), (6, 1), (11, 1), (12, 0)])
def test_months_that_are_missing(months: int, problems: int) -> None:
    """Six months or more are meant as normals and need the others; fewer are columns like any other."""
    names = [f"p{month}" for month in range(1, months + 1)]
    found = Problems()
    columns = normal_columns(["id", *names, "normal"], {}, "normal", found)
    assert len(found) == problems
    assert columns == (tuple(names) if months == 12 else () if problems else ("normal",))


def test_normals_below_zero(tmp_path: Path) -> None:
    """A negative normal is refused in any month, zero is not."""
    names = ",".join(f"normal_{month}" for month in range(1, 13))
    path = written(tmp_path, f"id,lon,lat,{names}\nA,1,2,{'0,' * 11}-0.5\n")
    with pytest.raises(
        ReadError, match=r"rain\.csv:2: column normal_12: gauge A: found a normal of -0\.5; expected 0 or more"
    ) as caught:
        read_gauges(path)
    assert len(caught.value.problems) == 1
