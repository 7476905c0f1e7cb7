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
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cache, partial
from importlib.resources import files
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike

from springlife.errors import InputError
from springlife.spring.helical import HelicalSpring
from springlife.spring.surge_filter import Band, Complex, Floats, Start, finite_row, overlap_save
from springlife.units import significant

MovingEnds = Literal["one", "both"]

# Numerical settings: what is left of a wave when it is forgotten; the longest memory in samples.
TRUNCATION, LONGEST = 1e-6, 1 << 19


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
    band = Band.of(sample_rate, up_to)
    past = math.ceil(wave.memory * sample_rate) + band.ripple
    if past > LONGEST:
        raise InputError(
            f"at {significant(sample_rate)} Hz the wave of {significant(wave.travel_time)} s with damping ratio "
            f"{wave.zeta:g} is remembered for {past} samples, more than {LONGEST}; "
            f"resample the record to about {significant(10 * needed_rate(wave), 2)} Hz"
        )
    kernels = [partial(response, positions=one, wave=wave, moving_ends=moving_ends) for one in x[:, None]]
    return overlap_save(blocks, kernels, band, past, upsample, start)


def periodic(
    turn: ArrayLike,
    frequency: float,
    wave: Wave,
    positions: ArrayLike,
    *,
    up_to: float | None = None,
    moving_ends: MovingEnds = "one",
) -> Floats:
    """Return the steady local deflection under a motion that repeats for ever, such as a cam's.

    Parameters
    ----------
    turn : array_like, shape (m,)
        Deflection of one period, m, evenly spaced, the first sample not repeated at the end.
    frequency : float
        Periods a second, Hz.
    wave, positions, moving_ends
        As for :func:`local_deflection`.
    up_to : float, optional
        Hz: harmonics above are left out. All below half the samples a period are kept by default.

    Returns
    -------
    ndarray, shape (positions, n)
        m, over one period, with enough samples to see the peaks of the highest harmonic kept.

    Notes
    -----
    Harmonic by harmonic: exact, with no start to die away.
    """
    y = finite_row(turn)
    x = np.atleast_1d(np.asarray(positions, dtype=np.float64))
    most = (y.size - 1) // 2
    kept = min(most, int(up_to / frequency)) if up_to else most
    harmonics = np.arange(kept + 1, dtype=np.float64) * frequency
    lines = np.asarray(np.fft.rfft(y), dtype=np.complex128)[: kept + 1] * response(harmonics, x, wave, moving_ends)
    samples = max(y.size, math.ceil(float(settings()["peaks"]["samples"]) * kept))
    return np.asarray(np.fft.irfft(lines, samples, axis=1) * (samples / y.size))
