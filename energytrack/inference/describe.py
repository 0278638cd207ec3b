"""A fitted model in the user's terms: the sizes of the noise, the conditions' effects, and what to expect next."""

from __future__ import annotations

from math import sqrt

import numpy as np

from energytrack.consumption.conditions import SEASON
from energytrack.consumption.terms import condition_of
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.results import Covariate, Expectation, Noise

_MIDDLE = (10, 90)  # percentiles of the conditions met over which an effect is stated


def noise_of(model: Model) -> Noise:
    """The four sources in percent of consumption, the level error in the vehicle's unit."""
    scatter = model.fit.scatter
    return Noise(
        trip_percent=100 * scatter.trip,
        level_error=scatter.level * model.scale.energy,
        drift_weeks_percent=100 * scatter.weeks,
        drift_seasons_percent=100 * scatter.seasons,
    )


def covariates_of(model: Model) -> dict[str, Covariate]:
    """Each term in percent per unit, and what its whole condition does over the conditions met."""
    names = model.terms.names
    percent = 100 / model.fit.coefficients[0] / model.terms.scales if names else np.zeros(0)
    estimates = model.fit.coefficients[model.term_columns] * percent
    errors = np.sqrt(np.diag(model.fit.covariance)[model.term_columns]) * np.abs(percent)
    effects = {condition: _effect(model, condition) for condition in {condition_of(name) for name in names}}
    return {
        name: Covariate(float(estimate), float(error), *effects[condition_of(name)], condition_of(name))
        for name, estimate, error in zip(names, estimates, errors, strict=True)
    }


def expectation_of(model: Model) -> Expectation:
    """What an average segment should use, for an echo without heavy libraries."""
    terms, base = model.terms, float(model.fit.coefficients[0])
    slopes = 100 * model.fit.coefficients[model.term_columns] / base / terms.scales
    scatter = model.fit.scatter
    spread = sqrt(scatter.trip**2 + 2 * scatter.level**2 + scatter.weeks**2 + scatter.seasons**2)
    shift = None if model.modification is None else 100 * float(model.fit.coefficients[1]) / base
    return Expectation(
        consumption=base * model.scale.consumption,
        shift_percent=shift,
        sd_percent=100 * spread,
        terms={name: float(slope) for name, slope in zip(terms.names, slopes, strict=True)},
        centres={name: float(centre) for name, centre in zip(terms.names, terms.centres, strict=True)},
    )


def _effect(model: Model, condition: str) -> tuple[float, float, float]:
    """Percent from the low to the high end of a condition, and those ends; for the season its lowest and highest."""
    response = _response(model, condition)
    if condition == SEASON:
        return float(np.ptp(response)), float(response.min()), float(response.max())
    value = model.conditions.values[condition]
    low, high = (float(np.percentile(value, q)) for q in _MIDDLE)
    order = np.argsort(value)
    at_low, at_high = np.interp([low, high], value[order], response[order])
    return float(at_high - at_low), low, high


def _response(model: Model, condition: str) -> Array:
    """Percent by which each segment's condition moved its consumption (n,)."""
    chosen = [k for k, name in enumerate(model.terms.names) if condition_of(name) == condition]
    slopes = model.fit.coefficients[model.term_columns][chosen]
    response: Array = 100 * model.terms.columns(model.conditions)[:, chosen] @ slopes / model.fit.coefficients[0]
    return response
