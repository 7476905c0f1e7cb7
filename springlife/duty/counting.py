"""Rainflow counting (ASTM E1049-85) as an algebra: count pieces apart, add them, repeat them, exactly.

A ``Count`` is what counting leaves of a history: its closed cycles and the residue of turning points that have not
closed. Joining two residues and counting on gives what the whole history gives, for any split, so records are
counted in blocks, on several cores, and a service life is ``n * pass``. See the manual, ``manual/counting.md``.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.duty import stack
from springlife.duty.cycles import NONE, Cycles, CycleTable, distinct, joined, pairs, times
from springlife.errors import InputError, nearest

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Residue = Literal["half", "repeat", "drop"]
Gaps = Literal["error", "split"]

EXACT = 2**53  # whole numbers up to here are floats


_GAP = np.array([np.nan])
_BAGS = ("closed", "ended_half", "ended_repeat")


def _fixed(values: Any) -> Floats:
    array = np.array(values, dtype=np.float64)
    array.flags.writeable = False
    return array


@dataclass(frozen=True, eq=False, repr=False)
class Count:
    """What counting leaves of a history; ``Count()`` is the empty history.

    ``a + b`` is a then b, ``n * a`` is a repeated n times; both equal the count of the history written out.
    ``==`` compares cycles, as unordered pairs with their number, and residue.

    Parameters
    ----------
    residue : float array, shape (m,)
        Turning points that have not closed. One NaN among them stands for all gaps: before it what precedes the
        first gap, after it what follows the last one.
    closed, ended_half, ended_repeat : Cycles
        The closed cycles, and the residues of the pieces between gaps, to which nothing can be joined any more:
        their half cycles (each 1), and their cycles when closed as a repeating history.
    minimum, maximum : float
        Extremes of the history, exact; NaN for the empty one.
    samples : int
        Number of samples, without gaps.
    gate : float
        Cycles with a range up to this are left out. A sum takes the larger gate of its parts.

    Notes
    -----
    Counts form a monoid: ``+`` is associative and ``Count()`` its identity. The residue joined to itself reduces to
    itself again, so ``n * a`` has n times the closed cycles, n - 1 times those that close at the joint, and the
    residue of a.
    """

    residue: Floats = field(default_factory=lambda: _fixed([]))
    closed: Cycles = NONE
    ended_half: Cycles = NONE
    ended_repeat: Cycles = NONE
    minimum: float = math.nan
    maximum: float = math.nan
    samples: int = 0
    gate: float = 0.0

    @cached_property
    def _distinct(self) -> Cycles:
        return distinct(self.closed)

    @property
    def low(self) -> Floats:
        """Lower ends of the closed cycles, one for each distinct pair, sorted."""
        return self._distinct.low

    @property
    def high(self) -> Floats:
        """Upper ends of the closed cycles."""
        return self._distinct.high

    @property
    def number(self) -> Ints:
        """How often each pair has closed."""
        return self._distinct.number

    def __add__(self, other: Count) -> Count:
        """Return the count of this history followed by the other one."""
        if not isinstance(other, Count):
            return NotImplemented
        gate = max(self.gate, other.gate)
        (*head, tail), (start, *rest) = pieces(self.residue), pieces(other.residue)
        closed, seam = _join(tail, start, gate)
        half, repeat = [self.ended_half, other.ended_half], [self.ended_repeat, other.ended_repeat]
        if head and rest:  # what lies between two gaps has ended
            half.append(_adjacent(seam, gate))
            repeat.append(_recurring(seam, gate))
            seams = [head[0], rest[0]]
        else:
            seams = [*head, seam, *rest]
        return Count(
            residue=_between_gaps(seams),
            closed=joined(self.closed, other.closed, closed, gate=gate),
            ended_half=joined(*half, gate=gate),
            ended_repeat=joined(*repeat, gate=gate),
            minimum=float(np.fmin(self.minimum, other.minimum)),
            maximum=float(np.fmax(self.maximum, other.maximum)),
            samples=self.samples + other.samples,
            gate=gate,
        )

    def __radd__(self, other: object) -> Count:
        """Let ``sum`` start at 0."""
        return self if isinstance(other, int) and other == 0 else NotImplemented

    def __mul__(self, n: int) -> Count:
        """Return the count of this history repeated ``n`` times in sequence.

        Raises
        ------
        InputError
            ``n`` is negative, or a pair would close more than 2**63 - 1 times.
        """
        try:
            n = operator.index(n)
        except TypeError:
            return NotImplemented
        if n < 0:
            raise InputError(f"a count cannot be repeated {n} times; give a whole number from 0")
        if n == 0:
            return Count()
        *head, tail = pieces(self.residue)
        closed, seam = _join(tail, head[0] if head else tail, self.gate)
        half, repeat = times(n, self.ended_half), times(n, self.ended_repeat)
        if head:
            half = joined(half, times(n - 1, _adjacent(seam, self.gate)))
            repeat = joined(repeat, times(n - 1, _recurring(seam, self.gate)))
        return Count(
            residue=self.residue,
            closed=joined(times(n, self.closed), times(n - 1, closed)),
            ended_half=half,
            ended_repeat=repeat,
            minimum=self.minimum,
            maximum=self.maximum,
            samples=n * self.samples,
            gate=self.gate,
        )

    __rmul__ = __mul__

    def __eq__(self, other: object) -> bool:
        """Compare cycles as unordered pairs with their number, and the residue."""
        if not isinstance(other, Count):
            return NotImplemented
        return np.array_equal(self.residue, other.residue, equal_nan=True) and all(
            distinct(mine).same(distinct(theirs))
            for mine, theirs in (
                (self.closed, other.closed),
                (self.ended_half, other.ended_half),
                (self.ended_repeat, other.ended_repeat),
            )
        )

    __hash__ = None  # type: ignore[assignment]

    def __repr__(self) -> str:
        """Show sizes rather than arrays."""
        span = f", {self.minimum:g} to {self.maximum:g}" if self.samples else ""
        return f"Count({self.samples} samples{span}, {self.low.size} pairs closed, {self.residue.size} points open)"

    def settled(self, residue: Residue = "half") -> CycleTable:
        """Return the cycles that nothing joined later can change: the closed ones and pieces between gaps.

        Parameters
        ----------
        residue : "half", "repeat", "drop"
            How the residue of a piece between gaps is read; see ``table``.
        """
        return CycleTable.of((self.closed, 1.0), *self._ended(residue))

    def table(self, residue: Residue = "half") -> CycleTable:
        """Return the cycles with the residue read, one row for each distinct pair, sorted by low and high.

        Parameters
        ----------
        residue : "half", "repeat", "drop"
            ``"half"``: every adjacent pair is one half cycle (ASTM E1049-85 5.4.4), for a history that happens
            once. ``"repeat"``: the history recurs, and these are the cycles that one more pass adds (5.4.5).
            ``"drop"``: only what has closed.

        Raises
        ------
        InputError
            Another word for ``residue``.
        """
        low, high, *_ = traced(self.residue, residue)
        kept = high - low > self.gate
        rows = pairs(low[kept], high[kept])
        weight = 0.5 if residue == "half" else 1.0
        return CycleTable.of((self.closed, 1.0), *self._ended(residue), (rows, weight))

    def _ended(self, residue: Residue) -> list[tuple[Cycles, float]]:
        _check_residue(residue)
        return {"half": [(self.ended_half, 0.5)], "repeat": [(self.ended_repeat, 1.0)], "drop": []}[residue]

    def cycles(self, residue: Residue = "half") -> pd.DataFrame:
        """Return ``table`` as a DataFrame with columns low, high, range, mean, count; a half cycle counts 0.5."""
        import pandas as pd

        t = self.table(residue)
        mean = t.low + (t.high - t.low) / 2
        return pd.DataFrame({"low": t.low, "high": t.high, "range": t.high - t.low, "mean": mean, "count": t.count})

    def mapped(self, scale: float, offset: float = 0.0) -> Count:
        """Return the count of ``scale * x + offset``; a negative scale turns the history over.

        Raises
        ------
        InputError
            A scale or offset that is not finite.
        """
        if not (math.isfinite(scale) and math.isfinite(offset)):
            raise InputError(f"scale {scale!r} and offset {offset!r} must be finite numbers")
        gate = abs(scale) * self.gate
        # Rounding can make neighbours equal, so the residue goes through the stack again.
        again = [_join(_fixed([]), scale * piece + offset, gate) for piece in pieces(self.residue)]
        ends = sorted((scale * self.minimum + offset, scale * self.maximum + offset))
        return Count(
            residue=_between_gaps([points for _, points in again]),
            closed=joined(self.closed.mapped(scale, offset), *(closed for closed, _ in again)),
            ended_half=self.ended_half.mapped(scale, offset),
            ended_repeat=self.ended_repeat.mapped(scale, offset),
            minimum=ends[0],
            maximum=ends[1],
            samples=self.samples,
            gate=gate,
        )

    def to_dict(self) -> dict[str, Any]:
        """Give the count for JSON; ``from_dict`` returns it exactly."""
        return {
            "gate": self.gate,
            "samples": self.samples,
            "minimum": self.minimum if self.samples else None,
            "maximum": self.maximum if self.samples else None,
            "residue": [piece.tolist() for piece in pieces(self.residue)],
            **{
                name: {"low": bag.low.tolist(), "high": bag.high.tolist(), "number": bag.number.tolist()}
                for name in _BAGS
                for bag in [distinct(getattr(self, name))]
            },
        }

    @classmethod
    def from_dict(cls, given: Mapping[str, Any]) -> Count:
        """Return the count that ``to_dict`` gave.

        Raises
        ------
        InputError
            A key is missing, or its value is none that a count gives.
        """
        try:
            bags = {name: Cycles(**_arrays(given[name])) for name in _BAGS}
            return cls(
                residue=_between_gaps([np.array(piece, dtype=np.float64) for piece in given["residue"]]),
                minimum=math.nan if given["minimum"] is None else float(given["minimum"]),
                maximum=math.nan if given["maximum"] is None else float(given["maximum"]),
                samples=operator.index(given["samples"]),
                gate=float(given["gate"]),
                **bags,
            )
        except KeyError as error:
            raise InputError(f"count: key {error} is missing; give what to_dict returned") from error
        except (TypeError, ValueError, OverflowError) as error:
            raise InputError(f"count: {error}; give what to_dict returned") from error


def count(samples: ArrayLike, *, gate: float = 0.0, nan: Gaps = "error") -> Count:
    """Count the rainflow cycles of a history.

    Parameters
    ----------
    samples : array-like of numbers, shape (n,), any unit
        Whole numbers are exact up to 2**53 and refused beyond.
    gate : float
        Cycles with a range up to this are left out, after counting, so that pieces still add up exactly. It is not
        the hysteresis filter of the trade, which smooths the samples before counting and shifts what remains.
    nan : "error", "split"
        With ``"split"`` a NaN ends a piece: what precedes it is never joined to what follows.

    Returns
    -------
    Count

    Raises
    ------
    InputError
        Samples that are not one row of finite numbers; the message names the first index.

    References
    ----------
    ASTM E1049-85 (2017), 5.4.4.
    """
    tally = Tally(gate=gate, nan=nan)
    tally.feed(samples)
    return tally.result()


class Tally:
    """Count a history that comes in chunks.

    Parameters
    ----------
    gate, nan
        See ``count``.
    """

    def __init__(self, *, gate: float = 0.0, nan: Gaps = "error") -> None:
        """Start with nothing counted."""
        if not (math.isfinite(gate) and gate >= 0):
            raise InputError(f"gate is {gate!r}; give a range of 0 or more, in the unit of the samples")
        if nan not in ("error", "split"):
            raise InputError(f"nan is {nan!r}; {nearest(nan, ('error', 'split'))}")
        self._total = Count(gate=gate)
        self._split = nan == "split"
        self._seen = 0

    def feed(self, chunk: ArrayLike) -> None:
        """Count the next samples.

        Raises
        ------
        InputError
            See ``count``; the index counts from the first chunk's first sample.
        """
        values = _numbers(chunk)
        gaps = self._gaps(values)
        for number, piece in enumerate(np.split(values, gaps)):
            if number:
                self._total += Count(residue=_GAP, gate=self._total.gate)
                piece = piece[1:]
            self._total += _piece(piece, self._total.gate)
        self._seen += values.size

    def _gaps(self, values: Floats) -> NDArray[np.intp]:
        odd = np.flatnonzero(~np.isfinite(values))
        for i in odd[:1] if not self._split else odd[np.isinf(values[odd])][:1]:
            remedy = "mend it" if self._split or np.isinf(values[i]) else 'mend it, or count with nan="split"'
            raise InputError(f"sample {self._seen + i} is {values[i]}, which cannot be counted; {remedy}")
        return odd

    def result(self) -> Count:
        """Return the count of everything fed so far."""
        return self._total


def traced(points: ArrayLike, residue: Residue = "half") -> tuple[Floats, Floats, Floats, Ints, Ints]:
    """Count a history and say where each cycle has its ends.

    Parameters
    ----------
    points : array-like of numbers, shape (n,)
        Samples or turning points; NaN separates pieces.
    residue : "half", "repeat", "drop"
        See ``Count.table``. With ``"repeat"`` the last piece goes on into the first.

    Returns
    -------
    low, high, count : float arrays, shape (m,)
        One row for each cycle; a half cycle counts 0.5.
    index_low, index_high : int arrays, shape (m,)
        Positions of the two ends in ``points``; on a plateau, its first sample.

    Raises
    ------
    InputError
        See ``count``.
    """
    _check_residue(residue)
    values = _numbers(points)
    if np.isinf(values).any():
        i = int(np.flatnonzero(np.isinf(values))[0])
        raise InputError(f"sample {i} is {values[i]}, which cannot be counted; mend it")
    seen = values.tolist()
    gaps = [-1, *np.flatnonzero(np.isnan(values)).tolist(), values.size]
    rows: list[tuple[list[int], list[int]]] = []

    def follow(order: list[int]) -> list[int]:
        low, high, rest = stack.trace(seen, order)
        rows.append((low, high))
        return rest

    rests = [follow(list(range(a + 1, b))) for a, b in pairwise(gaps)]
    if residue == "repeat":
        first, *middle, last = rests if len(rests) > 1 else [[], *rests]
        for rest in (*middle, follow(last + first)):
            follow(rest + rest)
    index = [np.array([i for row in rows for i in row[end]], dtype=np.int64) for end in (0, 1)]
    number = np.ones(index[0].size)
    if residue == "half":
        begin = np.array([i for rest in rests for i in rest[:-1]], dtype=np.int64)
        end = np.array([i for rest in rests for i in rest[1:]], dtype=np.int64)
        up = values[begin] < values[end]
        index = [
            np.concatenate([index[0], np.where(up, begin, end)]),
            np.concatenate([index[1], np.where(up, end, begin)]),
        ]
        number = np.concatenate([number, np.full(begin.size, 0.5)])
    return values[index[0]], values[index[1]], number, index[0], index[1]


def pieces(residue: Floats) -> list[Floats]:
    """Return the turning points before the first and after the last gap, or all of them when there is none."""
    gaps = np.flatnonzero(np.isnan(residue))
    return [residue[: gaps[0]], residue[gaps[-1] + 1 :]] if gaps.size else [residue]


def _between_gaps(parts: list[Floats]) -> Floats:
    return _fixed(parts[0] if len(parts) == 1 else np.concatenate([parts[0], _GAP, parts[-1]]))


def _piece(values: Floats, gate: float) -> Count:
    """Count a history without gaps."""
    if not values.size:
        return Count(gate=gate)
    closed, points = _join(_GAP[:0], values, gate)
    return Count(
        residue=points,
        closed=closed,
        minimum=float(points.min()),
        maximum=float(points.max()),
        samples=values.size,
        gate=gate,
    )


def _join(first: Floats, then: Floats, gate: float) -> tuple[Cycles, Floats]:
    """Count on from a residue: what closes, and the residue after it."""
    points: list[float] = first.tolist()
    low: list[float] = []
    high: list[float] = []
    stack.push(points, then.tolist(), low, high)
    return joined(pairs(np.array(low), np.array(high)), gate=gate), _fixed(points)


def _adjacent(points: Floats, gate: float) -> Cycles:
    """Return the half cycles of a residue."""
    low, high = np.minimum(points[:-1], points[1:]), np.maximum(points[:-1], points[1:])
    return joined(pairs(low, high), gate=gate)


def _recurring(points: Floats, gate: float) -> Cycles:
    """Return the cycles of a residue that recurs: what closes when it follows itself."""
    return _join(points, points, gate)[0]


def _check_residue(residue: str) -> None:
    if residue not in ("half", "repeat", "drop"):
        raise InputError(f"residue is {residue!r}; {nearest(residue, ('half', 'repeat', 'drop'))}")


def _numbers(samples: ArrayLike) -> Floats:
    """Return samples as float64, exactly, or say why not."""
    if np.ma.is_masked(samples):
        raise InputError('samples are masked in places; fill those with NaN and count with nan="split"')
    try:
        array = np.asarray(samples)
    except ValueError as error:
        raise InputError(f"samples are not one row of numbers: {error}") from error
    if array.ndim != 1:
        raise InputError(f"samples have the shape {array.shape}; give one row of numbers, such as one column")
    if not array.size:
        return np.empty(0)
    kind = array.dtype
    if kind.kind not in "iuf" or kind.itemsize > 8:
        raise InputError(f"samples are of type {kind}; give integers or floats of up to 64 bits")
    if (kind.kind in "iu" and kind.itemsize == 8) or not isinstance(samples, np.ndarray):
        _check_exact(samples, array)
    return array.astype(np.float64, copy=False)


def _check_exact(samples: ArrayLike, array: NDArray[Any]) -> None:
    """Refuse whole numbers that a float cannot hold, also those that a list mixes with floats."""
    for i in np.flatnonzero((array > EXACT) | (array < -EXACT)):
        value = samples[i] if isinstance(samples, (list, tuple)) else array[i]
        if isinstance(value, (int, np.integer)):
            raise InputError(f"sample {i} is {value}; whole numbers are counted exactly up to 2**53 only")


def _arrays(given: Mapping[str, Any]) -> dict[str, Any]:
    low, high = (np.array(given[name], dtype=np.float64) for name in ("low", "high"))
    number = np.array(given["number"], dtype=np.int64)
    if not (low.ndim == 1 and low.shape == high.shape == number.shape and (low < high).all() and (number > 0).all()):
        raise InputError("count: low, high and number do not make cycles; give what to_dict returned")
    return {"low": low, "high": high, "number": number}
