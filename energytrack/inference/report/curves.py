"""Consumption against one condition: partial residuals and the fitted curve, everything else at the reference.

Partial residuals (Ezekiel, 1924; Larsen and McCleary, 1972): what is left of a segment's consumption once the fitted
effects of all other conditions and of all modifications are taken off. Ranges hold for each point of the curve, with
Satterthwaite's (1946) degrees of freedom.
"""

from __future__ import annotations

from typing import Literal, get_args

import numpy as np

from energytrack.consumption.terms import condition_of, term
from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.report.results import Curve, Dot, Step
from energytrack.inference.shift import LEVEL

Condition = Literal["temperature_c", "speed_kmh"]
_STEPS = 61


def curves_of(model: Model, confidence: float) -> tuple[Curve, ...]:
    """A curve for temperature and for speed, where the log says something about them."""
    fitted = {condition_of(name) for name in model.terms.names}
    return tuple(_curve(model, each, confidence) for each in get_args(Condition) if each in fitted)


def _curve(model: Model, condition: Condition, confidence: float) -> Curve:
    logged = model.observed.conditions[condition]
    known = ~np.isnan(logged)
    residual = model.scale.consumption * partial_residuals(model, condition)
    dots = np.column_stack([logged, residual, model.observed.distance_km])[known]
    values = np.linspace(logged[known].min(), logged[known].max(), _STEPS)
    weights = _weights(model, condition, values)
    level, reach = weights @ model.fit.coefficients, _reach(model, weights, confidence)
    ends = model.scale.consumption * np.column_stack([level, level - reach, level + reach])
    return Curve(
        condition=condition,
        dots=tuple(Dot(*dot) for dot in dots.tolist()),
        steps=tuple(Step(value, *row) for value, row in zip(values.tolist(), ends.tolist(), strict=True)),
        confidence=confidence,
        filled_in=int((~known).sum()),
    )


def partial_residuals(model: Model, condition: str) -> Array:
    """Relative consumption of each segment (n,) less the fitted effects of everything but this condition."""
    relative = model.observed.distance_km / model.scale.distance_km
    others = model.problem.columns / relative[:, None]
    others[:, [LEVEL, *_columns(model, condition)]] = 0.0
    consumption = model.observed.energy / model.observed.distance_km / model.scale.consumption
    residual: Array = consumption - others @ model.fit.coefficients
    return residual


def _weights(model: Model, condition: str, values: Array) -> Array:
    """Of the coefficients that make consumption at each value of the condition (k, p)."""
    weights = np.zeros((len(values), len(model.fit.coefficients)))
    weights[:, LEVEL] = 1.0
    for column in _columns(model, condition):
        k = column - model.term_columns.start
        raw = np.asarray(term(model.terms.names[k], values), dtype=float)
        weights[:, column] = (raw - model.terms.centres[k]) / model.terms.scales[k]
    return weights


def _columns(model: Model, condition: str) -> list[int]:
    """Columns of the design that belong to a condition."""
    first = model.term_columns.start
    return [first + k for k, name in enumerate(model.terms.names) if condition_of(name) == condition]


def _reach(model: Model, weights: Array, confidence: float) -> Array:
    """Half the width of the range at each row of weights (k,)."""
    fit = model.fit
    variance = np.einsum("ki,ij,kj->k", weights, fit.covariance, weights)
    slope = np.einsum("ki,tij,kj->kt", weights, fit.covariance_gradient, weights)
    wobble = np.einsum("kt,ts,ks->k", slope, fit.theta_covariance, slope)
    freedom = [max(1.0, 2 * v**2 / w) if w > 0 else float("inf") for v, w in zip(variance, wobble, strict=True)]
    bound = np.array([mixture_quantile((1 - confidence) / 2, each) for each in freedom])
    reach: Array = bound * np.sqrt(variance)
    return reach
