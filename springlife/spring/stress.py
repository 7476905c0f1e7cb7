"""Shear stress at the inside of the coil: curvature factors, and the map from deflection to stress."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError, nearest
from springlife.spring.helical import HelicalSpring

Floats = NDArray[np.float64]
Index = TypeVar("Index", float, Floats)


def direct_shear(C: Index) -> Index:
    """Return the direct-shear factor Ks, without curvature, for a spring index C (float or ndarray).

    Notes
    -----
    Ks = 1 + 0.5/C. Used after set removal, when yielding has evened out the effect of curvature.

    References
    ----------
    Shigley's Mechanical Engineering Design, ch. 10 (memory).
    """
    return 1 + 0.5 / C


def bergstraesser(C: Index) -> Index:
    """Return Bergstraesser's stress factor KB for a spring index C (float or ndarray).

    Notes
    -----
    KB = (4C + 2)/(4C - 3), which is also (C + 0.5)/(C - 0.75) of EN 13906-1. Within 0.13 % of the exact
    torsion of a ring sector for C from 4 to 12.

    References
    ----------
    Shigley's Mechanical Engineering Design, eq. 10-5 (memory).
    """
    return (4 * C + 2) / (4 * C - 3)


def wahl(C: Index) -> Index:
    """Return Wahl's stress factor KW for a spring index C (float or ndarray).

    Notes
    -----
    KW = (4C - 1)/(4C - 4) + 0.615/C. Above the exact torsion of a ring sector by 0.5 to 1.6 % for C from
    4 to 12.

    References
    ----------
    A. M. Wahl, Mechanical Springs; Shigley's Mechanical Engineering Design, eq. 10-4 (memory).
    """
    return (4 * C - 1) / (4 * C - 4) + 0.615 / C


def greatest_index(amplitude: float, shear: float) -> float:
    """Return the spring index at which Bergstraesser's factor brings a load just to a stress.

    Parameters
    ----------
    amplitude : float
        Stress to be reached, Pa.
    shear : float
        beta = 8 F/(pi d^2) of the load, Pa; below the amplitude by the factor that an index of about 2 needs.

    Raises
    ------
    InputError
        No index gives this stress: the wire is too thin for the load.

    Notes
    -----
    KB beta C = amplitude, a quadratic in C; the larger root
    C = (2a - b)/(4b) + sqrt(((2a - b)/(4b))^2 - 3a/(4b)).

    References
    ----------
    Shigley's Mechanical Engineering Design, eq. 10-23 (memory).
    """
    half = (2 * amplitude - shear) / (4 * shear)
    inside = half * half - 3 * amplitude / (4 * shear)
    if half <= 0 or inside < 0:
        raise InputError(f"no spring index brings the load to {amplitude:g} Pa; take a thicker wire")
    return half + math.sqrt(inside)


FACTORS: dict[str, Callable[[float], float]] = {"bergstraesser": bergstraesser, "wahl": wahl}
CURVATURE_ON = ("both", "alternating")


@dataclass(frozen=True)
class StressMap:
    """Deflection to stress as plain numbers: Pa per m of deflection, and the deflection at solid in m.

    ``alternating`` carries the full factor K; ``mean`` carries K or Ks by the practice chosen; ``static``
    carries K before set removal and Ks after it.
    """

    alternating: float
    mean: float
    static_part: float
    solid_deflection: float

    def cycles(self, low: ArrayLike, high: ArrayLike) -> tuple[Floats, Floats]:
        """Return alternating and mean stress of cycles between two deflections.

        Parameters
        ----------
        low, high : array_like
            Deflections from the free length, m, ``low <= high``.

        Returns
        -------
        tau_a, tau_m : ndarray
            Pa. Off the seat the stress is zero, past solid it is that at solid; a cycle that lies wholly
            outside comes out with ``tau_a`` zero.

        Notes
        -----
        tau = K 8 F D/(pi d^3), F = k y. The map is monotone, so cycles counted in deflection are the cycles
        counted in stress.

        References
        ----------
        Shigley's Mechanical Engineering Design, ch. 10; with Ks on the mean: A. M. Wahl, Mechanical Springs,
        and Norton, Machine Design, ch. 14 (memory).
        """
        bottom, top = self._clipped(low), self._clipped(high)
        return self.alternating * (top - bottom) / 2, self.mean * (top + bottom) / 2

    def of_deflection(self, y: ArrayLike) -> Floats:
        """Return the stress with the full factor K at a deflection in m, Pa; never falling."""
        return np.asarray(self.alternating * self._clipped(y))[()]

    def static(self, y: ArrayLike) -> Floats:
        """Return the stress to hold against the static limit at a deflection in m, Pa.

        Notes
        -----
        With K before set removal and Ks after it (Shigley's table 10-6, memory).
        """
        return np.asarray(self.static_part * self._clipped(y))[()]

    def _clipped(self, y: ArrayLike) -> Floats:
        return np.clip(np.asarray(y, dtype=np.float64), 0.0, self.solid_deflection)


def stress_map(spring: HelicalSpring, factor: str = "bergstraesser", curvature_on: str = "both") -> StressMap:
    """Return the map from deflection to stress of a spring.

    Parameters
    ----------
    spring : HelicalSpring
        The part; its rate in use is the measured one when there is one.
    factor : str
        A key of :data:`FACTORS`.
    curvature_on : str
        "both": K on alternating and mean stress; "alternating": Ks on the mean.

    Raises
    ------
    InputError
        An unknown factor or practice.
    """
    if factor not in FACTORS:
        raise InputError(f"stress factor {factor!r} is not known; {nearest(factor, FACTORS)}")
    if curvature_on not in CURVATURE_ON:
        raise InputError(f"curvature_on {curvature_on!r} is not known; {nearest(curvature_on, CURVATURE_ON)}")
    d, D = spring.wire_diameter, spring.mean_diameter
    plain = 8 * spring.rate * D / (math.pi * d**3)
    K, Ks = FACTORS[factor](D / d), direct_shear(D / d)
    return StressMap(
        alternating=K * plain,
        mean=(K if curvature_on == "both" else Ks) * plain,
        static_part=(Ks if spring.set_removed else K) * plain,
        solid_deflection=spring.solid_deflection,
    )
