"""What a record looks like, gathered block by block while it is counted."""

from __future__ import annotations

from dataclasses import asdict, dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.duty.formats.table import Floats
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.duty.record import Recording

LEVELS = 1024  # distinct values counted before a record is called fine-grained
WINDOWS = 32  # windows whose minima show a drift
SHORTEST_WINDOW = 64  # samples


@dataclass(frozen=True)
class RecordSummary:
    """A record at a glance; values in SI.

    Positions count the samples that ``blocks()`` gave, from 0, separators of gaps included. ``levels`` is the
    number of distinct values, None when there are more than :data:`LEVELS`; ``resolution`` the smallest step
    between the distinct values seen. ``drift`` is how far the running minimum moves from start to end (the
    median slope through the minima of 16 to 32 windows), None for a short record.
    """

    samples: int
    span_s: float | None
    rate_Hz: float | None
    minimum: float
    maximum: float
    mean: float
    minimum_at: int
    maximum_at: int
    minimum_time_s: float | None
    maximum_time_s: float | None
    negative_share: float
    resolution: float | None
    levels: int | None
    longest_at_minimum: int
    longest_at_maximum: int
    drift: float | None
    drift_z: float | None  # Kendall's test of a trend in the minima: past 3 is no chance
    gaps: int
    repeated_times: int

    def to_dict(self) -> dict[str, Any]:
        """Give the summary for JSON."""
        return asdict(self)

    def lines(self) -> list[tuple[str, str]]:
        """Label and text of what a person wants to see first."""
        span = f", {significant(self.span_s)} s" if self.span_s is not None else ""
        rate = f" at {significant(self.rate_Hz)} Hz" if self.rate_Hz is not None else ", rate not known"
        lines = [("samples", f"{self.samples}{span}{rate}")]
        grain = f"more than {LEVELS}" if self.levels is None else str(self.levels)
        lines.append(("levels", f"{grain} distinct values"))
        runs = f"{self.longest_at_minimum} samples at the least value, {self.longest_at_maximum} at the greatest"
        lines.append(("longest runs", runs))
        if self.drift is not None and self.maximum > self.minimum:
            share = 100 * self.drift / (self.maximum - self.minimum)
            lines.append(("drift", f"the running minimum moves by {significant(share, 2)} % of the range"))
        if self.gaps or self.repeated_times:
            lines.append(("gaps", f"{self.gaps}, and {self.repeated_times} repeated times"))
        return lines


@dataclass
class _Extreme:
    """The greatest value (of the signal or of its negative), where it is, and the longest run at it."""

    value: float = -np.inf
    at: int = -1
    time: float | None = None
    longest: int = 0
    _open: int = 0  # length of the run that reaches the end of the last block

    def feed(self, block: Floats, greatest: float, start: int, times: Floats | None) -> None:
        if greatest < self.value:
            self._open = 0
            return
        at = np.flatnonzero(block == greatest)
        if greatest > self.value:
            first = int(at[0])
            self.value, self.at, self.longest, self._open = greatest, start + first, 0, 0
            self.time = None if times is None else float(times[first])
        breaks = np.flatnonzero(np.diff(at) > 1)
        firsts = np.concatenate([at[:1], at[breaks + 1]])
        lengths = np.concatenate([at[breaks], at[-1:]]) - firsts + 1
        if firsts[0] == 0:
            lengths[0] += self._open
        self.longest = max(self.longest, int(lengths.max()))
        self._open = int(lengths[-1]) if at[-1] == block.size - 1 else 0


@dataclass
class SummaryAccumulator:
    """Gathers a :class:`RecordSummary`; feed it every block of one pass, in order.

    With the recording given, times, rate and gaps are known too.
    """

    recording: Recording | None = None
    _position: int = field(default=0, repr=False)
    _samples: int = field(default=0, repr=False)
    _negative: int = field(default=0, repr=False)
    _sum: float = field(default=0.0, repr=False)
    _high: _Extreme = field(default_factory=_Extreme, repr=False)
    _low: _Extreme = field(default_factory=_Extreme, repr=False)
    _levels: Floats = field(default_factory=lambda: np.empty(0), repr=False)
    _fine: bool = field(default=False, repr=False)
    _minima: list[float] = field(default_factory=list, repr=False)
    _window: int = field(default=SHORTEST_WINDOW, repr=False)
    _partial: Floats = field(default_factory=lambda: np.empty(0), repr=False)

    def feed(self, block: Floats) -> None:
        """Take the next block, in SI, NaN where the record has gaps."""
        times = self.recording.block_times if self.recording else None
        if not block.size:
            return
        least = float(block.min())
        known = block
        if np.isnan(least):
            known = block[~np.isnan(block)]
            if not known.size:
                self._position += block.size
                self._high._open = self._low._open = 0
                return
            least = float(known.min())
        self._high.feed(block, float(known.max()), self._position, times)
        self._low.feed(-block, -least, self._position, times)
        self._position += block.size
        self._samples += known.size
        self._negative += int(np.count_nonzero(known < 0))
        self._sum += float(known.sum())
        if not self._fine:
            self._feed_levels(known)
        self._feed_minima(known)

    def _feed_levels(self, known: Floats) -> None:
        """Add the distinct values; give up counting when there are more than LEVELS."""
        for start in range(0, known.size, 1 << 16):
            part = known[start : start + (1 << 16)]
            part = part[np.concatenate([[True], part[1:] != part[:-1]])]
            if self._levels.size:
                near = np.searchsorted(self._levels, part).clip(max=self._levels.size - 1)
                part = part[self._levels[near] != part]
            if part.size:
                self._levels = np.union1d(self._levels, part)
            if self._levels.size > LEVELS:
                self._fine = True
                return

    def _feed_minima(self, known: Floats) -> None:
        """Keep the minima of windows of equal length, doubled whenever they grow too many."""
        series = np.concatenate([self._partial, known])
        whole = series.size // self._window
        self._minima += series[: whole * self._window].reshape(whole, self._window).min(axis=1).tolist()
        self._partial = series[whole * self._window :]
        while len(self._minima) >= 2 * WINDOWS:
            if len(self._minima) % 2:
                # The odd one out goes back into the open window: its minimum stands for its samples.
                last = np.full(self._window, self._minima.pop())
                self._partial = np.concatenate([last, self._partial])
            self._minima = [min(pair) for pair in zip(self._minima[::2], self._minima[1::2], strict=True)]
            self._window *= 2

    def result(self) -> RecordSummary:
        """Return the summary of everything fed."""
        recording = self.recording
        steps = np.diff(self._levels)
        drift, drift_z = self._drift()
        return RecordSummary(
            samples=self._samples,
            span_s=recording.span if recording else None,
            rate_Hz=recording.sample_rate if recording else None,
            minimum=-self._low.value,
            maximum=self._high.value,
            mean=self._sum / self._samples if self._samples else float("nan"),
            minimum_at=self._low.at,
            maximum_at=self._high.at,
            minimum_time_s=self._low.time,
            maximum_time_s=self._high.time,
            negative_share=self._negative / self._samples if self._samples else 0.0,
            resolution=float(steps.min()) if steps.size else None,
            levels=None if self._fine else self._levels.size,
            longest_at_minimum=self._low.longest,
            longest_at_maximum=self._high.longest,
            drift=drift,
            drift_z=drift_z,
            gaps=recording.gaps_found if recording else 0,
            repeated_times=recording.repeated_times if recording else 0,
        )

    def _drift(self) -> tuple[float | None, float | None]:
        """Median of the slopes between all pairs of window minima times the record's length, and Kendall's z."""
        n = len(self._minima)
        if n < WINDOWS // 2:
            return None, None
        minima = np.array(self._minima)
        i, j = np.triu_indices(n, 1)
        rises = minima[j] - minima[i]
        z = np.sign(rises).sum() / np.sqrt(n * (n - 1) * (2 * n + 5) / 18)
        return float(np.median(rises / (j - i)) * n), float(z)
