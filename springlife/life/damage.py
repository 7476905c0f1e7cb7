"""From deflection cycles to damage: the stress map, the criterion and the curve put together.

Damage is Miner's sum D = sum n_i / N_i. The three readings of cycles under the knee live in the curve.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from springlife.spring.stress import StressMap
from springlife.strength.criteria import Criterion
from springlife.strength.curve import LifeCurve, Miner

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class DamageModel:
    """Everything that turns a deflection cycle into a number of cycles to failure.

    Strengths ``Ssu``, ``Ssy`` in Pa.
    """

    stress: StressMap
    criterion: Criterion
    curve: LifeCurve
    Ssu: float
    Ssy: float
    miner: Miner

    def cycles_to_failure(self, low: Floats, high: Floats, factor: float = 1.0) -> Floats:
        """Return N, shape of ``low``, for cycles between deflections ``low`` and ``high`` in m.

        ``factor`` multiplies every stress. A mean at or past the criterion's intercept gives N = 0;
        cycles without damage give infinity.
        """
        tau_a, tau_m = self.stress.cycles(low, high)
        equivalent = self.criterion.equivalent(factor * tau_a, factor * tau_m, self.Ssu, self.Ssy)
        return self.curve.cycles(equivalent, self.miner)

    def damage(self, low: Floats, high: Floats, count: Floats, factor: float = 1.0) -> Floats:
        """Return the damage n/N of each row; infinite where the cycle fails at once."""
        lives = self.cycles_to_failure(low, high, factor)
        with np.errstate(divide="ignore"):
            return np.asarray(np.where(count > 0, count / lives, 0.0), dtype=np.float64)


def greatest_factor(damage_at: Callable[[float], float], allowed: float, ceiling: float) -> float:
    """Return the factor on every stress at which the damage just reaches ``allowed``.

    Parameters
    ----------
    damage_at : callable
        Damage at the target as a function of the factor; never falling.
    allowed : float
        Allowed Miner sum.
    ceiling : float
        Factor at which another limit (yield) governs; the search ends there.

    Returns
    -------
    float
        ``ceiling`` when the damage there is still allowed.
    """
    from scipy.optimize import brentq

    def excess(log_factor: float) -> float:
        # Logarithm, held finite: damage may be zero under the knee and infinite past an intercept.
        damage = damage_at(float(np.exp(log_factor)))
        return float(np.clip(np.log(max(damage, 1e-300) / allowed), -100.0, 100.0))

    top = float(np.log(ceiling))
    if excess(top) <= 0:
        return ceiling
    bottom = top - 1.0
    while excess(bottom) > 0:
        bottom -= 1.0
        if bottom < -30:
            return 0.0
    root = float(brentq(excess, bottom, top, xtol=1e-13, rtol=1e-13, maxiter=500))
    return float(np.exp(root))
