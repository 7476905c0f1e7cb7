"""What the duty room answers to published checks: inputs as written in data/published, plain numbers out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from springlife.duty.counting import count


def _by_range(inputs: Mapping[str, Any]) -> dict[str, float]:
    """Cycles by range; a range that does not occur has no key."""
    table = count(inputs["history"]).table(inputs["residue"])
    found: dict[str, float] = {}
    for low, high, number in zip(table.low, table.high, table.count, strict=True):
        key = f"range_{high - low:g}"
        found[key] = found.get(key, 0.0) + float(number)
    return found


def _power_sums(inputs: Mapping[str, Any]) -> dict[str, float]:
    counted = count(inputs["history"])
    tables = {residue: counted.table(residue) for residue in ("half", "repeat")}
    return {
        f"{residue}_{power}": float((table.count * (table.high - table.low) ** power).sum())
        for residue, table in tables.items()
        for power in inputs["powers"]
    }


METHODS: dict[str, Callable[[Mapping[str, Any]], dict[str, float]]] = {
    "rainflow cycles by range": _by_range,
    "sum of cycles times range to a power": _power_sums,
}
