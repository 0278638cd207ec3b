"""Months at the reference conditions: each a column of the vehicle's regression, as a modification is.

The noise is that of the log as a whole. At it, generalised least squares gives a month's level with a column for that
month alone, and a difference of two months with a column for each: everything else in the log says what the conditions
do. Neighbouring months share a level of the tank at the month's end and much of the drift, so their difference is
better known than two levels that were estimated apart; the covariance accounts for that. Drift counts as noise: a
difference is told from what the vehicle does from month to month anyway.

Intervals of ratios by Fieller (1954), degrees of freedom by Satterthwaite (1946).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.conditions import SEASON
from energytrack.consumption.terms import ELECTRIC, condition_of
from energytrack.errors import InferenceError
from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.model import Model
from energytrack.inference.noise import Array, Scatter, products
from energytrack.inference.reml import Fit
from energytrack.inference.shift import LEVEL, ratio_interval

FEWEST = 6  # segments before the conditions can be taken out
FEWEST_OUTSIDE = 3  # segments' worth of distance outside the months asked about
_STEP = 0.02  # of central differences, in log standard deviation


@dataclass(frozen=True)
class Estimate:
    """A quantity with its range."""

    value: float
    interval: tuple[float, float] | None  # None: unbounded
    freedom: float


@dataclass(frozen=True)
class Months:
    """A fitted log, and the share (n,) of each segment's distance that was driven in each month."""

    model: Model
    shares: Mapping[str, Array]
    confidence: float

    def level(self, month: str) -> Estimate | None:
        """Energy per km in a month, with what was fitted then; None where the log cannot tell."""
        fit = self._fit([month])
        if fit is None:
            return None
        weights = self._weights([month], month)
        variance, freedom = _variance(fit, weights)
        value = float(weights @ fit.coefficients)
        reach = self._bound(freedom) * float(np.sqrt(variance))
        unit = self.model.scale.consumption
        return Estimate(unit * value, (unit * (value - reach), unit * (value + reach)), freedom)

    def difference(self, month: str, other: str | None) -> tuple[Estimate, float] | None:
        """A month relative to another, and that other's energy per km; None as other: relative to the baseline."""
        asked = [month] if other is None else [month, other]
        fit = self._fit(asked)
        if fit is None:
            return None
        base = np.zeros(len(fit.coefficients))
        base[LEVEL] = 1.0
        base = base if other is None else self._weights(asked, other)
        step = self._weights(asked, month) - base
        a, b = float(step @ fit.coefficients), float(base @ fit.coefficients)
        freedom = _variance(fit, step / b - a / b**2 * base)[1]
        vaa, vbb, vab = (float(one @ fit.covariance @ two) for one, two in ((step, step), (base, base), (step, base)))
        estimate = Estimate(a / b, ratio_interval(a, b, vaa, vbb, vab, self._bound(freedom)), freedom)
        return estimate, self.model.scale.consumption * b

    def reference_conditions(self) -> dict[str, float]:
        """The conditions that levels are brought to: means over the distance of the log; driving on fuel alone."""
        distance = self.model.observed.distance_km
        named = dict.fromkeys(map(condition_of, self.model.terms.names))
        values = {**self.model.conditions.values, ELECTRIC: np.zeros(len(distance))}
        return {name: float(distance @ values[name] / distance.sum()) for name in named if name != SEASON}

    def _bound(self, freedom: float) -> float:
        return mixture_quantile((1 - self.confidence) / 2, freedom)

    def _fit(self, months: Sequence[str]) -> Fit | None:
        """The regression with a column for each of these months, at the noise of the log."""
        model, shares = self.model, [self.shares[month] for month in months]
        outside = 1 - np.sum(shares, axis=0)
        if any(not share.any() for share in shares) or outside.sum() < FEWEST_OUTSIDE:
            return None
        own = self._columns(months)
        precision = np.append(model.problem.precision, np.zeros(len(months)))
        normal = self._cross[np.ix_(own, own)] + np.diag(precision)
        try:
            covariance: Array = np.asarray(np.linalg.inv(normal), dtype=np.float64)
            np.linalg.cholesky(normal)
        except np.linalg.LinAlgError:
            return None
        changes = self._cross_gradient[:, own[:, None], own]
        gradient = -covariance @ changes @ covariance
        coefficients = covariance @ self._cross[own, -1]
        coefficients[model.term_columns] += model.terms.prior_mean  # taken off the energies beforehand
        return Fit(model.fit.theta, model.fit.theta_covariance, coefficients, covariance, gradient)

    def _columns(self, months: Sequence[str]) -> NDArray[np.intp]:
        """Of the cross-products: the regression's own, and those of these months."""
        own, names = self.model.problem.columns.shape[1], list(self.shares)
        return np.array([*range(own), *(own + names.index(month) for month in months)], dtype=np.intp)

    @cached_property
    def _stacked(self) -> Array:
        """The regression's own columns, one for each month, and the energies (n, p + k + 1)."""
        problem = self.model.problem
        relative = self.model.observed.distance_km / self.model.scale.distance_km
        return np.column_stack([problem.columns, *(relative * share for share in self.shares.values()), problem.energy])

    @cached_property
    def _cross(self) -> Array:
        """Products of all columns under the inverse covariance of the noise: one pass for all months."""
        return self._products(self.model.fit.theta)

    @cached_property
    def _cross_gradient(self) -> Array:
        """How those products change with the four log standard deviations (4, ., .), by central differences."""
        theta = self.model.fit.theta
        steps = _STEP * np.eye(len(theta))
        return np.array([self._products(theta + d) - self._products(theta - d) for d in steps]) / (2 * _STEP)

    def _products(self, theta: Array) -> Array:
        scatter = Scatter(*np.exp(theta).tolist())
        found: Array = products(self.model.problem.shape, scatter, self._stacked).cross
        return found

    def _weights(self, months: Sequence[str], month: str) -> Array:
        """Of the coefficients (p,) that make a month's level at the reference conditions, with what was fitted then."""
        model = self.model
        weights = np.zeros(len(model.fit.coefficients) + len(months))
        weights[LEVEL] = 1.0
        driven = model.observed.distance_km * self.shares[month]
        first = model.term_columns.stop
        for number, name in enumerate(model.others):
            column = model.observed.shares[:, model.observed.names.index(name)] / model.levels[name]
            weights[first + number] = driven @ column / driven.sum()
        weights[len(model.fit.coefficients) + months.index(month)] = 1.0
        return weights


def _variance(fit: Fit, direction: Array) -> tuple[float, float]:
    """Of a combination of the coefficients (p,), and its Satterthwaite degrees of freedom."""
    variance = float(direction @ fit.covariance @ direction)
    slope = np.einsum("i,kij,j->k", direction, fit.covariance_gradient, direction)
    wobble = float(slope @ fit.theta_covariance @ slope)
    if not variance > 0:
        raise InferenceError("the log has no scatter at all: check that amounts are what was bought")
    return variance, max(1.0, 2 * variance**2 / wobble) if wobble > 0 else float("inf")
