"""One reader a file format. To add one: write a function in a file of this folder and a line in READERS.

A reader takes the path and the :class:`springlife.duty.record.RecordSpec` and returns a
:class:`springlife.duty.formats.table.Table`: which columns the file has, which were chosen, and a function
that streams their raw samples. Scaling, units, gaps and provenance are the record's business.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from springlife.duty.formats.table import Table
from springlife.duty.formats.text import read_text

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

Reader = Callable[[Path, "RecordSpec"], Table]

READERS: dict[str, Reader] = {
    "text": read_text,
}


def open_table(path: Path, spec: RecordSpec) -> Table:
    """Open a file with the reader of its format."""
    return READERS["text"](path, spec)
