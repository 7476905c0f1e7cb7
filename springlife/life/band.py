"""How far the life moves under every published choice, and which choice moves it most."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from springlife.units import significant


@dataclass(frozen=True)
class BandRow:
    """A life under one published choice; ``withheld`` says why there is none."""

    criterion: str
    endurance: str
    miner: str
    life_passes: float | None  # None: unlimited, unless withheld
    withheld: str | None = None


@dataclass(frozen=True)
class Mover:
    """What one choice does to the life, the others held as the case has them."""

    choice: str  # "criterion", "endurance" or "miner"
    shortest: BandRow
    longest: BandRow

    @property
    def factor(self) -> float:
        """Longest over shortest life; infinite when the longest is unlimited or the shortest is nothing."""
        short, long = _passes(self.shortest), _passes(self.longest)
        return 1.0 if short == long else math.inf if short == 0 else long / short

    def sentence(self) -> str:
        """Say which choice moves the life most, and by how much."""
        if self.factor == 1.0:
            return "no published choice moves the life"
        low, high = getattr(self.shortest, self.choice), getattr(self.longest, self.choice)
        word = {"criterion": "criterion", "endurance": "endurance basis", "miner": "reading of Miner's rule"}[
            self.choice
        ]
        if _passes(self.shortest) == 0:
            return f"the {word} moves the life most: no life at all by {low}, some by {high}"
        if math.isinf(self.factor):
            return f"the {word} moves the life most: finite by {low}, unlimited by {high}"
        return f"the {word} moves the life most: {high} gives {significant(self.factor, 2)} times the life of {low}"


def greatest_mover(band: Sequence[BandRow], *, criterion: str, endurance: str, miner: str) -> Mover | None:
    """Return the choice that moves the life most, one changed at a time; None when fewer than two lives stand."""
    chosen = {"criterion": criterion, "endurance": endurance, "miner": miner}
    movers = []
    for choice in chosen:
        rows = [
            row
            for row in band
            if row.withheld is None and all(getattr(row, key) == chosen[key] for key in chosen if key != choice)
        ]
        if len(rows) > 1:
            ordered = sorted(rows, key=_passes)
            movers.append(Mover(choice, ordered[0], ordered[-1]))
    return max(movers, key=lambda mover: mover.factor, default=None)


def _passes(row: BandRow) -> float:
    return math.inf if row.life_passes is None else row.life_passes
