"""The reader of published checks: worked examples and tables from books, held against our own numbers.

data/published/*.toml holds them. A file may give ``method``, ``source`` and ``provenance`` once for all
of its checks; each ``[[check]]`` has an ``id``, ``inputs`` and the ``printed`` answers as text with their
unit, so that the book's rounding shows::

    [[check]]
    id = "a spring"
    inputs = { grade = "A228", wire_diameter = "0.092 in" }
    printed = { Sut = "284.1 kpsi", index = "5.11" }

``method`` names a function in the ``METHODS`` of a room's ``checks`` module; it takes the inputs as written
and returns SI values under the printed names. An answer agrees within half of its last printed digit. A wider
``tolerance`` (in the printed unit) needs a ``tolerance_reason``.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from importlib.resources import files
from pathlib import Path
from typing import Any

from springlife.errors import InputError, nearest
from springlife.units import KINDS, convert, factor, split

PROVENANCES = ("published", "seen", "memory", "derived", "common practice")
_DEFAULTS = ("method", "source", "provenance")
_KEYS = ("id", *_DEFAULTS, "inputs", "printed", "tolerance", "tolerance_reason")


@dataclass(frozen=True)
class Answer:
    """One printed answer: ``text`` as printed with its unit, ``tolerance`` in that unit."""

    name: str
    text: str
    tolerance: float

    @property
    def value(self) -> float:
        """The printed number, in the printed unit."""
        return split(self.text)[0]

    def ours(self, si: float) -> float:
        """Return our SI value in the printed unit."""
        unit = split(self.text)[1]
        return convert(si, unit, _kind(unit)) if unit else si

    def agrees(self, si: float) -> bool:
        """Tell whether our SI value lies within the tolerance; one that is not finite never does."""
        return abs(self.ours(si) - self.value) <= self.tolerance * (1 + 1e-9)


@dataclass(frozen=True)
class Check:
    """One published example or table row. ``tolerance_reason`` says why a tolerance is wider than printed."""

    id: str
    method: str
    source: str
    provenance: str
    inputs: Mapping[str, Any]
    answers: tuple[Answer, ...]
    tolerance_reason: str = ""


def load(folder: Path | None = None) -> list[Check]:
    """Return every published check, by file name and then in the order of the file.

    Parameters
    ----------
    folder : Path, optional
        Where the files are; the package's own by default.

    Raises
    ------
    InputError
        An unknown or missing key, an answer without a number, or an id used twice.
    """
    place = folder or Path(str(files("springlife").joinpath("data/published")))
    checks = [check for file in sorted(place.glob("*.toml")) for check in _read(file)]
    ids = [check.id for check in checks]
    twice = sorted({name for name in ids if ids.count(name) > 1})
    if twice:
        raise InputError(f"{place}: id {twice[0]!r} is used twice; give each check its own")
    return checks


def tolerance(printed: str) -> float:
    """Return half of the last digit of a printed number, in its own unit: ``"5.11"`` gives 0.005."""
    split(printed)  # one message for whatever is not a number with a unit
    try:
        exponent = Decimal(printed.split()[0]).as_tuple().exponent
    except InvalidOperation as error:
        raise InputError(f"{printed!r} hides its last digit; write a decimal number, a space, the unit") from error
    return float(Decimal(5).scaleb(int(exponent) - 1))


def _read(file: Path) -> list[Check]:
    raw = tomllib.loads(file.read_text(encoding="utf-8"))
    common = {key: raw[key] for key in _DEFAULTS if key in raw}
    for key in raw:
        if key not in (*_DEFAULTS, "check"):
            raise InputError(f"{file}: key {key!r} is not known; {nearest(key, (*_DEFAULTS, 'check'))}")
    return [_check(common | entry, f"{file}: check[{i}].") for i, entry in enumerate(raw["check"], start=1)]


def _check(entry: dict[str, Any], where: str) -> Check:
    for key in entry:
        if key not in _KEYS:
            raise InputError(f"{where}{key} is not known; {nearest(key, _KEYS)}")
    for key in ("id", *_DEFAULTS, "inputs", "printed"):
        if key not in entry:
            raise InputError(f"{where}{key} is missing; add it")
    if entry["provenance"] not in PROVENANCES:
        raise InputError(f"{where}provenance {entry['provenance']!r}: {nearest(entry['provenance'], PROVENANCES)}")
    wider = entry.get("tolerance", {})
    if wider and not entry.get("tolerance_reason"):
        raise InputError(f"{where}tolerance needs a tolerance_reason; say why half of the last digit is not enough")
    for name in wider:
        if name not in entry["printed"]:
            raise InputError(f"{where}tolerance.{name} belongs to no answer; {nearest(name, entry['printed'])}")
    answers = tuple(
        Answer(name, text, float(wider.get(name, tolerance(text)))) for name, text in entry["printed"].items()
    )
    kept = {key: entry[key] for key in ("id", *_DEFAULTS, "inputs")}
    return Check(**kept, answers=answers, tolerance_reason=entry.get("tolerance_reason", ""))


def _kind(unit: str) -> str:
    """Return the kind of quantity that a unit measures."""
    for kind in KINDS:
        try:
            factor(unit, kind)
        except InputError:
            continue
        return kind
    raise InputError(f"unit {unit!r} measures none of {', '.join(KINDS)}")
