"""How a template becomes a page: everything escaped, nothing undefined, no character that HTML cannot hold."""

from __future__ import annotations

import re
from typing import Any, Final

from jinja2 import Environment, PackageLoader, StrictUndefined

__all__ = ["render_template"]

# Neither HTML nor XML can hold these, and no name needs them.
_FORBIDDEN: Final = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff\ufffe\uffff]")


def render_template(name: str, **values: Any) -> str:  # noqa: ANN401 - whatever the template shows
    """Return a template of the report room with its values in place.

    Parameters
    ----------
    name
        The template's file name.
    **values
        What it shows; text is escaped, :class:`~markupsafe.Markup` is taken as it is. One that is missing is an error.

    Returns
    -------
    str
        HTML, to be written as UTF-8.
    """
    environment = Environment(
        loader=PackageLoader("basinrain.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    return _FORBIDDEN.sub("\ufffd", environment.get_template(name).render(**values))
