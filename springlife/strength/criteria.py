"""Fatigue criteria: how a mean stress takes away from the alternating stress that wire endures.

Each criterion is two laws: the share of the fully reversed strength that is left at a mean stress, and the
factor along a load line. Adding one is these two functions and one line in :data:`CRITERIA`.

All functions take scalars, arrays that broadcast, or Series (read by position), in any one unit of stress,
and return an array, or for scalars a NumPy float. Means at or below zero take nothing away.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import CriterionError, InputError, nearest

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Criterion:
    """One criterion, made of pure functions; the methods follow from them.

    ``fraction(tau_m, Ssu, Ssy)`` is the allowable amplitude as a fraction of the fully reversed strength,
    zero or negative at and past the intercept. ``load_line(a, m, i)`` is the factor n at which the point
    (n a, i + n m) reaches the allowable line, all stresses already divided by their strengths.
    ``intercept`` names the strength at which the mean alone fails, or is None.
    """

    name: str
    intercept: str | None
    fraction: Callable[[Floats, Floats, Floats], Floats]
    load_line: Callable[[Floats, Floats, Floats], Floats]

    def equivalent(self, tau_a: ArrayLike, tau_m: ArrayLike, Ssu: ArrayLike, Ssy: ArrayLike) -> Floats:
        """Return the fully reversed amplitude that harms as much as ``tau_a`` at the mean ``tau_m``.

        Parameters
        ----------
        tau_a, tau_m : array_like
            Alternating and mean shear stress, Pa.
        Ssu, Ssy : array_like
            Ultimate and yield strength in shear, Pa.

        Returns
        -------
        float or ndarray
            tau_ar, Pa; infinite where the mean is at or past the intercept: a static failure.

        Notes
        -----
        Goodman tau_a/(1 - tau_m/Ssu); Gerber tau_a/(1 - (tau_m/Ssu)^2); ASME-elliptic
        tau_a/sqrt(1 - (tau_m/Ssy)^2); Sines tau_a.

        References
        ----------
        Shigley's Mechanical Engineering Design, ch. 6 and sec. 10-9 (memory).
        """
        tau_a, tau_m, Ssu, Ssy = _floats(tau_a, tau_m, Ssu, Ssy)
        left = self.fraction(np.maximum(tau_m, 0.0), Ssu, Ssy)
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(left <= 0, np.inf, tau_a / left)[()]

    def reversed_strength(self, Ssa: ArrayLike, Ssm: ArrayLike, Ssu: ArrayLike, Ssy: ArrayLike) -> Floats:
        """Return the fully reversed strength Sse on the criterion's own curve through (Ssm, Ssa), Pa.

        Raises
        ------
        CriterionError
            The mean strength ``Ssm`` is at or past the intercept, so that no curve passes through the point.
        """
        Sse = self.equivalent(Ssa, Ssm, Ssu, Ssy)
        if not np.all(np.isfinite(Sse)):
            raise CriterionError(self._no_strength(Ssm, Ssu, Ssy))
        return Sse

    def allowable(self, tau_m: ArrayLike, Sse: ArrayLike, Ssu: ArrayLike, Ssy: ArrayLike) -> Floats:
        """Return the allowable amplitude at a mean stress, Pa: the Haigh line, never below 0."""
        tau_m, Sse, Ssu, Ssy = _floats(tau_m, Sse, Ssu, Ssy)
        return Sse * np.maximum(self.fraction(np.maximum(tau_m, 0.0), Ssu, Ssy), 0.0)

    def safety_factor(
        self, tau_a: ArrayLike, tau_m: ArrayLike, Sse: ArrayLike, Ssu: ArrayLike, Ssy: ArrayLike
    ) -> Floats:
        """Return the factor on both stresses at which the allowable line is reached: r = tau_a/tau_m held.

        Notes
        -----
        Goodman 1/n = tau_a/Sse + tau_m/Ssu; Gerber tau_a n/Sse + (tau_m n/Ssu)^2 = 1; ASME-elliptic
        1/n^2 = (tau_a/Sse)^2 + (tau_m/Ssy)^2; Sines n = Sse/tau_a, whose Sse is the amplitude Ssa.

        References
        ----------
        Shigley's Mechanical Engineering Design, ch. 6 (memory).
        """
        return self.factor_fixed_preload(tau_a, tau_m, 0.0, Sse, Ssu, Ssy)

    def factor_fixed_preload(
        self,
        tau_a: ArrayLike,
        tau_m: ArrayLike,
        tau_i: ArrayLike,
        Sse: ArrayLike,
        Ssu: ArrayLike,
        Ssy: ArrayLike,
    ) -> Floats:
        """Return the factor on what comes on top of a preload stress ``tau_i``, which stays as it is.

        The load line starts at (tau_i, 0) in the Haigh diagram: n is the factor at which the amplitude
        n tau_a at the mean tau_i + n (tau_m - tau_i) reaches the allowable line. Zero when the preload alone
        is at or past the intercept; infinite without stress. Valid for tau_i not above tau_m.
        """
        tau_a, tau_m, tau_i, Sse, Ssu, Ssy = _floats(tau_a, tau_m, tau_i, Sse, Ssu, Ssy)
        limit = {"Ssu": Ssu, "Ssy": Ssy, None: np.asarray(np.inf)}[self.intercept]
        tau_m, tau_i = np.maximum(tau_m, 0.0), np.maximum(tau_i, 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            return self.load_line(tau_a / Sse, (tau_m - tau_i) / limit, tau_i / limit)[()]

    def _no_strength(self, Ssm: ArrayLike, Ssu: ArrayLike, Ssy: ArrayLike) -> str:
        from springlife.units import METRIC

        limit = float(np.min(np.asarray(Ssu if self.intercept == "Ssu" else Ssy, dtype=float)))
        mean = float(np.max(np.asarray(Ssm, dtype=float)))
        return (
            f"{self.name} has no fully reversed strength: the mean stress {METRIC(mean, 'stress')} of the "
            f"endurance data is at or past its intercept {self.intercept} = {METRIC(limit, 'stress')}; "
            "choose another criterion or endurance basis"
        )


def _floats(*values: ArrayLike) -> tuple[Floats, ...]:
    return tuple(np.asarray(value, dtype=np.float64) for value in values)


def _quadratic(A: Floats, b: Floats, c: Floats) -> Floats:
    """Return the positive root of A n^2 + b n - c = 0, in the form that holds for A = 0; 0 for c <= 0."""
    c = np.maximum(c, 0.0)
    root = 2 * c / (b + np.sqrt(b * b + 4 * A * c))
    return np.where(c > 0, root, 0.0)


# Goodman: tau_a/Sse + tau_m/Ssu = 1.
def _goodman(tau_m: Floats, Ssu: Floats, Ssy: Floats) -> Floats:
    return 1 - tau_m / Ssu


def _goodman_line(a: Floats, m: Floats, i: Floats) -> Floats:
    return np.where(i < 1, (1 - i) / np.maximum(a + m, 0.0), 0.0)


# Gerber: tau_a/Sse + (tau_m/Ssu)^2 = 1.
def _gerber(tau_m: Floats, Ssu: Floats, Ssy: Floats) -> Floats:
    return 1 - (tau_m / Ssu) ** 2


def _gerber_line(a: Floats, m: Floats, i: Floats) -> Floats:
    return _quadratic(m * m, a + 2 * i * m, 1 - i * i)


# ASME-elliptic: (tau_a/Sse)^2 + (tau_m/Ssy)^2 = 1.
def _elliptic(tau_m: Floats, Ssu: Floats, Ssy: Floats) -> Floats:
    return np.sqrt(np.maximum(1 - (tau_m / Ssy) ** 2, 0.0))


def _elliptic_line(a: Floats, m: Floats, i: Floats) -> Floats:
    return _quadratic(a * a + m * m, 2 * i * m, 1 - i * i)


# Sines: the mean shear stress takes nothing away.
def _sines(tau_m: Floats, Ssu: Floats, Ssy: Floats) -> Floats:
    return np.ones(np.broadcast_shapes(tau_m.shape, Ssu.shape, Ssy.shape))


def _sines_line(a: Floats, m: Floats, i: Floats) -> Floats:
    return 1 / (a + 0 * (m + i))


CRITERIA: dict[str, Criterion] = {
    one.name: one
    for one in (
        Criterion("goodman", "Ssu", _goodman, _goodman_line),
        Criterion("gerber", "Ssu", _gerber, _gerber_line),
        Criterion("asme-elliptic", "Ssy", _elliptic, _elliptic_line),
        Criterion("sines", None, _sines, _sines_line),
    )
}


def criterion(name: str) -> Criterion:
    """Look a criterion up by its name.

    Raises
    ------
    InputError
        The name is not one of :data:`CRITERIA`; the message lists them.
    """
    if name not in CRITERIA:
        raise InputError(f"criterion {name!r} is not known; {nearest(name, CRITERIA)}")
    return CRITERIA[name]


def yield_factor(tau_a: ArrayLike, tau_m: ArrayLike, Ssy: ArrayLike) -> Floats:
    """Return the factor against yield (Langer), n = Ssy/(tau_a + tau_m); infinite without stress.

    References
    ----------
    Shigley's Mechanical Engineering Design, ch. 6, first-cycle yield (memory).
    """
    tau_a, tau_m, Ssy = _floats(tau_a, tau_m, Ssy)
    with np.errstate(divide="ignore"):
        return np.divide(Ssy, tau_a + tau_m)
