"""What a recorded signal shows about how it was recorded, gathered block by block in flat memory.

Nothing here knows of springs: values are in the unit of the samples, times in seconds.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from springlife.duty.counting import Count, Tally

Floats = NDArray[np.float64]
SEGMENT = 4096  # samples of one spectrum
SPIKE_STEPS = 20.0  # a spike leaves and returns by more than this many times the block's 99 % step
MOST_PLACES = 20  # spikes whose place is kept
MOST_SEGMENTS = 48  # of one block that enter the spectrum
SAMPLED = 8192  # steps of a block that tell its usual step
_WINDOW = np.hanning(SEGMENT)


@dataclass(frozen=True)
class Spectrum:
    """Mean power of Hann-windowed segments, half overlapping (P. D. Welch, 1967): frequencies Hz, power per bin."""

    frequency: Floats
    power: Floats

    def below(self, share: float) -> float:
        """Return the frequency under which a share of the power lies, Hz."""
        total = np.cumsum(self.power)
        return float(self.frequency[int(np.searchsorted(total, share * total[-1]))]) if total[-1] > 0 else 0.0

    def share_near(self, frequency: float, width: float = 0.1) -> float:
        """Return the share of the power within ``width`` (relative) of a frequency."""
        total = float(self.power.sum())
        near = np.abs(self.frequency - frequency) <= width * frequency
        return float(self.power[near].sum()) / total if total > 0 else 0.0


@dataclass(frozen=True)
class SignalFacts:
    """A recorded signal at a glance, for the findings.

    ``half_rate`` is the count of every second sample; ``spikes`` the number of isolated samples and ``spike_at``
    the first of their places; ``fastest`` the greatest change from one sample to the next.
    """

    samples: int
    sample_rate: float | None
    crossings: int
    fastest: float
    spikes: int
    spike_at: tuple[int, ...]
    longest_inside: int
    half_rate: Count
    spectrum: Spectrum | None

    @property
    def samples_a_cycle(self) -> float | None:
        """Samples between two upward crossings of the mean level; None without any."""
        return 2 * self.samples / self.crossings if self.crossings else None


@dataclass
class SignalAccumulator:
    """Feed it every block of one pass, in order; gaps are NaN."""

    _position: int = 0
    _samples: int = 0
    _crossings: int = 0
    _fastest: float = 0.0
    _spikes: int = 0
    _places: list[int] = field(default_factory=list)
    _inside: int = 0
    _run: int = 0
    _half: Tally = field(default_factory=lambda: Tally(nan="split"))
    _level: float | None = None
    _low: float = np.inf
    _high: float = -np.inf
    _tail: Floats = field(default_factory=lambda: np.empty(0))
    _segments: int = 0
    _power: Floats = field(default_factory=lambda: np.zeros(SEGMENT // 2 + 1))
    _pending: Floats = field(default_factory=lambda: np.empty(0))

    def feed(self, block: Floats) -> None:
        """Take the next block of samples."""
        if not block.size:
            return
        self._half.feed(block[self._position % 2 :: 2])
        series = np.concatenate([self._tail, block])
        self._feed_steps(series)
        self._feed_spectrum(block)
        self._tail = block[-2:] if block.size > 1 else series[-2:]
        self._position += block.size
        self._samples += int(np.count_nonzero(~np.isnan(block)))

    def _feed_steps(self, series: Floats) -> None:
        """Take steps, crossings, spikes and runs; ``series`` begins with the last two samples seen before."""
        steps = np.diff(series)
        sizes = np.abs(steps)
        if np.isnan(sizes).all():
            return
        self._fastest = max(self._fastest, float(np.nanmax(sizes)))
        if self._level is None:
            self._level = float(np.nanmean(series))
        new = series[self._tail.size - 1 :] if self._tail.size else series
        above = new > self._level  # a gap reads as below: at most one crossing too many for each
        self._crossings += int(np.count_nonzero(above[1:] != above[:-1]))
        few = sizes[:: max(1, sizes.size // SAMPLED)]
        self._feed_spikes(steps, sizes, float(np.nanquantile(few, 0.99)))
        self._feed_runs(series)

    def _feed_spikes(self, steps: Floats, sizes: Floats, usual: float) -> None:
        """An isolated sample leaves by a step far past the usual and comes straight back."""
        if usual <= 0:
            return
        far = np.flatnonzero(sizes[:-1] > SPIKE_STEPS * usual)
        leave, back = steps[far], steps[far + 1]
        isolated = (
            (np.abs(back) > SPIKE_STEPS * usual) & (leave * back < 0) & (np.abs(leave + back) < 0.5 * np.abs(leave))
        )
        at = far[isolated] + 1 + self._position - self._tail.size
        self._spikes += at.size
        self._places += at[: MOST_PLACES - len(self._places)].tolist()

    def _feed_runs(self, series: Floats) -> None:
        """Keep the longest run of one value inside the range: a clipped sensor has long runs at its ends only."""
        self._low, self._high = min(self._low, float(np.nanmin(series))), max(self._high, float(np.nanmax(series)))
        edges = np.flatnonzero(np.concatenate([[True], series[1:] != series[:-1], [True]]))
        lengths, values = np.diff(edges), series[edges[:-1]]
        inside = (values > self._low) & (values < self._high)
        self._inside = max(self._inside, int(lengths[inside].max(initial=0)))

    def _feed_spectrum(self, block: Floats) -> None:
        """Add segments half overlapping; of a long block evenly spread ones, which its spectrum does not notice."""
        self._pending = np.concatenate([self._pending, block])
        last = self._pending.size - SEGMENT
        if last < 0:
            return
        every = SEGMENT // 2 * max(1, last // (SEGMENT // 2 * MOST_SEGMENTS))
        for start in range(0, last + 1, every):
            part = self._pending[start : start + SEGMENT]
            if not np.isnan(part).any():
                self._power += np.abs(np.fft.rfft(_WINDOW * (part - part.mean()))) ** 2
                self._segments += 1
        self._pending = self._pending[last + SEGMENT // 2 :]

    def result(self, sample_rate: float | None) -> SignalFacts:
        """Return the facts; the sample rate is known after the pass."""
        spectrum = None
        if sample_rate is not None:
            spectrum = self._spectrum(sample_rate)
        return SignalFacts(
            samples=self._samples,
            sample_rate=sample_rate,
            crossings=self._crossings,
            fastest=self._fastest,
            spikes=self._spikes,
            spike_at=tuple(self._places),
            longest_inside=self._inside,
            half_rate=self._half.result(),
            spectrum=spectrum,
        )

    def _spectrum(self, sample_rate: float) -> Spectrum | None:
        """Return the mean spectrum; a record shorter than a segment gives one spectrum of what there is."""
        if self._segments:
            return Spectrum(_frequencies(SEGMENT, sample_rate), self._power / self._segments)
        part = self._pending[~np.isnan(self._pending)]
        if part.size < 16:
            return None
        power = np.abs(np.fft.rfft(np.hanning(part.size) * (part - part.mean()))) ** 2
        return Spectrum(_frequencies(part.size, sample_rate), power)


def _frequencies(samples: int, sample_rate: float) -> Floats:
    return np.fft.rfftfreq(samples, 1 / sample_rate).astype(np.float64)


def without_spikes(block: Floats, places: NDArray[np.intp]) -> Floats:
    """Return a block with the samples at ``places`` put halfway between their neighbours."""
    mended = block.copy()
    inner = places[(places > 0) & (places < block.size - 1)]
    mended[inner] = (block[inner - 1] + block[inner + 1]) / 2
    return mended
