"""Text tables (CSV as loggers write it), read in blocks of whole rows.

There is one set of rules, those of the reader that goes cell by cell. Longer files go through Arrow, which takes
a subset of those rules with the same values; a block that it refuses is read again with care, and either is fine or
yields the sentence that says what is wrong, and where.
"""

from __future__ import annotations

import codecs
import csv
import gzip
import io
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO, TYPE_CHECKING, Literal, cast

import numpy as np

from springlife.duty.formats.blocks import Columns, Parsed, ahead, parse
from springlife.duty.formats.dates import AMBIGUOUS, STAMP, stamps_of
from springlife.duty.formats.table import Chunk, Floats, Stamps, Table, choose_pair
from springlife.duty.sniff import HEAD, NUMBER, Layout, cells_of, encoding_of, is_missing, layout_of
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

BLOCK = 1 << 20  # bytes read at a time: what fits a core's cache is read fastest
SHORT = 1 << 20  # bytes; a shorter file is read cell by cell before Arrow has loaded
LONGEST = 1 << 22  # bytes of one row
GZIP, ZSTANDARD = b"\x1f\x8b", b"\x28\xb5\x2f\xfd"
OPEN_QUOTE = "a quoted cell is not closed in its row"


def read_text(path: Path, spec: RecordSpec) -> Table:
    """Open a text table; see :data:`springlife.duty.formats.READERS`."""
    with open_bytes(path) as stream:
        raw = _read(path, stream, HEAD)
    if not raw.strip():
        raise InputError(f"{path}: is empty; record again or correct the path")
    encoding = encoding_of(path, raw)
    head = _head(path, raw, encoding)
    layout = layout_of(path, head, encoding, (spec.channel, spec.time))
    for wanted, what in ((spec.channel, "channel"), (spec.time, "time column")):
        if isinstance(wanted, str) and not layout.has_header:
            raise InputError(
                f"{path}: has no header row, so there is no {what} {wanted!r}; give its number, 1 to "
                f"{len(layout.columns)}"
            )
    channel, time = choose_pair(path, layout.columns, spec.channel, spec.time)
    clock = "numbers" if time is None else _clock(path, layout, time)
    columns = Columns(layout.delimiter, layout.decimal, layout.width, channel, time, clock)
    named = layout.columns
    reader = _Reader(path, layout, columns)
    return Table(named, named[channel], None if time is None else named[time], reader.chunks, steps=layout.steps)


def _clock(path: Path, layout: Layout, time: int) -> Literal["numbers", "stamps", "zoned stamps"]:
    """Tell from the first time whether the column holds numbers or date-times."""
    first = layout.first[time]
    match = STAMP.fullmatch(first)
    if match:
        return "zoned stamps" if match[3] else "stamps"
    if not NUMBER.fullmatch(first) and AMBIGUOUS.fullmatch(first):
        raise InputError(
            f"{path}, column {layout.columns[time].title!r}, row {layout.start}: {first!r} can be read in several "
            "ways; write times as 2025-03-31T14:05:06.250 (ISO 8601) or in seconds, or give sample_rate"
        )
    return "numbers"


def _head(path: Path, raw: bytes, encoding: str) -> str:
    """Decode the head and cut it after its last whole line."""
    whole = len(raw) < HEAD
    try:
        text = raw[: len(raw) // 2 * 2].decode("utf-16") if encoding == "utf-16" else raw.decode(encoding, "ignore")
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: cannot be decoded as UTF-16 ({error.reason}); save it as CSV in UTF-8") from error
    cut = text.rfind("\n") + 1
    if not cut and "\r" in text.rstrip():
        raise InputError(f"{path}: its lines end in bare carriage returns; save it with line feeds")
    if not cut and not whole:
        raise InputError(f"{path}: no line ends within {HEAD} bytes; save it as a table with one row a sample")
    return text if whole else text[:cut]


class _Reader:
    """One pass after another over a text table whose layout is known."""

    def __init__(self, path: Path, layout: Layout, columns: Columns) -> None:
        self.path, self.layout, self.columns = path, layout, columns

    def chunks(self) -> Iterator[Chunk]:
        """Yield the samples block by block."""
        row = self.layout.start
        for block, parsed in self._parsed():
            if parsed is not None:
                yield Chunk(*parsed, lambda i, row=row: f"row {row + i}")  # type: ignore[misc]
                row += parsed[0].size
                continue
            yield self._careful(row, block)
            row += block.count(b"\n")

    def _parsed(self) -> Iterator[tuple[bytes, Parsed | None]]:
        """Yield each block of rows with what Arrow made of it, None where care is needed."""
        if self.path.stat().st_size < SHORT:
            return ((block, None) for block in self._rows())
        return ahead(lambda block: parse(block, self.columns), self._rows())

    def _rows(self) -> Iterator[bytes]:
        """Yield the blocks without what stands above the first row of numbers."""
        above = self.layout.start - 1
        for block in self._blocks():
            if above:
                lines = block.split(b"\n", above)
                above, block = above - len(lines) + 1, lines[-1]
            if block and not block.isspace():
                yield block

    def _blocks(self) -> Iterator[bytes]:
        """Yield whole rows in UTF-8 or Latin-1, without the blank lines at the end of the file."""
        carry, done = b"", 0
        with open_bytes(self.path) as file:
            for data in _as_bytes(self.path, file, self.layout.encoding):
                data = carry + data
                cut = _end_of_rows(data)
                if not cut and len(data) > LONGEST and not data.isspace():
                    row = self._row_at(done)
                    raise InputError(f"{self.path}, row {row}: is longer than {LONGEST} bytes; save one row a sample")
                if cut:
                    yield data[:cut]
                carry, done = data[cut:], done + cut
            if carry and not carry.isspace():
                yield carry

    def _row_at(self, end: int) -> int:
        """Return the number of the row that begins at a place in the decoded text."""
        row = 1
        with open_bytes(self.path) as file:
            for data in _as_bytes(self.path, file, self.layout.encoding):
                row += data[: max(0, end)].count(b"\n")
                end -= len(data)
        return row

    def _careful(self, row: int, block: bytes) -> Chunk:
        """Read a block cell by cell."""
        encoding = "latin-1" if self.layout.encoding == "latin-1" else "utf-8"
        text = block.decode(encoding, "replace")
        lines: list[int] = []
        cells: list[str] = []
        clock: list[str] = []
        width, channel, time = self.layout.width, self.columns.channel, self.columns.time
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=self.layout.delimiter, strict=True)
        try:
            for record in reader:
                if reader.line_num - len(lines) > 1:
                    raise csv.Error(OPEN_QUOTE)
                if len(record) != width:
                    if any(cell.strip() for cell in record):
                        raise InputError(self._ragged(row + reader.line_num - 1, len(record)))
                    record = [""] * width
                lines.append(row + reader.line_num - 1)
                cells.append(record[channel])
                if time is not None:
                    clock.append(record[time])
        except csv.Error as error:
            reason = OPEN_QUOTE if "unexpected end" in str(error) else str(error)
            line = row + len(lines)
            raise InputError(f"{self.path}, row {line}: cannot be split into cells ({reason}); correct it") from error
        values = self._numbers(cells, lines, channel)
        return Chunk(values, None if time is None else self._times(clock, lines, time), lambda i: f"row {lines[i]}")

    def _ragged(self, line: int, seen: int) -> str:
        columns = self.layout.width
        return f"{self.path}, row {line}: has {cells_of(seen)}, the rows above have {columns}; correct the row"

    def _numbers(self, cells: list[str], lines: list[int], column: int) -> Floats:
        """Turn cells into floats, NaN where one is missing."""
        joined = "".join(cells)
        decimal = self.layout.decimal
        if "_" not in joined and joined.isascii() and (decimal == "." or "." not in joined):
            try:
                return np.array([float(cell.replace(decimal, ".")) for cell in cells])
            except ValueError:
                pass  # a missing or a wrong cell: look at each
        return np.array([self._number(cell, line, column) for cell, line in zip(cells, lines, strict=True)])

    def _number(self, cell: str, line: int, column: int) -> float:
        cell = cell.strip()
        other = "," if self.layout.decimal == "." else "."
        if NUMBER.fullmatch(cell) and other not in cell:
            return float(cell.replace(",", "."))
        if is_missing(cell):
            return float("nan")
        remedy = "correct the cell or choose another column"
        if NUMBER.fullmatch(cell):
            sign = "comma" if self.layout.decimal == "," else "point"
            remedy = f"the table above has a decimal {sign}; save it with one decimal sign"
        title = self.layout.columns[column].title
        raise InputError(f"{self.path}, column {title!r}, row {line}: {cell[:60]!r} is not a number; {remedy}")

    def _times(self, cells: list[str], lines: list[int], column: int) -> Floats | Stamps:
        if self.columns.clock == "numbers":
            return self._numbers(cells, lines, column)
        place = f"{self.path}, column {self.layout.columns[column].title!r}, row "
        return stamps_of(cells, is_missing, lambda i: f"{place}{lines[i]}")


def _end_of_rows(data: bytes) -> int:
    """Return the place after the last row that is not blank: blank lines are gaps only when rows follow them."""
    end = data.rfind(b"\n") + 1
    near = max(0, end - 1000)
    if data[near:end].isspace():
        near = 0
    row = near + len(data[near:end].rstrip())
    return data.find(b"\n", row) + 1 if row > near else 0


@contextmanager
def open_bytes(path: Path) -> Iterator[IO[bytes]]:
    """Open a text file for reading bytes, unpacking gzip and Zstandard on the way."""
    with path.open("rb") as plain:
        head = plain.read(4)
        plain.seek(0)
        if head.startswith(GZIP):
            with gzip.open(plain) as stream:
                yield cast(IO[bytes], stream)
        elif head == ZSTANDARD:
            import pyarrow as pa

            with pa.CompressedInputStream(plain, "zstd") as stream:
                yield stream
        else:
            yield plain


def _as_bytes(path: Path, file: IO[bytes], encoding: str) -> Iterator[bytes]:
    """Yield the file in pieces, in UTF-8 or Latin-1, without its byte-order mark."""
    decoder = codecs.getincrementaldecoder(encoding)() if encoding == "utf-16" else None
    first = True
    while data := _read(path, file, BLOCK):
        if decoder:
            try:
                data = decoder.decode(data).encode()
            except UnicodeError as error:
                raise InputError(f"{path}: cannot be decoded as UTF-16 ({error}); save it as CSV in UTF-8") from error
        if first and encoding == "utf-8-sig":
            data = data.removeprefix(codecs.BOM_UTF8)
        first = False
        yield data


def _read(path: Path, file: IO[bytes], size: int) -> bytes:
    """Read up to ``size`` bytes, with one sentence when packed data end early or are damaged."""
    try:
        return bytes(file.read(size))
    except (EOFError, zlib.error, gzip.BadGzipFile) as error:
        raise InputError(f"{path}: the packed data are damaged or cut short ({error}); copy the file again") from error
    except OSError as error:
        if error.errno is None:  # from the unpacking library, not from the disk
            raise InputError(
                f"{path}: the packed data are damaged or cut short ({error}); copy the file again"
            ) from error
        raise
