"""Thresholds of the findings, read from the data file; a case may set its own."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.resources import files


@dataclass(frozen=True)
class Limit:
    """One threshold: its value, what it limits and where it comes from."""

    value: float
    meaning: str
    source: str
    provenance: str


def _load() -> dict[str, Limit]:
    text = files("springlife").joinpath("data/limits.toml").read_text(encoding="utf-8")
    return {key: Limit(**entry) for key, entry in tomllib.loads(text).items()}


LIMITS: dict[str, Limit] = _load()


def limit_values(overrides: Mapping[str, float]) -> dict[str, float]:
    """Return every threshold's value, those of the case in place of the data file's."""
    return {key: limit.value for key, limit in LIMITS.items()} | dict(overrides)
