"""A plan without a log: driving and noise as someone states them, in the place of those that a log tells.

The stated figures become a log without energy: fill-ups at even distances, temperatures of a year between those of
January and July, and the noise as stated. What such a log would tell of its noise is Fisher's information of the
restricted likelihood, so that a plan from stated figures pays for not knowing the noise as any other does.
"""

from __future__ import annotations

import datetime as dt
import math
from dataclasses import dataclass

import numpy as np

from energytrack.consumption.conditions import TEMPERATURE, Conditions, Pattern, Terms, choose
from energytrack.consumption.observations import Observations
from energytrack.consumption.terms import YEAR_DAYS
from energytrack.errors import InferenceError
from energytrack.inference.likelihood import Problem, evaluate
from energytrack.inference.looks import FEWEST_BASELINE
from energytrack.inference.model import Model, Scale, noise_priors, stack
from energytrack.inference.noise import HALF_LIFE_DAYS, Array, structure
from energytrack.inference.reml import Fit
from energytrack.logbook.records import UNITS

_SEASONS_OF_WEEKS = 2 / 3  # drift of seasons relative to that of weeks, where only the latter is stated
_COLDEST = 15  # of January, in the northern half
_WEATHER_SD = 3.0  # K, of a fill-up's temperature around the yearly pattern
_SMALLEST = 1e-4  # a source stated as 0, as a share of consumption
_TYPICAL = 40  # fill-ups from which the information on the noise is taken


@dataclass(frozen=True)
class Stated:
    """Driving and noise as stated. Raises InferenceError for figures that cannot be.

    Noise in percent of the consumption of one fill-up: trip_noise, drift (over weeks), season_drift; None for the
    drifts: what is usual beside such trips. filling: sd of one fill or level reading, in `unit`; None: the usual
    share of the capacity. consumption: `unit` per 100 km. january_c, july_c: monthly means. date: when the baseline
    is complete and the test could begin; None: today.
    """

    trip_noise: float
    drift: float | None = None
    season_drift: float | None = None
    filling: float | None = None
    capacity: float = 50.0
    consumption: float = 7.0
    unit: str = "L"
    km_per_fill: float = 550.0
    days_per_fill: float = 7.0
    baseline_km: float = 3_000.0
    january_c: float = -2.0
    july_c: float = 22.0
    date: dt.date | None = None

    def __post_init__(self) -> None:
        if self.unit not in UNITS:
            raise InferenceError(f"unit {self.unit!r} is unknown; use one of {', '.join(UNITS)}")
        _check("trip_noise", self.trip_noise, above=0.0, at_most=100.0)
        for name in ("capacity", "consumption", "km_per_fill", "days_per_fill"):
            _check(name, getattr(self, name), above=0.0)
        for name in ("drift", "season_drift"):
            _check(name, getattr(self, name) or 0.0, at_most=100.0)
        _check("filling", self.filling or 0.0)
        for name in ("january_c", "july_c"):
            _check(name, getattr(self, name), at_least=-60.0, at_most=60.0)
        fewest = FEWEST_BASELINE * self.km_per_fill
        if not fewest <= self.baseline_km < math.inf:
            raise InferenceError(
                f"a baseline of {self.baseline_km:g} km is less than {FEWEST_BASELINE} fill-ups: "
                f"give {fewest:g} km or more"
            )

    @property
    def fills(self) -> int:
        """Whole fill-ups of the baseline."""
        return int(self.baseline_km / self.km_per_fill + 1e-9)


def stated_model(stated: Stated) -> Model:
    """The stated figures as a fitted model (nothing asked about), its noise known as well as such a log would tell."""
    observed = _driven(stated, stated.fills)
    conditions, terms = _conditions(stated, observed), _terms(stated)
    scale = Scale(stated.km_per_fill, stated.consumption / 100)
    columns = stack(terms.columns(conditions), np.zeros((len(observed), 0)), asked=False)
    problem = _problem(observed, columns, terms, scale)
    theta = _log_sds(stated, problem, scale)
    spread = np.linalg.inv(problem.prior_precision + _information(stated, theta) * len(observed)).astype(np.float64)
    there = evaluate(problem, theta)
    unmoved = np.zeros((4, *there.covariance.shape))
    fit = Fit(theta, spread, there.coefficients, there.covariance, unmoved)
    return Model(observed, conditions, terms, scale, None, (), {}, problem, fit)


def _check(name: str, value: float, above: float = -math.inf, at_least: float = 0.0, at_most: float = math.inf) -> None:
    if not (math.isfinite(value) and value > above and at_least <= value <= at_most):
        low = f"more than {above:g}" if above > -math.inf else f"{at_least:g} or more"
        high = "" if at_most == math.inf else f", {at_most:g} at most"
        raise InferenceError(f"{name.replace('_', ' ')} of {value:g} cannot be: state {low}{high}")


def _driven(stated: Stated, count: int) -> Observations:
    """`count` fill-ups before the test, as a log would hold them."""
    today = (stated.date or dt.date.today()).toordinal()
    end_day = today - stated.days_per_fill * np.arange(count - 1, -1, -1.0)
    mid_day = end_day - stated.days_per_fill / 2
    distance = np.full(count, stated.km_per_fill)
    end_km = np.cumsum(distance)
    weather = _WEATHER_SD * np.random.default_rng(count).standard_normal(count)
    return Observations(
        distance_km=distance,
        energy=distance * stated.consumption / 100,
        mid_day=mid_day,
        start_km=end_km - distance,
        end_km=end_km,
        end_day=end_day,
        linked=np.arange(count) > 0,
        start_weight=np.ones(count),
        end_weight=np.ones(count),
        conditions={TEMPERATURE: _year(stated).at(mid_day) + weather},
        known_share={TEMPERATURE: np.ones(count)},
        shares=np.zeros((count, 0)),
        fitted=np.zeros((count, 0)),
        levels=np.zeros((count, 0)),
        names=(),
        unit=stated.unit,
        capacity=stated.capacity,
        entry=np.arange(count),
        confirmed=np.zeros(count, dtype=np.bool_),
    )


def _year(stated: Stated) -> Pattern:
    """Temperature over the year, coldest (in the southern half warmest) in the middle of January."""
    mean, swing = (stated.january_c + stated.july_c) / 2, (stated.january_c - stated.july_c) / 2
    angle = 2 * math.pi * dt.date(2001, 1, _COLDEST).toordinal() / YEAR_DAYS
    return Pattern(np.array([mean, swing * math.cos(angle), swing * math.sin(angle)]), _WEATHER_SD**2)


def _conditions(stated: Stated, observed: Observations) -> Conditions:
    known = {name: np.zeros(len(observed)) for name in observed.conditions}
    values = {name: np.asarray(value) for name, value in observed.conditions.items()}
    return Conditions(observed.mid_day, values, known, {TEMPERATURE: _year(stated)}, {})


def _terms(stated: Stated) -> Terms:
    """The terms that a whole year of such driving supports: a short baseline has not met all of them yet."""
    year = _driven(stated, max(_TYPICAL, math.ceil(YEAR_DAYS / stated.days_per_fill)))
    return choose(year, _conditions(stated, year))


def _problem(observed: Observations, columns: Array, terms: Terms, scale: Scale) -> Problem:
    count = len(observed)
    shape = structure(
        np.ones(count), observed.mid_day, observed.linked, observed.start_weight, observed.end_weight
    )
    precision = np.concatenate([np.zeros(1), 1 / terms.prior_sd**2])
    return Problem(shape, columns, columns[:, 0], precision, noise_priors(observed, scale))


def _log_sds(stated: Stated, problem: Problem, scale: Scale) -> Array:
    """Log standard deviations in relative units (4,)."""
    _, level, weeks, _ = (math.exp(prior.median) for prior in problem.priors)
    trip = stated.trip_noise / 100
    drift = trip * weeks if stated.drift is None else stated.drift / 100
    seasons = drift * _SEASONS_OF_WEEKS if stated.season_drift is None else stated.season_drift / 100
    filling = level if stated.filling is None else stated.filling / scale.energy
    return np.log(np.maximum([trip, filling, drift, seasons], _SMALLEST))


def _information(stated: Stated, theta: Array) -> Array:
    """Fisher's information on theta (4, 4) that one fill-up brings, in a log of typical length.

    Of the restricted likelihood: tr(P V_j P V_k) / 2, V_j the derivative of the covariance (Patterson and Thompson,
    1971). Dense: the log is short.
    """
    driven = _driven(stated, _TYPICAL)
    terms = _terms(stated)
    columns = stack(terms.columns(_conditions(stated, driven)), np.zeros((_TYPICAL, 0)), asked=False)
    apart = np.abs(np.subtract.outer(driven.mid_day, driven.mid_day))
    shapes = [
        np.eye(_TYPICAL),
        2 * np.eye(_TYPICAL) - np.eye(_TYPICAL, k=1) - np.eye(_TYPICAL, k=-1),
        *(np.exp2(-apart / half_life) for half_life in HALF_LIFE_DAYS),
    ]
    parts = [math.exp(2 * size) * shape for size, shape in zip(theta, shapes, strict=True)]
    inverse = np.linalg.inv(sum(parts[1:], parts[0]))
    precision = np.diag([0.0, *(1 / terms.prior_sd**2)])
    normal = columns.T @ inverse @ columns + precision
    projection = inverse - inverse @ columns @ np.linalg.solve(normal, columns.T @ inverse)
    products = [projection @ (2 * part) for part in parts]
    information = np.array([[np.trace(one @ other) / 2 for other in products] for one in products])
    return information / _TYPICAL
