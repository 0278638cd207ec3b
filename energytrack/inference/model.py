"""A log and a question become one regression: columns, noise structure, priors, and the fit.

    energy_i = distance_i (b0 + terms_i b + shares_i delta) + u_i
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import log, sqrt

import numpy as np

from energytrack.consumption.conditions import Conditions, Terms, choose, fill
from energytrack.consumption.observations import Observations
from energytrack.errors import InferenceError
from energytrack.inference.likelihood import Prior, Problem
from energytrack.inference.noise import Array, structure
from energytrack.inference.reml import Fit, fit

_CLICK_OFF = {"kWh": 0.010}  # sd of one fill or reading as a share of capacity
_USUAL_CLICK_OFF = 0.012
_WEEKS, _SEASONS = 0.3, 0.2  # median drift relative to the trip noise of a usual tank,
_USUAL_TANK_KM = 500.0  # so that logging the same driving more often does not make it drift more
_LOOSE = 0.8  # log-sd of those priors
_TRIP = Prior((1, 0, 0, 0), log(0.05), 1.5)  # all but free: 95 % of it lies between 0.3 and 95 %
_STRETCH = 500  # segments at least, or a tenth of the log, that give a long log's first guess of the noise
_ANOTHER_MODIFICATION = 0.2  # prior sd of the effect of a modification not asked about


@dataclass(frozen=True)
class Scale:
    """What relative units are relative to."""

    distance_km: float  # an average segment
    consumption: float  # energy per km over the whole log

    @property
    def energy(self) -> float:
        return self.distance_km * self.consumption


@dataclass(frozen=True)
class Model:
    """A fitted regression. Columns: level, the modification asked about (if any), terms, other modifications."""

    observed: Observations
    conditions: Conditions
    terms: Terms
    scale: Scale
    modification: str | None
    others: tuple[str, ...]
    levels: dict[str, float]  # modification -> highest level so far, at which its column is 1
    problem: Problem
    fit: Fit

    @property
    def term_columns(self) -> slice:
        start = 1 if self.modification is None else 2
        return slice(start, start + len(self.terms.names))


def fit_model(
    observed: Observations,
    modification: str | None,
    *,
    covariates: Sequence[str] = (),
    start: Array | None = None,
) -> Model:
    """Fit one log. `start` (4,) is a guess of the log standard deviations, such as the last look's."""
    conditions = fill(observed)
    terms = choose(observed, conditions, covariates)
    scale = _scale(observed)
    levels = dict(zip(observed.names, observed.levels[-1].tolist(), strict=True))
    if modification is not None and levels.get(modification, 0.0) == 0:
        raise InferenceError(f"nothing has been driven with {modification!r} fitted: log the next full tank")
    others = tuple(name for name in observed.names if name != modification and _varies(observed, name))
    names = others if modification is None else (modification, *others)
    shares = observed.shares[:, [observed.names.index(name) for name in names]] / np.array([levels[n] for n in names])
    relative = observed.distance_km / scale.distance_km
    columns = relative[:, None] * stack(terms.columns(conditions), shares, asked=modification is not None)
    foreseen = _foreseen(terms, asked=modification is not None, others=len(others))
    energy = observed.energy / scale.energy - columns @ foreseen  # the priors of the rest are centred on no effect
    precision = _precision(terms, asked=modification is not None, others=len(others))
    extra = _filled_in_variance(columns, energy, precision, relative, terms, conditions, modification is not None)
    shape = structure(
        relative, observed.mid_day, observed.linked, observed.start_weight, observed.end_weight, extra=extra
    )
    problem = Problem(shape, columns, energy, precision, noise_priors(observed, scale))
    fitted = fit(problem, _first_guess(observed, problem) if start is None else start)
    whole = replace(fitted, coefficients=fitted.coefficients + foreseen)
    return Model(observed, conditions, terms, scale, modification, others, levels, problem, whole)


def stack(terms: Array, shares: Array, *, asked: bool) -> Array:
    """Columns of the design per unit distance: level, the modification asked about, terms, other modifications."""
    ones = np.ones((len(terms), 1))
    asked_columns, other_columns = (shares[:, :1], shares[:, 1:]) if asked else (shares[:, :0], shares)
    return np.hstack([ones, asked_columns, terms, other_columns])


def noise_priors(observed: Observations, scale: Scale) -> tuple[Prior, ...]:
    """Weak log-normal priors: fills to their usual accuracy, drift in proportion to the trips' own scatter."""
    capacity = observed.capacity or float(observed.energy.max())
    level = _CLICK_OFF.get(observed.unit, _USUAL_CLICK_OFF) * capacity / scale.energy
    tank = sqrt(scale.distance_km / _USUAL_TANK_KM)
    return (
        _TRIP,
        Prior((0, 1, 0, 0), log(level), _LOOSE),
        Prior((-1, 0, 1, 0), log(_WEEKS * tank), _LOOSE),
        Prior((-1, 0, 0, 1), log(_SEASONS * tank), _LOOSE),
    )


def _first_guess(observed: Observations, problem: Problem) -> Array:
    """The priors' medians; for a long log what a stretch of it says, so that few rounds are paid at full length."""
    if len(observed) > 2 * _STRETCH:
        return fit_model(observed.head(max(_STRETCH, len(observed) // 10)), None).fit.theta
    trip, level, weeks, seasons = (prior.median for prior in problem.priors)
    return np.array([trip, level, trip + weeks, trip + seasons])


def _scale(observed: Observations) -> Scale:
    return Scale(float(observed.distance_km.mean()), float(observed.energy.sum() / observed.distance_km.sum()))


def _varies(observed: Observations, name: str) -> bool:
    """Fitted for part of this log: what never changed cannot be told from the vehicle itself."""
    return bool(np.ptp(observed.shares[:, observed.names.index(name)]) > 0)


def _foreseen(terms: Terms, *, asked: bool, others: int) -> Array:
    """Prior means of the coefficients (p,)."""
    return np.concatenate([np.zeros(2 if asked else 1), terms.prior_mean, np.zeros(others)])


def _precision(terms: Terms, *, asked: bool, others: int) -> Array:
    flat = np.zeros(2 if asked else 1)
    return np.concatenate([flat, 1 / terms.prior_sd**2, np.full(others, 1 / _ANOTHER_MODIFICATION**2)])


def _filled_in_variance(
    columns: Array,
    energy: Array,
    precision: Array,
    relative: Array,
    terms: Terms,
    conditions: Conditions,
    asked: bool,
) -> Array:
    """Variance that filled-in conditions add to each segment (n,), from a first weighted least-squares response."""
    variances = terms.variances(conditions)
    if not variances.any():
        return np.zeros(len(energy))
    weights = 1 / relative
    noise = 0.05**2
    normal = columns.T @ (columns * weights[:, None]) / noise + np.diag(precision)
    response = np.linalg.solve(normal, columns.T @ (energy * weights) / noise)
    first = 2 if asked else 1
    slopes = response[first : first + len(terms.names)]
    variance: Array = relative**2 * (variances @ slopes**2)
    return variance
