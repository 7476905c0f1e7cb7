"""Flat memory for closed cycles: exact while few pairs are distinct, in cells of low and high when many.

A cell keeps how many cycles it holds and their mean low and high. Its width is a power of two and its edges are
multiples of it, so when the range grows, two cells become one and nothing else changes: which cells there are
depends on the cycles alone, not on the order in which they came.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from springlife.duty.cycles import SIDE, Cycles, pairs, width
from springlife.duty.stack import loops

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

FINE = 2.0**20  # steps in a cell in which means are kept: sums of whole numbers are the same in any order
FINEST = 2.0**24  # 2**63 / FINEST: cycles that a cell can hold after its range has grown


class Kept:
    """The closed cycles of a stream.

    Parameters
    ----------
    most : int
        Distinct pairs that are kept exactly.
    gate : float
        Cycles with a range up to this are left out.
    """

    def __init__(self, most: int, gate: float) -> None:
        """Start with nothing."""
        self._most, self._gate = most, gate
        self._low, self._high, self._size = np.empty(0), np.empty(0), 0  # as they came
        self._distinct: Any = None  # what came before, equal pairs joined
        self._grid: Grid | None = None

    def add(self, low: Floats, high: Floats) -> None:
        """Add cycles; the arrays may be used again afterwards."""
        if self._gate:
            kept = high - low > self._gate
            low, high = low[kept], high[kept]
        if not low.size:
            return
        if self._grid:
            self._grid.add(pairs(low, high))
            return
        self._make_room(low.size)
        there = slice(self._size, self._size + low.size)
        self._low[there], self._high[there] = low, high
        self._size += low.size
        if self._size > self._most:
            self._settle()

    def _make_room(self, more: int) -> None:
        if self._size + more > self._low.size:
            room = 2 * self._size + more
            for name in ("_low", "_high"):
                wider = np.empty(room)
                wider[: self._size] = getattr(self, name)[: self._size]
                setattr(self, name, wider)

    def _settle(self) -> None:
        """Join equal pairs, or go over to cells."""
        self._distinct = self._distinct or loops().Distinct(self._most)
        low, high = self._low[: self._size], self._high[: self._size]
        taken = self._distinct.add(low, high)
        if taken < self._size:
            parts = [bag for bag in (Cycles(*self._distinct.rows()), pairs(low[taken:], high[taken:])) if len(bag)]
            self._grid = Grid(min(bag.low.min() for bag in parts), max(bag.high.max() for bag in parts))
            for bag in parts:
                self._grid.add(bag)
            self._low = self._high = np.empty(0)
            self._distinct = None
        self._size = 0

    def result(self) -> Cycles:
        """Return what has been added."""
        if self._distinct or self._size > self._most:
            self._settle()
        if self._grid:
            return self._grid.cycles()
        if self._distinct:
            return Cycles(*(column.copy() for column in self._distinct.rows()))
        given = pairs(self._low[: self._size], self._high[: self._size])
        self._low, self._high = given.low, given.high  # full, so that more goes elsewhere
        return given


class Grid:
    """Cells of low and high, with the cycle of the largest range kept exactly beside them."""

    def __init__(self, low: float, high: float) -> None:
        """Cover the range of the first cycles, which sets the steps in which means are kept."""
        self._lowest, self._highest = float(low), float(high)
        self._lay_out(0.0)
        self._step = self._width / FINE
        self._cells = np.zeros((SIDE, SIDE, 3), dtype=np.int64)
        self._largest, self._times = np.zeros(2), np.zeros(1, dtype=np.int64)

    def _lay_out(self, least: float) -> None:
        """Choose the width of cells, and the first of them so that the range can grow on both sides."""
        self._width = max(least, width(self._lowest, self._highest, SIDE))
        lowest, highest = self._lowest // self._width, self._highest // self._width
        self._first = lowest - (SIDE - 1 - (highest - lowest)) // 2

    def add(self, bag: Cycles) -> None:
        """Add cycles."""
        self._cover(bag.low.min(), bag.high.max())
        loops().fold(
            bag.low, bag.high, bag.number, self._width, self._first, self._width / self._step, self._cells,
            self._largest, self._times,
        )  # fmt: skip

    def _cover(self, low: float, high: float) -> None:
        """Make room for a wider range."""
        self._lowest, self._highest = float(min(low, self._lowest)), float(max(high, self._highest))
        if self._lowest // self._width >= self._first and self._highest // self._width < self._first + SIDE:
            return
        was, first, old = self._width, self._first, self._cells
        self._lay_out(was)
        i, j = np.nonzero(old[:, :, 0])
        moved = old[i, j]
        if self._width / self._step > FINEST:
            coarser = int(self._width / self._step / FINEST)
            self._step *= coarser
            moved[:, 1:] //= coarser
        self._cells = np.zeros_like(old)
        places = []
        for axis, k in enumerate((i, j), start=1):
            edge = (first + k) * was
            place = np.floor(edge / self._width)
            moved[:, axis] += moved[:, 0] * ((edge - place * self._width) / self._step).astype(np.int64)
            places.append((place - self._first).astype(np.int64))
        np.add.at(self._cells, (places[0], places[1]), moved)

    def cycles(self) -> Cycles:
        """Return one row for each cell that holds cycles, and one for the largest cycle."""
        i, j = np.nonzero(self._cells[:, :, 0])
        sums = self._cells[i, j]
        edges = self._largest // self._width  # take the largest cycle out of its cell
        at = np.flatnonzero((i + self._first == edges[0]) & (j + self._first == edges[1]))
        steps = (self._largest - edges * self._width) / self._step
        sums[at] -= self._times * np.array([1, *steps.astype(np.int64)])
        held = sums[:, 0] > 0
        i, j, (number, low_steps, high_steps) = i[held], j[held], sums[held].T
        low = (self._first + i) * self._width + (low_steps / number + 0.5) * self._step
        high = (self._first + j) * self._width + (high_steps / number + 0.5) * self._step
        high = np.maximum(high, np.nextafter(low, np.inf))  # ranges under a step still are cycles
        return Cycles(
            np.append(low, self._largest[0]),
            np.append(high, self._largest[1]),
            np.append(number, self._times),
            self._width,
        )
