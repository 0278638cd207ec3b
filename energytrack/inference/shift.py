"""From a fitted model to a shift in percent: a ratio, its interval and its degrees of freedom."""

from __future__ import annotations

from dataclasses import dataclass
from math import sqrt

import numpy as np

from energytrack.inference.noise import Array
from energytrack.inference.reml import Fit

LEVEL, SHIFT = 0, 1  # columns of every design: consumption at reference conditions, and the modification


@dataclass(frozen=True)
class Shift:
    """An effect relative to consumption without it; a ratio of 0.01 is one percent."""

    effect: float
    base: float
    effect_variance: float
    base_variance: float
    covariance: float
    freedom: float  # Satterthwaite degrees of freedom of the ratio

    @property
    def ratio(self) -> float:
        return self.effect / self.base

    @property
    def standard_error(self) -> float:
        """Of the ratio, by the delta method."""
        variance = self.effect_variance - 2 * self.ratio * self.covariance + self.ratio**2 * self.base_variance
        return sqrt(variance) / abs(self.base)

    @property
    def z(self) -> float:
        """Effect over its own standard error: zero lies in the ratio interval when |z| is below the bound."""
        return self.effect / sqrt(self.effect_variance)

    def interval(self, bound: float | None) -> tuple[float, float] | None:
        """Fieller's (1954) interval for the ratio at a bound on |z|; None where it is unbounded."""
        if bound is None:
            return None
        return ratio_interval(
            self.effect, self.base, self.effect_variance, self.base_variance, self.covariance, bound
        )


def shift_of(fit: Fit) -> Shift:
    """The shift of the modification asked about."""
    weights = np.zeros(len(fit.coefficients))
    weights[SHIFT] = 1.0
    return shift_along(fit, weights)


def shift_along(fit: Fit, weights: Array) -> Shift:
    """The shift of any combination of coefficients (p,): a sum of modifications, or one less another.

    Degrees of freedom by Satterthwaite (1946), as in Fai and Cornelius (1996).
    """
    base, effect = float(fit.coefficients[LEVEL]), float(weights @ fit.coefficients)
    direction = weights / base
    direction[LEVEL] -= effect / base**2
    variance = float(direction @ fit.covariance @ direction)
    slope = np.einsum("i,kij,j->k", direction, fit.covariance_gradient, direction)
    wobble = float(slope @ fit.theta_covariance @ slope)
    return Shift(
        effect,
        base,
        float(weights @ fit.covariance @ weights),
        float(fit.covariance[LEVEL, LEVEL]),
        float(fit.covariance[LEVEL] @ weights),
        max(1.0, 2 * variance**2 / wobble) if wobble > 0 else float("inf"),
    )


def contrast_variance(covariance: Array, base: float, ratio: float) -> float:
    """Variance of the modification's ratio by the delta method, from the coefficients' covariance (p, p)."""
    direction = np.array([-ratio, 1.0]) / base
    return float(direction @ covariance[:2, :2] @ direction)


def ratio_interval(a: float, b: float, vaa: float, vbb: float, vab: float, bound: float) -> tuple[float, float] | None:
    """All r with |a - r b| <= bound * sd(a - r b) (Fieller, 1954); None where they are no bounded interval."""
    square = bound**2
    p = b * b - square * vbb
    q = a * b - square * vab
    r = a * a - square * vaa
    root = q * q - p * r
    if not p > 0 or not root >= 0:  # a huge bound overflows to infinity or nan: unbounded as well
        return None
    return (q - sqrt(root)) / p, (q + sqrt(root)) / p
