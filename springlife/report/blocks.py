"""What a report is made of: plain data that the page and the sheet set in type alike.

Text is text: nothing in it is ever read as markup. Only formulas, which are the program's own, know ``_`` for a
subscript and ``^`` for a power.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from springlife.units import UnitSystem, significant

if TYPE_CHECKING:
    from matplotlib.figure import Figure as MplFigure

DIGITS = 6  # of the numbers put into a formula, so that the result can be checked by hand
# A name such as N_a, S_ut, τ_ar or y; functions and constants stay as they are.
_SYMBOL = re.compile(r"[A-Za-zτλα]+(?:_[A-Za-z0-9]+)?")
_SCRIPT = re.compile(r"([_^])(?:\(([^()]*)\)|([A-Za-z0-9.,]+))")
_UNCHANGED = {"ln", "Σ"}


@dataclass(frozen=True)
class Text:
    """A paragraph."""

    text: str


@dataclass(frozen=True)
class Rows:
    """Labels with what stands beside them."""

    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Points:
    """Sentences that stand side by side."""

    caption: str
    items: tuple[str, ...]


@dataclass(frozen=True)
class Table:
    """A table; ``align`` has a letter for each column, l for words and r for numbers, the last holding for the rest.

    ``empty`` stands in its place when there are no rows.
    """

    caption: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    align: str = "lr"
    empty: str = "none"


@dataclass(frozen=True)
class Figure:
    """A figure by name; ``draw`` makes it when it is wanted, ``alt`` tells it to whoever cannot see it."""

    name: str
    caption: str
    alt: str
    draw: Callable[[], MplFigure]


@dataclass(frozen=True)
class Worked:
    """A formula in symbols, with the numbers put in, and the result; ``source`` says where it is printed."""

    title: str
    symbols: str
    numbers: str
    result: str
    source: str


Block = Text | Rows | Points | Table | Figure | Worked


@dataclass(frozen=True)
class Section:
    """A numbered part of the report."""

    title: str
    blocks: tuple[Block, ...]


def rows(pairs: Sequence[tuple[str, str]]) -> Rows:
    """Return labels and texts, those without text left out."""
    return Rows(tuple((label, text) for label, text in pairs if text))


def worked(
    title: str, name: str, formula: str, values: Mapping[str, tuple[float, str]], result: tuple[float, str],
    source: str, say: UnitSystem,
) -> Worked:  # fmt: skip
    """Return a formula with its numbers, put in by the program.

    Parameters
    ----------
    name, formula : str
        What stands left and right of the equals sign, such as "k" and "d^4·G / (8·D^3·N_a)".
    values : mapping
        Each symbol's value in SI and its kind of :mod:`springlife.units`.
    result : tuple
        The value as the program computed it, and its kind.
    """
    return Worked(
        title, f"{name} = {formula}", substituted(formula, values, say), _said(*result, say, digits=4), source
    )


def substituted(formula: str, values: Mapping[str, tuple[float, str]], say: UnitSystem) -> str:
    """Return a formula with every symbol replaced by its value and unit.

    Raises
    ------
    KeyError
        A symbol without a value.
    """

    def put(match: re.Match[str]) -> str:
        if match[0] in _UNCHANGED:
            return match[0]
        text = _said(*values[match[0]], say, digits=DIGITS)
        raised = formula[match.end() : match.end() + 1] == "^"
        wide = " " in text and (raised or "/" in text or formula[: match.start()].rstrip().endswith("/"))
        return f"({text})" if wide or (text.startswith("-") and raised) else text

    return _SYMBOL.sub(put, formula)


def _said(value: float, kind: str, say: UnitSystem, digits: int) -> str:
    return significant(value, digits) if kind == "number" else say(value, kind, digits)


def runs(formula: str) -> list[tuple[str, str]]:
    """Return a formula as runs of ("base" | "sub" | "super", text) for the typesetter."""

    def parts() -> Iterator[tuple[str, str]]:
        at = 0
        for match in _SCRIPT.finditer(formula):
            if match.start() > at:
                yield "base", formula[at : match.start()]
            yield ("sub" if match[1] == "_" else "super"), match[2] or match[3]
            at = match.end()
        if at < len(formula):
            yield "base", formula[at:]

    return list(parts())


def plain(block: Block) -> dict[str, Any]:
    """Return a block as plain data with its kind."""
    match block:
        case Text(text):
            return {"kind": "text", "text": text}
        case Rows(pairs):
            return {"kind": "rows", "rows": [list(pair) for pair in pairs]}
        case Points(caption, items):
            return {"kind": "points", "caption": caption, "items": list(items)}
        case Table(caption, heads, body, align, empty):
            return {
                "kind": "table",
                "caption": caption,
                "heads": list(heads),
                "rows": [list(row) for row in body],
                "align": list(align.ljust(len(heads), align[-1])),
                "empty": empty,
            }
        case Figure(name, caption, alt):
            return {"kind": "figure", "name": name, "caption": caption, "alt": alt}
        case Worked(title, symbols, numbers, result, source):
            return {
                "kind": "worked",
                "title": title,
                "symbols": runs(symbols.replace("·", " · ")),
                "numbers": runs(numbers.replace("·", " · ")),
                "result": result,
                "source": source,
            }
