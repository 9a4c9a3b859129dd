"""The public names: what is promised is there, and nothing heavy loads before it is used."""

from __future__ import annotations

import importlib
import json
import pkgutil
import subprocess
import sys

import pytest

import basinrain

HEAVY = [
    "numpy",
    "pandas",
    "geopandas",
    "matplotlib",
    "scipy",
    "shapely",
    "pyproj",
    "pyogrio",
    "pydantic",
    "jinja2",
    "rich",
]


def loaded_by(code: str) -> list[str]:
    script = f"import sys, json\n{code}\nprint('#' + json.dumps([m for m in {HEAVY} if m in sys.modules]))"
    out = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True).stdout
    found: list[str] = json.loads(out.split("#")[-1])
    return found


def test_import_and_help_load_nothing_heavy() -> None:
    """`import basinrain` and `basinrain --help` load none of the heavy libraries."""
    assert loaded_by("import basinrain") == []
    run_help = "from basinrain.cli import main\ntry:\n    main(['{}', '--help'])\nexcept SystemExit:\n    pass"
    assert loaded_by(run_help.replace("'{}', ", "")) == []
    assert loaded_by(run_help.format("storm")) == []


def test_a_name_loads_what_it_needs() -> None:
    """The check above can fail: a name of a heavy room loads its libraries."""
    assert "numpy" in loaded_by("import basinrain\nbasinrain.GaugeNetwork")


def test_all_names_exist_and_are_sorted() -> None:
    """`__all__` of the package is sorted, complete, and equal to what dir() shows."""
    assert sorted(basinrain.__all__) == basinrain.__all__ == dir(basinrain)
    assert all(getattr(basinrain, name) is not None for name in basinrain.__all__)
    with pytest.raises(AttributeError, match="has no attribute 'nothing'"):
        basinrain.nothing  # noqa: B018


def modules() -> list[str]:
    return [m.name for m in pkgutil.walk_packages(basinrain.__path__, "basinrain.") if ".sample" not in m.name]


@pytest.mark.parametrize("name", modules())
def test_every_module_says_what_it_offers(name: str) -> None:
    """Every module has a docstring and a sorted `__all__` of names that exist."""
    module = importlib.import_module(name)
    assert module.__doc__
    # Constants, then classes, then functions, as the linter sorts them.
    order = sorted(module.__all__, key=lambda n: (not n.isupper(), not n[0].isupper(), n))
    assert order == list(module.__all__)
    assert [n for n in module.__all__ if not hasattr(module, n)] == []


def test_computing_rooms_import_no_file_plot_or_command_line_code() -> None:
    """Imports go one way: computing rooms load neither reading, writing, report nor cli."""
    rooms = ["averaging", "infill", "series", "storms", "weights", "cautions", "spreading", "catch", "colocated"]
    code = "import importlib\n" + "\n".join(f"importlib.import_module('basinrain.{room}')" for room in rooms)
    code += "\nbad = [m for m in sys.modules if m.startswith(tuple('basinrain.' + r for r in "
    code += "('reading', 'writing', 'report', 'cli', 'job')))]\nassert not bad, bad"
    assert "matplotlib" not in loaded_by(code)
