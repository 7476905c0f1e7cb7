"""What every reader hands back: the columns of a file, the chosen ones, and a stream of raw samples."""

from __future__ import annotations

import importlib
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from springlife.errors import InputError, MissingExtraError, nearest

Floats = NDArray[np.float64]
Stamps = NDArray[np.datetime64]

_WITH_UNIT = re.compile(r"(?P<name>.+?)\s*(?:\[(?P<square>[^\[\]]*)\]|\((?P<round>[^()]*)\)|\s/\s*(?P<slash>\S+))\s*")


@dataclass(frozen=True)
class Column:
    """One column: ``title`` as the file writes it, ``name`` without its unit, ``unit`` if stated."""

    title: str
    name: str
    unit: str | None = None

    @classmethod
    def of(cls, title: str, unit: str | None = None) -> Column:
        """Split a header such as "travel (mm)", "t [ms]" or "F / N"; ``unit`` is what a units row states."""
        match = _WITH_UNIT.fullmatch(title)
        unit = (unit or "").strip().strip("[]()").strip() or None
        if not match:
            return cls(title, title, unit)
        stated = (match["square"] or match["round"] or match["slash"] or "").strip() or None
        return cls(title, match["name"], unit or stated)


@dataclass(frozen=True)
class Chunk:
    """Consecutive samples as the file holds them: not yet scaled, NaN where a value is missing.

    ``times`` is None, floats in the time column's unit, or date-times; ``place`` says where sample ``i``
    stands in the file, as a person counts; ``starts`` marks the first chunk of a further piece of the record.
    """

    values: Floats
    times: Floats | Stamps | None
    place: Callable[[int], str]
    starts: bool = False


@dataclass(frozen=True)
class Table:
    """One opened file: its columns, the channel and time columns chosen, and the stream of chunks."""

    columns: tuple[Column, ...]
    channel: Column
    time: Column | None
    chunks: Callable[[], Iterator[Chunk]]
    sample_rate: float | None = None
    steps: tuple[str, ...] = field(default=())


def choose(path: Path, columns: Sequence[Column], wanted: str | int, what: str) -> int:
    """Return the index of a column given by its number from 1 or its name (with or without unit, any case).

    Raises
    ------
    InputError
        When there is no such column, or more than one.
    """
    if isinstance(wanted, int):
        if not 1 <= wanted <= len(columns):
            raise InputError(
                f"{path}: {what} number {wanted} does not exist; columns count from 1 to {len(columns)}: "
                f"{listing(columns)}"
            )
        return wanted - 1
    folded = wanted.strip().casefold()
    tests: tuple[Callable[[Column], bool], ...] = (
        lambda column: column.title == wanted,
        lambda column: column.name == wanted,
        lambda column: column.title.casefold() == folded,
        lambda column: column.name.casefold() == folded,
    )
    for test in tests:
        found = [index for index, column in enumerate(columns) if test(column)]
        if len(found) == 1:
            return found[0]
        if found:
            places = " and ".join(str(index + 1) for index in found)
            raise InputError(
                f"{path}: {what} {wanted!r} is ambiguous, columns {places} have that name; give its number"
            )
    raise InputError(f"{path}: there is no {what} {wanted!r}; {nearest(wanted, [column.title for column in columns])}")


def choose_pair(
    path: Path, columns: Sequence[Column], channel: str | int | None, time: str | int | None
) -> tuple[int, int | None]:
    """Return the indices of channel and time column; with no channel named, the only other column is it.

    Raises
    ------
    InputError
        When a column does not exist, is ambiguous, or several are left to choose from.
    """
    at_time = None if time is None else choose(path, columns, time, "time column")
    if channel is None:
        left = [index for index in range(len(columns)) if index != at_time]
        if len(left) != 1:
            seen = listing(columns) if columns else "none"
            raise InputError(f"{path}: name the channel; the file has {len(columns)} columns: {seen}")
        return left[0], at_time
    at = choose(path, columns, channel, "channel")
    if at == at_time:
        raise InputError(f"{path}: column {columns[at].title!r} is named as channel and as time; name two columns")
    return at, at_time


def listing(columns: Sequence[Column]) -> str:
    """Name the columns, at most twenty of them."""
    names = [column.title for column in columns]
    return ", ".join(names[:20]) + (f" and {len(names) - 20} more" if len(names) > 20 else "")


def need(module: str, what: str, path: Path) -> Any:
    """Import an optional library.

    Raises
    ------
    MissingExtraError
        When it is not installed; the message says how to install it.
    """
    try:
        return importlib.import_module(module)
    except ImportError as error:
        raise MissingExtraError(
            f'{path}: reading {what} needs the library {module}; install it with pip install "springlife[formats]"'
        ) from error
