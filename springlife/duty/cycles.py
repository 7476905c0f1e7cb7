"""Bags of cycles: pairs of a lower and an upper end, each with how often it occurs; in cells when too many differ."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from springlife.duty.stack import groups
from springlife.errors import InputError

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

MOST = 2**63 - 1  # int64
SIDE = 512  # at most so many cells across the range, and more than half as many


@dataclass(frozen=True, eq=False)
class Cycles:
    """Cycles as unordered pairs: ``low``, ``high`` (float64) and ``number`` (int64), all of shape (n,), read-only.

    A pair may stand in several rows; ``distinct`` makes them one. ``cell`` is 0 when every pair is exact; else the
    rows are the means of what lay in cells of that side.
    """

    low: Floats
    high: Floats
    number: Ints
    cell: float = 0.0

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
        if kept.all():
            return self
        return replace(self, low=self.low[kept], high=self.high[kept], number=self.number[kept])

    def mapped(self, scale: float, offset: float) -> Cycles:
        """Return the cycles of ``scale * x + offset``; those that rounding leaves without a range drop out."""
        low, high = scale * self.low + offset, scale * self.high + offset
        if scale < 0:
            low, high = high, low
        return Cycles(low, high, self.number, abs(scale) * self.cell).where(high > low)


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
        by, starts = groups(low, high)
        return cls(low[by][starts] + 0.0, high[by][starts] + 0.0, _sums(count[by], starts))


def pairs(low: Floats, high: Floats) -> Cycles:
    """Return cycles that occur once each."""
    return Cycles(low, high, np.broadcast_to(np.int64(1), low.size))


NONE = pairs(np.empty(0), np.empty(0))


def joined(*bags: Cycles, gate: float = 0.0, most: int = MOST) -> Cycles:
    """Put bags together.

    Parameters
    ----------
    gate : float
        Cycles with a range up to this are left out.
    most : int
        More distinct pairs than this are folded into cells; so is everything once a bag has cells.
    """
    filled = [bag for bag in bags if len(bag)]
    if not filled:
        return NONE
    whole = filled[0]
    if len(filled) > 1:
        whole = Cycles(
            np.concatenate([bag.low for bag in filled]),
            np.concatenate([bag.high for bag in filled]),
            np.concatenate([bag.number for bag in filled]),
            max(bag.cell for bag in filled),
        )
    if gate:
        whole = whole.where(whole.high - whole.low > gate)
    if not whole.cell and len(whole) > most:
        whole = distinct(whole)
    return folded(whole) if (whole.cell and len(filled) > 1) or len(whole) > most else whole


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
    return Cycles(bag.low, bag.high, n * bag.number, bag.cell)


def distinct(bag: Cycles) -> Cycles:
    """Return the bag with one row for each pair, sorted by low and high.

    Raises
    ------
    InputError
        A pair occurs more than 2**63 - 1 times.
    """
    by, starts = groups(bag.low, bag.high)
    number = _whole_sums(bag.number[by], starts)
    return Cycles(bag.low[by][starts] + 0.0, bag.high[by][starts] + 0.0, number, bag.cell)


def width(low: float, high: float, side: int) -> float:
    """Return the least power of two of which at most ``side`` cells, from multiples of it, cover a range."""
    found = 2.0 ** np.floor(np.log2(high / side - low / side))
    while np.floor(high / found) - np.floor(low / found) >= side:
        found *= 2
    return float(found)


def folded(bag: Cycles) -> Cycles:
    """Fold rows into the cells of low and high that hold them; the cycle of the largest range stays as it is."""
    bag = distinct(bag)
    span = bag.high - bag.low
    largest = np.flatnonzero(span == span.max())[-1]
    cell = max(width(bag.low[0], bag.high.max(), SIDE), 2.0 ** np.ceil(np.log2(bag.cell)) if bag.cell else 0.0)
    rest = np.delete(np.arange(len(bag)), largest)
    low, high, number = bag.low[rest], bag.high[rest], bag.number[rest]
    by, starts = groups(np.floor(low / cell), np.floor(high / cell))
    low, high, number = low[by], high[by], number[by]
    sums = _whole_sums(number, starts)

    def means(end: Floats) -> Floats:
        first = end[starts]  # the mean is taken from the first row, so that a row alone stays exactly as it is
        above = end - np.repeat(first, np.diff(np.append(starts, end.size)))
        return first + _sums(above * number, starts) / sums

    return distinct(
        Cycles(
            np.append(means(low), bag.low[largest]),
            np.append(means(high), bag.high[largest]),
            np.append(sums, bag.number[largest]),
            cell,
        )
    )


def _sums(values: Floats, starts: NDArray[np.intp]) -> Floats:
    return np.add.reduceat(values, starts) if starts.size else np.empty(0)


def _whole_sums(number: Ints, starts: NDArray[np.intp]) -> Ints:
    if not starts.size:
        return np.empty(0, dtype=np.int64)
    if number.sum(dtype=np.float64) < 2**62:
        return np.add.reduceat(number, starts)
    exact = np.add.reduceat(number.astype(object), starts)
    if exact.max() > MOST:
        raise InputError(f"one pair makes {exact.max()} cycles; at most 2**63 - 1 can be counted")
    return exact.astype(np.int64)
