"""Rainflow counting (ASTM E1049-85) of samples: whole, in chunks, on several cores, or with places.

The answer is a ``Count``, which can be added and repeated; see ``algebra`` and the manual, ``manual/counting.md``.
"""

from __future__ import annotations

import math
from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.duty.algebra import Count, Residue, adjacent, between_gaps, check_residue, recurring
from springlife.duty.cycles import CycleTable
from springlife.duty.grid import Kept
from springlife.duty.stack import Scratch, expect, turning
from springlife.errors import InputError, nearest

__all__ = ["Count", "CycleTable", "Located", "Tally", "count", "traced"]

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Gaps = Literal["error", "split"]
Piece = tuple[Floats, Floats, Floats]

EXACT = 2**53  # whole numbers up to here are floats
SEGMENT = 2**20  # samples that are counted apart: 8 MB, so that handing them to a worker does not show
MOST_PAIRS = 250_000  # 6 MB, and 700,000 samples of noise; see the manual


def count(
    samples: ArrayLike,
    *,
    gate: float = 0.0,
    nan: Gaps = "error",
    most_pairs: int = MOST_PAIRS,
    workers: int = 1,
) -> Count:
    """Count the rainflow cycles of a history.

    Parameters
    ----------
    samples : array-like of numbers, shape (n,), any unit
        Whole numbers are exact up to 2**53 and refused beyond.
    gate : float
        Cycles with a range up to this are left out, after counting, so that pieces still add up exactly. It is not
        the hysteresis filter of the trade, which drops small reversals before counting and may so shorten or join
        the larger cycles around them.
    nan : "error", "split"
        With ``"split"`` a NaN ends a piece: what precedes it is never joined to what follows.
    most_pairs : int
        Distinct pairs of low and high that are kept exactly. With more, cycles go to cells; see ``Count.exact``.
    workers : int
        Threads that count; the answer is the same for any number.

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
    tally = Tally(gate=gate, nan=nan, most_pairs=most_pairs, workers=workers)
    tally.feed(samples)
    return tally.result()


@dataclass(frozen=True)
class Located:
    """A closed cycle and the positions of its ends, counted from the first sample fed, gaps included."""

    low: float
    high: float
    index_low: int
    index_high: int


@dataclass
class _Job:
    """A segment that some thread counts apart."""

    segment: Floats
    scratch: Scratch
    piece: Future[Piece | None]


def _oldest(run: Any, ahead: deque[_Job]) -> tuple[Floats, Piece | None]:
    """Take the oldest job; while another thread is still at it, do the next one that nobody has begun."""
    while not ahead[0].piece.done():
        job = next((job for job in ahead if job.piece.cancel()), None)
        if job is None:
            ahead[0].piece.result()
        else:
            job.piece = Future()
            job.piece.set_result(run.reduce(job.segment, job.scratch))
    job = ahead.popleft()
    return job.segment, job.piece.result()


class Tally:
    """Count a history that comes in chunks, in flat memory.

    Parameters
    ----------
    gate, nan, most_pairs, workers
        See ``count``.
    where : bool
        Follow positions too: ``largest`` and ``positions`` are then known. Takes several times as long.
    """

    def __init__(
        self,
        *,
        gate: float = 0.0,
        nan: Gaps = "error",
        most_pairs: int = MOST_PAIRS,
        workers: int = 1,
        where: bool = False,
    ) -> None:
        """Start with nothing counted."""
        if not (math.isfinite(gate) and gate >= 0):
            raise InputError(f"gate is {gate!r}; give a range of 0 or more, in the unit of the samples")
        if nan not in ("error", "split"):
            raise InputError(f"nan is {nan!r}; {nearest(nan, ('error', 'split'))}")
        for name, value in (("most_pairs", most_pairs), ("workers", workers)):
            if value < 1:
                raise InputError(f"{name} is {value!r}; give 1 or more")
        self._gate, self._split, self._most, self._workers = gate, nan == "split", most_pairs, workers
        self._closed, self._half, self._repeat = (Kept(most_pairs, gate) for _ in range(3))
        self._head: Floats | None = None  # residue of what preceded the first gap
        self._stack, self._top = np.empty(64), 0
        self._minimum, self._maximum = math.inf, -math.inf
        self._fed = self._samples = 0
        self._scratch = [Scratch() for _ in range(2 * workers + 2)]  # what is ahead, and one for pieces between gaps
        self._places = np.empty(0, dtype=np.int64) if where else None
        self.largest: Located | None = None

    @property
    def positions(self) -> Ints | None:
        """Positions of the points that are still open, when asked to follow them."""
        return self._places

    def feed(self, chunk: ArrayLike) -> None:
        """Count the next samples.

        Raises
        ------
        InputError
            See ``count``; the index counts from the first chunk's first sample.
        """
        values = _row(chunk)
        run = expect(values.size)
        for segment, piece in self._reduced(run, values):
            if piece is None:
                self._feed_between_gaps(run, segment)
            else:
                self._append(run, *piece)
                self._samples += segment.size
            self._fed += segment.size

    def _reduced(self, run: Any, values: NDArray[Any]) -> Iterator[tuple[Floats, Piece | None]]:
        """Count segments apart, in order; None where there are gaps or positions to follow.

        Other threads run ahead, but segments and the order in which they are joined are the same for any number.
        """
        starts = range(0, values.size, SEGMENT)
        segments = (_floats(values[i : i + SEGMENT], self._fed) for i in starts)
        if self._places is not None:
            yield from ((segment, None) for segment in segments)
            return
        if self._workers == 1 or len(starts) == 1:
            yield from ((segment, run.reduce(segment, self._scratch[0])) for segment in segments)
            return
        ahead: deque[_Job] = deque()
        with ThreadPoolExecutor(self._workers - 1) as pool:
            for number, segment in enumerate(segments):
                scratch = self._scratch[number % (2 * self._workers + 1)]
                ahead.append(_Job(segment, scratch, pool.submit(run.reduce, segment, scratch)))
                if len(ahead) > 2 * self._workers:
                    yield _oldest(run, ahead)
            while ahead:
                yield _oldest(run, ahead)

    def _append(self, run: Any, low: Floats, high: Floats, points: Floats) -> None:
        """Join a piece to what is open."""
        self._closed.add(low, high)
        self._make_room(points.size)
        low, high, self._top = run.push(self._stack, self._top, points)
        self._closed.add(low, high)
        self._minimum = min(self._minimum, float(points.min()))
        self._maximum = max(self._maximum, float(points.max()))

    def _make_room(self, more: int) -> None:
        if self._top + more > self._stack.size:
            self._stack = np.concatenate([self._stack[: self._top], np.empty(self._top + more)])

    def _feed_between_gaps(self, run: Any, segment: Floats) -> None:
        """Count the pieces of a segment one by one."""
        _check_finite(segment, self._fed, self._split)
        gaps = [-1, *np.flatnonzero(np.isnan(segment)).tolist(), segment.size]
        for number, (before, gap) in enumerate(pairwise(gaps)):
            if number:
                self._end_piece()
            piece = segment[before + 1 : gap]
            if not piece.size:
                continue
            if self._places is not None:
                self._follow(run, piece, self._fed + before + 1)
            else:
                self._append(run, *run.reduce(piece, self._scratch[-1]))  # the one that no thread has
                self._samples += piece.size

    def _end_piece(self) -> None:
        points = self._stack[: self._top].copy()
        if self._head is None:
            self._head = points
        else:
            half, repeat = adjacent(points), recurring(points)
            self._half.add(half.low, half.high)
            self._repeat.add(repeat.low, repeat.high)
        self._top = 0
        if self._places is not None:
            self._places = self._places[:0]

    def _follow(self, run: Any, piece: Floats, start: int) -> None:
        """Count a piece with the positions of its samples, the first of which is ``start``."""
        assert self._places is not None
        turns = turning(piece)
        values = np.concatenate([self._stack[: self._top], piece[turns]])
        places = np.concatenate([self._places, turns + start])
        low, high, rest = run.trace(values, np.arange(values.size))
        self._closed.add(values[low], values[high])
        span = values[high] - values[low]
        if span.size and (self.largest is None or span.max() > self.largest.high - self.largest.low):
            i, j = low[span.argmax()], high[span.argmax()]
            self.largest = Located(float(values[i]), float(values[j]), int(places[i]), int(places[j]))
        self._top, self._places = 0, places[rest]
        self._make_room(rest.size)
        self._stack[: rest.size], self._top = values[rest], rest.size
        self._minimum = min(self._minimum, float(piece.min()))
        self._maximum = max(self._maximum, float(piece.max()))
        self._samples += piece.size

    def result(self) -> Count:
        """Return the count of everything fed so far."""
        points = self._stack[: self._top].copy()
        return Count(
            residue=between_gaps([points] if self._head is None else [self._head, points]),
            closed=self._closed.result(),
            ended_half=self._half.result(),
            ended_repeat=self._repeat.result(),
            minimum=self._minimum if self._samples else math.nan,
            maximum=self._maximum if self._samples else math.nan,
            samples=self._samples,
            gate=self._gate,
            most_pairs=self._most,
        )


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
    check_residue(residue)
    row = _row(points)
    values = _floats(row, 0)
    _check_finite(values, 0, split=True)
    run = expect(values.size)
    gaps = [-1, *np.flatnonzero(np.isnan(values)).tolist(), values.size]
    closed: list[tuple[Ints, Ints]] = []

    def follow(order: Ints) -> Ints:
        low, high, rest = run.trace(values, order)
        closed.append((low, high))
        return rest  # type: ignore[no-any-return]

    rests = [follow(turning(values[a + 1 : b]) + a + 1) for a, b in pairwise(gaps)]
    if residue == "repeat":
        first, *middle, last = rests if len(rests) > 1 else [rests[0][:0], *rests]
        for rest in (*middle, follow(np.concatenate([last, first]))):
            follow(np.concatenate([rest, rest]))
    low, high = (np.concatenate([row[end] for row in closed]) for end in (0, 1))
    number = np.ones(low.size)
    if residue == "half":
        begin, end = (np.concatenate([rest[k : rest.size - 1 + k] for rest in rests]) for k in (0, 1))
        up = values[begin] < values[end]
        low = np.concatenate([low, np.where(up, begin, end)])
        high = np.concatenate([high, np.where(up, end, begin)])
        number = np.concatenate([number, np.full(begin.size, 0.5)])
    return values[low], values[high], number, low, high


def _row(samples: ArrayLike) -> NDArray[Any]:
    """Return samples as one row of numbers of their own type, or say why not."""
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
    if kind.kind == "f" and isinstance(samples, (list, tuple)):  # whole numbers among floats have become floats
        for i in np.flatnonzero(np.abs(array) >= EXACT):
            if isinstance(samples[i], int):
                _check_whole(samples[i], int(i))
    return array


def _floats(values: NDArray[Any], start: int) -> Floats:
    """Return a segment as contiguous float64, exactly."""
    if values.dtype.kind in "iu" and values.dtype.itemsize == 8:
        for i in np.flatnonzero((values > EXACT) | (values < -EXACT))[:1]:
            _check_whole(values[i], start + int(i))
    return np.ascontiguousarray(values, dtype=np.float64)


def _check_whole(value: int, i: int) -> None:
    if abs(int(value)) > EXACT:
        raise InputError(f"sample {i} is {value}; whole numbers are counted exactly up to 2**53 only")


def _check_finite(values: Floats, start: int, split: bool) -> None:
    odd = np.isinf(values) if split else ~np.isfinite(values)
    for i in np.flatnonzero(odd)[:1]:
        remedy = "mend it" if np.isinf(values[i]) else 'mend it, or count with nan="split"'
        raise InputError(f"sample {start + i} is {values[i]}, which cannot be counted; {remedy}")
