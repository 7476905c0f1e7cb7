"""Surge: the local deflection of every coil from the motion of one end, by the exact transfer function.

The active wire is a uniform rod in the coil coordinate x, from 0 at the fixed end to 1 at the moving end:
u_tt + 2 zeta w1 u_t = u_xx/T^2, u(0, t) = 0, u(1, t) = y(t), where T is the time a wave takes along the
wire. The local deflection u_x says how far a coil is pressed, as the deflection that would press all coils
so: in slow motion it is y everywhere. Local stress is the static stress at the local deflection.
``surge_wave`` marches the same equation by characteristics, as the independent check, and lets the ends lift.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from functools import cache, partial
from importlib.resources import files
from itertools import chain
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError
from springlife.spring.helical import HelicalSpring
from springlife.units import significant

Floats = NDArray[np.float64]
Complex = NDArray[np.complex128]
MovingEnds = Literal["one", "both"]
Start = Literal["rest", "moving"]

# Numerical settings: what is left of a wave when it is forgotten, and of the ripple of the band's end; the part of
# the rate over which the band ends, and deviations of the Gaussian that ends it (1e-9 beyond either side); the
# longest memory in samples; kernel values kept rather than computed again for every block.
TRUNCATION, RIPPLE, BAND_END, DEVIATIONS, LONGEST, KEPT = 1e-6, 1e-9, 0.1, 6.0, 1 << 19, 1 << 22


@cache
def settings() -> dict[str, Any]:
    """Return data/surge.toml."""
    return tomllib.loads(files("springlife").joinpath("data/surge.toml").read_text(encoding="utf-8"))


@dataclass(frozen=True)
class Wave:
    """The wave in the coils: ``travel_time`` T from end to end in s, and ``zeta``, the first mode's damping ratio.

    Raises
    ------
    InputError
        T not above 0, or zeta not from 0 up to 1.
    """

    travel_time: float
    zeta: float

    def __post_init__(self) -> None:
        """Check both numbers."""
        if not 0 < self.travel_time < math.inf:
            raise InputError(f"travel_time is {self.travel_time:g} s; it must be above 0 and finite")
        if not 0 <= self.zeta < 1:
            raise InputError(f"damping ratio is {self.zeta:g}; it must be from 0 up to 1, such as 0.01")

    @property
    def first_frequency(self) -> float:
        """f1 = 1/(2T), Hz: the first natural frequency between seats."""
        return 0.5 / self.travel_time

    @property
    def memory(self) -> float:
        """Time in s after which :data:`TRUNCATION` of a wave is left; infinite without damping.

        Notes
        -----
        Every mode decays as exp(-zeta w1 t), w1 = pi/T.
        """
        return self.travel_time * math.log(1 / TRUNCATION) / (math.pi * self.zeta) if self.zeta else math.inf


def wave_of(spring: HelicalSpring, zeta: float) -> Wave:
    """Return the wave of a spring.

    Notes
    -----
    T = sqrt(m/k), m the active mass; so f1 = (1/2) sqrt(k/m).

    References
    ----------
    Shigley's Mechanical Engineering Design, eq. 10-25 (memory).
    """
    return Wave(math.sqrt(spring.active_mass / spring.rate), zeta)


def transfer(frequency: ArrayLike, position: ArrayLike, wave: Wave) -> Complex:
    """Return local deflection over the deflection of the moving end.

    Parameters
    ----------
    frequency : array_like
        Hz.
    position : array_like
        Coil coordinate from 0 at the fixed end to 1 at the moving end; broadcast with ``frequency``.
    wave : Wave
        Without damping the value at a natural frequency has no meaning.

    Notes
    -----
    H = b cos(b x)/sin(b), b = w T sqrt(1 - 2 i zeta w1/w); 1 at w = 0. At the n-th natural frequency of a
    lightly damped spring |H| is n/zeta at the ends.

    References
    ----------
    Derived from the equation of the module; the undamped end forces w T/sin(w T) and w T cot(w T) are the
    classical ones of a rod.
    """
    omega = 2 * np.pi * np.asarray(frequency, dtype=np.float64)
    x = np.asarray(position, dtype=np.float64)
    b = wave.travel_time * np.sqrt(omega * (omega - 2j * wave.zeta * np.pi / wave.travel_time))
    still = b == 0
    b = np.where(still, 1.0, b)
    return np.asarray(np.where(still, 1.0, b * np.cos(b * x) / np.sin(b)))[()]


def response(frequency: Floats, positions: Floats, wave: Wave, moving_ends: MovingEnds = "one") -> Complex:
    """Return the transfer function, shape (positions, frequencies), with one end moving or both by half each."""
    x = np.asarray(positions, dtype=np.float64)[:, None]
    if moving_ends == "one":
        return transfer(frequency, x, wave)
    return (transfer(frequency, x, wave) + transfer(frequency, 1 - x, wave)) / 2


def needed_rate(wave: Wave) -> float:
    """Return the least sample rate, Hz, at which a record can show what moves the first modes.

    Notes
    -----
    Modes and the ratio of rate to highest frequency stand in data/surge.toml. Below this rate motion that
    excites the spring is missing from the record or aliased in it, and no computing brings it back.
    """
    sampling = settings()["sampling"]
    return float(sampling["rate_over_band"] * sampling["modes"] * wave.first_frequency)


def impact_stress(speed: float, shear_modulus: float, density: float, stress_factor: float = 1.0) -> float:
    """Return the stress, Pa, that a seat adds to the coils it drives at a speed, whatever the geometry.

    Parameters
    ----------
    speed, shear_modulus, density : float
        Of the seat, m/s; of the wire, Pa and kg/m^3.
    stress_factor : float
        K, for the curvature.

    Notes
    -----
    K v sqrt(2 rho G), while the wave has not come back; at a fixed end it doubles.

    References
    ----------
    A. M. Wahl, Mechanical Springs (memory); follows from k/m and the stress of a spring.
    """
    return stress_factor * speed * math.sqrt(2 * density * shear_modulus)


def peak_factor(up_to: float, sample_rate: float) -> int:
    """Return how many times finer than ``sample_rate`` peaks of frequencies ``up_to`` (Hz) must be sampled."""
    return max(1, math.ceil(float(settings()["peaks"]["samples"]) * up_to / sample_rate))


def local_deflection(
    blocks: Iterable[ArrayLike],
    sample_rate: float,
    wave: Wave,
    positions: ArrayLike,
    *,
    up_to: float | None = None,
    upsample: int = 1,
    start: Start = "rest",
    moving_ends: MovingEnds = "one",
) -> Iterator[Floats]:
    """Yield the local deflection at each position, in blocks of a length that the wave's memory sets.

    Parameters
    ----------
    blocks : iterable of array_like
        Deflection, m, as one history in pieces of any length, without gaps.
    sample_rate : float
        Hz.
    wave : Wave
        Damped: without damping a wave is never forgotten (``surge_wave`` marches that).
    positions : array_like, shape (n,)
        Coil coordinates, 0 at the fixed end to 1 at the moving end.
    up_to : float, optional
        Hz: motion above is left out, which keeps the noise of a sensor from being taken for impacts. By default,
        and at most, 0.4 of the sample rate.
    upsample : int
        Samples given for each one taken, by band-limited interpolation, so that peaks between samples are seen.
    start : "rest", "moving"
        What went before: the spring at rest at the first deflection, so that a motion already under way strikes
        it; or the first motion seen in a mirror (odd about the first sample) and fading out backwards.
    moving_ends : "one", "both"
        Whether the end at 1 moves alone, or both by half the deflection each.

    Yields
    ------
    ndarray, shape (n, m)
        m; together (samples - 1) * upsample + 1 columns.

    Raises
    ------
    InputError
        No damping, a rate or band that cannot be, a memory of more than :data:`LONGEST` samples, a gap.

    Notes
    -----
    Overlap-save: blocks are transformed with the samples of the wave's memory before them, so nothing wraps
    around; what is left out is :data:`TRUNCATION` of each wave. Between ``up_to`` and the end of the band the
    transfer function fades as the integral of a Gaussian, whose ripple reaches some hundred samples back and ahead.
    """
    x = np.atleast_1d(np.asarray(positions, dtype=np.float64))
    if x.ndim != 1 or not x.size or not ((x >= 0) & (x <= 1)).all():
        raise InputError(f"positions are {x.tolist()}; give a list of numbers from 0 (fixed end) to 1 (moving end)")
    if wave.zeta == 0:
        raise InputError("damping ratio is 0; without damping a wave is never forgotten, give one such as 0.01")
    band = _Band.of(sample_rate, up_to)
    past = math.ceil(wave.memory * sample_rate) + band.ripple
    if past > LONGEST:
        raise InputError(
            f"at {significant(sample_rate)} Hz the wave of {significant(wave.travel_time)} s with damping ratio "
            f"{wave.zeta:g} is remembered for {past} samples, more than {LONGEST}; "
            f"resample the record to about {significant(10 * needed_rate(wave), 2)} Hz"
        )
    kernels = [partial(response, positions=one, wave=wave, moving_ends=moving_ends) for one in x[:, None]]
    return _overlap_save(blocks, kernels, band, past, upsample, start)


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
    band = _Band.of(sample_rate, None)
    past = 8 * band.ripple  # long against the kernel, which then does not feel the mirror image fade
    parts = _overlap_save([samples], [lambda f: np.ones((1, f.size), complex)], band, past, factor, "moving")
    return np.concatenate([part[0] for part in parts])


@dataclass(frozen=True)
class _Band:
    """The frequencies kept: all up to ``up_to``, none above ``up_to + fade``, Hz."""

    rate: float
    up_to: float
    fade: float

    @classmethod
    def of(cls, sample_rate: float, up_to: float | None) -> _Band:
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


def _overlap_save(
    blocks: Iterable[ArrayLike],
    kernels: Sequence[Callable[[Floats], Complex]],
    band: _Band,
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
            line = np.concatenate([line, _checked(block) - y0])
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


def _checked(block: ArrayLike) -> Floats:
    values = np.asarray(block, dtype=np.float64)
    if not np.isfinite(values).all():
        raise InputError("the history has a gap or an infinite value; give its pieces one by one")
    return values


def _gathered(blocks: Iterator[ArrayLike], least: int) -> Floats:
    """Take blocks until there are ``least`` samples, or all of them."""
    found: list[Floats] = []
    count = 0
    for block in blocks:
        found.append(_checked(block))
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
