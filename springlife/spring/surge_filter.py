"""Filtering a history that comes in blocks: overlap-save through the FFT, with a band whose end is smooth.

The band ends as the integral of a Gaussian, so that a kernel dies away as a Gaussian does, and what is cut off
is known.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import chain
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError

Floats = NDArray[np.float64]
Complex = NDArray[np.complex128]
Start = Literal["rest", "moving"]

# Numerical settings: what is left of the ripple of the band's end when it is cut; the part of the rate over which
# the band ends, and deviations of the Gaussian that ends it (1e-9 beyond either side); kernel values that are kept
# rather than computed again for every block.
RIPPLE, BAND_END, DEVIATIONS, KEPT = 1e-9, 0.1, 6.0, 1 << 22


@dataclass(frozen=True)
class Band:
    """The frequencies kept: all up to ``up_to``, none above ``up_to + fade``, Hz."""

    rate: float
    up_to: float
    fade: float

    @classmethod
    def of(cls, sample_rate: float, up_to: float | None) -> Band:
        """Return the band of a record sampled at a rate, Hz, up to a frequency or to 0.4 of the rate."""
        if not 0 < sample_rate < math.inf:
            raise InputError(f"sample rate is {sample_rate:g} Hz; it must be above 0 and finite")
        most = (0.5 - BAND_END) * sample_rate
        if up_to is None:
            return cls(sample_rate, most, BAND_END * sample_rate)
        if not 0 < up_to <= most * (1 + 1e-12):
            raise InputError(f"up_to is {up_to:g} Hz; it must be above 0 and at most {most:g} Hz, 0.4 of the rate")
        return cls(sample_rate, up_to, min(BAND_END * sample_rate, up_to / 4))

    @property
    def ripple(self) -> int:
        """Samples after which the ripple of the band's end has gone: a Gaussian's transform is a Gaussian."""
        deviation = self.fade / (2 * DEVIATIONS)
        return math.ceil(math.sqrt(2 * math.log(1 / RIPPLE)) / (2 * math.pi * deviation) * self.rate)

    def gain(self, frequency: Floats) -> Floats:
        """Return the part of each frequency (Hz) that is kept."""
        from scipy.special import erfc

        return np.asarray(erfc((2 * (frequency - self.up_to) / self.fade - 1) * DEVIATIONS / math.sqrt(2)) / 2)


def overlap_save(
    blocks: Iterable[ArrayLike],
    kernels: Sequence[Callable[[Floats], Complex]],
    band: Band,
    past: int,
    upsample: int,
    start: Start,
) -> Iterator[Floats]:
    """Filter a history, given in blocks, by kernels whose gain at 0 Hz is 1 and that reach ``past`` samples back.

    A kernel gives its transfer function at frequencies in Hz, shape (1, n).
    """
    if upsample < 1:
        raise InputError(f"upsample is {upsample}; it must be a whole number from 1")
    lead, ahead = band.ripple, iter(blocks)
    size = 1 << (2 * (past + lead) - 1).bit_length()
    step = size - past - lead
    first = _gathered(ahead, past + 1)
    if not first.size:
        return
    y0 = first[0]
    frequency = np.asarray(np.fft.rfftfreq(size, 1 / band.rate), dtype=np.float64)
    gain = band.gain(frequency)

    def rows() -> Iterator[Complex]:
        return (kernel(frequency)[0] * gain for kernel in kernels)

    kept = list(rows()) if len(kernels) * frequency.size <= KEPT else None
    line = np.concatenate([_before(first, past, start), first]) - y0
    early = upsample - 1  # samples between the one before the first and the first
    for block in chain(ahead, [None]):
        if block is None:
            line = np.concatenate([line, _mirrored(line, lead)])
        else:
            line = np.concatenate([line, finite_row(block) - y0])
        while line.size >= size:
            yield y0 + _filtered(line[:size], kept or rows(), upsample, past, step)[:, early:]
            line, early = line[step:], 0
    rest = line.size - past - lead
    if rest > 0:
        line = np.concatenate([line, np.full(size - line.size, line[-1])])
        yield y0 + _filtered(line, kept or rows(), upsample, past, rest)[:, early:]


def _filtered(line: Floats, rows: Iterable[Complex], upsample: int, past: int, count: int) -> Floats:
    """Transform one stretch, and return ``count`` samples after ``past``, each with those between it and the last."""
    spectrum = np.fft.rfft(line) * upsample
    size = line.size * upsample
    kept = slice((past - 1) * upsample + 1, (past + count - 1) * upsample + 1)
    return np.stack([np.fft.irfft(spectrum * row, size)[kept] for row in rows])


def finite_row(block: ArrayLike) -> Floats:
    """Return samples as an array; a gap or an infinite value is refused."""
    values = np.asarray(block, dtype=np.float64)
    if not np.isfinite(values).all():
        raise InputError("the history has a gap or an infinite value; give its pieces one by one")
    return values


def _gathered(blocks: Iterator[ArrayLike], least: int) -> Floats:
    """Take blocks until there are ``least`` samples, or all of them."""
    found: list[Floats] = []
    count = 0
    for block in blocks:
        found.append(finite_row(block))
        count += found[-1].size
        if count >= least:
            break
    return np.concatenate(found) if found else np.empty(0)


def _before(first: Floats, past: int, start: Start) -> Floats:
    """Return what went before the first sample, ``past`` samples long."""
    before = np.full(past, first[0])
    if start == "moving":
        seen = first[1 : past + 1]
        fade = (1 + np.cos(np.pi * np.arange(1, seen.size + 1) / (seen.size + 1))) / 2
        before[past - seen.size :] = (first[0] - fade * (seen - first[0]))[::-1]
    return before


def _mirrored(line: Floats, lead: int) -> Floats:
    """Return what comes after the last sample, ``lead`` samples long: the history odd about its end."""
    seen = line[-2 : -lead - 2 : -1]
    after = 2 * line[-1] - seen
    return np.concatenate([after, np.full(lead - after.size, after[-1] if after.size else line[-1])])


def upsampled(samples: ArrayLike, factor: int, sample_rate: float = 1.0) -> Floats:
    """Return a history sampled ``factor`` times finer, by band-limited interpolation through the FFT.

    Parameters
    ----------
    samples : array_like, shape (n,)
        Beyond its ends the history is continued by its mirror image, odd about the end.
    factor : int
        At least 1.
    sample_rate : float
        Hz; only errors speak of it.

    Returns
    -------
    ndarray, shape ((n - 1) * factor + 1,)
        Content up to 0.4 of the sample rate passes; above it fades and is gone at half the rate.
    """
    band = Band.of(sample_rate, None)
    past = 8 * band.ripple  # long against the kernel, which then does not feel the mirror image fade
    parts = overlap_save([samples], [lambda f: np.ones((1, f.size), complex)], band, past, factor, "moving")
    return np.concatenate([part[0] for part in parts])
