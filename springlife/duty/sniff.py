"""Find out how a text table is written: encoding, delimiter, decimal sign, header, units, first row.

Only the head of the file is looked at. What stays ambiguous is refused with a sentence, never guessed.
"""

from __future__ import annotations

import codecs
import csv
import io
import re
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from itertools import islice
from pathlib import Path
from typing import NoReturn

from springlife.duty.formats.dates import STAMP
from springlife.duty.formats.table import Column
from springlife.errors import InputError

HEAD = 1 << 16  # bytes looked at; a preamble longer than this is refused
FEW = 250  # lines that usually tell enough
MISSING = frozenset({"", "nan", "-nan", "na", "n/a", "#n/a", "null"})
NUMBER = re.compile(r"[+-]?(?:\d+[.,]?\d*|[.,]\d+)(?:[eE][+-]?\d+)?|[+-]?inf(?:inity)?", re.IGNORECASE | re.ASCII)
_COMMENT = re.compile(r"\s*(#|//|%)+")
_BOMS = ((codecs.BOM_UTF8, "utf-8-sig"), (codecs.BOM_UTF16_LE, "utf-16"), (codecs.BOM_UTF16_BE, "utf-16"))
_ENCODINGS = {
    "utf-8": "text in UTF-8",
    "utf-8-sig": "text in UTF-8",
    "utf-16": "text in UTF-16",
    "latin-1": "text not in UTF-8, read as Latin-1",
}
_NAMES = {";": "semicolons", "\t": "tabs", ",": "commas"}


@dataclass(frozen=True)
class Layout:
    """How the table is written. ``start`` is the line number of its first row of numbers, from 1."""

    encoding: str
    delimiter: str
    decimal: str
    width: int  # cells in a row, a trailing empty one included
    columns: tuple[Column, ...]
    has_header: bool
    start: int
    first: tuple[str, ...]  # the first cell of each column that is not missing
    steps: tuple[str, ...]


@dataclass(frozen=True)
class _Record:
    line: int
    cells: list[str]
    comment: bool

    @cached_property
    def numbers(self) -> int:
        """Number of cells that hold a number or a date and time."""
        return sum((NUMBER.fullmatch(cell) or STAMP.fullmatch(cell)) is not None for cell in self.cells)

    @property
    def is_text(self) -> bool:
        return self.numbers == 0 and any(cell.casefold() not in MISSING for cell in self.cells)

    @property
    def is_data(self) -> bool:
        return not self.comment and self.numbers > 0


def is_missing(cell: str) -> bool:
    """Tell whether a cell stands for a value that is not there."""
    return cell.strip().casefold() in MISSING


def encoding_of(path: Path, head: bytes) -> str:
    """Name the encoding of the head of a text file.

    Raises
    ------
    InputError
        When it is not text.
    """
    for bom, name in _BOMS:
        if head.startswith(bom):
            return name
    junk = re.search(rb"[\x00-\x08\x0e-\x1f\x7f]", head)
    if junk:
        raise InputError(
            f"{path}: is not text (byte {junk.group()[0]:#04x} at position {junk.start()}); "
            "save the record as CSV in UTF-8, or give the file the ending of its format"
        )
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head)
    except UnicodeDecodeError:
        return "latin-1"
    return "utf-8"


def layout_of(path: Path, text: str, encoding: str, wanted: Iterable[str | int | None]) -> Layout:
    """Find the table in the head of a text file (whole lines).

    Parameters
    ----------
    path : Path
        Named in messages.
    text : str
        The head, decoded.
    encoding : str
        As found by :func:`encoding_of`.
    wanted : iterable
        Column names asked for; they tell the header from other lines of text above the numbers.

    Raises
    ------
    InputError
        No table of numbers, columns separated by spaces, decimal commas between commas, header and rows of
        different width.
    """
    few = "".join(islice(io.StringIO(text, newline=""), FEW))
    delimiter, width, records = _split(path, few) or _split(path, text) or _refuse(path, text)
    rows = [record for record in records if record.is_data and len(record.cells) == width]
    decimal = _decimal(path, rows)
    if not decimal and any(sign in text for sign in ".,".replace(delimiter, "")):
        decimal = _decimal(path, [record for record in _records(path, text, delimiter) if record.is_data])
    decimal = decimal or "."
    names, units, start = _header(path, records, width, delimiter, {w for w in wanted if isinstance(w, str)})
    if names is None:
        _refuse_fractions(path, rows, delimiter)
    named = names or [""] * width
    ends_empty = width > 1 and named[-1] == "" and all(record.cells[-1] == "" for record in rows)
    count = width - 1 if ends_empty else width
    titles = [title or f"column {n}" for n, title in enumerate(named[:count], start=1)]
    stated = (units or [])[:count] + [""] * (count - len(units or []))
    columns = tuple(Column.of(title, unit) for title, unit in zip(titles, stated, strict=True))
    first = tuple(
        next((record.cells[i] for record in rows if not is_missing(record.cells[i])), "") for i in range(width)
    )
    steps = [_ENCODINGS[encoding]]
    steps.append(f"{count} columns between {_NAMES[delimiter]}" if count > 1 else "one column")
    steps.append(f"decimal {'comma' if decimal == ',' else 'point'}")
    steps.append(f"numbers from row {start}" + ("" if names else ", no header") + (", units row" if units else ""))
    return Layout(encoding, delimiter, decimal, width, columns, names is not None, start, first, (", ".join(steps),))


def _split(path: Path, text: str) -> tuple[str, int, list[_Record]] | None:
    """Choose the delimiter that gives most rows of one width; semicolon before tab before comma in a tie."""
    best: tuple[int, str, int, list[_Record]] = (0, ",", 0, [])
    for delimiter in ";\t,":
        records = _records(path, text, delimiter)
        widths = Counter(len(record.cells) for record in reversed(records) if record.is_data)
        width, rows = max(widths.items(), key=lambda item: item[1], default=(0, 0))
        if width > 1 and rows > best[0]:
            best = (rows, delimiter, width, records)
    if best[0]:
        return best[1:]
    records = _records(path, text, ",")
    return (",", 1, records) if any(record.is_data for record in records) else None


def _records(path: Path, text: str, delimiter: str) -> list[_Record]:
    """Split the head into records that are not blank, each with its line number."""
    records, line = [], 1
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    try:
        for raw in reader:
            cells = [cell.strip() for cell in raw]
            sign = _COMMENT.match(raw[0]) if raw else None
            if sign:
                cells[0] = raw[0][sign.end() :].strip()
            comment = sign is not None or bool(raw and delimiter != ";" and cells[0].startswith(";"))
            if any(cells):
                records.append(_Record(line, cells, comment))
            line = reader.line_num + 1
    except csv.Error as error:
        raise InputError(f"{path}, row {line}: cannot be split into cells ({error}); correct the row") from error
    return records


def _refuse(path: Path, text: str) -> NoReturn:
    """Say why there is no table."""
    lines = [line.strip() for line in text.splitlines() if line.strip()]
    spaced = next((line for line in lines if len(line.split()) > 1 and all(map(NUMBER.fullmatch, line.split()))), None)
    seen = repr((spaced or lines[0])[:60])
    if spaced:
        raise InputError(
            f"{path}: columns are separated by spaces ({seen}); save with commas, semicolons or tabs instead"
        )
    if len(lines) <= 2:
        raise InputError(f"{path}: has a header but no rows of numbers (it begins {seen}); export the record again")
    raise InputError(f"{path}: no rows of numbers found (it begins {seen}); save it as a table with one row a sample")


def _decimal(path: Path, rows: list[_Record]) -> str:
    """Tell decimal comma from decimal point, "" when there is neither; both in one file is refused."""
    seen: dict[str, tuple[int, str]] = {}
    for record in rows:
        for cell in record.cells:
            if NUMBER.fullmatch(cell):
                for sign in ".,":
                    if sign in cell:
                        seen.setdefault(sign, (record.line, cell))
    if len(seen) == 2:
        (point_row, point), (comma_row, comma) = seen["."], seen[","]
        raise InputError(
            f"{path}: has decimal points ({point!r} in row {point_row}) and decimal commas ({comma!r} in row "
            f"{comma_row}); save it with one decimal sign"
        )
    return next(iter(seen), "")


def _header(
    path: Path, records: list[_Record], width: int, delimiter: str, wanted: set[str]
) -> tuple[list[str] | None, list[str] | None, int]:
    """Return the names, the units row and the line of the first row of numbers."""
    first = next(i for i, record in enumerate(records) if record.is_data and len(record.cells) == width)
    runs: list[tuple[list[list[str]], int]] = []
    solid = False
    for i in range(first, len(records)):
        # A line such as "Serial;12345" above the header is half text; a row of numbers only ends the search.
        if not (records[i].is_data and len(records[i].cells) == width):
            continue
        run = _text_above(records, i, width)
        if run:
            runs.append((run, records[i].line))
        solid = records[i].numbers == sum(cell != "" for cell in records[i].cells)
        if solid:
            break
    if runs:
        run, line = next((r for r in runs if _find(r[0], wanted) is not None), runs[-1 if solid else 0])
        return *_names_and_units(run, wanted), line
    if first and not records[first - 1].comment:
        above = records[first - 1]
        # One cell above a wider table is a line of preamble, unless "1,5" may be one number below its name.
        if len(above.cells) > 1 or (delimiter == "," and width == 2):
            raise InputError(
                f"{path}, row {above.line}: {_mismatch(len(above.cells), width, delimiter, records[first])}"
            )
    return None, None, records[first].line


def _text_above(records: list[_Record], i: int, width: int) -> list[list[str]]:
    """Collect the lines of text directly above record ``i`` that have the table's width, top line first."""
    run: list[list[str]] = []
    comments = False
    for record in reversed(records[:i]):
        cells = list(record.cells)
        while len(cells) > width and cells[-1] == "":
            cells.pop()
        short = len(cells) == width - 1 and all(r.cells[-1] == "" for r in records[i:] if len(r.cells) == width)
        if record.is_data or not record.is_text or not (len(cells) == width or short):
            break
        if record.comment and (run and not comments):
            break
        comments = record.comment
        run.insert(0, cells + [""] * (width - len(cells)))
    return run


def _names_and_units(run: list[list[str]], wanted: set[str]) -> tuple[list[str], list[str] | None]:
    """Choose the line of names: the one with the names asked for, else the last that has no units."""
    found = _find(run, wanted)
    if found is not None:
        return run[found], run[found + 1] if found + 1 < len(run) else None
    if len(run) > 1 and _are_units(run[-1]):
        return run[-2], run[-1]
    return run[-1], None


def _find(run: list[list[str]], wanted: set[str]) -> int | None:
    """Return the first line of a run that holds all names asked for."""
    folded = {name.strip().casefold() for name in wanted}
    for i, cells in enumerate(run):
        if folded and folded <= {name.casefold() for cell in cells for name in (cell, Column.of(cell).name)}:
            return i
    return None


def _are_units(cells: list[str]) -> bool:
    from springlife.units import is_unit

    stated = [cell.strip("[]() ") for cell in cells if cell.strip("[]()- ")]
    return bool(stated) and sum(is_unit(cell) for cell in stated) * 2 > len(stated)


def cells_of(count: int) -> str:
    """Say a number of cells."""
    return f"{count} {'cell' if count == 1 else 'cells'}"


def _mismatch(names: int, width: int, delimiter: str, row: _Record) -> str:
    seen = f"has {cells_of(names)} but row {row.line} has {width}"
    if delimiter == "," and width == 2 * names:
        return (
            f"{seen} ({','.join(row.cells)!r}): decimal commas cannot be told from commas between columns; "
            "save with semicolons between columns or with decimal points"
        )
    return f"{seen}; give every row the same number of cells"


def _refuse_fractions(path: Path, rows: list[_Record], delimiter: str) -> None:
    """Refuse whole numbers between commas without a header when they could be halves of decimal fractions."""
    width = len(rows[0].cells)
    if (
        delimiter != ","
        or width % 2
        or not all(record.cells[i].isdigit() for record in rows for i in range(1, width, 2))
    ):
        return
    if all(re.fullmatch(r"[+-]?\d+", record.cells[i]) for record in rows for i in range(0, width, 2)):
        raise InputError(
            f"{path}, row {rows[0].line}: {','.join(rows[0].cells)!r} can be {width} whole numbers or "
            f"{width // 2} with decimal commas; add a header row, or save with semicolons between columns"
        )
