"""The documentation cannot drift: its examples run, its links lead somewhere, its jobs are jobs."""

from __future__ import annotations

import doctest
import re
import tomllib
from pathlib import Path

import pytest

from basinrain.averaging import METHODS as AVERAGING
from basinrain.infill import METHODS as INFILL
from basinrain.jobfile import parse_job
from basinrain.rainfall import Status

ROOT = Path(__file__).parents[1]
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").glob("*.md"))]


def test_the_examples_of_the_readme_run(monkeypatch: pytest.MonkeyPatch) -> None:
    """Every Python example of the README gives what it says, run from the project's folder."""
    monkeypatch.chdir(ROOT)
    result = doctest.testfile(str(ROOT / "README.md"), module_relative=False)
    assert (result.failed, result.attempted > 8) == (0, True)


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_links_lead_to_files(page: Path) -> None:
    """Every relative link of a page names a file that is there."""
    links = re.findall(r"\]\((?!https?:)([^)#]+)(?:#[^)]*)?\)", page.read_text(encoding="utf-8"))
    assert [link for link in links if not (page.parent / link).exists()] == []


def test_jobs_in_the_documentation_are_jobs() -> None:
    """A whole job shown in TOML is accepted as it stands."""
    jobs = [
        block
        for page in PAGES
        for block in re.findall(r"```toml\n(.*?)```", page.read_text(encoding="utf-8"), flags=re.DOTALL)
        if "[job]" in block and "[basins]" in block
    ]
    assert jobs
    for text in jobs:
        assert parse_job(tomllib.loads(text)).job.name


def test_every_method_and_status_is_described() -> None:
    """docs/methods.md has every registered method, docs/conventions.md every status."""
    methods = (ROOT / "docs" / "methods.md").read_text(encoding="utf-8")
    assert [name for name in (*AVERAGING, *INFILL) if f"(`{name}`)" not in methods] == []
    conventions = (ROOT / "docs" / "conventions.md").read_text(encoding="utf-8")
    assert [status.label for status in Status if f"| {status.label} |" not in conventions] == []


def test_every_dependency_has_its_reason() -> None:
    """docs/dependencies.md names every package of pyproject.toml."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    listed = [*project["dependencies"], *(p for extra in project["optional-dependencies"].values() for p in extra)]
    names = {re.split(r"[<>=~ \[]", requirement)[0] for requirement in listed}
    text = (ROOT / "docs" / "dependencies.md").read_text(encoding="utf-8").lower()
    assert {name for name in names if f"`{name.lower()}`" not in text and name.lower() not in text} == set()
