"""The loops of ``stack`` compiled, same names, same answers; loaded only when the record is long enough to pay for it.

Samples go through in blocks that stay in the innermost cache. In a block the turning points are compacted without
branches, then cycles between wider neighbours are taken out pass by pass, again without branches, as long as a
pass pays; only what is left goes over the stack, whose branches no processor can predict.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numba
import numpy as np
from numpy.typing import NDArray

from springlife.duty.stack import Scratch

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

BLOCK = 4096  # samples: 32 kB of turning points; 1,024 to 8,192 differ by a few per cent
PAYS = np.uint64(4)  # a pass is repeated while it takes out more than one point in four

_numba: Any = numba  # partly typed, and signatures are not
_floats, _ints, _places, _cells = (_numba.float64[::1], _numba.int64[::1], _numba.int32[::1], _numba.int64[:, :, ::1])
_given, _whole = (_numba.types.Array(of, 1, "C", readonly=True) for of in (_numba.float64, _numba.int64))
_sizes = _numba.types.UniTuple(_numba.int64, 2)


def _compiled(*signature: Any) -> Callable[[Any], Any]:
    def compile_(function: Any) -> Any:
        try:
            return _numba.njit(*signature, nogil=True, cache=True)(function)
        except RuntimeError:  # no place to write the cache to
            return _numba.njit(*signature, nogil=True)(function)

    return compile_


# Counters that index arrays are unsigned: a signed one costs a test for negative indices at every access.
_zero, _one, _two, _three = (np.uint64(i) for i in range(4))


@_compiled()
def _compact(b, size, rising, up, out):  # type: ignore[no-untyped-def]
    """Put those of b[:size] that turn into ``out``; b[:size + 1] has no neighbours alike, b[0] was reached ``rising``.

    The first two loops become vector instructions. ``out`` may be ``b``.
    """
    up[0] = rising
    for k in range(size):
        up[k + 1] = b[k + 1] > b[k]
    rising = up[size]
    for k in range(size):
        up[k] ^= up[k + 1]
    n = _zero
    for k in range(size):
        out[n] = b[k]
        n += np.uint64(up[k])
    return n, rising


@_compiled()
def _turns(b, rising, up, out):  # type: ignore[no-untyped-def]
    """Put the samples of b but the last that turn into ``out``; b[0] was reached ``rising``.

    Returns how many they are, whether the last sample was reached rising, and whether all are finite.
    """
    size, level, odd = b.size - 1, 0, 0
    for k in range(size):
        v = b[k + 1]
        level += v == b[k]
        odd += v - v != 0.0
    if not level:
        n, rising = _compact(b, size, rising, up, out)
        return n, rising, odd == 0
    for k in range(size):
        up[k] = b[k + 1] != b[k]
    m = _one
    out[0] = b[0]
    for k in range(size):  # plateaus: first drop what repeats
        out[m] = b[k + 1]
        m += np.uint64(up[k])
    n, rising = _compact(out, np.int64(m) - 1, rising, up, out)
    return n, rising, odd == 0


@_compiled()
def _peel(p, n, peak, low, high, m):  # type: ignore[no-untyped-def]
    """Close pairs of p[:n] that their neighbours span, none of which touch; see ``stack``.

    ``peak`` tells whether p[0] is one. Returns how many points are left, in place, and the cycles so far.
    """
    if n < 5:
        return n, m
    i, kept, was = _one, _one, False
    a, b, c = p[0], p[1], p[2]
    if peak:  # one step, so that b is a peak below
        was = (c < a) & (p[3] < b)
        low[m], high[m] = b, c
        m += np.uint64(was)
        kept += np.uint64(not was)
        i, a, b, c = _two, b, c, p[3]
    lifted = c >= a
    while i + _three < n:
        d, e = p[i + _two], p[i + _three]
        higher = d >= b
        fall = higher & lifted
        low[m], high[m] = c, b
        m += np.uint64(fall)
        p[kept] = b
        kept += np.uint64(not (fall | was))
        lifted = e >= c
        was = not (higher | lifted)  # the rise from c to d
        low[m], high[m] = c, d
        m += np.uint64(was)
        p[kept] = c
        kept += np.uint64(not (was | fall))
        b, c = d, e
        i += _two
    p[kept] = b
    kept += np.uint64(not was)
    i += _one
    while i < n:
        p[kept] = p[i]
        kept += _one
        i += _one
    return kept, m


@_compiled()
def _stack(p, n, peak, s, t, low, high, m):  # type: ignore[no-untyped-def]
    """Put the alternating points p[:n] on the stack s[:t], below which they turn."""
    for i in range(n):
        v = p[i]
        if peak:
            while t > _two and s[t - _one] >= s[t - _three] and v >= s[t - _two]:
                low[m], high[m] = s[t - _one], s[t - _two]
                m += _one
                t -= _two
        else:
            while t > _two and s[t - _one] <= s[t - _three] and v <= s[t - _two]:
                low[m], high[m] = s[t - _two], s[t - _one]
                m += _one
                t -= _two
        s[t] = v
        t += _one
        peak = not peak
    return t, m


@_compiled(_sizes(_given, _floats, _floats, _floats))
def _reduce(x, low, high, s):  # type: ignore[no-untyped-def]
    size, out, up = x.size, np.empty(BLOCK + 1), np.empty(BLOCK + 1, dtype=np.uint8)
    m, t, i = _zero, _one, 1
    while i < size and x[i] == x[0]:
        i += 1
    s[0] = x[0]
    if i == size:
        return np.int64(0), np.int64(1 if np.isfinite(x[0]) else -1)
    rising = np.uint8(x[i] > x[0])
    finite = np.isfinite(x[0]) and np.isfinite(x[i])
    while i < size - 1 and finite:
        end = min(size - 1, i + BLOCK)
        peak = rising > 0
        n, rising, finite = _turns(x[i : end + 1], rising, up, out)
        before = n + n
        while PAYS * (before - n) > before:
            before = n
            n, m = _peel(out, n, peak, low, high, m)
        t, m = _stack(out, n, peak, s, t, low, high, m)
        i = end
    out[0] = x[i]
    t, m = _stack(out, _one, rising > 0, s, t, low, high, m)
    return np.int64(m), np.int64(t) if finite else np.int64(-1)


def reduce(x: Floats, scratch: Scratch) -> tuple[Floats, Floats, Floats] | None:
    """Count a piece apart; see ``stack.reduce``. The answer lies in ``scratch``."""
    low, high, points = scratch.fit(x.size)
    m, t = _reduce(x, low, high, points)
    return None if t < 0 else (low[:m], high[:m], points[:t])


@_compiled(_sizes(_floats, _numba.int64, _given, _floats, _floats))
def _push(s, top, points, low, high):  # type: ignore[no-untyped-def]
    t, m, one = np.uint64(top), _zero, np.empty(1)
    for i in range(points.size):
        v = points[i]
        if t > _zero:
            if v == s[t - _one]:
                continue
            rising = v > s[t - _one]
            if t > _one and (s[t - _one] > s[t - _two]) == rising:
                t -= _one
            one[0] = v
            t, m = _stack(one, _one, rising, s, t, low, high, m)
        else:
            s[0] = v
            t = _one
    return np.int64(t), np.int64(m)


def push(stack: Floats, top: int, points: Floats) -> tuple[Floats, Floats, int]:
    """Count on from the residue ``stack[:top]``; see ``stack.push``."""
    room = (top + points.size) // 2 + 1
    low, high = np.empty(room), np.empty(room)
    t, m = _push(stack, top, points, low, high)
    return low[:m], high[:m], t


@_compiled(_sizes(_given, _whole, _ints, _ints, _ints))
def _trace(x, order, low, high, s):  # type: ignore[no-untyped-def]
    t, m = 0, 0
    for i in order:
        v = x[i]
        if t and v == x[s[t - 1]]:
            continue
        if t > 1 and (x[s[t - 1]] > x[s[t - 2]]) == (v > x[s[t - 1]]):
            t -= 1
        while t > 2:
            a, b, c = x[s[t - 3]], x[s[t - 2]], x[s[t - 1]]
            if a < b:
                if c < a or v < b:
                    break
                low[m], high[m] = s[t - 1], s[t - 2]
            else:
                if c > a or v > b:
                    break
                low[m], high[m] = s[t - 2], s[t - 1]
            m += 1
            t -= 2
        s[t] = i
        t += 1
    return m, t


def trace(values: Floats, order: Ints) -> tuple[Ints, Ints, Ints]:
    """Count positions; see ``stack.trace``."""
    room = order.size // 2 + 1
    low, high, rest = np.empty(room, np.int64), np.empty(room, np.int64), np.empty(order.size, np.int64)
    m, t = _trace(values, order, low, high, rest)
    return low[:m], high[:m], rest[:t]


@_compiled(_sizes(_given, _given, _places, _floats, _floats, _ints, _numba.int64))
def _insert(low, high, places, rows_low, rows_high, rows_number, used):  # type: ignore[no-untyped-def]
    """Hash table with open addressing: ``places`` holds row numbers, -1 where free."""
    mask, pair = np.uint64(places.size - 1), np.empty(2)
    mix = np.uint64(0x9E3779B97F4A7C15)  # 2**64 over the golden ratio: spreads neighbouring bit patterns
    bits = pair.view(np.uint64)
    for i in range(low.size):
        a, b = low[i] + 0.0, high[i] + 0.0  # -0.0 is 0.0
        pair[0], pair[1] = a, b
        key = (bits[0] * mix ^ bits[1]) * mix
        place = ((key ^ key >> np.uint64(32)) * mix >> np.uint64(32)) & mask
        row = places[place]
        while row >= 0 and (rows_low[row] != a or rows_high[row] != b):
            place = (place + _one) & mask
            row = places[place]
        if row < 0:
            if used == rows_low.size:
                return i, used
            row = used
            places[place] = row
            rows_low[row], rows_high[row], rows_number[row] = a, b, 0
            used += 1
        rows_number[row] += 1
    return low.size, used


class Distinct:
    """Pairs with their numbers, equal ones joined; see ``stack.Distinct``."""

    def __init__(self, most: int) -> None:
        """Start empty, with room for all."""
        self._places = np.full(1 << (2 * most).bit_length(), -1, dtype=np.int32)
        self._room = np.empty(most), np.empty(most), np.empty(most, dtype=np.int64)
        self._used = 0

    def add(self, low: Floats, high: Floats) -> int:
        """Add cycles, one each, and return how many of them, from the first, found a place."""
        taken, self._used = _insert(low, high, self._places, *self._room, self._used)
        return int(taken)

    def rows(self) -> tuple[Floats, Floats, Ints]:
        """Return low, high and number of the pairs, in any order; as they are until more is added."""
        low, high, number = self._room
        return low[: self._used], high[: self._used], number[: self._used]


@_compiled(_numba.void(_given, _given, _whole, *[_numba.float64] * 3, _cells, _floats, _ints))
def _fold(low, high, number, per_cell, first, fine, cells, largest, times):  # type: ignore[no-untyped-def]
    each = 1 if number.size == low.size else 0  # 0: one number for all
    side, flat = cells.shape[0], cells.reshape(-1)
    span = largest[1] - largest[0]
    for r in range(low.size):
        x, y, n = low[r], high[r], number[each * r]
        if y - x >= span:
            if x == largest[0] and y == largest[1]:
                times[0] += n
            elif y - x > span or x > largest[0]:
                largest[0], largest[1], times[0], span = x, y, n, y - x
        a, b = x * per_cell, y * per_cell
        i, j = np.floor(a), np.floor(b)
        at = _three * np.uint64((i - first) * side + (j - first))
        flat[at] += n
        flat[at + _one] += n * np.int64((a - i) * fine)
        flat[at + _two] += n * np.int64((b - j) * fine)


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
    """Add cycles to cells; see ``stack.fold``."""
    _fold(low, high, number[:1] if number.strides == (0,) else number, 1 / width, first, fine, cells, largest, times)
