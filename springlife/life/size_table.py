"""The screened grid of a sizing as one table: its rows in the order of the goal, near misses, candidates."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from springlife.life.result import finite
from springlife.life.size_grid import Floats, Springs
from springlife.spring.helical import HelicalSpring

MISSES, EACH = 12, 3  # near misses shown, and of one kind


@dataclass(frozen=True)
class Candidate:
    """One spring: ``failed`` maps each failed check to the part of what is asked that it reaches (below 1)."""

    spring: HelicalSpring
    damage: float | None  # at the target; None when it was not evaluated
    passes: float | None  # life; None without damage or when it was not evaluated
    failed: dict[str, float]
    warnings: tuple[str, ...] = ()  # codes of the findings that its own judgement warns of

    @property
    def cost(self) -> float:
        """Relative wire cost: mass in kg times the grade's relative cost; infinite when that is not known."""
        relative = self.spring.grade.relative_cost
        return math.inf if relative is None else self.spring.mass * relative

    def to_dict(self) -> dict[str, Any]:
        """Give the candidate for JSON."""
        s = self.spring
        return {
            "grade": s.grade.name,
            "shot_peened": s.shot_peened,
            "wire_diameter_m": s.wire_diameter,
            "mean_diameter_m": s.mean_diameter,
            "total_coils": s.total_coils,
            "free_length_m": s.free_length,
            "solid_length_m": s.solid_length,
            "rate_N_per_m": s.rate,
            "mass_kg": s.mass,
            "relative_cost": finite(self.cost),
            "damage_at_target": None if self.damage is None else finite(self.damage),
            "life_passes": self.passes,
            "failed": self.failed,
            "warnings": list(self.warnings),
        }


@dataclass(frozen=True)
class Cloud:
    """All springs of the grid that pass every static check: mass (kg), passes (infinite without damage), peening."""

    mass: Floats
    passes: Floats
    peened: NDArray[np.bool_]


@dataclass(frozen=True)
class Batch:
    """Springs of one wire, peened or not: shortfalls by check and damage at the target, all of shape (n,)."""

    springs: Springs
    ratios: dict[str, Floats]
    damage: Floats  # nan where several static checks fail

    @property
    def size(self) -> int:
        """Number of springs."""
        return self.damage.size


class Table:
    """All batches as one table of rows, ordered by the goal."""

    def __init__(self, batches: list[Batch], goal: str) -> None:
        """Join the batches; ``goal`` is "mass", "cost" or "life"."""
        self.batches, self.goal = batches, goal
        self.batch = np.repeat(np.arange(len(batches)), [batch.size for batch in batches])
        self.place = np.concatenate([np.arange(batch.size) for batch in batches])
        self.mass = np.concatenate([batch.springs.mass.ravel() for batch in batches])
        self.damage = np.concatenate([batch.damage for batch in batches])
        self.ratios = {name: np.concatenate([batch.ratios[name] for batch in batches]) for name in batches[0].ratios}
        self.failed = np.sum([ratio < 1 for ratio in self.ratios.values()], axis=0)
        self.price = self._price()

    def _price(self) -> Floats:
        """What is to be small: mass, cost or damage."""
        if self.goal == "life":
            return self.damage
        if self.goal == "mass":
            return self.mass
        relative = (batch.springs.first.grade.relative_cost for batch in self.batches)
        each: Floats = np.array([math.inf if one is None else one for one in relative])
        return self.mass * each[self.batch]

    def passing(self) -> NDArray[np.intp]:
        """Return the rows that pass every check of the screen, best first, the lighter of equals first."""
        rows = np.flatnonzero(self.failed == 0)
        return rows[np.lexsort((self.mass[rows], self.price[rows]))]

    def near_misses(self, best: int | None) -> NDArray[np.intp]:
        """Return rows that fail by little, nearest first.

        With a best row: those that fail one check and would be better than it; otherwise those that fail fewest checks.
        """
        if best is not None:
            rows = np.flatnonzero((self.failed == 1) & (self.price < self.price[best]))
        else:
            rows = np.flatnonzero(self.failed == max(1, self.failed.min()))
        short = np.min([ratio[rows] for ratio in self.ratios.values()], axis=0)
        return rows[np.lexsort((self.mass[rows], -short))]

    def failures(self) -> dict[str, int]:
        """Count the rows that fail each check."""
        counted = {name: int(np.count_nonzero(ratio < 1)) for name, ratio in self.ratios.items()}
        return {name: number for name, number in counted.items() if number}

    def candidate(self, row: int, target_passes: float) -> Candidate:
        """Build the spring of a row."""
        batch, place = self.batches[self.batch[row]], self.place[row]
        many = batch.springs
        spring = replace(
            many.first,
            mean_diameter=float(many.mean_diameter[place, 0]),
            total_coils=float(many.total_coils[place, 0]),
            free_length=float(many.free_length[place, 0]),
        )
        damage = None if np.isnan(self.damage[row]) else float(self.damage[row])
        failed = {name: float(ratio[row]) for name, ratio in self.ratios.items() if ratio[row] < 1}
        return Candidate(spring, damage, target_passes / damage if damage else None, failed)

    def cloud(self, target_passes: float) -> Cloud:
        """Return mass and life of all rows that pass the static checks."""
        static = [ratio >= 1 for name, ratio in self.ratios.items() if name != "life"]
        rows = np.flatnonzero(np.all(static, axis=0))
        with np.errstate(divide="ignore"):
            passes = target_passes / self.damage[rows]
        peened = np.array([batch.springs.first.shot_peened for batch in self.batches])
        return Cloud(self.mass[rows], passes, peened[self.batch[rows]])


def few_of_each(misses: Iterable[Candidate]) -> tuple[Candidate, ...]:
    """Keep the first few of each kind of miss; a peened twin that fails alike on the same springs is left out."""
    kinds: Counter[tuple[str, ...]] = Counter()
    seen, kept = set(), []
    for one in misses:
        kind, s = tuple(one.failed), one.spring
        twin = (kind, s.grade.name, s.wire_diameter, s.mean_diameter, s.total_coils)
        if kinds[kind] == EACH or twin in seen:
            continue
        kinds[kind] += 1
        seen.add(twin)
        kept.append(one)
        if len(kept) == MISSES:
            break
    return tuple(kept)
