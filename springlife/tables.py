"""One table of a TOML file with its place in it, so that every message says where the fault is."""

from __future__ import annotations

import math
import tomllib
from dataclasses import dataclass
from typing import Any

from springlife.errors import InputError, nearest
from springlife.units import parse


def parse_toml(text: str, where: str) -> dict[str, Any]:
    """Return a TOML text's tables; ``where`` names the file.

    Raises
    ------
    InputError
        Not TOML, nested too deeply, or a number of thousands of digits.
    """
    try:
        return tomllib.loads(text)
    except RecursionError as error:
        raise InputError(f"{where}: not usable TOML: tables or lists are nested too deeply; flatten them") from error
    except ValueError as error:  # TOMLDecodeError is one; so is a whole number of too many digits
        raise InputError(f"{where}: not valid TOML: {str(error).split('; use sys')[0]}") from error


@dataclass(frozen=True)
class Table:
    """A table of a TOML file; ``where`` is the file and the keys that lead here, for messages."""

    raw: dict[str, Any]
    where: str

    def wrong(self, key: str, remedy: str) -> InputError:
        """Return the error for a key: what was seen and what would be right."""
        seen = f"is {self.raw[key]!r}" if key in self.raw else "is missing"
        return InputError(f"{self.where}{key} {seen}; {remedy}")

    def only(self, *keys: str) -> None:
        """Refuse keys that are not among ``keys``."""
        for key in self.raw:
            if key not in keys:
                raise InputError(f"{self.where}{key} is not a known key; {nearest(key, keys)}")

    def text(self, key: str, otherwise: str | None = None) -> str:
        """Return text; ``otherwise`` when the key is not there."""
        value = self.raw.get(key, otherwise)
        if not isinstance(value, str):
            raise self.wrong(key, "write text in quotes")
        return value

    def flag(self, key: str, otherwise: bool | None = None) -> bool:
        """Return true or false; ``otherwise`` when the key is not there."""
        value = self.raw.get(key, otherwise)
        if not isinstance(value, bool):
            raise self.wrong(key, "write true or false")
        return value

    def quantity(self, key: str, kind: str) -> float:
        """Return a quantity above zero, SI."""
        text = self.text(key)
        try:
            value = parse(text, kind)
        except InputError as error:
            raise InputError(f"{self.where}{key}: {error}") from error
        if not value > 0:
            raise self.wrong(key, "it must be above zero")
        return value

    def positive(self, key: str) -> float:
        """Return a finite number above zero."""
        value = self.number(key, -math.inf, math.inf)
        if not 0 < value < math.inf:
            raise self.wrong(key, "it must be above zero and finite")
        return value

    def share(self, key: str) -> float:
        """Return a number between 0 and 1."""
        value = self.number(key, -math.inf, math.inf)
        if not 0 < value < 1:
            raise self.wrong(key, "it must be between 0 and 1, such as 0.9")
        return value

    def whole(self, key: str) -> int:
        """Return a whole number."""
        value = self.raw.get(key)
        if type(value) is not int:
            raise self.wrong(key, "write a whole number")
        return value

    def number(self, key: str, low: float, high: float) -> float:
        """Return a number from ``low`` to ``high``."""
        value = self.raw.get(key)
        bounds = f" from {low:g} to {high:g}" if math.isfinite(high) else ""
        return number(value, low, high, self.wrong(key, f"write a number{bounds}"))

    def table(self, key: str) -> Table:
        """Return a table inside this one."""
        value = self.raw.get(key)
        if not isinstance(value, dict):
            raise self.wrong(key, "write it as a table")
        return Table(value, f"{self.where}{key}.")

    def tables(self, key: str) -> list[Table]:
        """Return a list of tables inside this one; they are counted from 1."""
        value = self.raw.get(key)
        if not isinstance(value, list) or not value or not all(isinstance(one, dict) for one in value):
            raise self.wrong(key, "write a list of one or more tables")
        return [Table(one, f"{self.where}{key}[{i}].") for i, one in enumerate(value, start=1)]


def number(value: object, low: float, high: float, fault: InputError) -> float:
    """Return a value as a float when it is a number from ``low`` to ``high``; raise ``fault`` otherwise."""
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
        raise fault
    return float(value)
