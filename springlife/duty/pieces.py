"""A folder or a pattern of files as one event: pieces in natural order of their names, one after the other."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from springlife.duty.formats import open_table
from springlife.duty.formats.table import Chunk, Table, listing
from springlife.errors import FileError, InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec


def files_of(path: Path) -> tuple[Path, ...]:
    """Return the files that a path means: itself, the visible files of a folder, or those that match * and ?.

    Raises
    ------
    FileError
        When nothing is there, or nothing matches.
    """
    if path.is_fifo() or path.is_char_device():
        raise FileError(f"{path}: is no regular file; save the record to one")
    if path.is_dir():
        found = [part for part in path.iterdir() if part.is_file() and not part.name.startswith((".", "~"))]
        if not found:
            raise FileError(f"{path}: is a directory without files; name a record, or a directory of records")
    elif path.exists() or not re.search(r"[*?]", str(path)):
        return (path,)
    else:
        first = next(i for i, part in enumerate(path.parts) if re.search(r"[*?]", part))
        pattern = "/".join(path.parts[first:]).replace("[", "[[]")
        found = [part for part in Path(*path.parts[:first]).glob(pattern) if part.is_file()]
        if not found:
            raise FileError(f"{path}: matches no file; check the pattern")
    return tuple(sorted(found, key=_natural))


def open_pieces(path: Path, pieces: Sequence[Path], spec: RecordSpec) -> Table:
    """Open every piece and join them to one table; their first samples are marked.

    Raises
    ------
    InputError
        When a piece cannot be read, or its columns, units or rate differ from the first one's.
    """
    tables = [_open(path, piece, spec) for piece in pieces]
    first = tables[0]
    for piece, table in zip(pieces[1:], tables[1:], strict=True):
        if [c.title for c in table.columns] != [c.title for c in first.columns]:
            raise InputError(
                f"{piece}: has columns {listing(table.columns)} where {pieces[0].name} has {listing(first.columns)}; "
                "pieces of one record have the same columns"
            )
        for what, seen, wanted in (
            ("unit", table.channel.unit, first.channel.unit),
            ("time unit", table.time and table.time.unit, first.time and first.time.unit),
            ("sample rate", table.sample_rate, first.sample_rate),
        ):
            if seen != wanted:
                raise InputError(f"{piece}: its {what} is {seen} where {pieces[0].name} has {wanted}; make them agree")

    def chunks() -> Iterator[Chunk]:
        for number, (piece, table) in enumerate(zip(pieces, tables, strict=True)):
            starts = number > 0
            for chunk in table.chunks():
                yield replace(chunk, starts=starts, place=_named(piece, chunk))
                starts = False

    return replace(first, chunks=chunks)


def _open(path: Path, piece: Path, spec: RecordSpec) -> Table:
    try:
        return open_table(piece, spec)
    except InputError as error:
        if not path.is_dir():
            raise
        raise InputError(
            f"{error} (every file of the directory {path} is read; name the records with a pattern such as *.csv)"
        ) from error


def _named(piece: Path, chunk: Chunk) -> Callable[[int], str]:
    return lambda i: f"{piece.name}, {chunk.place(i)}"


def _natural(path: Path) -> list[tuple[int, str]]:
    """Order run2 before run10."""
    return [(int(part), "") if part.isdigit() else (-1, part.casefold()) for part in re.split(r"(\d+)", str(path))]
