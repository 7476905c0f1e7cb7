"""Maximum likelihood of a straight-line model with normal scatter and right-censored observations.

With gamma = beta/sigma and tau = 1/sigma the log-likelihood is concave, so Newton's method finds its one
maximum, and every quantity asked for here (a coefficient, a quantile of the response, the scatter) fixes a
straight line through these parameters: its profile is the same problem with one parameter less.

References
----------
R. J. Olsen, Econometrica 46 (1978), the concave form (memory); W. Q. Meeker and L. A. Escobar, Statistical
Methods for Reliability Data, censored regression and profile-likelihood intervals (memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtri

from springlife.errors import InputError
from springlife.strength.criteria import Floats

_HALF_LOG_TWO_PI = 0.5 * np.log(2 * np.pi)


@dataclass(frozen=True)
class Quantity:
    """A number that is a ratio of the parameters: value q makes ``a . theta - b q tau = d`` hold.

    ``pivot`` is the parameter expressed by the others. With ``scatter`` the quantity is ln(sigma) instead.
    """

    a: tuple[float, ...]
    d: float
    pivot: int
    scatter: bool = False


def coefficient(j: int, size: int) -> Quantity:
    """Return the coefficient j of ``size`` as a quantity."""
    return Quantity(tuple(float(i == j) for i in range(size)), 0.0, j)


def quantile(at: tuple[float, ...], probability: float) -> Quantity:
    """Return the response's quantile where the regressors are ``at``; the first of them is 1."""
    return Quantity(at, -float(ndtri(probability)), 0)


def scatter(size: int) -> Quantity:
    """Return ln(sigma) of a model with ``size`` coefficients as a quantity."""
    return Quantity((0.0,) * size, 0.0, size, scatter=True)


@dataclass(frozen=True)
class Censored:
    """Observations: regressors X (n, p) whose first column is 1, response y (n), failed (n) or censored.

    Failed rows must differ in X and not all lie on one line: then the maximum exists.
    """

    X: Floats
    y: Floats
    failed: NDArray[np.bool_]

    @cached_property
    def _design(self) -> tuple[Floats, Floats, Floats, float]:
        """Return W, w0, t, t0 of the whole problem: z = w0 + W theta, tau = t0 + t theta."""
        W = np.column_stack([-self.X, self.y])
        return W, np.zeros(len(self.y)), np.append(np.zeros(self.X.shape[1]), 1.0), 0.0

    @cached_property
    def _best(self) -> tuple[Floats, float]:
        beta, *_ = np.linalg.lstsq(self.X, self.y, rcond=None)
        sigma = float(np.std(self.y - self.X @ beta)) or 1.0
        return self._maximise(*self._design, np.append(beta, 1.0) / sigma)

    @property
    def theta(self) -> Floats:
        """The parameters (beta/sigma, 1/sigma) at the maximum."""
        return self._best[0]

    @property
    def log_likelihood(self) -> float:
        """The greatest log-likelihood."""
        return self._best[1]

    @property
    def beta(self) -> Floats:
        """The coefficients at the maximum."""
        return np.asarray(self.theta[:-1] / self.theta[-1])

    @property
    def sigma(self) -> float:
        """The scatter at the maximum: not corrected for the number of parameters."""
        return float(1 / self.theta[-1])

    @cached_property
    def _covariance(self) -> Floats:
        W, w0, t, t0 = self._design
        return np.asarray(np.linalg.inv(-self._derivatives(W, w0, t, t0, self.theta)[1]), dtype=np.float64)

    def estimate(self, of: Quantity) -> float:
        """Return the quantity at the maximum."""
        if of.scatter:
            return float(np.log(self.sigma))
        return float((np.dot(of.a, self.theta[:-1]) - of.d) / self.theta[-1])

    def standard_error(self, of: Quantity) -> float:
        """Return the quantity's standard error from the curvature at the maximum."""
        c = self._constraint(of, self.estimate(of))[0]
        return float(np.sqrt(c @ self._covariance @ c) / self.theta[-1])

    def profile(self, of: Quantity, value: float) -> float:
        """Return the greatest log-likelihood with the quantity held at ``value``."""
        c, d = self._constraint(of, value)
        W, w0, t, t0 = self._design
        e = of.pivot
        free = np.delete(np.eye(len(c)), e, axis=1)
        free[e] = -np.delete(c, e) / c[e]
        base = np.zeros(len(c))
        base[e] = d / c[e]
        start = np.delete(self.theta, e)
        return self._maximise(W @ free, w0 + W @ base, t @ free, t0 + float(t @ base), start)[1]

    def bound(self, of: Quantity, side: int, confidence: float) -> float:
        """Return the one-sided profile-likelihood bound of a quantity.

        ``side`` is -1 for a lower bound and +1 for an upper one. The bound is where the signed root of twice
        the loss in log-likelihood reaches the normal quantile of ``confidence``.
        """
        from scipy.optimize import brentq

        target = float(ndtri(confidence))
        centre, step = self.estimate(of), self.standard_error(of)

        def excess(u: float) -> float:
            loss = self.log_likelihood - self.profile(of, centre + side * u * step)
            return float(np.sqrt(2 * max(loss, 0.0))) - target

        near, far = 0.0, target
        while excess(far) < 0:
            near, far = far, 1.5 * far
        return centre + side * step * float(brentq(excess, near, far, xtol=1e-4, rtol=1e-6))

    def interval(self, of: Quantity, confidence: float) -> tuple[float, float]:
        """Return the two-sided profile-likelihood interval of a quantity."""
        one_sided = (1 + confidence) / 2
        return self.bound(of, -1, one_sided), self.bound(of, 1, one_sided)

    def _constraint(self, of: Quantity, value: float) -> tuple[Floats, float]:
        if of.scatter:
            return np.append(of.a, 1.0), float(np.exp(-value))
        return np.append(of.a, -value), of.d

    def _value(self, W: Floats, w0: Floats, t: Floats, t0: float, phi: Floats) -> float:
        tau = t0 + float(t @ phi)
        if tau <= 0:
            return -np.inf
        z = w0 + W @ phi
        failed = self.failed
        gone = z[failed]
        count = len(gone)
        return float(count * (np.log(tau) - _HALF_LOG_TWO_PI) - 0.5 * (gone @ gone) + log_ndtr(-z[~failed]).sum())

    def _derivatives(self, W: Floats, w0: Floats, t: Floats, t0: float, phi: Floats) -> tuple[Floats, Floats]:
        """Return gradient and Hessian of the log-likelihood in ``phi``."""
        tau = t0 + float(t @ phi)
        z = w0 + W @ phi
        hazard = np.exp(-0.5 * z * z - _HALF_LOG_TWO_PI - log_ndtr(-z))
        first = np.where(self.failed, -z, -hazard)
        second = np.where(self.failed, -1.0, -hazard * (hazard - z))
        count = np.count_nonzero(self.failed)
        gradient = W.T @ first + count * t / tau
        return gradient, W.T @ (second[:, None] * W) - count * np.outer(t, t) / tau**2

    def _maximise(self, W: Floats, w0: Floats, t: Floats, t0: float, phi: Floats) -> tuple[Floats, float]:
        """Climb by Newton's method with halved steps; the function is concave."""
        value = self._value(W, w0, t, t0, phi)
        for _ in range(200):
            gradient, hessian = self._derivatives(W, w0, t, t0, phi)
            step = np.linalg.solve(hessian, -gradient)
            promised = float(gradient @ step)
            if promised < 1e-11:
                return phi, value
            length = 1.0
            while (trial := self._value(W, w0, t, t0, phi + length * step)) < value + 1e-4 * length * promised:
                length /= 2
                if length < 1e-12:
                    return phi, value
            phi, value = phi + length * step, trial
        raise InputError("the likelihood has no maximum: the results do not determine a line and its scatter")
