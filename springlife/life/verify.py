"""Recompute every published check on this machine, and recount random histories with an independent package."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from springlife import published
from springlife.duty import checks as duty_checks
from springlife.duty.counting import count
from springlife.life.tally import recount
from springlife.published import Answer, Check
from springlife.spring import checks as spring_checks
from springlife.spring import surge_checks
from springlife.strength import checks as strength_checks

METHODS = spring_checks.METHODS | surge_checks.METHODS | duty_checks.METHODS | strength_checks.METHODS
HISTORIES, SEED = 200, 1049


@dataclass(frozen=True)
class Verified:
    """One printed answer beside ours, in the printed unit."""

    check: Check
    answer: Answer
    ours: float
    agrees: bool

    def to_dict(self) -> dict[str, Any]:
        """Give the row for JSON."""
        return {
            "check": self.check.id,
            "source": self.check.source,
            "provenance": self.check.provenance,
            "name": self.answer.name,
            "printed": self.answer.text,
            "ours": self.ours,
            "tolerance": self.answer.tolerance,
            "tolerance_reason": self.check.tolerance_reason,
            "agrees": self.agrees,
        }


@dataclass(frozen=True)
class Verification:
    """All printed answers, and how many random histories the independent recount agrees on."""

    rows: tuple[Verified, ...]
    recounted: int
    recounts_agree: int

    @property
    def passed(self) -> bool:
        """Whether everything agrees."""
        return all(row.agrees for row in self.rows) and self.recounted == self.recounts_agree

    def to_dict(self) -> dict[str, Any]:
        """Give everything for JSON."""
        return {
            "passed": self.passed,
            "recounted_histories": self.recounted,
            "recounts_agree": self.recounts_agree,
            "rows": [row.to_dict() for row in self.rows],
        }


def verify() -> Verification:
    """Walk data/published and recount seeded random histories with the ``rainflow`` package."""
    rows = tuple(row for check in published.load() for row in verify_check(check))
    return Verification(rows, HISTORIES, sum(_recounts(rng) for rng in _generators()))


def verify_check(check: Check) -> list[Verified]:
    """Recompute one check.

    Raises
    ------
    KeyError
        The check names a method, or an answer, that no room has: a mistake in the data file.
    """
    values = METHODS[check.method](check.inputs)
    return [
        Verified(check, answer, answer.ours(values[answer.name]), answer.agrees(values[answer.name]))
        for answer in check.answers
    ]


def _generators() -> list[np.random.Generator]:
    return [np.random.default_rng(seed) for seed in np.random.SeedSequence(SEED).spawn(HISTORIES)]


def _recounts(rng: np.random.Generator) -> bool:
    """Tell whether a random history with plateaus and ties counts alike here and in the package."""
    samples = np.repeat(rng.integers(0, int(rng.integers(3, 40)), size=int(rng.integers(3, 200))), 2).astype(float)
    table = count(samples).table("half")
    ours = {(float(a), float(b)): float(n) for a, b, n in zip(table.low, table.high, table.count, strict=True)}
    return ours == recount([samples])
