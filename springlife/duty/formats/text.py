"""Text tables (CSV as loggers write it), read in blocks of whole rows.

Small files and awkward blocks go through the csv module, cell by cell, under one set of rules. Large files
go through Arrow, which accepts a subset of those rules with the same values (both round decimal fractions
correctly); a block that Arrow refuses is read again with care, and either is fine or yields the sentence.
"""

from __future__ import annotations

import codecs
import csv
import io
import re
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import IO, TYPE_CHECKING

import numpy as np

from springlife.duty.formats.table import Chunk, Floats, Stamps, Table, choose_pair
from springlife.duty.sniff import HEAD, MISSING, NUMBER, STAMP, Layout, cells_of, encoding_of, layout_of
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

BLOCK = 1 << 22  # bytes read at a time
SMALL = 1 << 20  # blocks up to this size are not worth loading Arrow for
_DATE = re.compile(r"\d{1,4}[./-]\d{1,2}[./-]\d{1,4}.*|\d{1,2}:\d{2}(:\d{2}.*)?")


def read_text(path: Path, spec: RecordSpec) -> Table:
    """Open a text table; see :data:`springlife.duty.formats.READERS`."""
    with path.open("rb") as stream:
        raw = stream.read(HEAD)
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
    reader = _Reader(path, layout, channel, time)
    columns = layout.columns
    return Table(
        columns, columns[channel], None if time is None else columns[time], reader.chunks, steps=layout.steps
    )


def _head(path: Path, raw: bytes, encoding: str) -> str:
    """Decode the head and cut it after its last whole line."""
    whole = len(raw) < HEAD
    try:
        text = (
            raw[: len(raw) // 2 * 2].decode("utf-16")
            if encoding == "utf-16"
            else raw.decode(encoding, "ignore")
        )
    except UnicodeDecodeError as error:
        raise InputError(
            f"{path}: cannot be decoded as UTF-16 ({error.reason}); save it as CSV in UTF-8"
        ) from error
    cut = text.rfind("\n") + 1
    if not cut and "\r" in text.rstrip():
        raise InputError(f"{path}: its lines end in bare carriage returns; save it with line feeds")
    if not cut and not whole:
        raise InputError(
            f"{path}: no line ends within {HEAD} bytes; save it as a table with one row a sample"
        )
    return text if whole else text[:cut]


class _Reader:
    """One pass after another over a text table whose layout is known."""

    def __init__(self, path: Path, layout: Layout, channel: int, time: int | None) -> None:
        self.path, self.layout, self.channel, self.time = path, layout, channel, time
        self.stamped: bool | None = None  # whether times are dates; None until a row has been seen

    def chunks(self) -> Iterator[Chunk]:
        """Yield the samples block by block."""
        for row, block in self._blocks():
            chunk = self._fast(row, block) if len(block) > SMALL else None
            yield chunk or self._careful(row, block)

    def _blocks(self) -> Iterator[tuple[int, bytes]]:
        """Yield (line number of the first row, whole rows in UTF-8 or Latin-1), no blank lines at the end."""
        row, carry = 1, b""
        with self.path.open("rb") as file:
            for data in _as_bytes(self.path, file, self.layout.encoding):
                data = carry + data
                cut = len(data[: data.rfind(b"\n") + 1].rstrip(b"\r\n\t "))
                cut = data.find(b"\n", cut) + 1 if cut else 0
                if not cut:
                    self._check_length(row, data)
                    carry = data
                    continue
                block, carry = data[:cut], data[cut:]
                first, row = row, row + block.count(b"\n")
                yield from self._from_start(first, block)
            if carry.strip():
                yield from self._from_start(row, carry)

    def _check_length(self, row: int, data: bytes) -> None:
        if len(data) > BLOCK and data.strip():
            raise InputError(
                f"{self.path}, row {row}: is longer than {BLOCK} bytes; save the record with one row a sample"
            )

    def _from_start(self, first: int, block: bytes) -> Iterator[tuple[int, bytes]]:
        """Drop what stands above the first row of numbers."""
        skip = self.layout.start - first
        if skip > 0:
            block = block.split(b"\n", skip)[-1] if block.count(b"\n") >= skip else b""
            first = self.layout.start
        if block.strip():
            yield first, block

    def _fast(self, row: int, block: bytes) -> Chunk | None:
        """Read a block through Arrow; None when it holds anything that needs care."""
        import pyarrow as pa
        from pyarrow import csv as arrow

        layout = self.layout
        if b"\n\n" in block or b"\n\r\n" in block or block.startswith((b"\n", b"\r\n")):
            return None
        names = [str(n) for n in range(layout.width)]
        kinds = {names[self.channel]: pa.float64()}
        if self.time is not None:
            kinds[names[self.time]] = pa.string() if self.stamped else pa.float64()
        try:
            table = arrow.read_csv(
                pa.BufferReader(block),
                read_options=arrow.ReadOptions(column_names=names, block_size=1 << 20),
                parse_options=arrow.ParseOptions(delimiter=layout.delimiter),
                convert_options=arrow.ConvertOptions(
                    include_columns=list(kinds), column_types=kinds, null_values=["", "nan", "NaN"],
                    decimal_point=layout.decimal, check_utf8=False,
                ),
            )  # fmt: skip
        except pa.ArrowInvalid:
            return None
        values = table[names[self.channel]].to_numpy()
        times = None
        if self.time is not None:
            column = table[names[self.time]]
            times = self._stamps(column.to_pylist(), lambda i: row + i) if self.stamped else column.to_numpy()
        return Chunk(values, times, lambda i: f"row {row + i}")

    def _careful(self, row: int, block: bytes) -> Chunk:
        """Read a block cell by cell."""
        encoding = "latin-1" if self.layout.encoding == "latin-1" else "utf-8"
        text = block.decode(encoding, "replace")
        lines: list[int] = []
        cells: list[str] = []
        clock: list[str] = []
        width, channel, time = self.layout.width, self.channel, self.time
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=self.layout.delimiter)
        try:
            for record in reader:
                if len(record) != width:
                    if any(cell.strip() for cell in record):
                        raise InputError(self._ragged(row + reader.line_num - 1, len(record)))
                    record = [""] * width
                lines.append(row + reader.line_num - 1)
                cells.append(record[channel])
                if time is not None:
                    clock.append(record[time])
        except csv.Error as error:
            line = row + reader.line_num - 1
            raise InputError(
                f"{self.path}, row {line}: cannot be split into cells ({error}); correct the row"
            ) from error
        values = self._numbers(cells, lines, channel)
        return Chunk(values, None if time is None else self._times(clock, lines), lambda i: f"row {lines[i]}")

    def _ragged(self, line: int, seen: int) -> str:
        columns = self.layout.width
        return (
            f"{self.path}, row {line}: has {cells_of(seen)}, the rows above have {columns}; correct the row"
        )

    def _numbers(self, cells: list[str], lines: list[int], column: int) -> Floats:
        """Turn cells into floats, NaN where one is missing."""
        joined = "".join(cells)
        decimal = self.layout.decimal
        if decimal == "," and "." not in joined:
            cells, joined = [cell.replace(",", ".") for cell in cells], joined.replace(",", ".")
            decimal = "."
        if decimal == "." and "_" not in joined and joined.isascii():
            try:
                return np.array([float(cell) for cell in cells])
            except ValueError:
                pass  # a missing or a wrong cell: look at each
        return np.array(
            [self._number(cell, decimal, line, column) for cell, line in zip(cells, lines, strict=True)]
        )

    def _number(self, cell: str, decimal: str, line: int, column: int) -> float:
        cell = cell.strip()
        other = "," if decimal == "." else "."
        if NUMBER.fullmatch(cell) and other not in cell:
            return float(cell.replace(",", "."))
        if cell.casefold() in MISSING:
            return float("nan")
        remedy = "correct the cell or choose another column"
        if NUMBER.fullmatch(cell):
            sign = "comma" if self.layout.decimal == "," else "point"
            remedy = f"the table above has a decimal {sign}; save it with one decimal sign"
        title = self.layout.columns[column].title
        raise InputError(
            f"{self.path}, column {title!r}, row {line}: {cell[:60]!r} is not a number; {remedy}"
        )

    def _times(self, cells: list[str], lines: list[int]) -> Floats | Stamps:
        assert self.time is not None
        if self.stamped is None:
            first = next((cell.strip() for cell in cells if cell.strip().casefold() not in MISSING), "")
            self.stamped = STAMP.fullmatch(first) is not None
            if not self.stamped and not NUMBER.fullmatch(first) and _DATE.fullmatch(first):
                title = self.layout.columns[self.time].title
                raise InputError(
                    f"{self.path}, column {title!r}, row {lines[0]}: {first!r} can be read in several ways; "
                    "write times as 2025-03-31T14:05:06.250 (ISO 8601) or in seconds, or give sample_rate"
                )
        if self.stamped:
            return self._stamps(cells, lines.__getitem__)
        return self._numbers(cells, lines, self.time)

    def _stamps(self, cells: Sequence[str | None], line: Callable[[int], int]) -> Stamps:
        """Turn ISO 8601 date-times into instants; a zone is taken off, so its change is no jump."""
        assert self.time is not None
        bare, zones = [], []
        for i, cell in enumerate(cells):
            match = STAMP.fullmatch((cell or "").strip())
            if not match and (cell or "").strip().casefold() not in MISSING:
                title = self.layout.columns[self.time].title
                raise InputError(
                    f"{self.path}, column {title!r}, row {line(i)}: {cell!r} is not a date and time such as "
                    "2025-03-31T14:05:06.250; correct the cell"
                )
            bare.append(f"{match[1]}T{match[2]}".replace(",", ".") if match else "NaT")
            zones.append(match[3] if match else None)
        try:
            stamps = np.array(bare, dtype="datetime64[ns]")
        except ValueError as error:
            title = self.layout.columns[self.time].title
            raise InputError(
                f"{self.path}, column {title!r}, from row {line(0)}: {error}; correct the date"
            ) from error
        shifts = {zone: _zone_seconds(zone) for zone in set(zones)}
        if any(shifts.values()):
            stamps -= np.array([shifts[zone] for zone in zones], dtype="timedelta64[s]")
        return stamps


def _zone_seconds(zone: str | None) -> int:
    if zone in (None, "Z"):
        return 0
    assert zone is not None
    digits = zone[1:].replace(":", "")
    return (-1 if zone[0] == "-" else 1) * (int(digits[:2]) * 3600 + int(digits[2:]) * 60)


def _as_bytes(path: Path, file: IO[bytes], encoding: str) -> Iterator[bytes]:
    """Yield the file in pieces, in UTF-8 or Latin-1, without its byte-order mark."""
    decoder = codecs.getincrementaldecoder(encoding)() if encoding == "utf-16" else None
    first = True
    while data := file.read(BLOCK):
        if decoder:
            try:
                data = decoder.decode(data).encode()
            except UnicodeError as error:
                raise InputError(
                    f"{path}: cannot be decoded as UTF-16 ({error}); save it as CSV in UTF-8"
                ) from error
        if first and encoding == "utf-8-sig":
            data = data.removeprefix(codecs.BOM_UTF8)
        first = False
        yield data
