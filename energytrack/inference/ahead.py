"""The road ahead: the log continued by the vehicle's own habit, and the information that would bring.

Future segments are drawn from the recent ones (distance, days, speed), those since the part was fitted once there are
enough; their temperature comes from the vehicle's yearly pattern at their dates. No consumption is needed:
information depends on the design and the noise alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.conditions import Conditions
from energytrack.inference.graded import level_terms
from energytrack.inference.growing import growing_products
from energytrack.inference.model import Model, stack
from energytrack.inference.noise import Array, Scatter, Structure, structure

RECENT = 40  # segments that make up the habit
ENOUGH_SINCE = 8  # segments since the last switch, from which on they alone make it up
HORIZON_DAYS, HORIZON_KM = 3 * 365.25, 100_000.0  # whichever comes first: nobody plans a test beyond
_MOST_SEGMENTS = 2_000
_STEP = 0.005  # in log standard deviation, for the freedom's derivative
_FLAT = 1e-4  # precision of the flat priors, so that a log without a baseline is no error: it tells next to nothing
_SHORTEST_DAYS = 0.1  # of an average future segment, for logs whose entries share one date

# days from now at which each of the m segments ahead ends (m,) -> share of each driven with the modification (m,)
Schedule = Callable[[Array], Array]


def always_fitted(ends: Array) -> Array:
    """One switch: the modification stays on."""
    return np.ones(len(ends))


@dataclass(frozen=True)
class Road:
    """A log of n segments and m more: arrays over n + m, in the model's relative units."""

    past: int
    distance: Array
    day: Array
    ends: Array  # days from now, at the end of each of the m segments
    linked: np.ndarray[tuple[int], np.dtype[np.bool_]]
    start_weight: Array
    end_weight: Array
    extra: Array
    columns: Array  # (n + m, p) with the modification asked about in column 1
    precision: Array  # (p,)
    base: float
    ratio: float
    kilometre: float  # km per relative distance
    noise_known: Array  # (4, 4) precision of theta that the log gave
    noise_prior: Array  # (4, 4) precision of theta that the priors gave

    @property
    def begins(self) -> int | None:
        """How many of the segments ahead pass before the first with the modification; None: driven with already."""
        if self.columns[: self.past, 1].any():
            return None
        fitted = np.flatnonzero(self.columns[self.past :, 1])
        return int(fitted[0]) if fitted.size else self.ahead

    @property
    def ahead(self) -> int:
        return len(self.distance) - self.past

    def normals(self, theta: Array) -> Array:
        """Normal matrices of the coefficients (m + 1, p, p) once 0 ... m of the segments ahead have been driven."""
        cross = growing_products(self._shape, Scatter(*np.exp(theta)), self.columns, self.past)
        normals: Array = cross + np.diag(np.maximum(self.precision, _FLAT))
        return normals

    def variances(self, theta: Array) -> Array:
        """Variance of the shift (m + 1,), as a ratio; infinite before anything was driven with the modification."""
        found = np.full(self.ahead + 1, np.inf)
        found[self._begun :] = shift_variance(self.normals(theta)[self._begun :], self.base, self.ratio)
        return found

    def variance(self, count: int, theta: Array) -> float:
        """Variance of the shift once `count` of the segments ahead have been driven."""
        return float(self.variances(theta)[count])

    def freedoms(self, theta: Array) -> Array:
        """Satterthwaite degrees of freedom (m + 1,): what the log tells of the noise grows with its length."""
        first = self._begun
        variance = self.variances(theta)[first:]
        moved = [self.variances(theta + step)[first:] for step in _STEP * np.eye(4)]
        slope = ((np.array(moved) - variance) / _STEP).T[:, :, None]
        length = (self.past + np.arange(first, self.ahead + 1)) / self.past
        precision = self.noise_prior + self.noise_known * length[:, None, None]
        wobble = (slope * np.linalg.solve(precision, slope)).sum(axis=(1, 2))
        found = np.ones(self.ahead + 1)
        found[first:] = np.maximum(2 * variance**2 / wobble, 1.0)
        return found

    def learnt(self, count: int) -> Array:
        """What `count` more segments will tell of the noise: how much the covariance of theta (4, 4) falls."""
        now, then = self.noise_known, self.noise_known * (self.past + count) / self.past
        less: Array = np.linalg.inv(self.noise_prior + now) - np.linalg.inv(self.noise_prior + then)
        return less

    @cached_property
    def _shape(self) -> Structure:
        return structure(
            self.distance, self.day, self.linked, self.start_weight, self.end_weight, extra=self.extra
        )

    @property
    def _begun(self) -> int:
        """Segments ahead after which something was driven with the modification; one more than there are for never."""
        return 0 if self.begins is None else self.begins + 1


def shift_variance(normals: Array, base: float, ratio: float) -> Array:
    """Variance of the shift by the delta method (k,), from normal matrices of the coefficients (k, p, p)."""
    direction = np.zeros((normals.shape[-1], 1))
    direction[:2, 0] = -ratio / base, 1 / base
    variance: Array = (direction * np.linalg.solve(normals, direction)).sum(axis=(1, 2))
    return variance


@dataclass(frozen=True)
class Reach:
    """Where on the road the information suffices: km and days from now."""

    distance_km: float
    days: float


def road(model: Model, schedule: Schedule, seed: int, wait_days: float = 0.0) -> Road:
    """The log of `model`, continued to the horizon. wait_days: from its last day until now, when driving goes on."""
    habit = _habit(model, seed, wait_days)
    shares = schedule(habit.ends)
    observed, scale = model.observed, model.scale
    distance = np.concatenate([observed.distance_km, habit.distance_km]) / scale.distance_km
    ahead = _columns_ahead(model, habit.conditions, shares) * (habit.distance_km / scale.distance_km)[:, None]
    past = model.problem.columns
    if model.modification is None:  # planning: nothing of the log was driven with it
        past = np.insert(past, 1, 0.0, axis=1)
    asked = model.modification is not None
    return Road(
        past=len(observed.distance_km),
        distance=distance,
        day=np.concatenate([observed.mid_day, habit.conditions.day]),
        ends=habit.ends,
        linked=np.concatenate([observed.linked, [habit.linked], np.ones(len(shares) - 1, dtype=bool)]),
        start_weight=np.concatenate([observed.start_weight, habit.start_weight]),
        end_weight=np.concatenate([observed.end_weight, habit.end_weight]),
        extra=np.concatenate([model.problem.shape.extra, np.zeros(len(shares))]),
        columns=np.vstack([past, ahead]),
        precision=model.problem.precision if asked else np.insert(model.problem.precision, 1, 0.0),
        base=float(model.fit.coefficients[0]),
        ratio=float(model.fit.coefficients[1] / model.fit.coefficients[0]) if asked else 0.0,
        kilometre=scale.distance_km,
        noise_known=_told_by_the_log(model),
        noise_prior=model.problem.prior_precision,
    )


def _told_by_the_log(model: Model) -> Array:
    """Precision of theta (4, 4) beyond that of the priors; none where the likelihood bends the other way."""
    values, vectors = np.linalg.eigh(np.linalg.inv(model.fit.theta_covariance) - model.problem.prior_precision)
    told: Array = (vectors * np.maximum(values, 0.0)) @ vectors.T
    return told


def reach(ahead: Road, variance_after: Callable[[int], float], variance: float) -> Reach | None:
    """The first point of the road at which a variance has fallen to `variance`; None beyond the horizon.

    `variance_after` gives it for any number of the segments ahead. It falls as they grow: found by bisection.
    """
    begins, high = ahead.begins, ahead.ahead
    if begins == high:
        return None
    low = begins or 0
    at = {low: variance_after(0) if begins is None else float("inf"), high: variance_after(high)}
    if at[high] > variance:
        return None
    if at[low] <= variance:
        return Reach(0.0, 0.0)
    while high - low > 1:
        middle = (low + high) // 2
        at[middle] = variance_after(middle)
        low, high = (low, middle) if at[middle] <= variance else (middle, high)
    part = _within(at[low], at[high], variance)
    driven = np.concatenate([[0.0], np.cumsum(ahead.distance[ahead.past :]) * ahead.kilometre])
    days = np.concatenate([[0.0], ahead.ends])
    return Reach(
        float(driven[low] + part * (driven[high] - driven[low])), float(days[low] + part * (days[high] - days[low]))
    )


def segments_within(ahead: Road, distance_km: float) -> int:
    """How many of the segments ahead fit into a distance, at least one."""
    driven = np.cumsum(ahead.distance[ahead.past :]) * ahead.kilometre
    return max(1, int(np.searchsorted(driven, distance_km, side="right")))


def segments_begun(ahead: Road, distance_km: float) -> int:
    """How many of the segments ahead a distance reaches into, at least one."""
    driven = np.cumsum(ahead.distance[ahead.past :]) * ahead.kilometre
    return max(1, min(ahead.ahead, int(np.searchsorted(driven, distance_km * (1 - 1e-9), side="left")) + 1))


def _within(before: float, after: float, wanted: float) -> float:
    """Share of a segment at which the information, linear in distance, reaches the wanted one."""
    gained = 1 / after - (0.0 if np.isinf(before) else 1 / before)
    missing = 1 / wanted - (0.0 if np.isinf(before) else 1 / before)
    return float(np.clip(missing / gained, 0.0, 1.0)) if gained > 0 else 1.0


@dataclass(frozen=True)
class _Habit:
    distance_km: Array
    ends: Array
    start_weight: Array
    end_weight: Array
    conditions: Conditions
    linked: bool  # to the log's last level; not after a wait in which entries must have been made and are not there


def _habit(model: Model, seed: int, wait_days: float) -> _Habit:
    rng = np.random.default_rng(seed)
    observed = model.observed
    recent = _recent(model)
    days_of = np.diff(observed.end_day, prepend=observed.end_day[0] - _mean_days(observed.end_day))[recent]
    mean_km = float(observed.distance_km[recent].mean())
    mean_days = max(float(days_of.mean()), _SHORTEST_DAYS)
    count = int(min(HORIZON_DAYS / mean_days, HORIZON_KM / mean_km, _MOST_SEGMENTS)) + 1
    drawn = rng.choice(recent, size=count)
    days = np.maximum(days_of[drawn - recent[0]], _SHORTEST_DAYS)
    ends = np.cumsum(days)
    day = float(observed.end_day[-1]) + wait_days + ends - days / 2
    values = {name: value[drawn] for name, value in model.conditions.values.items()}
    if "temperature_c" in values:
        values["temperature_c"] = model.conditions.patterns["temperature_c"].at(day)
    still = {name: np.zeros(count) for name in values}
    start = np.concatenate([observed.end_weight[-1:], observed.end_weight[drawn[:-1]]])
    ahead = Conditions(day, values, still, {}, {})
    linked = bool(wait_days <= days_of.max())
    return _Habit(observed.distance_km[drawn], ends, start, observed.end_weight[drawn], ahead, linked)


def _recent(model: Model) -> NDArray[np.intp]:
    """Places of the segments that make up the habit: a part is often fitted when the driving changes too."""
    count = len(model.observed)
    since = 0
    if model.modification is not None:
        fitted = model.observed.fitted[:, model.observed.names.index(model.modification)]
        since = int(np.flatnonzero(np.diff(fitted, prepend=fitted[0])).max(initial=0))
    first = max(0, count - RECENT)
    return np.arange(max(first, since) if count - since >= ENOUGH_SINCE else first, count)


def _mean_days(end_day: Array) -> float:
    return float(end_day[-1] - end_day[0]) / max(len(end_day) - 1, 1)


def _columns_ahead(model: Model, conditions: Conditions, shares: Array) -> Array:
    """Per unit distance (m, p): other modifications stay as they are now, and the levels are mixed as they were."""
    own = () if model.modification is None else level_terms(model.modification)
    now = [
        0.0 if name in own else model.observed.shares[-1, model.observed.names.index(name)] / model.levels[name]
        for name in model.others
    ]
    others = np.tile(now, (len(shares), 1)).reshape(len(shares), len(model.others))
    return stack(model.terms.columns(conditions), np.hstack([shares[:, None], others]), asked=True)
