"""Count one record on its own, and recount it with the independent ``rainflow`` package."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import numpy as np

from springlife.duty.counting import Count
from springlife.duty.counting import Tally as Counter
from springlife.duty.record import RecordSpec, open_record
from springlife.units import significant


@dataclass(frozen=True)
class Tally:
    """A counted record: rows of range, mean, low, high and count, largest range first."""

    path: Path
    sha256: str
    channel: str
    unit: str
    residue: str
    gate: float
    count: Count
    table: list[dict[str, float]]
    agrees: bool | None  # None: not recounted
    difference: str
    provenance: tuple[str, ...]

    @property
    def cycles(self) -> float:
        """Number of cycles, half cycles as one half."""
        return float(sum(row["count"] for row in self.table))

    def lines(self) -> list[tuple[str, str]]:
        """Label and text of what was counted, for a person."""
        c = self.count
        lines = [
            ("record", f"{self.path}, channel {self.channel}"),
            ("cycles", f"{significant(self.cycles, 6)} in {len(self.table)} classes"),
            ("residue", f"{c.residue.size} turning points, read as {self.residue}"),
        ]  # fmt: skip
        if c.residue.size:
            unit = f" {self.unit}" if self.unit else ""
            lines.append(("extremes", f"{significant(c.minimum, 6)} to {significant(c.maximum, 6)}{unit}"))
        if self.gate:
            lines.append(("gate", f"cycles with a range up to {self.gate:g} {self.unit} left out"))
        if self.agrees is not None:
            lines.append(("recount", self.difference))
        return lines

    def to_dict(self) -> dict[str, Any]:
        """Give the tally for JSON."""
        return {
            "path": str(self.path),
            "sha256": self.sha256,
            "channel": self.channel,
            "unit": self.unit,
            "residue": self.residue,
            "gate": self.gate,
            "cycles": self.cycles,
            "recount_agrees": self.agrees,
            "recount": self.difference or None,
            "provenance": list(self.provenance),
            "rows": self.table,
        }


def tally_record(
    path: Path,
    *,
    channel: str | int | None = None,
    time: str | int | None = None,
    time_unit: str | None = None,
    sample_rate: float | None = None,
    unit: str | None = None,
    gate: float = 0.0,
    gaps: Literal["error", "split"] = "error",
    residue: Literal["half", "repeat", "drop"] = "half",
    recount: bool = False,
) -> Tally:
    """Count a record in its own unit; with ``recount``, once more by the independent package.

    Raises
    ------
    FileError, InputError
        When the record cannot be read as asked.
    """
    spec = RecordSpec(
        path=path, channel=channel, time=time, time_unit=time_unit, sample_rate=sample_rate, unit=unit, kind=None,
        gaps=gaps,
    )  # fmt: skip
    recording = open_record(spec)
    counter = Counter(gate=gate, nan="split" if gaps == "split" else "error")
    kept: list[np.ndarray] = []
    for block in recording.blocks():
        counter.feed(block)
        if recount:
            kept.append(block)
    total = counter.result()
    agrees, difference = _recount(kept, total, gate) if recount else (None, "")
    cycles = total.table(residue)
    order = np.lexsort((cycles.low, cycles.low - cycles.high))
    rows = [
        {
            "range": float(high - low),
            "mean": float((high + low) / 2),
            "low": float(low),
            "high": float(high),
            "count": float(number),
        }
        for low, high, number in zip(cycles.low[order], cycles.high[order], cycles.count[order], strict=True)
    ]
    return Tally(
        path, recording.sha256, recording.channel, recording.unit or "", residue, gate, total, rows, agrees, difference,
        recording.provenance,
    )  # fmt: skip


def _recount(blocks: list[np.ndarray], ours: Count, gate: float) -> tuple[bool, str]:
    """Compare with the ``rainflow`` package (ASTM E1049-85 5.4.4): same ranges, means and counts."""
    samples = np.concatenate(blocks) if blocks else np.empty(0)
    theirs = recount(np.split(samples, np.flatnonzero(np.isnan(samples))), gate)
    table = ours.table("half")
    mine = _classes(zip(table.low, table.high, table.count, strict=True))
    if mine == theirs:
        return True, f"the rainflow package finds the same {significant(sum(mine.values()), 6)} cycles"
    low, high = min(mine.keys() ^ theirs.keys() or (key for key in mine if mine[key] != theirs[key]))
    key = (low, high)
    return False, (
        f"the rainflow package differs: cycle {low:g} to {high:g} counted {mine.get(key, 0):g} here, "
        f"{theirs.get(key, 0):g} there"
    )


def recount(pieces: Iterable[np.ndarray], gate: float = 0.0) -> dict[tuple[float, float], float]:
    """Count with the ``rainflow`` package: {(low, high): cycles}, pieces apart.

    Two samples give it no cycle and a constant series a zero-range one; both are put right here.
    """
    import rainflow

    rows: list[tuple[float, float, float]] = []
    for piece in pieces:
        series = [float(value) for value in piece if value == value]
        if len(series) == 2 and series[0] != series[1]:
            rows.append((min(series), max(series), 0.5))
            continue
        for _, _, number, start, end in rainflow.extract_cycles(series):
            rows.append((min(series[start], series[end]), max(series[start], series[end]), number))
    return _classes((low, high, number) for low, high, number in rows if high - low > gate)


def _classes(rows: Iterable[tuple[float, float, float]]) -> dict[tuple[float, float], float]:
    classes: dict[tuple[float, float], float] = {}
    for low, high, number in rows:
        key = (float(low), float(high))
        classes[key] = classes.get(key, 0.0) + float(number)
    return classes
