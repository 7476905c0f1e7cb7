"""The rainflow stack itself, on turning points.

With X, Y, Z three successive ranges, Y is closed when ``Y <= X and Y <= Z``, decided by comparing the four values
rather than by subtracting them. What stays, the residue, then grows strictly, swings through the extremes, and
shrinks strictly. Every adjacent pair of it is one half cycle of ASTM E1049-85 5.4.4.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


def push(stack: list[float], points: Sequence[float], low: list[float], high: list[float]) -> None:
    """Put samples on the stack one after the other; cycles that close go to ``low`` and ``high``."""
    for d in points:
        if stack:
            last = stack[-1]
            if d == last:
                continue
            if len(stack) > 1 and (last > stack[-2]) == (d > last):
                stack.pop()  # the last point did not turn
        stack.append(d)
        while len(stack) > 3:
            a, b, c = stack[-4:-1]
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
            del stack[-3:-1]


def trace(values: Sequence[float], order: Sequence[int]) -> tuple[list[int], list[int], list[int]]:
    """Do the same on positions in ``values``, taken in ``order``: those of lows, highs and residue."""
    stack: list[int] = []
    low: list[int] = []
    high: list[int] = []
    for i in order:
        d = values[i]
        if stack:
            last = values[stack[-1]]
            if d == last:
                continue
            if len(stack) > 1 and (last > values[stack[-2]]) == (d > last):
                stack.pop()
        stack.append(i)
        while len(stack) > 3:
            a, b, c = (values[j] for j in stack[-4:-1])
            rising = a < b
            if (c < a or d < b) if rising else (c > a or d > b):
                break
            low.append(stack[-2] if rising else stack[-3])
            high.append(stack[-3] if rising else stack[-2])
            del stack[-3:-1]
    return low, high, stack
