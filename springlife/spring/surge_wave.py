"""Surge marched along characteristics at Courant number one: the independent check of ``surge``.

Two waves run along the wire, a cell a step, and nothing is lost on the way. The ends may lift off their seats
and strike them again, or one end may be struck by a mass. Energy is kept account of.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError
from springlife.spring.surge import Wave
from springlife.spring.surge_filter import Floats

LONG = 20_000  # steps from which compiling pays


@dataclass(frozen=True)
class WaveMotion:
    """What a march gives; row n holds for the middle of step n, at (n + 1/2) step seconds.

    Parameters
    ----------
    step : float
        s.
    positions : ndarray, shape (p,)
        Coil coordinates at which ``local`` is given: the cell borders nearest to those asked for.
    local : ndarray, shape (n, p)
        Local deflection, m.
    fixed_end, moving_end : ndarray, shape (n,)
        Local deflection at the two ends, m; times the rate it is the force on the seat, 0 while lifted off.
    end_motion : ndarray, shape (n,)
        Deflection of the wire's moving end at the end of each step, m; above the seat's while it is lifted off.
    stored, work, lost : ndarray, shape (n,)
        Energy over the rate, m^2, at the end of each step: in the wire, put in by the ends (or the mass) since
        the start, and taken by damping since the start.
    """

    step: float
    positions: Floats
    local: Floats
    fixed_end: Floats
    moving_end: Floats
    end_motion: Floats
    stored: Floats
    work: Floats
    lost: Floats

    @property
    def times(self) -> Floats:
        """Middle of each step, s."""
        return np.asarray((np.arange(self.local.shape[0]) + 0.5) * self.step, dtype=np.float64)

    @property
    def lifted(self) -> NDArray[np.bool_]:
        """Whether an end carries no force, shape (n,)."""
        return (self.fixed_end <= 0) | (self.moving_end <= 0)


def march(
    deflection: ArrayLike,
    wave: Wave,
    cells: int,
    positions: ArrayLike = (0.0, 1.0),
    *,
    attached: bool = False,
    compiled: bool | None = None,
) -> WaveMotion:
    """March the wave under a given motion of the seat, from rest at its first deflection.

    Parameters
    ----------
    deflection : array_like, shape (n + 1,)
        Of the moving seat, m, at intervals of travel time / cells. A first deflection under 0 starts lifted off.
    wave : Wave
        With or without damping.
    cells : int
        Cells along the wire, which set the step.
    positions : array_like, shape (p,)
        Coil coordinates from 0 (fixed end) to 1.
    attached : bool
        Whether the seats can pull; a compression spring's cannot.
    compiled : bool, optional
        Compile the march with numba; by default when it has at least :data:`LONG` steps.

    Raises
    ------
    InputError
        Fewer than two deflections or one cell, values that are not finite, positions off the wire.

    Notes
    -----
    With v = u_t and q = u_x/T the waves v + q and v - q move one cell a step; q = 0 at a lifted end. Damping
    acts between the steps, so that the scheme is exact without it and of second order with it. Energy over the
    rate is the mean of (T^2 v^2 + u_x^2)/2.
    """
    y = np.ascontiguousarray(deflection, dtype=np.float64)
    if y.ndim != 1 or y.size < 2 or not np.isfinite(y).all():
        raise InputError("deflection must be at least two finite numbers in a row")
    rest = float(y[0]) if attached else max(0.0, float(y[0]))
    return _marched(y, wave, cells, positions, rest, attached, 0.0, 0.0, compiled)


def struck(
    mass_ratio: float,
    speed: float,
    steps: int,
    wave: Wave,
    cells: int,
    positions: ArrayLike = (0.0, 1.0),
    *,
    compiled: bool | None = None,
) -> WaveMotion:
    """March the wave after a mass has struck the free end of the resting wire; the far end is on its seat.

    Parameters
    ----------
    mass_ratio : float
        Active mass of the spring over the striking mass, above 0.
    speed : float
        m/s at which it strikes.
    steps, wave, cells, positions, compiled
        As for :func:`march`; the mass flies off when nothing presses it any more.

    References
    ----------
    Saint-Venant's problem: Timoshenko and Goodier, Theory of Elasticity (memory).
    """
    if not (0 < mass_ratio < math.inf and 0 < speed < math.inf) or steps < 1:
        raise InputError(f"mass ratio {mass_ratio:g}, speed {speed:g} m/s and steps {steps} must all be above 0")
    return _marched(np.zeros(steps + 1), wave, cells, positions, 0.0, False, 1 / mass_ratio, speed, compiled)


def _marched(
    y: Floats, wave: Wave, cells: int, positions: ArrayLike, rest: float, attached: bool, mass: float, speed: float,
    compiled: bool | None,
) -> WaveMotion:  # fmt: skip
    x = np.atleast_1d(np.asarray(positions, dtype=np.float64))
    if not ((x >= 0) & (x <= 1)).all():
        raise InputError(f"positions are {x.tolist()}; give numbers from 0 (fixed end) to 1 (moving end)")
    if cells < 1:
        raise InputError(f"cells is {cells}; give a whole number from 1")
    T, step = wave.travel_time, wave.travel_time / cells
    at = np.rint(x * cells).astype(np.int64)
    kept = math.exp(-2 * wave.zeta * math.pi / cells)
    run = _compiled() if (y.size > LONG if compiled is None else compiled) else _steps
    local, ends, energy = run(y / T, rest / T, cells, at, kept, attached, mass, speed)
    return WaveMotion(
        step, at / cells, local * T, ends[:, 0] * T, ends[:, 1] * T, ends[:, 2] * T,
        energy[:, 0] * T**2, energy[:, 1] * T**2, energy[:, 2] * T**2,
    )  # fmt: skip


def _steps(
    y: Floats, rest: float, cells: int, at: NDArray[np.int64], kept: float, attached: bool, mass: float, speed: float
) -> tuple[Floats, Floats, Floats]:
    """March in units of travel times: y and rest are deflections over T, mass is in active masses.

    Plain NumPy, which numba compiles as it stands. Returns local deflections over T, shape (n, p); local
    deflections at the ends and the position of the moving end, shape (n, 3); energies over T^2, shape (n, 3).
    """
    steps = y.size - 1
    local, ends, energy = np.empty((steps, at.size)), np.empty((steps, 3)), np.empty((steps, 3))
    dt = 1.0 / cells  # of a travel time
    left, right = np.full(cells, rest), np.full(cells, -rest)  # v + q runs to the fixed end, v - q from it
    q = np.empty(cells + 1)
    fixed, moving, work, lost = 0.0, rest, 0.0, 0.0
    for n in range(steps):
        arriving, leaving = right[cells - 1], left[0]
        if mass > 0:  # the mass's own speed changes by half of the force before the middle of the step
            v = (2 * mass * speed / dt + arriving) / (2 * mass / dt + 1)
            if v < arriving:
                v = arriving  # it has left, and the end is free
            speed = speed - (v - arriving) * dt / mass
        else:
            v = (y[n + 1] - moving) / dt
            if not attached and v < arriving:
                v = arriving
        v0 = -fixed / dt
        if not attached and v0 > leaving:
            v0 = leaving
        fixed, moving = fixed + v0 * dt, moving + v * dt
        q[0], q[cells] = leaving - v0, v - arriving
        q[1:cells] = (left[1:] - right[: cells - 1]) / 2
        work += (q[cells] * v - q[0] * v0) * dt
        left[: cells - 1] = left[1:].copy()
        left[cells - 1] = 2 * v - arriving
        right[1:] = right[: cells - 1].copy()
        right[0] = 2 * v0 - leaving
        for j in range(at.size):
            local[n, j] = q[at[j]]
        if kept < 1:
            sum_, difference = (left + right) / 2, (left - right) / 2
            lost += (1 - kept * kept) * np.sum(sum_ * sum_) * dt / 2
            left, right = kept * sum_ + difference, kept * sum_ - difference
        energy[n, 0] = np.sum(left * left + right * right) * dt / 4
        energy[n, 1], energy[n, 2] = work, lost
        ends[n, 0], ends[n, 1], ends[n, 2] = q[0], q[cells], moving
    return local, ends, energy


@cache
def _compiled() -> Callable[..., Any]:
    import numba

    try:
        run: Callable[..., Any] = numba.njit(cache=True)(_steps)
    except RuntimeError:  # nowhere to write the cache: compile once a process instead
        run = numba.njit(_steps)
    return run
