"""A record in a few hundred columns: least and greatest value of equal stretches, gathered while it streams."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
COLUMNS = 512  # stretches kept: 512 to 1023 of them, whatever the length


@dataclass(frozen=True)
class Envelope:
    """Least (``low``) and greatest (``high``) value of stretches of ``samples`` samples, in order; NaN in gaps."""

    low: Floats
    high: Floats
    samples: int

    def columns(self, count: int) -> tuple[Floats, Floats]:
        """Return at most ``count`` columns: least and greatest of each."""
        edges = np.linspace(0, self.low.size, min(count, self.low.size) + 1).astype(int)[:-1]
        return np.fmin.reduceat(self.low, edges), np.fmax.reduceat(self.high, edges)


@dataclass
class EnvelopeAccumulator:
    """Feed it every block of one pass, in order."""

    _low: list[float] = field(default_factory=list)
    _high: list[float] = field(default_factory=list)
    _stretch: int = 1
    _open: Floats = field(default_factory=lambda: np.empty(0))

    def feed(self, block: Floats) -> None:
        """Take the next block of samples."""
        series = np.concatenate([self._open, block])
        while series.size // self._stretch + len(self._low) >= 2 * COLUMNS:
            series = self._halve(series)
        whole = series.size // self._stretch * self._stretch
        if whole:
            parts = series[:whole].reshape(-1, self._stretch)
            self._low += np.fmin.reduce(parts, axis=1).tolist()
            self._high += np.fmax.reduce(parts, axis=1).tolist()
        self._open = series[whole:]

    def _halve(self, series: Floats) -> Floats:
        """Join stretches two by two; the odd one goes back to the open samples as its two ends."""
        if len(self._low) % 2:
            ends = np.full(self._stretch, self._low.pop())
            ends[-1] = self._high.pop()
            series = np.concatenate([ends, series])
        self._low = [min(pair) for pair in zip(self._low[::2], self._low[1::2], strict=True)]
        self._high = [max(pair) for pair in zip(self._high[::2], self._high[1::2], strict=True)]
        self._stretch *= 2
        return series

    def result(self) -> Envelope:
        """Return the envelope of everything fed."""
        low, high = list(self._low), list(self._high)
        if self._open.size:
            low.append(float(np.fmin.reduce(self._open)))
            high.append(float(np.fmax.reduce(self._open)))
        return Envelope(np.array(low), np.array(high), self._stretch)
