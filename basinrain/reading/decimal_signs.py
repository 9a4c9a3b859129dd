"""Which decimal signs the numbers of a text have."""

from __future__ import annotations

import re

__all__ = ["decimal_signs"]


def decimal_signs(text: str, separator: str) -> frozenset[str]:
    r"""Return the signs, of comma and point, that stand in whole cells which are numbers with a decimal sign.

    A comma is the file's decimal sign where no cell has a point.

    Examples
    --------
    >>> sorted(decimal_signs("8:00;1,5\n9:00;0.5", ";")), sorted(decimal_signs("1,5", ","))
    ([',', '.'], [])
    """
    if separator == ",":
        return frozenset()

    def has(sign: str) -> bool:
        cell = rf'(?:^|{separator})[ "]*[+-]?[0-9]*{sign}[0-9]+(?:[eE][+-]?[0-9]+)?[ "]*(?:{separator}|$)'
        return re.search(cell, text, re.MULTILINE) is not None

    return frozenset(sign for sign, form in ((",", ","), (".", r"\.")) if has(form))
