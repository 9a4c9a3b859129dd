"""Design hyetographs as one Parquet file."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

from basinrain.designstorm.design_hyetograph import DesignHyetograph
from basinrain.writing.design_content import DesignContent
from basinrain.writing.design_csv import COLUMNS
from basinrain.writing.series_content import writing
from basinrain.writing.series_parquet import basin_facts, chosen_words

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["NAME", "write_parquet"]

NAME: Final = "design_hyetographs.parquet"
"""The file's name."""

_HELD: Final = 1 << 18
"""Rows of a group of the file, which are held together."""


def write_parquet(folder: Path, content: DesignContent) -> None:
    """Write the hyetographs as one row per hyetograph, basin and step, in the columns of the tidy CSV file.

    Parameters
    ----------
    folder
        Where ``design_hyetographs.parquet`` is made.
    content
        What to write. A group of rows holds whole hyetographs, of about 260 thousand values together.

    Raises
    ------
    WriteError
        The file cannot be written.
    """
    import pyarrow as pa
    import pyarrow.parquet as pq

    schema = _schema(content)
    with writing(NAME), pq.ParquetWriter(folder / NAME, schema, compression="zstd", version="2.6") as file:
        for group in content.groups(_HELD):
            columns = _columns(content, group)
            batch = pa.RecordBatch.from_arrays([columns[name] for name in schema.names], schema=schema)
            file.write_batch(batch, row_group_size=len(batch))


def _columns(content: DesignContent, group: tuple[DesignHyetograph, ...]) -> dict[str, pa.Array]:
    import pyarrow as pa

    sizes = np.array([one.depth.size for one in group])
    depths = [content.depth(one) for one in group]

    def numbers(of: Callable[[DesignHyetograph], float]) -> pa.Array:
        return pa.array(np.repeat([of(one) for one in group], sizes), from_pandas=True)

    def words(of: Callable[[DesignHyetograph], str]) -> pa.Array:
        return _words([of(one) for one in group], sizes)

    place = {basin: at for at, basin in enumerate(content.basins)}
    basins = [np.repeat([place[basin] for basin in one.basins], one.n_steps) for one in group]
    elapsed = np.concatenate([np.tile(one.elapsed, len(one.basins)) for one in group])
    return {
        "point": words(lambda one: one.point),
        "aep": numbers(lambda one: one.frequency.written_aep),
        "return_period": numbers(lambda one: one.frequency.written_years),
        "return_period_in": words(lambda one: one.frequency.series),
        "duration": words(lambda one: one.duration),
        "pattern": words(lambda one: one.pattern),
        "basin": chosen_words(np.concatenate(basins).astype(np.int32), content.basins),
        "elapsed_min": pa.array(elapsed.astype(np.int32)),
        "time": pa.array(content.ends(elapsed).astype("datetime64[ms]")),
        "depth": pa.array(np.concatenate([depth.ravel() for depth in depths])),
        "cumulative": pa.array(np.concatenate([np.cumsum(depth, axis=1).ravel() for depth in depths])),
        "depth_unit": _words([content.depth_unit] * len(group), sizes),
    }


def _words(words: Sequence[str], sizes: npt.NDArray[np.int64]) -> pa.Array:
    known = list(dict.fromkeys(words))
    place = {word: at for at, word in enumerate(known)}
    return chosen_words(np.repeat(np.array([place[word] for word in words], dtype=np.int32), sizes), known)


def _schema(content: DesignContent) -> pa.Schema:
    import pyarrow as pa

    word, number = pa.dictionary(pa.int32(), pa.string()), pa.float64()
    depth = {"unit": content.depth_unit}
    kinds = {
        "aep": pa.field("aep", number, metadata={"unit": "1"}),
        "return_period": pa.field("return_period", number, nullable=False, metadata={"unit": "year"}),
        "elapsed_min": pa.field("elapsed_min", pa.int32(), nullable=False, metadata={"unit": "min"}),
        "time": pa.field("time", pa.timestamp("ms"), nullable=False),
        "depth": pa.field("depth", number, nullable=False, metadata=depth),
        "cumulative": pa.field("cumulative", number, nullable=False, metadata=depth),
    }
    facts = {
        "job": content.job,
        "depth_unit": content.depth_unit,
        "elapsed_min": "minutes from the start of the storm to the end of the step",
        "start": "" if content.start is None else str(content.start),
        "comment": content.caution,
        "point_depths": content.source,
        "source": f"basinrain {content.version}".strip(),
        "basins": basin_facts(content.basins, content.names, content.areas),
    }
    return pa.schema(
        [
            kinds.get(name, pa.field(name, word, nullable=False))
            for name in COLUMNS
            if name != "time" or content.start is not None
        ],
        metadata={key: text for key, text in facts.items() if text},
    )
