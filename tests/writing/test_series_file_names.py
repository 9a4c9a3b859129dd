"""Every basin has a file of its own on every system, whatever its id."""

from __future__ import annotations

import unicodedata
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from basinrain.writing.series_file_names import file_stems


@pytest.mark.parametrize(
    ("ids", "stems"),
    [
        (["Mill", "B-12_b.3"], ["Mill", "B-12_b.3"]),
        (["a/b", "a\\b", "a:b", "a b"], ["a_b", "a_b-2", "a_b-3", "a_b-4"]),
        ([".", "..", ".hidden", "end."], ["_", "__", "_hidden", "end_"]),
        (["MILL", "mill", "Mill"], ["MILL", "mill-2", "Mill-3"]),
        (["CON", "lpt1", "nul.b", "cone"], ["CON_", "lpt1_", "nul_.b", "cone"]),
        (["Mühle", "Mu\u0308hle"], ["Mühle", "Mühle-2"]),
        (["x", "x", "x-2"], ["x", "x-2", "x-2-2"]),
        (["x" * 300, "ß" * 100], ["x" * 160, "ß" * 80]),
        (["", " ", "\n", '*?<>|"'], ["_", "_-2", "_-3", "______"]),
    ],
)
def test_names(ids: list[str], stems: list[str]) -> None:
    """Reserved signs, dots at the ends, cases, devices, encodings, repeats, lengths, nothing at all."""
    assert file_stems(ids) == stems


@given(st.lists(st.text(max_size=40), max_size=8))
def test_no_two_files_are_alike(ids: list[str]) -> None:
    """Also where case and the encoding of letters do not count, and none leaves its folder."""
    stems = file_stems(ids, taken=["index"])
    alike = [unicodedata.normalize("NFKC", stem).casefold() for stem in [*stems, "index"]]
    assert len(set(alike)) == len(ids) + 1
    for stem in stems:
        assert Path(stem).name == stem
        assert not set('/\\:*?"<>| \n\t\0') & set(stem)
        assert stem.strip(".") == stem
        assert 0 < len(f"{stem}.csv".encode()) < 256
