"""Reading blocks of whole rows of a text table with Arrow, some blocks ahead.

Arrow is given what it reads by the rules of the cell-by-cell reader, with the same values; a block that holds
anything else is refused (None).
"""

from __future__ import annotations

import os
import re
from collections import deque
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from springlife.duty.formats.table import Floats, Stamps

if TYPE_CHECKING:
    from concurrent.futures import Future

Parsed = tuple[Floats, Floats | Stamps | None]


@dataclass(frozen=True)
class Columns:
    """What to read of each row: delimiter and decimal sign, cells a row, and the places of channel and time.

    ``clock`` says what the times are: numbers, date-times, or date-times with a zone.
    """

    delimiter: str
    decimal: str
    width: int
    channel: int
    time: int | None
    clock: Literal["numbers", "stamps", "zoned stamps"] = "numbers"


def ahead(work: Callable[[bytes], Any], blocks: Iterator[bytes]) -> Iterator[tuple[bytes, Any]]:
    """Yield each block with its result, in order, worked out some blocks ahead by a thread a core."""
    from concurrent.futures import ThreadPoolExecutor

    workers = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    waiting: deque[tuple[bytes, Future[Any]]] = deque()
    with ThreadPoolExecutor(workers) as pool:
        for block in blocks:
            waiting.append((block, pool.submit(work, block)))
            if len(waiting) > 2 * workers:
                done, future = waiting.popleft()
                yield done, future.result()
        for done, future in waiting:
            yield done, future.result()


def parse(block: bytes, columns: Columns) -> Parsed | None:
    """Read a block of whole rows, or return None where one needs care."""
    import pyarrow as pa
    from pyarrow import csv

    if b'"' in block and re.search(rb'[^%b\n]"[^%b\r\n]' % (2 * (re.escape(columns.delimiter.encode()),)), block):
        return None  # Arrow takes a quote amid a cell
    names = [str(n) for n in range(columns.width)]
    clocks = {"numbers": pa.float64(), "stamps": pa.timestamp("ns"), "zoned stamps": pa.timestamp("ns", "UTC")}
    kinds = {names[columns.channel]: pa.float64()}
    if columns.time is not None:
        kinds[names[columns.time]] = clocks[columns.clock]
    try:
        table = csv.read_csv(
            pa.BufferReader(block),
            read_options=csv.ReadOptions(column_names=names, use_threads=False, block_size=len(block) + 1),
            parse_options=csv.ParseOptions(delimiter=columns.delimiter, ignore_empty_lines=False),
            convert_options=csv.ConvertOptions(
                include_columns=list(kinds), column_types=kinds, null_values=["", "nan", "NaN"],
                decimal_point=columns.decimal, check_utf8=False,
            ),
        )  # fmt: skip
    except pa.ArrowInvalid:
        return None
    values = table[names[columns.channel]].to_numpy()
    return values, None if columns.time is None else table[names[columns.time]].to_numpy()
