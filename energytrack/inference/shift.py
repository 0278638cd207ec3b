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
    """The modification's effect relative to consumption without it; 0.01 is one percent."""

    ratio: float
    standard_error: float  # by the delta method
    z: float  # effect over its own standard error: zero lies in the ratio interval when |z| is below the bound
    freedom: float

    def interval(self, bound: float | None, fit: Fit) -> tuple[float, float] | None:
        """Fieller's (1954) interval for the ratio at a bound on |z|; None where it is unbounded."""
        if bound is None:
            return None
        (b, a), cov = fit.coefficients[:2], fit.covariance
        return ratio_interval(float(a), float(b), cov[SHIFT, SHIFT], cov[LEVEL, LEVEL], cov[LEVEL, SHIFT], bound)


def shift_of(fit: Fit) -> Shift:
    """The shift a fit implies; Satterthwaite (1946) degrees of freedom as in Fai and Cornelius (1996)."""
    base, effect = float(fit.coefficients[LEVEL]), float(fit.coefficients[SHIFT])
    ratio = effect / base
    variance = contrast_variance(fit.covariance, base, ratio)
    direction = np.array([-ratio, 1.0]) / base
    slope = np.einsum("i,kij,j->k", direction, fit.covariance_gradient[:, :2, :2], direction)
    wobble = float(slope @ fit.theta_covariance @ slope)
    freedom = 2 * variance**2 / wobble if wobble > 0 else float("inf")
    return Shift(ratio, sqrt(variance), effect / sqrt(fit.covariance[SHIFT, SHIFT]), max(freedom, 1.0))


def contrast_variance(covariance: Array, base: float, ratio: float) -> float:
    """Variance of the ratio by the delta method, from the coefficients' covariance (p, p)."""
    direction = np.array([-ratio, 1.0]) / base
    return float(direction @ covariance[:2, :2] @ direction)


def ratio_interval(a: float, b: float, vaa: float, vbb: float, vab: float, bound: float) -> tuple[float, float] | None:
    """All r with |a - r b| <= bound * sd(a - r b) (Fieller, 1954); None where they are no bounded interval."""
    square = bound**2
    p = b * b - square * vbb
    q = a * b - square * vab
    r = a * a - square * vaa
    root = q * q - p * r
    if p <= 0 or root < 0:
        return None
    return (q - sqrt(root)) / p, (q + sqrt(root)) / p
