"""Effects of several units pooled by random effects: each unit's own effect varies around a common one.

Variance between units by REML; interval for the common effect by Hartung and Knapp (2001) and Sidik and Jonkman
(2002), never narrower than without their factor (the max(1, q) safeguard of Knapp and Hartung, 2003; Roever, Knapp and
Friede, 2015); prediction interval for the next unit by Higgins, Thompson and Spiegelhalter (2009).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from math import sqrt

import numpy as np
from scipy.optimize import brentq
from scipy.special import chdtrc, stdtrit

from energytrack.errors import InferenceError
from energytrack.inference.noise import Array


@dataclass(frozen=True)
class RandomEffects:
    """k effects (k,) with known variances (k,), and the variance between units."""

    effects: Array
    variances: Array
    between: float  # variance

    @property
    def count(self) -> int:
        return len(self.effects)

    @cached_property
    def weights(self) -> Array:
        weights: Array = 1 / (self.variances + self.between)
        return weights

    @cached_property
    def mean(self) -> float:
        return float(self.weights @ self.effects / self.weights.sum())

    @property
    def usual_error(self) -> float:
        """Standard error with the variances taken as known."""
        return 1 / sqrt(float(self.weights.sum()))

    @property
    def factor(self) -> float:
        """Hartung and Knapp's q: what the effects' own spread makes of the usual variance."""
        return float(self.weights @ (self.effects - self.mean) ** 2) / (self.count - 1)

    def standard_error(self, *, safeguard: bool = True) -> float:
        """Hartung and Knapp's; with the safeguard never below the usual one."""
        q = max(1.0, self.factor) if safeguard else self.factor
        return self.usual_error * sqrt(q)

    def interval(self, confidence: float, *, safeguard: bool = True) -> tuple[float, float]:
        """For the common effect, by Student's t with k - 1."""
        reach = t_quantile(confidence, self.count - 1) * self.standard_error(safeguard=safeguard)
        return self.mean - reach, self.mean + reach

    def prediction(
        self, confidence: float, *, freedom: float | None = None, safeguard: bool = True
    ) -> tuple[float, float] | None:
        """For the true effect of the next unit, by Student's t with k - 2; None for fewer than three units."""
        nu = self.count - 2 if freedom is None else freedom
        if nu < 1:
            return None
        reach = t_quantile(confidence, nu) * sqrt(self.between + self.standard_error(safeguard=safeguard) ** 2)
        return self.mean - reach, self.mean + reach

    @property
    def q(self) -> float:
        """Cochran's (1954) statistic of heterogeneity."""
        weights = 1 / self.variances
        return float(weights @ (self.effects - weights @ self.effects / weights.sum()) ** 2)

    @property
    def q_p_value(self) -> float:
        return float(chdtrc(self.count - 1, self.q))

    @property
    def i_squared(self) -> float:
        """Share of the variance that lies between units (Higgins and Thompson, 2002), for this `between`."""
        weights = 1 / self.variances
        typical = (self.count - 1) * weights.sum() / (weights.sum() ** 2 - (weights**2).sum())
        return float(self.between / (self.between + typical))


def t_quantile(confidence: float, freedom: float) -> float:
    """Two-sided quantile of Student's t."""
    return float(stdtrit(freedom, (1 + confidence) / 2))


def pool(effects: Sequence[float], variances: Sequence[float]) -> RandomEffects:
    """Random effects by REML. Raises InferenceError for fewer than two effects or a variance that is not positive."""
    y, v = np.asarray(effects, dtype=np.float64), np.asarray(variances, dtype=np.float64)
    if len(y) < 2:
        raise InferenceError("a pooled shift takes at least two vehicles with the modification")
    if not (v > 0).all() or not np.isfinite(v).all():
        raise InferenceError("a pooled shift takes effects with a variance above 0")
    return RandomEffects(y, v, _between(y, v))


def _between(y: Array, v: Array) -> float:
    """Root of the slope of the restricted likelihood in the variance between units; 0 where it falls from 0 on."""

    def slope(between: float) -> float:
        w = 1 / (v + between)
        mean = w @ y / w.sum()
        return float((w**2) @ (y - mean) ** 2 - w.sum() + (w**2).sum() / w.sum())

    if slope(0.0) <= 0:
        return 0.0
    upper = float(np.var(y, ddof=1) + v.max())
    while slope(upper) > 0:
        upper *= 2
    return float(brentq(slope, 0.0, upper, xtol=1e-14 * upper, rtol=1e-14))
