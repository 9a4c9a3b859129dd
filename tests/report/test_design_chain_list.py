from __future__ import annotations

from dataclasses import replace
from decimal import ROUND_HALF_UP, Decimal
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from report.design_run import bare, from_record, make_design, two_halves
from report.markup import svg_texts

from basinrain.designstorm.depth_chain import Links
from basinrain.report.design_chain_list import chain_pictures, chain_sentences, chain_tables, reduces


def test_the_arithmetic_of_a_point_of_interest() -> None:
    """70 mm x 1.1 x 0.9427 = 72.6 mm: 1 - exp(-1.1 6^0.25)(1 - exp(-0.01 x 38.61)) for 100 km² = 38.61 mi² in 6 h."""
    ford, mouth = chain_tables(two_halves())
    factor = 1 - np.exp(-1.1 * 6**0.25) * (1 - np.exp(-0.01 * 100 / 2.589988110336))
    assert factor == pytest.approx(0.94274, abs=5e-6)
    assert mouth.rows[4] == ("AEP 0.1 (1 in 10)", "6 h", "70.000", "1", "1.1", "0.94274", "72.6")
    assert mouth.heads == (
        "frequency",
        "duration",
        "point depth, mm",
        "× interval factor",
        "× uplift",
        "× areal reduction",
        "= areal depth, mm",
    )
    assert ford.rows[0] == ("AEP 0.5 (1 in 2)", "1 h", "20.00", "1", "1.1", "0.9416", "20.7")
    assert ford.caption == "ford: from point depth to areal depth over 50.00 km²"


depths = st.floats(0.1, 900)
factors = st.floats(0.2, 1.0)


@given(point=depths, interval=st.floats(1.0, 1.2), uplift=st.sampled_from([1.0, 1.1, 1.25, 1.333]), reduction=factors)
def test_what_is_printed_multiplies_to_what_is_printed(
    point: float, interval: float, uplift: float, reduction: float
) -> None:
    """Whatever the depth and the factors, by long multiplication of the printed numbers."""
    run = bare()
    (key,) = run.links
    links = Links(
        minutes=np.array([360.0]),
        point=np.array([point]),
        interval_factor=np.array([interval]),
        uplift=uplift,
        reduction=np.array([reduction]),
        reduced_area=1e8,
    )
    (row,) = chain_tables(replace(run, links={key: links}))[0].rows
    product = Decimal(1)
    for cell in row[2:-1]:
        product *= Decimal(cell)
    assert str(product.quantize(Decimal("0.1"), ROUND_HALF_UP)) == row[-1]


def test_links_that_there_are_none_of_are_said() -> None:
    """1 stands for them; nothing is said of what is there."""
    assert chain_sentences(bare())[-1] == (
        "The job asks for no interval factor and no uplift and no areal reduction: 1 stands for them."
    )
    assert chain_sentences(two_halves())[-1] == "The job asks for no interval factor: 1 stands for it."
    assert (reduces(bare()), reduces(two_halves()), reduces(from_record())) == (False, True, False)


def test_depths_of_the_record_are_areal_already() -> None:
    """Without factors there is nothing to multiply: the areal depth stands alone."""
    run = from_record()
    table = chain_tables(run)[0]
    assert table.heads == ("frequency", "duration", "areal depth, mm")
    assert table.caption.startswith("ford: areal depth over 50.00 km²")
    assert "Areal depth =" not in " ".join(chain_sentences(run))
    assert chain_sentences(run)[-1] == "The job asks for no interval factor and no uplift."
    assert float(table.rows[0][-1]) == pytest.approx(run.design_depths["areal_depth"][0], abs=0.05)


def test_the_uplift_of_depths_from_the_record_is_a_link(tmp_path: Path) -> None:
    """They are multiplied, but never reduced."""
    run = from_record()
    links = {key: replace(found, uplift=1.2) for key, found in run.links.items()}
    design = run.asked.design.model_copy(update={"uplift": two_halves().asked.design.uplift})
    run = replace(run, links=links, asked=replace(run.asked, design=design))
    table = chain_tables(run)[0]
    assert table.heads[2:] == ("from the record, mm", "× interval factor", "× uplift", "= areal depth, mm")
    assert table.rows[0][4] == "1.2"
    assert chain_sentences(run)[1].startswith("Areal depth = depth from the record × interval factor × uplift, ")


def test_depths_for_fixed_intervals_have_their_factor(tmp_path: Path) -> None:
    """8 x 6 / (8 x 6 - 1) = 1.0213 of six hours that were read by the hour."""
    run = make_design(tmp_path, design__depths__interval_factor="weiss", design__depths__observed_every="1h")
    assert {row[3] for row in chain_tables(run)[0].rows if row[1] == "6 h"} == {"1.0213"}
    assert "drawn with the interval factor and the uplift, " in chain_pictures(run)[0].caption


def test_the_figures() -> None:
    """One a point of interest, point depths with the uplift so that the reduction is seen; of the record none."""
    ford, mouth = chain_pictures(two_halves())
    assert (ford.name, mouth.name) == ("design-depths-1", "design-depths-2")
    assert mouth.caption.endswith(
        "Point depths are drawn with the uplift, so that what lies between the curves is the reduction."
    )
    assert {"point depth", "areal depth"} <= set(svg_texts(mouth.svg))
    # 70 mm with the uplift.
    assert "6 h 77.0" in mouth.svg
    of_record = chain_pictures(from_record())[0]
    assert "point depth" not in svg_texts(of_record.svg)
    assert "drawn with" not in of_record.caption
    assert chain_pictures(bare()) == []


def test_inches(tmp_path: Path) -> None:
    """60 mm are 2.3622 in; 40 mm are 1.5748 in, which 1.575 would round up to 1.58: so all have one decimal more."""
    run = make_design(
        tmp_path, job__depth_unit="in", design__uplift=None, design__areal_reduction=None, design__durations=["6h"]
    )
    assert [row[2:] for row in chain_tables(run)[0].rows] == [
        ("1.5748", "1", "1", "1", "1.57"),
        ("2.3622", "1", "1", "1", "2.36"),
    ]
