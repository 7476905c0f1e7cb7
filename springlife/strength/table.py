"""One table of a TOML file with its place in it, so that every message says where the fault is."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from springlife.errors import InputError, nearest
from springlife.units import parse


@dataclass(frozen=True)
class Table:
    """A table as read; ``where`` is the file and the keys that lead to it."""

    raw: dict[str, Any]
    where: str

    def only(self, *keys: str) -> None:
        """Refuse keys that are not among ``keys``."""
        for key in self.raw:
            if key not in keys:
                raise InputError(f"{self.where}{key} is not a known key; {nearest(key, keys)}")

    def get(self, key: str, kind: type) -> Any:
        """Return a value that must be there and be of one kind."""
        names = {str: "text in quotes", bool: "true or false", int: "a whole number", float: "a number",
                 dict: "a table", list: "a list of tables"}  # fmt: skip
        if key not in self.raw:
            raise InputError(f"{self.where}{key} is missing; add it as {names[kind]}")
        value = self.raw[key]
        wanted: Iterable[type] = (int, float) if kind is float else (kind,)
        if type(value) not in wanted:
            raise InputError(f"{self.where}{key} is {value!r}; it must be {names[kind]}")
        return value

    def positive(self, key: str) -> float:
        """Return a finite number above zero."""
        value = float(self.get(key, float))
        if not 0 < value < np.inf:
            raise InputError(f"{self.where}{key} is {value:g}; it must be above zero and finite")
        return value

    def share(self, key: str) -> float:
        """Return a number between 0 and 1."""
        value = float(self.get(key, float))
        if not 0 < value < 1:
            raise InputError(f"{self.where}{key} is {value:g}; it must be between 0 and 1, such as 0.9")
        return value

    def stress(self, key: str) -> float:
        """Return a stress above zero, Pa."""
        try:
            value = parse(self.get(key, str), "stress")
        except InputError as error:
            raise InputError(f"{self.where}{key}: {error}") from error
        if not value > 0:
            raise InputError(f"{self.where}{key} is {self.raw[key]!r}; it must be above zero")
        return value

    def table(self, key: str) -> Table:
        """Return a table inside this one."""
        return Table(self.get(key, dict), f"{self.where}{key}.")

    def tables(self, key: str) -> tuple[Table, ...]:
        """Return a list of tables inside this one; they are counted from 1."""
        found = self.get(key, list)
        if not found or not all(isinstance(one, dict) for one in found):
            raise InputError(f"{self.where}{key} must be a list of one or more tables")
        return tuple(Table(one, f"{self.where}{key}[{i}].") for i, one in enumerate(found, start=1))
