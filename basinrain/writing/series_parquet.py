"""Basin-mean series as one Parquet file."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from basinrain.clocks import clock_seconds
from basinrain.writing.series_content import SeriesContent, words_by_code, writing

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["NAME", "basin_facts", "chosen_words", "write_parquet"]

NAME: Final = "series.parquet"
"""The file's name."""

_HELD: Final = 1 << 20
"""Rows of a group of the file, which are held together; about 100 MiB with what compressing takes."""


def write_parquet(folder: Path, content: SeriesContent) -> None:
    """Write the series as one row per series, step and basin, in the columns of the tidy CSV file.

    Parameters
    ----------
    folder
        Where ``series.parquet`` is made.
    content
        What to write. A group of rows holds one series of about a million values (or the basins of one step); no more
        is held at a time.

    Raises
    ------
    WriteError
        The file cannot be written.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    schema = _schema(content)
    words = words_by_code()
    # With every code, however few occur, so that all groups have the same words.
    vocabulary = list(dict.fromkeys(words))
    place = {word: at for at, word in enumerate(vocabulary)}
    place_of_code = np.array([place[word] for word in words], dtype=np.int8)
    n_basins = len(content.basins)
    ahead = clock_seconds(content.zone) if content.zone else 0
    milliseconds = (content.ends.astype(np.int64) - ahead) * 1000
    with writing(NAME), pq.ParquetWriter(folder / NAME, schema, compression="zstd", version="2.6") as file:
        for gaps, method in content.source.series:
            for steps in content.blocks(_HELD):
                block = content.block(gaps, method, steps)
                same = np.zeros(block.depth.size, dtype=np.int8)
                columns = [
                    chosen_words(np.tile(np.arange(n_basins, dtype=np.int32), len(block.depth)), content.basins),
                    chosen_words(same, [method]),
                    chosen_words(same, [gaps]),
                    pa.array(np.repeat(milliseconds[steps], n_basins)).cast(schema.field("time").type),
                    pa.array(block.depth.ravel(), from_pandas=True),
                    chosen_words(same, [content.depth_unit]),
                    pa.array(block.observed_share.ravel(), from_pandas=True),
                    chosen_words(place_of_code[block.flags.ravel()], vocabulary),
                ]
                file.write_batch(pa.RecordBatch.from_arrays(columns, schema=schema), row_group_size=len(same))


def _schema(content: SeriesContent) -> pa.Schema:
    import pyarrow as pa

    def words(index: pa.DataType) -> pa.DataType:
        return pa.dictionary(index, pa.string())

    fields = [
        pa.field("basin", words(pa.int32()), nullable=False),
        pa.field("method", words(pa.int8()), nullable=False),
        pa.field("gaps", words(pa.int8()), nullable=False),
        pa.field("time", pa.timestamp("ms", tz=content.zone or None), nullable=False),
        pa.field("depth", pa.float64(), metadata={"unit": content.depth_unit}),
        pa.field("depth_unit", words(pa.int8()), nullable=False),
        pa.field("observed_share", pa.float32(), metadata={"unit": "1"}),
        pa.field("flags", words(pa.int8()), nullable=False),
    ]
    facts = {
        "job": content.job,
        "depth_unit": content.depth_unit,
        "time": "end of the interval (start, end]",
        "zone": content.zone or "the record's clock, not known",
        "comment": content.caution,
        "references": content.references,
        "institution": content.institution,
        "source": f"basinrain {content.version}".strip(),
        "plane": content.plane,
        "basins": basin_facts(content.basins, content.names, content.areas),
    }
    return pa.schema(fields, metadata={key: text for key, text in facts.items() if text})


def basin_facts(basins: Sequence[str], names: Sequence[str], areas: npt.NDArray[np.float64]) -> str:
    """Return names and areas of basins as JSON, for a place among the facts of a schema.

    Examples
    --------
    >>> basin_facts(["upper"], [], np.array([4e6]))
    '{"upper": {"name": "", "area_m2": 4000000.0}}'
    """
    known = zip(basins, names or ("",) * len(basins), np.asarray(areas, dtype=float).tolist(), strict=True)
    return json.dumps({basin: {"name": name, "area_m2": area} for basin, name, area in known}, ensure_ascii=False)


def chosen_words(places: npt.NDArray[Any], words: Sequence[str]) -> pa.Array:
    """Return a column of words, each given by its place."""
    import pyarrow as pa

    return pa.DictionaryArray.from_arrays(pa.array(places), pa.array(words, type=pa.string()))
