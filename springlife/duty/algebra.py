"""The algebra of rainflow counts: pieces counted apart are added, histories repeated, exactly.

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
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from springlife.duty.cycles import MOST, NONE, Cycles, CycleTable, distinct, joined, pairs, times
from springlife.duty.stack import loops
from springlife.errors import InputError, nearest

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Residue = Literal["half", "repeat", "drop"]
Gaps = Literal["error", "split"]

EXACT = 2**53  # whole numbers up to here are floats


GAP = np.array([np.nan])
BAGS = ("closed", "ended_half", "ended_repeat")


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
    most_pairs : int
        Distinct pairs that are kept exactly; with more, cycles are kept in cells of low and high (see ``exact``).
        A sum takes the smaller number of its parts.

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
    most_pairs: int = MOST

    @property
    def exact(self) -> bool:
        """Whether every cycle is kept as it was, rather than in cells."""
        return self.cell == 0

    @property
    def cell(self) -> float:
        """Width of the cells of low and high, in the unit of the samples; 0 when exact.

        The residue, the extremes and the cycle with the largest range are exact all the same.
        """
        return max(self.closed.cell, self.ended_half.cell, self.ended_repeat.cell)

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
        gate, most = max(self.gate, other.gate), min(self.most_pairs, other.most_pairs)
        (*head, tail), (start, *rest) = pieces(self.residue), pieces(other.residue)
        closed, seam = join(tail, start, gate)
        half, repeat = [self.ended_half, other.ended_half], [self.ended_repeat, other.ended_repeat]
        if head and rest:  # what lies between two gaps has ended
            half.append(adjacent(seam, gate))
            repeat.append(recurring(seam, gate))
            seams = [head[0], rest[0]]
        else:
            seams = [*head, seam, *rest]
        return Count(
            residue=between_gaps(seams),
            closed=joined(self.closed, other.closed, closed, gate=gate, most=most),
            ended_half=joined(*half, gate=gate, most=most),
            ended_repeat=joined(*repeat, gate=gate, most=most),
            minimum=float(np.fmin(self.minimum, other.minimum)),
            maximum=float(np.fmax(self.maximum, other.maximum)),
            samples=self.samples + other.samples,
            gate=gate,
            most_pairs=most,
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
        closed, seam = join(tail, head[0] if head else tail, self.gate)
        half, repeat = times(n, self.ended_half), times(n, self.ended_repeat)
        if head:
            half = joined(half, times(n - 1, adjacent(seam, self.gate)), most=self.most_pairs)
            repeat = joined(repeat, times(n - 1, recurring(seam, self.gate)), most=self.most_pairs)
        return Count(
            residue=self.residue,
            closed=joined(times(n, self.closed), times(n - 1, closed), most=self.most_pairs),
            ended_half=half,
            ended_repeat=repeat,
            minimum=self.minimum,
            maximum=self.maximum,
            samples=n * self.samples,
            gate=self.gate,
            most_pairs=self.most_pairs,
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
        return CycleTable.of((self.closed, 1.0), *self._ended(residue), *self._open(residue))

    def _ended(self, residue: Residue) -> list[tuple[Cycles, float]]:
        check_residue(residue)
        return {"half": [(self.ended_half, 0.5)], "repeat": [(self.ended_repeat, 1.0)], "drop": []}[residue]

    def _open(self, residue: Residue) -> list[tuple[Cycles, float]]:
        """Read the residue; with ``"repeat"`` the last piece goes on into the first."""
        parts = pieces(self.residue)
        if residue == "half":
            return [(adjacent(part, self.gate), 0.5) for part in parts]
        if residue == "drop":
            return []
        *head, tail = parts
        closed, seam = join(tail, head[0], self.gate) if head else (NONE, tail)
        return [(closed, 1.0), (recurring(seam, self.gate), 1.0)]

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
        again = [join(_fixed([]), scale * piece + offset, gate) for piece in pieces(self.residue)]
        ends = sorted((scale * self.minimum + offset, scale * self.maximum + offset))
        return Count(
            residue=between_gaps([points for _, points in again]),
            closed=joined(self.closed.mapped(scale, offset), *(closed for closed, _ in again)),
            ended_half=self.ended_half.mapped(scale, offset),
            ended_repeat=self.ended_repeat.mapped(scale, offset),
            minimum=ends[0],
            maximum=ends[1],
            samples=self.samples,
            gate=gate,
            most_pairs=self.most_pairs,
        )

    def to_dict(self) -> dict[str, Any]:
        """Give the count for JSON; ``from_dict`` returns it exactly."""
        return {
            "gate": self.gate,
            "most_pairs": self.most_pairs,
            "samples": self.samples,
            "minimum": self.minimum if self.samples else None,
            "maximum": self.maximum if self.samples else None,
            "residue": [piece.tolist() for piece in pieces(self.residue)],
            **{
                name: {
                    "low": bag.low.tolist(),
                    "high": bag.high.tolist(),
                    "number": bag.number.tolist(),
                    "cell": bag.cell,
                }
                for name in BAGS
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
            bags = {name: Cycles(**_arrays(given[name])) for name in BAGS}
            return cls(
                residue=between_gaps([np.array(piece, dtype=np.float64) for piece in given["residue"]]),
                minimum=math.nan if given["minimum"] is None else float(given["minimum"]),
                maximum=math.nan if given["maximum"] is None else float(given["maximum"]),
                samples=operator.index(given["samples"]),
                gate=float(given["gate"]),
                most_pairs=operator.index(given["most_pairs"]),
                **bags,
            )
        except KeyError as error:
            raise InputError(f"count: key {error} is missing; give what to_dict returned") from error
        except (TypeError, ValueError, OverflowError) as error:
            raise InputError(f"count: {error}; give what to_dict returned") from error


def pieces(residue: Floats) -> list[Floats]:
    """Return the turning points before the first and after the last gap, or all of them when there is none."""
    gaps = np.flatnonzero(np.isnan(residue))
    return [residue[: gaps[0]], residue[gaps[-1] + 1 :]] if gaps.size else [residue]


def between_gaps(parts: list[Floats]) -> Floats:
    """Return one residue of what precedes the first gap and what follows the last one; ``pieces`` undoes it."""
    return _fixed(parts[0] if len(parts) == 1 else np.concatenate([parts[0], GAP, parts[-1]]))


def join(first: Floats, then: Floats, gate: float) -> tuple[Cycles, Floats]:
    """Count on from a residue: what closes, and the residue after it."""
    open_ = np.concatenate([first, then])  # room for all
    low, high, top = loops().push(open_, first.size, then)
    return joined(pairs(low, high), gate=gate), _fixed(open_[:top])


def adjacent(points: Floats, gate: float = 0.0) -> Cycles:
    """Return the half cycles of a residue."""
    low, high = np.minimum(points[:-1], points[1:]), np.maximum(points[:-1], points[1:])
    return joined(pairs(low, high), gate=gate)


def recurring(points: Floats, gate: float = 0.0) -> Cycles:
    """Return the cycles of a residue that recurs: what closes when it follows itself."""
    return join(points, points, gate)[0]


def check_residue(residue: str) -> None:
    """Refuse an unknown reading of the residue."""
    if residue not in ("half", "repeat", "drop"):
        raise InputError(f"residue is {residue!r}; {nearest(residue, ('half', 'repeat', 'drop'))}")


def _arrays(given: Mapping[str, Any]) -> dict[str, Any]:
    low, high = (np.array(given[name], dtype=np.float64) for name in ("low", "high"))
    number = np.array(given["number"], dtype=np.int64)
    if not (low.ndim == 1 and low.shape == high.shape == number.shape and (low < high).all() and (number > 0).all()):
        raise InputError("count: low, high and number do not make cycles; give what to_dict returned")
    return {"low": low, "high": high, "number": number, "cell": float(given["cell"])}
