"""Fast ways to read a block of whole rows of a text table.

Each way accepts a subset of what the cell-by-cell reader accepts, with the same values, and refuses (None)
whatever needs care. Arrow comes cheap and reads any decimal fraction correctly; the compiled kernel takes most of a
second to load and is two to three times faster then.
"""

from __future__ import annotations

import os
import re
import sys
import threading
from collections import deque
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from springlife.duty.formats.table import Floats, Stamps

if TYPE_CHECKING:
    from concurrent.futures import Future

Parsed = tuple[Floats, Floats | Stamps | None]
Way = Literal["kernel", "arrow"]
SHORT = 1 << 20  # bytes; a shorter file is read cell by cell before Arrow has loaded
LONG = 200_000_000  # bytes of text read in this process; from here on the kernel pays for loading it


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


_asked = 0  # bytes of text read in this process, which decides about speed and nothing else


def ways_for(size: int, columns: Columns) -> tuple[Way, ...]:
    """Return the ways to try, in order, for a file of so many bytes."""
    global _asked
    _asked += size
    if size < SHORT:
        return ()
    if columns.clock == "numbers" and (_asked >= LONG or "numba" in sys.modules) and _kernel_loads():
        return ("kernel", "arrow")
    return ("arrow",)


def _kernel_loads() -> bool:
    """Tell whether the kernel can be used: numba needs a folder in which to keep what it compiles."""
    try:
        import springlife.duty.formats.kernel  # noqa: F401
    except (ImportError, RuntimeError):
        return False
    return True


def parse(block: bytes, columns: Columns, ways: list[Way]) -> Parsed | None:
    """Read a block by the first way that takes it; a way that refuses what the next one takes is not asked again."""
    refused: list[Way] = []
    for way in tuple(ways):
        parsed = _WAYS[way](block, columns)
        if parsed is not None:
            ways[:] = [other for other in ways if other not in refused]
            return parsed
        refused.append(way)
    return None


def ahead(work: Callable[[bytes], Any], blocks: Iterator[bytes]) -> Iterator[tuple[bytes, Any]]:
    """Yield each block with its result, in order, worked out some blocks ahead on the other cores."""
    workers = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    if workers < 2:
        for block in blocks:
            yield block, work(block)
        return
    from concurrent.futures import ThreadPoolExecutor

    with ThreadPoolExecutor(workers) as pool:
        waiting: deque[tuple[bytes, Future[Any]]] = deque()
        for block in blocks:
            waiting.append((block, pool.submit(work, block)))
            if len(waiting) > 2 * workers:
                done, future = waiting.popleft()
                yield done, future.result()
        for done, future in waiting:
            yield done, future.result()


_scratch = threading.local()


def _kernel(block: bytes, columns: Columns) -> Parsed | None:
    from springlife.duty.formats.kernel import read_rows

    data = block if block.endswith(b"\n") else block + b"\n"
    most = len(data) // columns.width + 1
    if getattr(_scratch, "size", 0) < most:  # reused: fresh memory costs more than reading into it
        _scratch.size, _scratch.values, _scratch.times = most, np.empty(most), np.empty(most)
    time = -1 if columns.time is None else columns.time
    rows = read_rows(
        np.frombuffer(data, dtype=np.uint8), ord(columns.delimiter), ord(columns.decimal), columns.width,
        columns.channel, time, _scratch.values, _scratch.times,
    )  # fmt: skip
    if rows < 0:
        return None
    return _scratch.values[:rows].copy(), None if time < 0 else _scratch.times[:rows].copy()


def _arrow(block: bytes, columns: Columns) -> Parsed | None:
    import pyarrow as pa
    from pyarrow import csv

    if b"\n\n" in block or b"\n\r\n" in block or block.startswith((b"\n", b"\r\n")):
        return None  # Arrow passes over blank lines
    if b'"' in block and re.search(rb'[^%b\n]"[^%b\r\n]' % (2 * (re.escape(columns.delimiter.encode()),)), block):
        return None  # and takes a quote amid a cell
    names = [str(n) for n in range(columns.width)]
    clocks = {"numbers": pa.float64(), "stamps": pa.timestamp("ns"), "zoned stamps": pa.timestamp("ns", "UTC")}
    kinds = {names[columns.channel]: pa.float64()}
    if columns.time is not None:
        kinds[names[columns.time]] = clocks[columns.clock]
    try:
        table = csv.read_csv(
            pa.BufferReader(block),
            read_options=csv.ReadOptions(column_names=names, use_threads=False, block_size=len(block) + 1),
            parse_options=csv.ParseOptions(delimiter=columns.delimiter),
            convert_options=csv.ConvertOptions(
                include_columns=list(kinds), column_types=kinds, null_values=["", "nan", "NaN"],
                decimal_point=columns.decimal, check_utf8=False,
            ),
        )  # fmt: skip
    except pa.ArrowInvalid:
        return None
    values = table[names[columns.channel]].to_numpy()
    return values, None if columns.time is None else table[names[columns.time]].to_numpy()


_WAYS: dict[Way, Callable[[bytes, Columns], Parsed | None]] = {"kernel": _kernel, "arrow": _arrow}
