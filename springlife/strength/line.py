"""A Basquin line fitted to tests: lives with their intervals, and design lives.

The line is log10 N = A + B log10 S with normal scatter s in log10 N; S is the fully reversed amplitude.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from springlife.errors import InputError
from springlife.strength.criteria import Floats
from springlife.strength.likelihood import Censored, Quantity, coefficient, quantile, scatter
from springlife.units import METRIC, significant

CONFIDENCE = 0.9  # of intervals, when not asked otherwise
POINTS = 9  # of a curve between the least and greatest amplitude tested
EXACT = "tolerance bound by noncentral t, exact: every spring failed"
APPROXIMATE = "tolerance bound by noncentral t, approximate: run-outs enter by the curvature of the likelihood"


@dataclass(frozen=True)
class Estimate:
    """A life with its interval, cycles; ``beyond`` says how it leaves the tested range, or is None."""

    life: float
    low: float
    high: float
    beyond: str | None


@dataclass(frozen=True)
class FatigueLimit:
    """An amplitude (Pa) under which life is endless, its interval, and how likely chance alone shows one."""

    amplitude: float
    low: float
    high: float
    p_value: float


@dataclass(frozen=True)
class Line:
    """A Basquin line log10 N = A + B log10 S, S in Pa, with the scatter s of log10 N (maximum likelihood).

    ``amplitudes`` (Pa) and ``lives`` (cycles) are the least and greatest tested; ``centre`` is what
    ``observed`` has subtracted from log10 S and log10 N.
    """

    group: str
    A: float
    B: float
    s: float
    failures: int
    run_outs: int
    amplitudes: tuple[float, float]
    lives: tuple[float, float]
    observed: Censored = field(repr=False)
    centre: tuple[float, float] = field(repr=False)

    @property
    def slope(self) -> float:
        """Slope k of the life curve: N proportional to S^-k."""
        return -self.B

    def life(self, amplitude: ArrayLike, reliability: float = 0.5) -> Floats:
        """Return the life that a share ``reliability`` of springs reaches at an amplitude, Pa: best estimate."""
        from scipy.special import ndtri

        x = np.log10(np.asarray(amplitude, dtype=np.float64))
        logs: Floats = self.A + self.B * x - ndtri(share(reliability, "reliability")) * self.s
        return np.power(10.0, logs)

    def estimate(self, amplitude: float, reliability: float = 0.5, confidence: float = CONFIDENCE) -> Estimate:
        """Return the life at an amplitude (Pa) with its two-sided profile-likelihood interval."""
        of = self._quantile(amplitude, reliability)
        low, high = (
            float(10 ** (end + self.centre[1])) for end in self.observed.interval(of, share(confidence, "confidence"))
        )
        life = float(self.life(amplitude, reliability))
        return Estimate(life, low, high, self._beyond(amplitude, life))

    def slope_interval(self, confidence: float = CONFIDENCE) -> tuple[float, float]:
        """Return the two-sided profile-likelihood interval of the slope k."""
        low, high = self.observed.interval(coefficient(1, 2), share(confidence, "confidence"))
        return -high, -low

    def scatter_interval(self, confidence: float = CONFIDENCE) -> tuple[float, float]:
        """Return the two-sided profile-likelihood interval of the scatter s."""
        low, high = self.observed.interval(scatter(2), share(confidence, "confidence"))
        return float(np.exp(low)), float(np.exp(high))

    def falls(self, confidence: float = CONFIDENCE) -> bool:
        """Tell whether the interval of the slope lies above zero: whether life falls with stress."""
        from scipy.special import ndtri

        lost = self.observed.log_likelihood - self.observed.profile(coefficient(1, 2), 0.0)
        return self.B < 0 and 2 * lost > float(ndtri((1 + share(confidence, "confidence")) / 2)) ** 2

    @property
    def design_method(self) -> str:
        """How :meth:`design_life` is computed."""
        return APPROXIMATE if self.run_outs else EXACT

    def design_life(self, amplitude: float, reliability: float, confidence: float) -> float:
        """Return the life that a share ``reliability`` of springs reaches, said with ``confidence``.

        Notes
        -----
        log10 N = A + B x - k s' with s'^2 = s^2 n/(n - 2), n failures, and k the :func:`tolerance_factor` of
        n - 2 degrees of freedom, h the variance of the fitted line at x over s^2. Without run-outs this is
        the exact bound of linear regression. With run-outs the variance comes from the curvature of the
        likelihood and the bound is approximate: by simulation it holds its confidence or a little more.

        References
        ----------
        G. J. Hahn and W. Q. Meeker, Statistical Intervals, tolerance bounds by noncentral t (memory).
        """
        n = self.failures
        h = (self.observed.standard_error(self._quantile(amplitude, 0.5)) / self.s) ** 2
        k = tolerance_factor(reliability, confidence, n - 2, h)
        return float(self.life(amplitude) * 10 ** (-k * self.s * np.sqrt(n / (n - 2))))

    def curve_points(self, reliability: float, confidence: float | None) -> tuple[tuple[float, float], ...]:
        """Return points (cycles, Pa) of the life curve between the amplitudes tested; rising in cycles.

        They are design lives; without a ``confidence``, best estimates.
        """
        low, high = self.amplitudes
        amplitudes = [float(S) for S in np.geomspace(high, low, POINTS)]
        if confidence is None:
            return tuple((float(self.life(S, reliability)), S) for S in amplitudes)
        return tuple((self.design_life(S, reliability, confidence), S) for S in amplitudes)

    def fatigue_limit(self, confidence: float = CONFIDENCE) -> FatigueLimit:
        """Return the limit S0 of log10 N = A + B log10(S - S0), with its profile-likelihood interval.

        The p-value tests S0 = 0; zero lies on the border of what S0 can be, so half of the chi-square holds.
        The limit cannot pass the least amplitude that failed. It is a diagnosis: design curves stay straight.
        """
        from scipy.optimize import brentq, minimize_scalar
        from scipy.special import chdtrc, ndtri

        S = 10 ** (self.observed.X[:, 1] + self.centre[0])
        least_failed = float(S[self.observed.failed].min())

        def value(part: float) -> float:
            over = S - part * least_failed
            kept = over > 0  # a run-out at or under the limit agrees with it: probability one
            x = np.log10(over[kept])
            X = np.column_stack([np.ones_like(x), x - x.mean()])
            return Censored(X, self.observed.y[kept], self.observed.failed[kept]).log_likelihood

        parts = [float(part) for part in np.linspace(0, 0.999, 41)]
        values = [value(part) for part in parts]
        i = int(np.argmax(values))
        bounds = (parts[max(i - 1, 0)], parts[min(i + 1, 40)])
        found = minimize_scalar(lambda part: -value(part), bounds=bounds, method="bounded")
        best, most = max((parts[i], values[i]), (float(found.x), -float(found.fun)), key=lambda one: one[1])
        floor = most - float(ndtri((1 + share(confidence, "confidence")) / 2)) ** 2 / 2

        def end(outer: float, inner: float) -> float:
            if value(outer) >= floor:
                return float(round(outer, 2))
            return float(brentq(lambda part: value(part) - floor, outer, inner, xtol=1e-5))

        low, high = end(parts[0], best), end(parts[-1], best)
        p_value = 0.5 * float(chdtrc(1, max(2 * (most - values[0]), 0.0)))
        return FatigueLimit(best * least_failed, low * least_failed, high * least_failed, p_value)

    def _quantile(self, amplitude: float, reliability: float) -> Quantity:
        at = (1.0, float(np.log10(amplitude)) - self.centre[0])
        return quantile(at, 1 - share(reliability, "reliability"))

    def _beyond(self, amplitude: float, life: float) -> str | None:
        low, high = self.amplitudes
        said = METRIC(amplitude, "stress")
        if amplitude < low * (1 - 1e-9):
            return f"{said} is below the least amplitude tested, {METRIC(low, 'stress')}"
        if amplitude > high * (1 + 1e-9):
            return f"{said} is above the greatest amplitude tested, {METRIC(high, 'stress')}"
        if life > self.lives[1]:
            return f"{significant(life)} cycles are past the longest test, {significant(self.lives[1])}"
        return None


def tolerance_factor(reliability: float, confidence: float, dof: int, h: float) -> float:
    """Return k: with ``confidence``, a share ``reliability`` of a normal response lies above fit - k s'.

    Parameters
    ----------
    reliability, confidence : float
        Between 0 and 1.
    dof : int
        Degrees of freedom of s'; n - 1 for a sample of n without regression.
    h : float
        Variance of the fit over that of the response; 1/n for a sample without regression.

    Notes
    -----
    k = sqrt(h) t, with t the quantile ``confidence`` of the noncentral t distribution with ``dof`` degrees
    of freedom and noncentrality z_R/sqrt(h).
    """
    from scipy.special import nctdtrit, ndtri

    z = float(ndtri(share(reliability, "reliability")))
    return float(np.sqrt(h) * nctdtrit(dof, z / np.sqrt(h), share(confidence, "confidence")))


def share(value: float, name: str) -> float:
    """Return a number between 0 and 1, or say that it is not one."""
    if not 0 < value < 1:
        raise InputError(f"{name} is {value:g}; it must be between 0 and 1, such as 0.9")
    return value
