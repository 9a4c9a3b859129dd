from __future__ import annotations

import numpy as np
import pytest
from rarity_cases import END, FREQUENCIES, MINUTES, NAN, UPPER, at_gauges, over_basins, quill, storm_depths

from basinrain.designstorm.exceedance import PARTIAL_DURATION, Frequency
from basinrain.designstorm.rarity import comparable, storm_rarity
from basinrain.designstorm.storm_depths import StormRarity
from basinrain.errors import DataError
from basinrain.series.greatest_depths import greatest_depths


def said(rarity: StormRarity, part: str) -> str:
    """Return the one sentence that holds a part."""
    (sentence,) = (one for one in rarity.sentences if part in one)
    return sentence


def test_a_row_for_every_basin_and_duration() -> None:
    """By hand: 40 mm in 1 h is the 10-year depth of Upper; 75 mm in 6 h lies above its 70 mm of 100 years."""
    rows = quill().rows
    assert [(row.place, row.minutes, row.found.depth, row.found.words) for row in rows] == [
        ("Upper", 60.0, 40.0, "1 in 10 a year"),
        ("Upper", 360.0, 75.0, "rarer than 1 in 100 a year (the table's end)"),
        ("Upper", 1440.0, 80.0, "1 in 10 a year"),
        ("Lower", 60.0, 15.0, "more frequent than 1 in 2 a year (the table's most frequent)"),
        ("Lower", 360.0, 45.0, "between 1 in 2 and 1 in 10 a year, about 1 in 4.2"),
        ("Lower", 1440.0, 95.0, "rarer than 1 in 100 a year (the table's end)"),
    ]
    assert {row.kind for row in rows} == {"areal"}
    assert {row.end for row in rows} == {END}


def test_the_rarest_where_the_table_cannot_tell() -> None:
    """Two depths lie beyond the end, by how much they do is not held against either."""
    found = quill()
    assert [(row.place, row.minutes) for row in found.rarest] == [("Upper", 360.0), ("Lower", 1440.0)]
    assert found.sentences[0] == (
        "The rarest of the depths compared: over Upper in 6 h; over Lower in 24 h; each is rarer than 1 in 100 a year "
        "(the table's end), and which of them is the rarest the table cannot tell."
    )
    assert said(found, "extrapolated").startswith("A depth above the table's end")


def test_the_rarest_by_estimate() -> None:
    """65 mm in 6 h lies between 10 and 100 years, above 81 mm in 24 h between the same two."""
    depth = [[NAN], [30.0], [65.0], [81.0], [NAN]]
    found = quill(storm_depths("Upper", depth, [UPPER]))
    assert [row.found.commoner for row in found.rows] == [FREQUENCIES[0], FREQUENCIES[1], FREQUENCIES[1]]
    assert [row.minutes for row in found.rarest] == [360.0]
    assert found.sentences[0] == (
        "The rarest of the depths compared: over Upper in 6 h, between 1 in 10 and 1 in 100 a year, about 1 in 31."
    )


def test_how_much_was_searched() -> None:
    """Only what has a depth and a table counts as a look."""
    found = quill()
    assert (found.n_durations, found.n_areas, found.n_gauges) == (3, 2, 0)
    assert said(found, "Searched") == (
        "Searched: 3 durations over 2 basins, 6 depths. The rarest of 6 looks is rarer than one look: the more "
        "durations and basins are searched, the likelier something rare turns up somewhere. The probability is that of "
        "this duration over this basin, not that of the storm: a storm as a whole has none."
    )
    areal = over_basins()
    areal.depth[1, 0] = NAN
    areal.ladder[1] = NAN
    fewer = quill(areal)
    assert (fewer.n_durations, fewer.n_areas) == (2, 1)
    assert "2 durations over 1 basin, 2 depths." in said(fewer, "Searched")
    assert fewer.rows[0].found.words == "not known: no depth of the storm"
    assert fewer.rows[4].found.words == "not known: no depths of the table"


def test_durations_left_out_are_named() -> None:
    """Each with its reason; none has a row."""
    assert quill().left_out == (
        "30 min: shorter than the record's step of 1 h",
        "48 h: longer than the storm's window of 36 h",
    )
    areal = over_basins()
    areal.depth[2] = NAN
    areal.ladder[:, 3] = NAN
    found = quill(areal, step=25.0)
    assert found.left_out == (
        "30 min: no whole number of the record's steps of 25 min",
        "1 h: no whole number of the record's steps of 25 min",
        "6 h: no whole number of the record's steps of 25 min",
        "24 h: no whole number of the record's steps of 25 min",
        "48 h: longer than the storm's window of 36 h",
    )
    assert quill(areal).left_out[1:3] == (
        "6 h: no window of the storm has a depth at every step",
        "24 h: the table has no depths of it",
    )


def test_nothing_to_compare() -> None:
    """A window shorter than every duration leaves no row, no rarest and no count."""
    found = quill(window=20.0, gauges=at_gauges())
    assert (found.rows, found.gauge_rows, found.rarest, found.rarest_at_gauge) == ((), (), (), ())
    assert (found.n_durations, found.n_areas, found.n_gauges) == (0, 0, 0)
    assert found.sentences[0] == "None of the depths could be compared."
    assert not any("Searched" in sentence for sentence in found.sentences)


def test_comparable_agrees_with_what_is_left_out() -> None:
    """Asking first gives the durations that have rows afterwards."""
    mask = comparable(MINUTES, step=60, window=2160)
    assert mask.tolist() == [False, True, True, True, False]
    assert np.array(MINUTES)[mask].tolist() == [row.minutes for row in quill().rows[:3]]
    assert comparable([], step=60, window=60).shape == (0,)


def test_the_wettest_gauge_of_every_duration() -> None:
    """Against point depths, 10 mm above the areal ones; of equal depths the gauge first by name."""
    found = quill(gauges=at_gauges())
    assert [(row.place, row.minutes, row.found.depth, row.found.words) for row in found.gauge_rows] == [
        ("W2", 60.0, 45.0, "between 1 in 2 and 1 in 10 a year, about 1 in 4.2"),
        ("W1", 360.0, 70.0, "1 in 10 a year"),
        ("W3", 1440.0, 110.0, "1 in 100 a year (the table's end)"),
    ]
    assert {row.kind for row in found.gauge_rows} == {"point"}
    assert found.n_gauges == 3


def test_point_and_basin_are_told_apart() -> None:
    """A gauge's rarity is never given for the basin's."""
    found = quill(gauges=at_gauges())
    assert said(found, "wettest gauges' depths") == (
        "The rarest of the wettest gauges' depths: at gauge W3 in 24 h, 1 in 100 a year (the table's end)."
    )
    assert "compared with point depths and a basin's mean with areal ones" in said(found, "never mixed.")
    assert "The wettest of 3 gauges is not the basin" in said(found, "never mixed.")
    assert not any("gauge" in sentence for sentence in quill().sentences if "few gauges" not in sentence)


def test_a_gauge_without_a_depth_or_a_table_is_passed_over() -> None:
    """The wettest is sought among gauges that can be compared; a duration without any has no row."""
    gauges = at_gauges()
    gauges.depth[1, 1] = NAN
    gauges.ladder[0, 3] = NAN
    gauges.ladder[:, 2] = NAN
    found = quill(gauges=gauges)
    assert [(row.place, row.minutes) for row in found.gauge_rows] == [("W1", 60.0), ("W1", 1440.0)]
    assert [row.minutes for row in found.rows[:3]] == [60.0, 360.0, 1440.0]
    assert found.n_gauges == 3
    gauges.depth[:, 0] = NAN
    assert quill(gauges=gauges).n_gauges == 2


def test_few_steps_read_low_and_are_not_adjusted() -> None:
    """One hourly step: Weiss (1964), 8/7 = 1.143 (from memory); six steps 48/47; a day has 24 and no remark."""
    remarks = [row.remark for row in quill().rows[:3]]
    assert remarks[0].startswith("the sum of 1 step of the record: reads low against a table of true intervals")
    assert "8/7 = 1.143 (8n/(8n - 1), Weiss 1964), and is not adjusted" in remarks[0]
    assert "48/47 = 1.021" in remarks[1]
    assert remarks[2] == ""
    assert "observed and adjusted depths are not mixed" in said(quill(), "true intervals")
    assert quill().rows[0].found.depth == 40.0


def test_a_table_of_the_same_steps_reads_as_low() -> None:
    """Like with like needs no remark; other steps are told."""
    same = quill(table_step=60.0)
    assert {row.remark for row in same.rows} == {""}
    assert said(same, "reads low").startswith(
        "Both the storm's depths and the table's are greatest sums of steps of 1 h"
    )
    other = quill(table_step=1440.0)
    assert "the table's are sums of steps of 24 h." in said(other, "coarser steps")


def test_depths_tied_to_the_clock_are_kept_beside() -> None:
    """They are told and never compared: what is found does not change."""
    aligned = over_basins().depth - 5
    found = quill(over_basins(aligned=aligned))
    assert [row.aligned for row in found.rows] == [35.0, 70.0, 75.0, 10.0, 40.0, 90.0]
    assert [row.found.words for row in found.rows] == [row.found.words for row in quill().rows]
    assert "no probability is found for them" in said(found, "tied to the clock")
    assert np.isnan(quill().rows[0].aligned)


def test_what_it_does_not_mean() -> None:
    """No flood, no forecast, no certainty about the table, no random storm."""
    sentences = quill().sentences
    for part in (
        "the chance that in any one year a depth at least as great falls over this area in this duration",
        "not the probability of the flood",
        "not a forecast",
        "its own error",
        "not a storm picked at random",
    ):
        assert sum(part in sentence for sentence in sentences) == 1
    within = quill(storm_depths("Upper", UPPER[:, 1:2], [UPPER]))
    assert not any("extrapolated" in sentence for sentence in within.sentences)


def test_infilled_values() -> None:
    """Named above a quarter of the mean; what is not known is not named."""
    assert "(Upper 31 %)" in said(quill(infilled=[0.31, 0.25]), "infilled")
    assert not any("infilled" in sentence for sentence in quill(infilled=[NAN, 0.2]).sentences)
    assert "(Upper 100 %)" in said(quill(infilled=[1 + 1e-12, 0.0]), "infilled")


def test_partial_duration_is_said() -> None:
    """The table's series decides what a return period means."""
    found = quill(frequencies=[Frequency(years, PARTIAL_DURATION) for years in (2, 10, 100)])
    assert "1 - exp(-1/T) (Langbein 1949): 1 year is 63 %, 2 years 39 %, 10 years 9.5 %" in said(
        found, "partial duration series"
    )
    assert found.rows[0].found.words == "10 years (partial duration)"
    assert [round(100 * Frequency(years, PARTIAL_DURATION).aep, 1) for years in (1, 2, 10)] == [63.2, 39.3, 9.5]


def test_all_below_the_table() -> None:
    """Then no depth is the rarest, and that is said."""
    found = quill(storm_depths("Upper", np.where(np.isnan(over_basins().depth[:, :1]), NAN, 1.0), [UPPER]))
    assert found.sentences[0] == (
        "None of the depths compared is within the table: each is more frequent than 1 in 2 a year (the table's most "
        "frequent)."
    )


def test_with_depths_that_were_sought_in_a_series() -> None:
    """Forty mm fall astride the hour: sliding 2-h windows find them, and an hour finds half of them."""
    ends = np.datetime64("2031-05-04T00", "s") + np.arange(1, 9) * np.timedelta64(3600, "s")
    series = np.array([0.0, 0, 1, 20, 20, 1, 0, 0])[:, None]
    minutes = np.array([60.0, 120.0])
    found = greatest_depths(ends - 3600, ends, series, durations=[np.timedelta64(int(m), "m") for m in minutes])
    areal = storm_depths("Upper", found.sliding.depth, [[[20.0, 30, 40], [30, 40, 50]]], aligned=found.aligned.depth)
    rows = storm_rarity("Quill", minutes, areal, frequencies=FREQUENCIES, step=60, window=480).rows
    assert [(row.found.depth, row.aligned, row.found.words) for row in rows] == [
        (20.0, 20.0, "1 in 2 a year"),
        (40.0, 21.0, "1 in 10 a year"),
    ]


def test_inputs_that_do_not_fit() -> None:
    """All problems of a storm together."""
    with pytest.raises(DataError, match=r"durations: found \[60\.0, 60\.0\]; expected minutes above 0 that rise"):
        storm_rarity("Quill", [60, 60], over_basins(), frequencies=FREQUENCIES, step=60, window=600)
    twice = storm_depths("Upper Upper", over_basins().depth, [UPPER, UPPER])
    with pytest.raises(
        DataError, match=r"(?s)step: found 0 minutes.*area Upper: found twice.*'depth' of the gauges: found shape"
    ):
        quill(twice, step=0.0, gauges=storm_depths("W1", [[1.0]], [UPPER]))
    with pytest.raises(DataError, match=r"'aligned' of the areas: found shape \(1, 1\); expected shape \(5, 2\)"):
        quill(over_basins(aligned=np.zeros((1, 1))))
    with pytest.raises(DataError, match=r"infilled: found \[1\.5, 0\.0\]; expected shares between 0 and 1"):
        quill(infilled=[1.5, 0.0])
    with pytest.raises(DataError, match=r"infilled: found shape \(1,\); expected shape \(2,\)"):
        quill(infilled=[0.5])
    with pytest.raises(DataError, match=r"areas: found none; expected one at least"):
        quill(storm_depths("", np.zeros((5, 0)), np.zeros((0, 5, 3))))
