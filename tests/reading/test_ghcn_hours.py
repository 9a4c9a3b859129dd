"""Times of observation beside what the job says."""

from __future__ import annotations

from pathlib import Path

from ghcnfiles import ONE, TWO
from rainfiles import written

from basinrain.reading.rainfall import read_rainfall


def rows(station: str, *hours: str, element: str = "PRCP") -> str:
    """Return a row a day from 4 May 2031, each with its time of observation."""
    return "".join(f"{station},203105{4 + k:02d},{element},15,,,X,{hour}\n" for k, hour in enumerate(hours))


def told(folder: Path, *texts: str, **options: str) -> list[str]:
    """Return the notes of a source with one file a text."""
    files = [written(folder, text, f"{k}.csv") for k, text in enumerate(texts)]
    record = read_rainfall(files, layout="ghcn-csv", **options)  # type: ignore[arg-type]
    assert {note.code for note in record.notes} <= {"observation-hours"}
    return [note.text for note in record.notes]


def test_readings_of_the_morning(tmp_path: Path) -> None:
    """Stations that are mostly read at 07:00 are told where dates are taken for calendar days, and not if declared."""
    texts = [rows(ONE, "0700", "0700", "", "0800", "0700"), rows(TWO, "0700", "0700")]
    assert told(tmp_path, *texts) == [
        (
            f"Most values of {ONE}, {TWO} were read at 07:00 by the file, local time, and are taken for calendar days. "
            "If a date names the 24 h until that reading, declare read_hour = '07:00' and date_means = 'ends'."
        )
    ]
    assert told(tmp_path, *texts, read_hour="07:00", date_means="ends") == []
    [other] = told(tmp_path, *texts, read_hour="08:00", date_means="ends")
    assert "at 07:00 by the file, local time, and are taken for the 24 h to or from 08:00. If" in other


def test_hours_of_several_stations(tmp_path: Path) -> None:
    """Every hour has its note, and needs a source of its own."""
    said = told(tmp_path, rows(ONE, "0700"), rows(TWO, "1800"))
    assert ["at 07:00 by" in said[0], "at 18:00 by" in said[1]] == [True, True]
    assert all(text.endswith("date_means = 'ends', in a source of its own for every hour.") for text in said)


def test_nothing_to_tell(tmp_path: Path) -> None:
    """Midnight is the end of the calendar day; few, faulty or no times, and those of other elements, say nothing."""
    assert told(tmp_path, rows(ONE, "2400", "2400", "0700")) == []
    assert told(tmp_path, rows(ONE, "0700", "", "")) == []
    assert told(tmp_path, rows(ONE, "7", "9999", "noon")) == []
    assert told(tmp_path, rows(ONE, "", "") + rows(ONE, "0700", "0700", element="TMAX")) == []
