"""Rainflow counting as an algebra: pieces counted apart and joined give the count of the whole.

A cycle closes when three successive ranges X, Y, Z have Y <= X and Y <= Z; what never closes is the residue.
Closed cycles and residue form a monoid, so streams, repeats and whole service lives are counted exactly
without being written out. Closing at Y = Z too keeps the residue of a steady history short: of a run of equal
ranges the middle ones are counted at once, as the same cycles that they would be as pairs of half cycles.

References
----------
ASTM E1049-85 (2017), 5.4.4 (a history that happens once: every range of the residue is half a cycle) and
5.4.5 (a repeating history: the residue closes on itself).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import pairwise
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError, nearest

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Residue = Literal["half", "repeat", "drop"]
RESIDUES = ("half", "repeat", "drop")
MOST = 2**63 - 1
EXACT_INTEGERS = 2**53


@dataclass(frozen=True, eq=False)
class CycleTable:
    """Distinct cycles: ends ``low`` <= ``high`` and how many there are, arrays of shape (n,)."""

    low: Floats
    high: Floats
    count: Floats


def _empty() -> Floats:
    return np.empty(0)


@dataclass(frozen=True, eq=False)
class Count:
    """Closed cycles as distinct unordered pairs with their number, and the residue's turning points.

    ``low``, ``high`` have shape (n,), sorted by low, then high; ``number`` holds whole numbers.
    """

    low: Floats = field(default_factory=_empty)
    high: Floats = field(default_factory=_empty)
    number: Ints = field(default_factory=lambda: np.empty(0, dtype=np.int64))
    residue: Floats = field(default_factory=_empty)

    @property
    def minimum(self) -> float:
        """Least value of the history, exact; NaN for an empty one."""
        return float(self.residue.min()) if self.residue.size else float("nan")

    @property
    def maximum(self) -> float:
        """Greatest value of the history, exact; NaN for an empty one."""
        return float(self.residue.max()) if self.residue.size else float("nan")

    def __add__(self, other: Count) -> Count:
        """Return the count of this history followed by the other."""
        if not isinstance(other, Count):
            return NotImplemented
        low, high, residue = _close(_reversals(np.concatenate([self.residue, other.residue])))
        return Count(
            *_merged(
                np.concatenate([self.low, other.low, low]),
                np.concatenate([self.high, other.high, high]),
                np.concatenate([self.number, other.number, np.ones(low.size, dtype=np.int64)]),
            ),
            residue,
        )

    def __radd__(self, other: object) -> Count:
        """Let ``sum`` begin with its zero."""
        return self if other == 0 else NotImplemented

    def __rmul__(self, times: int) -> Count:
        """Return the count of this history repeated, by repeated squaring."""
        if isinstance(times, bool) or not isinstance(times, (int, np.integer)):
            return NotImplemented
        if times < 0:
            raise InputError(f"a history cannot be repeated {times} times; give zero or a positive whole number")
        result, power, left = Count(), self, int(times)
        while left:
            if left & 1:
                result = result + power
            left >>= 1
            if left:
                power = power + power
        return result

    __mul__ = __rmul__

    def __eq__(self, other: object) -> bool:
        """Equal when cycles and residue are."""
        return isinstance(other, Count) and all(
            np.array_equal(getattr(self, name), getattr(other, name)) for name in ("low", "high", "number", "residue")
        )

    __hash__ = None  # type: ignore[assignment]  # arrays have none

    def table(self, residue: Residue = "half") -> CycleTable:
        """Return the cycles with the residue read as asked; no cycle of zero range, one row a distinct pair.

        Parameters
        ----------
        residue : {"half", "repeat", "drop"}
            Half cycles; closed as a repeating history, which is what one more repeat adds; or left out.
        """
        low, high, count, _, _ = traced(self.residue, residue)
        return CycleTable(
            *_merged(
                np.concatenate([self.low, low]),
                np.concatenate([self.high, high]),
                np.concatenate([self.number.astype(np.float64), count]),
            )
        )

    def cycles(self, residue: Residue = "half") -> pd.DataFrame:
        """Return :meth:`table` as a DataFrame with columns low, high, range, mean, count."""
        import pandas as pd

        table = self.table(residue)
        low, high, count = table.low, table.high, table.count
        return pd.DataFrame({"low": low, "high": high, "range": high - low, "mean": (low + high) / 2, "count": count})

    def mapped(self, scale: float, offset: float) -> Count:
        """Return the count of ``scale * x + offset``; a negative scale turns the cycles over."""
        ends = (scale * self.low + offset, scale * self.high + offset)
        low, high = ends if scale >= 0 else ends[::-1]
        kept = low < high
        cycles = _merged(low[kept], high[kept], self.number[kept])
        return Count(*cycles) + count(scale * self.residue + offset)

    def to_dict(self) -> dict[str, Any]:
        """Give the count as plain lists, exactly."""
        return {name: getattr(self, name).tolist() for name in ("low", "high", "number", "residue")}

    @classmethod
    def from_dict(cls, data: dict[str, Any]) -> Count:
        """Rebuild a count from :meth:`to_dict`."""
        return cls(
            np.array(data["low"], dtype=np.float64),
            np.array(data["high"], dtype=np.float64),
            np.array(data["number"], dtype=np.int64),
            np.array(data["residue"], dtype=np.float64),
        )


def count(samples: ArrayLike, *, gate: float = 0.0, nan: Literal["error", "split"] = "error") -> Count:
    """Count the rainflow cycles of a history.

    Parameters
    ----------
    samples : array_like, shape (n,)
        Numbers; whole numbers are kept exactly.
    gate : float
        Closed cycles with a range up to this are dropped as they close, which leaves merging exact.
    nan : {"error", "split"}
        What NaN means: an error, or the border between two pieces that follow each other.

    Raises
    ------
    InputError
        Not one-dimensional, not numbers, not finite, or whole numbers too large to be kept exactly.
    """
    tally = Tally(gate=gate, nan=nan)
    tally.feed(samples)
    return tally.result()


class Tally:
    """Counts a history fed in blocks, in order, exactly as the whole."""

    def __init__(self, *, gate: float = 0.0, nan: Literal["error", "split"] = "error") -> None:
        """Start with nothing counted."""
        if not (np.isfinite(gate) and gate >= 0):
            raise InputError(f"gate is {gate}; it must be zero or a positive range")
        self.gate, self.nan = gate, nan
        self._position = 0
        self._total = Count()

    def feed(self, samples: ArrayLike) -> None:
        """Count the next block."""
        block = _floats(samples, self._position, self.nan)
        self._position += block.size
        block = block[~np.isnan(block)]
        low, high, residue = _close(_reversals(block))
        wide = high - low > self.gate
        piece = Count(*_merged(low[wide], high[wide], np.ones(int(wide.sum()), dtype=np.int64)), residue)
        joined = self._total + piece
        if self.gate:
            wide = joined.high - joined.low > self.gate
            joined = Count(joined.low[wide], joined.high[wide], joined.number[wide], joined.residue)
        self._total = joined

    def result(self) -> Count:
        """Return the count of everything fed so far."""
        return self._total


def traced(points: ArrayLike, residue: Residue) -> tuple[Floats, Floats, Floats, Ints, Ints]:
    """Return every cycle of a sequence with the positions of its two ends.

    Parameters
    ----------
    points : array_like, shape (n,)
        The history; of equal neighbours the first is meant.
    residue : {"half", "repeat", "drop"}
        As in :meth:`Count.table`.

    Returns
    -------
    low, high, count, index_low, index_high : ndarray, shape (m,)
        One row a cycle, in the order of closing.
    """
    if residue not in RESIDUES:
        raise InputError(f"residue {residue!r} is not known; {nearest(str(residue), RESIDUES)}")
    values = np.asarray(points, dtype=np.float64).tolist()
    pairs, rest = _stack(values, _reversal_positions(values, range(len(values))))
    number = [1.0] * len(pairs)
    if residue == "half":
        open_pairs = list(pairwise(rest))
        pairs, number = pairs + open_pairs, number + [0.5] * len(open_pairs)
    elif residue == "repeat":
        closing, _ = _stack(values, _reversal_positions(values, rest + rest))
        pairs, number = pairs + closing, number + [1.0] * len(closing)
    ends = [(a, b) if values[a] < values[b] else (b, a) for a, b in pairs]
    at_low = np.array([a for a, _ in ends], dtype=np.int64)
    at_high = np.array([b for _, b in ends], dtype=np.int64)
    array = np.asarray(values)
    return array[at_low], array[at_high], np.array(number), at_low, at_high


def _floats(samples: ArrayLike, position: int, nan: str) -> Floats:
    """Take samples as floats, or say which one cannot be."""
    array = np.asarray(samples)
    if array.ndim != 1:
        raise InputError(f"samples have {array.ndim} dimensions; give one channel as a one-dimensional sequence")
    if array.size and array.dtype.kind not in "biuf":
        raise InputError(f"samples are of type {array.dtype}; give numbers")
    if array.dtype.kind in "iu" and array.size:
        largest = max(abs(int(array.min())), abs(int(array.max())))
        if largest > EXACT_INTEGERS:
            raise InputError(f"whole number {largest} is past 2^53 and would be rounded; subtract an offset first")
    values = array.astype(np.float64)
    infinite = np.flatnonzero(np.isinf(values))
    if infinite.size:
        raise InputError(f"sample {position + int(infinite[0])} is infinite; every sample must be a finite number")
    missing = np.flatnonzero(np.isnan(values))
    if missing.size and nan != "split":
        raise InputError(f'sample {position + int(missing[0])} is NaN; repair it, or count the pieces with nan="split"')
    return values


def _reversals(values: Floats) -> Floats:
    """Return first and last value and the turning points between, equal neighbours once."""
    if values.size < 2:
        return values
    distinct: Floats = values[np.concatenate([[True], values[1:] != values[:-1]])]
    if distinct.size < 3:
        return distinct
    rising = distinct[1:] > distinct[:-1]
    turning: Floats = distinct[np.concatenate([[True], rising[1:] != rising[:-1], [True]])]
    return turning


def _close(points: Floats) -> tuple[Floats, Floats, Floats]:
    """Close every cycle of a sequence of turning points: low, high of each, and the residue.

    All closable ranges that do not touch are taken out together while that pays; a stack does the rest.
    """
    lows, highs = [], []
    while points.size > 64:
        a, b, c, d = points[:-3], points[1:-2], points[2:-1], points[3:]
        # Y < Z here: ranges that close then never touch, and the stack below takes the ties.
        at = 1 + np.flatnonzero(np.where(b > a, (c >= a) & (d > b), (c <= a) & (d < b)))
        if at.size * 100 < points.size:
            break
        lows.append(np.minimum(points[at], points[at + 1]))
        highs.append(np.maximum(points[at], points[at + 1]))
        kept = np.ones(points.size, dtype=bool)
        kept[at] = kept[at + 1] = False
        points = points[kept]
    values = points.tolist()
    pairs, rest = _stack(values, list(range(len(values))))
    lows.append(np.array([min(values[a], values[b]) for a, b in pairs], dtype=np.float64))
    highs.append(np.array([max(values[a], values[b]) for a, b in pairs], dtype=np.float64))
    return np.concatenate(lows), np.concatenate(highs), points[rest]


def _reversal_positions(values: list[float], positions: Any) -> list[int]:
    """Return which positions are turning points of the sequence they pick from ``values``."""
    kept: list[int] = []
    for i in positions:
        if kept and values[i] == values[kept[-1]]:
            continue
        if len(kept) > 1 and (values[kept[-1]] > values[kept[-2]]) == (values[i] > values[kept[-1]]):
            kept[-1] = i
        else:
            kept.append(i)
    return kept


def _stack(values: list[float], positions: list[int]) -> tuple[list[tuple[int, int]], list[int]]:
    """Close cycles over turning points: pairs of positions, and the positions left.

    Ranges are compared by their ends, in order, rather than by differences: no rounding decides a tie.
    """
    pairs: list[tuple[int, int]] = []
    rest: list[int] = []
    for i in positions:
        rest.append(i)
        while len(rest) >= 4:
            a, b, c, d = (values[j] for j in rest[-4:])
            inside = min(a, b) <= min(b, c) and max(b, c) <= max(a, b)
            closes = min(c, d) <= min(b, c) and max(b, c) <= max(c, d)
            if not (inside and closes):
                break
            pairs.append((rest[-3], rest[-2]))
            del rest[-3:-1]
    return pairs, rest


def _merged(low: Floats, high: Floats, number: NDArray[Any]) -> tuple[Floats, Floats, NDArray[Any]]:
    """Add up equal pairs and sort them."""
    if low.size == 0:
        return low, high, number
    order = np.lexsort((high, low))
    low, high, number = low[order], high[order], number[order]
    first = np.concatenate([[True], (low[1:] != low[:-1]) | (high[1:] != high[:-1])])
    if number.dtype.kind == "i" and float(number.sum(dtype=np.float64)) > MOST / 2:
        raise InputError("more than 4e18 cycles; a history this long cannot be counted exactly")
    return low[first], high[first], np.add.reduceat(number, np.flatnonzero(first))
