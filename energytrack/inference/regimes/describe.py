"""From breaks in a regression to breaks and regimes as they are reported."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from math import inf, sqrt

import numpy as np

from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.looks import percent
from energytrack.inference.noise import Array
from energytrack.inference.regimes import places as where
from energytrack.inference.regimes.breaks import Found
from energytrack.inference.regimes.explain import CAUTION, explanation, matches, suspects
from energytrack.inference.regimes.range import place_range
from energytrack.inference.regimes.results import Break, Point, Regime
from energytrack.inference.reml import Fit
from energytrack.inference.shift import LEVEL, ratio_interval, shift_along
from energytrack.logbook.records import Event, Modification


def breaks_of(
    found: Found, modifications: Sequence[Modification], events: Sequence[Event], confidence: float
) -> tuple[Break, ...]:
    """Every break found: where, when, how large, and what was logged there; in driving order."""
    return tuple(
        _described(found, number, modifications, events, confidence) for number in range(len(found.places))
    )


def _described(
    found: Found, number: int, modifications: Sequence[Modification], events: Sequence[Event], confidence: float
) -> Break:
    observed, place = found.observed, found.places[number]
    effects = found.model.fit.coefficients[list(found.coefficients_of(number))]
    low, high = place_range(found.search, found.model.fit.scatter, place, effects, confidence)
    km, interval_km = where.odometer(observed, place), (where.odometer(observed, low), where.odometer(observed, high))
    date, interval_dates = where.date(observed, place), (where.date(observed, low), where.date(observed, high))
    shift, interval = _shift(found, number, confidence)
    logged = matches(km, interval_km, interval_dates, modifications, events)
    return Break(
        odometer_km=km,
        date=date,
        interval_km=interval_km,
        interval_dates=interval_dates,
        shift_percent=100 * shift,
        interval_percent=percent(interval),
        p_value=_p_value(found, place),
        explained_by=logged[0].what if logged else None,
        matches=logged,
        explanation=explanation(logged, interval_km, interval_dates),
        suspects=() if logged else suspects(100 * shift, date, observed.unit),
        caution=CAUTION if not logged and shift > 0 else None,
    )


def _shift(found: Found, number: int, confidence: float) -> tuple[float, tuple[float, float] | None]:
    """A break relative to the consumption just before it, with Fieller's interval."""
    fit = found.model.fit
    before = _level(found, number)
    step = np.zeros(len(before))
    step[found.coefficients_of(number)[0]] = 1.0
    a, b = float(step @ fit.coefficients), float(before @ fit.coefficients)
    vaa, vbb, vab = (
        float(one @ fit.covariance @ other) for one, other in ((step, step), (before, before), (step, before))
    )
    bound = mixture_quantile((1 - confidence) / 2, shift_along(fit, step).freedom)
    return a / b, ratio_interval(a, b, vaa, vbb, vab, bound)


def _level(found: Found, breaks: int) -> Array:
    """Weights of the coefficients that make the consumption after so many breaks."""
    weights = np.zeros(len(found.model.fit.coefficients))
    weights[LEVEL] = 1.0
    for number in range(breaks):
        weights[found.coefficients_of(number)[0]] = 1.0
    return weights


def _p_value(found: Found, place: float) -> float:
    """Of the test that came nearest to this place among those that found a break."""
    successful = [t for t, after in zip(found.trials, (*found.trials[1:], None), strict=True)
                  if after is None or after.breaks > t.breaks]  # fmt: skip
    nearest = min(successful, key=lambda trial: min(abs(reached - place) for reached in trial.places))
    return nearest.p_value


def regimes_of(found: Found, confidence: float) -> tuple[Regime, ...]:
    """The stretches between breaks, each with its consumption at the reference conditions."""
    observed, fit, scale = found.observed, found.model.fit, found.model.scale.consumption
    ends = (0.0, *found.places, float(len(observed)))
    regimes = []
    for number, (start, end) in enumerate(pairwise(ends)):
        weights = _level(found, number)
        value, half = float(weights @ fit.coefficients), _half_width(fit, weights, confidence)
        regimes.append(
            Regime(
                where.odometer(observed, start),
                where.odometer(observed, end),
                where.date(observed, start),
                where.date(observed, end),
                round(end - start),
                value * scale,
                ((value - half) * scale, (value + half) * scale),
            )
        )
    return tuple(regimes)


def _half_width(fit: Fit, weights: Array, confidence: float) -> float:
    """Of the interval of a combination of coefficients, with Satterthwaite's (1946) degrees of freedom."""
    variance = float(weights @ fit.covariance @ weights)
    slope = np.einsum("i,kij,j->k", weights, fit.covariance_gradient, weights)
    wobble = float(slope @ fit.theta_covariance @ slope)
    freedom = max(1.0, 2 * variance**2 / wobble) if wobble > 0 else inf
    return mixture_quantile((1 - confidence) / 2, freedom) * sqrt(variance)


def points_of(found: Found) -> tuple[Point, ...]:
    """Every segment's consumption brought to the reference conditions, declared modifications in it taken out."""
    observed, bare, model = found.observed, found.bare, found.model
    same = list(range(bare.problem.columns.shape[1])) if not found.places else _in_both(found)
    effects = bare.problem.columns[:, 1:] @ model.fit.coefficients[same][1:] * bare.scale.energy
    consumption = (observed.energy - effects) / observed.distance_km
    return tuple(
        Point(float(start), float(end), where.date(observed, k + 0.5), float(value))
        for k, (start, end, value) in enumerate(zip(observed.start_km, observed.end_km, consumption, strict=True))
    )


def _in_both(found: Found) -> list[int]:
    """Where the columns of the regression without breaks stand in the one with them."""
    terms = found.model.term_columns
    others = [terms.stop + found.model.others.index(name) for name in found.bare.others]
    return [LEVEL, *range(terms.start, terms.stop), *others]
