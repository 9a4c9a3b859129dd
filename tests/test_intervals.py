"""Words for steps."""

from __future__ import annotations

import pytest

from basinrain.errors import JobError
from basinrain.intervals import interval_of, parse_interval


@pytest.mark.parametrize(
    ("word", "label", "seconds"),
    [
        ("1min", "1min", 60),
        ("5min", "5min", 300),
        ("15min", "15min", 900),
        ("1h", "1h", 3600),
        ("60min", "1h", 3600),
        ("6h", "6h", 21600),
        ("12h", "12h", 43200),
        ("24h", "1d", 86400),
        ("1d", "1d", 86400),
        ("31d", "31d", 31 * 86400),
        ("1mo", "1mo", None),
        (" 10 min ", "10min", 600),
    ],
)
def test_words(word: str, label: str, seconds: int | None) -> None:
    """Every accepted word has one label and one length; a month has none in seconds."""
    interval = parse_interval(word)
    assert (interval.label, interval.seconds) == (label, seconds)


@pytest.mark.parametrize("word", ["", "30s", "0h", "hourly", "h", "1.5h", "-1h", "32d", "2mo", "1M", "1y", "1 week"])
def test_other_words_are_refused(word: str) -> None:
    """A step under a minute, over a month, or in other words is refused, with the accepted forms."""
    with pytest.raises(
        JobError, match=rf"^interval: found '{word}'; expected a number with min, h or d, or 1mo: 1min, "
    ):
        parse_interval(word)


def test_item_is_named() -> None:
    """The message says where the word was given."""
    with pytest.raises(JobError, match=r"^\[step\] common: found 'x'"):
        parse_interval("x", item="[step] common")


def test_whole_days() -> None:
    """Days are whole days, hours and months are not."""
    assert [parse_interval(word).whole_days for word in ("1d", "2d", "12h", "1mo")] == [True, True, False, False]
    assert interval_of(7 * 86400).label == "7d"
