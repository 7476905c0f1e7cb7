"""Bags of cycles: pairs of a lower and an upper end, each with how often it occurs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from springlife.errors import InputError

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

MOST = 2**63 - 1  # int64


@dataclass(frozen=True, eq=False)
class Cycles:
    """Cycles as unordered pairs: ``low``, ``high`` (float64) and ``number`` (int64), all of shape (n,), read-only.

    A pair may stand in several rows; ``distinct`` makes them one.
    """

    low: Floats
    high: Floats
    number: Ints

    def __post_init__(self) -> None:
        """Nobody writes into a bag that others may share."""
        for array in (self.low, self.high, self.number):
            array.flags.writeable = False

    def __len__(self) -> int:
        """Return the number of rows."""
        return self.low.size

    def same(self, other: Cycles) -> bool:
        """Tell whether two bags hold the same rows."""
        return all(
            np.array_equal(mine, theirs)
            for mine, theirs in ((self.low, other.low), (self.high, other.high), (self.number, other.number))
        )

    def where(self, kept: Bools) -> Cycles:
        """Return the rows where ``kept`` is true."""
        return self if kept.all() else Cycles(self.low[kept], self.high[kept], self.number[kept])

    def mapped(self, scale: float, offset: float) -> Cycles:
        """Return the cycles of ``scale * x + offset``; those that rounding leaves without a range drop out."""
        low, high = scale * self.low + offset, scale * self.high + offset
        if scale < 0:
            low, high = high, low
        return Cycles(low, high, self.number.copy()).where(high > low)


@dataclass(frozen=True, eq=False)
class CycleTable:
    """Counted cycles, one row for each distinct pair, sorted by low and high.

    ``low``, ``high`` and ``count`` are float64 of shape (n,); a half cycle counts 0.5.
    """

    low: Floats
    high: Floats
    count: Floats

    @classmethod
    def of(cls, *parts: tuple[Cycles, float]) -> CycleTable:
        """Add bags up, each with the weight of one of its cycles."""
        low = np.concatenate([bag.low for bag, _ in parts])
        high = np.concatenate([bag.high for bag, _ in parts])
        count = np.concatenate([bag.number * weight for bag, weight in parts])
        if low.size == 0:
            return cls(low, high, count)
        order, starts = _groups(low, high)
        low, high = low[order][starts], high[order][starts]
        return cls(low, high, np.add.reduceat(count[order], starts))


def pairs(low: Floats, high: Floats) -> Cycles:
    """Return cycles that occur once each."""
    return Cycles(low, high, np.ones(low.size, dtype=np.int64))


NONE = pairs(np.empty(0), np.empty(0))


def joined(*bags: Cycles, gate: float = 0.0) -> Cycles:
    """Put bags together, leaving out cycles with a range up to ``gate``."""
    filled = [bag for bag in bags if len(bag)]
    if not filled:
        return NONE
    whole = filled[0] if len(filled) == 1 else Cycles(
        np.concatenate([bag.low for bag in filled]),
        np.concatenate([bag.high for bag in filled]),
        np.concatenate([bag.number for bag in filled]),
    )  # fmt: skip
    return whole.where(whole.high - whole.low > gate)


def times(n: int, bag: Cycles) -> Cycles:
    """Return a bag ``n`` times over.

    Raises
    ------
    InputError
        A pair would occur more than 2**63 - 1 times.
    """
    if n == 0 or not len(bag):
        return NONE
    most = n * int(bag.number.max())
    if most > MOST:
        raise InputError(f"{n} repeats make {most} cycles of one pair; at most 2**63 - 1 can be counted")
    return Cycles(bag.low, bag.high, n * bag.number)


def distinct(bag: Cycles) -> Cycles:
    """Return the bag with one row for each pair, sorted by low and high.

    Raises
    ------
    InputError
        A pair occurs more than 2**63 - 1 times.
    """
    if not len(bag):
        return NONE
    order, starts = _groups(bag.low, bag.high)
    low, high, number = bag.low[order], bag.high[order], bag.number[order]
    if number.sum(dtype=np.float64) < 2**62:
        return Cycles(low[starts], high[starts], np.add.reduceat(number, starts))
    exact = np.add.reduceat(number.astype(object), starts)
    if exact.max() > MOST:
        raise InputError(f"one pair makes {exact.max()} cycles; at most 2**63 - 1 can be counted")
    return Cycles(low[starts], high[starts], exact.astype(np.int64))


def _groups(low: Floats, high: Floats) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return the order by low and high, and where each distinct pair starts in it."""
    order = np.lexsort((high, low))
    new = np.ones(order.size, dtype=np.bool_)
    new[1:] = (np.diff(low[order]) > 0) | (np.diff(high[order]) != 0)
    return order, np.flatnonzero(new)
