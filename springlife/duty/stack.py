"""The rainflow stack: the loops of counting in NumPy and plain Python, and the choice of the compiled ones.

With X, Y, Z three successive ranges, Y is closed when ``Y <= X and Y <= Z``, decided by comparing the four values
rather than by subtracting them. What stays, the residue, then grows strictly, swings through the extremes, and
shrinks strictly. Every adjacent pair of it is one half cycle of ASTM E1049-85 5.4.4. Pairs may close in any order:
the cycles, as unordered pairs, and the residue are always the same.
"""

from __future__ import annotations

import sys
from importlib import import_module
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

# Measured; see the manual.
WORTH_LOADING = 20_000_000  # samples after which loading the compiled loops (0.7 s) is repaid
BLOCK = 32_768  # samples of which all intermediate arrays stay in cache
PASS_COST, PASS_COST_PER_PEAK = 20, 0.005  # of a pass, in cycles that the plain stack closes in the same time

_COMPILED = "springlife.duty.kernels"
_counted = 0
_missing = False


def loops() -> ModuleType:
    """Return the module whose loops to use: the compiled ones once they are loaded, or this one."""
    return sys.modules.get(_COMPILED, sys.modules[__name__])


def expect(samples: int) -> ModuleType:
    """Return the module whose loops to use for samples that are about to be counted.

    Loading the compiler takes longer than counting a short record without it, so it is loaded once this process
    has counted so many samples, in one record or in many, that it would have been repaid.
    """
    global _counted, _missing
    _counted += samples
    if _counted >= WORTH_LOADING and _COMPILED not in sys.modules and not _missing:
        try:
            import_module(_COMPILED)
        except ImportError:
            _missing = True
    return loops()


class Scratch:
    """Room for the answer of one ``reduce``, used again for the next piece."""

    def __init__(self) -> None:
        """Start empty."""
        self._size = -1

    def fit(self, samples: int) -> tuple[Floats, Floats, Floats]:
        """Return arrays for the lows and highs that so many samples can close, and for the points they leave."""
        if samples > self._size:
            self._size = samples
            self._arrays = np.empty(samples // 2 + 2), np.empty(samples // 2 + 2), np.empty(samples + 1)
        return self._arrays


def turning(x: Floats) -> Ints:
    """Return the positions of the turning points, ends included; on a plateau, its first sample."""
    places = None
    if (x[1:] == x[:-1]).any():
        places = np.flatnonzero(np.concatenate([[True], x[1:] != x[:-1]]))
        x = x[places]
    turns = np.ones(x.size, dtype=np.bool_)
    up = x[1:] > x[:-1]
    turns[1:-1] = up[1:] != up[:-1]
    found = np.flatnonzero(turns)
    return found if places is None else places[found]


def reduce(x: Floats, scratch: Scratch | None = None) -> tuple[Floats, Floats, Floats] | None:
    """Count a piece apart, as far as it goes without the stack.

    Parameters
    ----------
    x : float array, shape (n,), n > 0
    scratch : Scratch
        Where compiled loops put their answer.

    Returns
    -------
    low, high, points : float arrays
        Closed cycles, and alternating points to be pushed; None when a sample is not finite.
    """
    if not np.isfinite(x).all():
        return None
    blocks = (x[i : i + BLOCK] for i in range(0, x.size, BLOCK))
    points = np.concatenate([block[turning(block)] for block in blocks])
    return _peel(points[turning(points)])


def _peel(points: Floats) -> tuple[Floats, Floats, Floats]:
    """Close the pairs that both neighbours span, pass by pass while it pays.

    With valleys V and peaks P in turn (V0 P0 V1 P1 ...), the fall from P[i] to V[i + 1] is closed when neither the
    next peak nor its valley is lower than the one before, the rise from V[i] to P[i] when both its peak and the next
    valley are lower. So no point is in two pairs, and what spans a pair is only replaced by what spans more.
    """
    falls = points.size > 1 and points[0] > points[1]
    valleys = np.concatenate([[np.inf], points[1::2]]) if falls else points[0::2]  # inf spans nothing
    peaks = points[0::2] if falls else points[1::2]
    low, high = [np.empty(0)], [np.empty(0)]
    while peaks.size > 1:
        higher, lifted = peaks[1:] >= peaks[:-1], valleys[1:] >= valleys[:-1]
        n, m = higher.size, lifted.size - 1
        fall, rise = np.zeros(peaks.size, dtype=np.bool_), np.zeros(peaks.size, dtype=np.bool_)
        np.logical_and(higher, lifted[:n], out=fall[:n])
        np.logical_not(higher[:m] | lifted[1:], out=rise[1 : m + 1])
        closed = fall | rise
        at = np.flatnonzero(closed)
        if at.size < PASS_COST + peaks.size * PASS_COST_PER_PEAK:
            break
        high.append(peaks[at])
        low.append(valleys[at + fall[at]])
        stays = np.ones(valleys.size, dtype=np.bool_)
        stays[1 : n + 1] ^= fall[:n]
        stays[1 : m + 1] ^= rise[1 : m + 1]
        peaks, valleys = peaks[~closed], valleys[stays]
    rest = np.empty(valleys.size + peaks.size)
    rest[0::2], rest[1::2] = valleys, peaks
    return np.concatenate(low), np.concatenate(high), rest[1:] if falls else rest


def push(stack: Floats, top: int, points: Floats) -> tuple[Floats, Floats, int]:
    """Count on from a residue.

    Parameters
    ----------
    stack : float array
        The residue is ``stack[:top]``; there is room for the points behind it.
    points : float array
        Further samples.

    Returns
    -------
    low, high : float arrays
        The cycles that close.
    top : int
        The new size of the residue, which is in place.
    """
    low: list[float] = []
    high: list[float] = []
    # Only the end of the residue moves: take as much of it as the points reach back, in growing steps.
    base = max(0, top - 64)
    seam: list[float] = stack[base:top].tolist()
    for d in points.tolist():
        if seam:
            last = seam[-1]
            if d == last:
                continue
            if len(seam) > 1 and (last > seam[-2]) == (d > last):
                seam.pop()  # the last point did not turn
        seam.append(d)
        while True:
            if len(seam) < 4:
                if not base:
                    break
                reach = max(0, base - 4 * (top - base))
                seam[:0] = stack[reach:base].tolist()
                base = reach
            a, b, c = seam[-4:-1]
            if a < b:
                if c < a or d < b:
                    break
                low.append(c)
                high.append(b)
            else:
                if c > a or d > b:
                    break
                low.append(b)
                high.append(c)
            del seam[-3:-1]
    stack[base : base + len(seam)] = seam
    return np.array(low), np.array(high), base + len(seam)


def trace(values: Floats, order: Ints) -> tuple[Ints, Ints, Ints]:
    """Count positions instead of values, in one go.

    Parameters
    ----------
    values : float array, shape (n,)
    order : int array, shape (m,)
        Positions in ``values`` in the order in which they happen.

    Returns
    -------
    low, high, rest : int arrays
        Positions of the ends of closed cycles, and of the residue.
    """
    x: list[float] = values[order].tolist()
    low: list[int] = []
    high: list[int] = []
    stack: list[int] = []
    for i, d in enumerate(x):
        if stack:
            last = x[stack[-1]]
            if d == last:
                continue
            if len(stack) > 1 and (last > x[stack[-2]]) == (d > last):
                stack.pop()
        stack.append(i)
        while len(stack) > 3:
            a, b, c = x[stack[-4]], x[stack[-3]], x[stack[-2]]
            up = a < b
            if (c < a or d < b) if up else (c > a or d > b):
                break
            low.append(stack[-2 if up else -3])
            high.append(stack[-3 if up else -2])
            del stack[-3:-1]
    return order[low], order[high], order[stack]


def order(low: Floats, high: Floats) -> NDArray[np.intp]:
    """Return the order of pairs by low and then high."""
    found = np.argsort(low)
    first = low[found]
    if (first[1:] > first[:-1]).all():
        return found
    found = np.argsort(high)
    return found[np.argsort(low[found], kind="stable")]


def groups(low: Floats, high: Floats) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return the order of pairs by low and high, and where each distinct pair starts in it."""
    by = order(low, high)
    new = np.ones(by.size, dtype=np.bool_)
    new[1:] = (np.diff(low[by]) != 0) | (np.diff(high[by]) != 0)
    return by, np.flatnonzero(new)


class Distinct:
    """Pairs with their numbers, equal ones joined, as long as they are not too many.

    Parameters
    ----------
    most : int
        Distinct pairs that are kept.
    """

    def __init__(self, most: int) -> None:
        """Start empty."""
        self._most = most
        self._rows = np.empty(0), np.empty(0), np.empty(0, dtype=np.int64)

    def add(self, low: Floats, high: Floats) -> int:
        """Add cycles, one each, and return how many of them, from the first, found a place."""
        low, high = (np.concatenate([rows, new]) for rows, new in zip(self._rows, (low, high), strict=False))
        number = np.ones(low.size, dtype=np.int64)
        number[: self._rows[2].size] = self._rows[2]
        by, starts = groups(low, high)
        if starts.size > self._most:
            return 0
        added = low.size - self._rows[0].size
        self._rows = low[by][starts] + 0.0, high[by][starts] + 0.0, np.add.reduceat(number[by], starts)  # no -0.0
        return added

    def rows(self) -> tuple[Floats, Floats, Ints]:
        """Return low, high and number of the pairs, in any order; as they are until more is added."""
        return self._rows


def fold(
    low: Floats,
    high: Floats,
    number: Ints,
    width: float,
    first: float,
    fine: float,
    cells: Ints,
    largest: Floats,
    times: Ints,
) -> None:
    """Add cycles to cells.

    Parameters
    ----------
    low, high, number : arrays, shape (n,)
    width : float
        Of a cell; a power of two, so that dividing by it is exact.
    first : float
        Number of the first cell, whose lower edge is ``first * width``.
    fine : float
        Steps in a cell, a power of two.
    cells : int array, shape (side, side, 3)
        By cells of low and high: cycles, and the sums of the whole steps of low and high above the cells' edges.
        Sums of whole numbers come out alike in any order.
    largest : float array, shape (2,)
        Low and high of the cycle with the largest range; of equal ranges, the one that lies highest.
    times : int array, shape (1,)
        How often it has occurred.
    """
    a, b = low / width, high / width
    i, j = np.floor(a), np.floor(b)
    side = cells.shape[0]
    place = ((i - first) * side + (j - first)).astype(np.int64)
    flat = cells.reshape(-1, 3)
    np.add.at(flat[:, 0], place, number)  # bincount would add floats
    np.add.at(flat[:, 1], place, number * ((a - i) * fine).astype(np.int64))
    np.add.at(flat[:, 2], place, number * ((b - j) * fine).astype(np.int64))
    span = high - low
    widest = np.flatnonzero(span == span.max())
    k = widest[np.argmax(low[widest])]
    if (span[k], low[k]) > (largest[1] - largest[0], largest[0]):
        largest[:], times[0] = (low[k], high[k]), 0
    times[0] += number[(low == largest[0]) & (high == largest[1])].sum()
