"""Figures as they are drawn, before they become markup."""

from __future__ import annotations

from types import ModuleType
from typing import Any

import pytest
from markupsafe import Markup

from basinrain.report.figures import to_svg


def drawn_by(module: ModuleType, monkeypatch: pytest.MonkeyPatch) -> list[Any]:
    """Return the list to which every figure is added that a module turns into markup."""
    drawn: list[Any] = []

    def spy(figure: Any, *words: str) -> Markup:  # noqa: ANN401 - handed on
        drawn.append(figure)
        return to_svg(figure, *words)

    monkeypatch.setattr(module, "to_svg", spy)
    return drawn
