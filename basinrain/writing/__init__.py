"""Results to open formats, written as a whole or not at all."""

from basinrain.writing.folder import check_folder
from basinrain.writing.record import record_text
from basinrain.writing.run import write_run

__all__ = ["check_folder", "record_text", "write_run"]
