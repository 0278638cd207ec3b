"""A modification's shift over several vehicles, and what the fleet still has to drive to be sure of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import takewhile

import numpy as np
from scipy.special import ndtri

from energytrack.inference.fleet.random_effects import RandomEffects, pool, t_quantile
from energytrack.inference.fleet.results import (
    BriefAnswer,
    Contribution,
    Heterogeneity,
    Milestone,
    PooledShift,
    VehicleReview,
)
from energytrack.inference.noise import Array

_NEXT_KM = 1000.0  # over which a vehicle's gain is counted
_MOST_VEHICLES = 1000  # asked for when these cannot do it alone
_ROUNDS = 60


def pooled_shifts(
    vehicles: Sequence[VehicleReview], *, confidence: float, power: float
) -> tuple[PooledShift, ...]:
    """One for each modification that at least two vehicles have a shift of."""
    names = dict.fromkeys(answer.modification for each in vehicles for answer in each.answers)
    members = {name: [m for each in vehicles for m in _members(each, name)] for name in names}
    return tuple(
        _pooled(name, found, confidence=confidence, power=power) for name, found in members.items() if len(found) > 1
    )


_Member = tuple[str, BriefAnswer]


def _members(vehicle: VehicleReview, name: str) -> list[_Member]:
    """A shift that is for several parts together is no shift of this one."""
    return [
        (vehicle.vehicle, answer)
        for answer in vehicle.answers
        if answer.modification == name and answer.standard_error_percent and not answer.never_apart
    ]


def _pooled(name: str, members: Sequence[_Member], *, confidence: float, power: float) -> PooledShift:
    answers = [answer for _, answer in members]
    target = min(answer.target_percent for answer in answers)
    found = pool(
        [(answer.shift_percent or 0.0) / 100 for answer in answers],
        [((answer.standard_error_percent or 0.0) / 100) ** 2 for answer in answers],
    )
    wanted = information_wanted(target / 100, len(answers), confidence, power)
    fleet = _Fleet([_Path(answer.ahead) for answer in answers], found.between)
    now = float(found.weights.sum())
    days = 0.0 if now >= wanted else fleet.days_until(wanted)
    low, high = found.interval(confidence)
    following = found.prediction(confidence)
    return PooledShift(
        modification=name,
        vehicles=_contributions(members, found),
        shift_percent=100 * found.mean,
        standard_error_percent=100 * found.standard_error(),
        interval_percent=(100 * low, 100 * high),
        heterogeneity=Heterogeneity(
            found.q, found.q_p_value, 100 * found.i_squared, 100 * float(np.sqrt(found.between))
        ),
        next_vehicle_percent=None if following is None else (100 * following[0], 100 * following[1]),
        confidence=confidence,
        target_percent=target,
        information_fraction=min(1.0, now / wanted),
        distance_to_go_km=None if days is None else fleet.distance(days),
        days_to_go=days,
        vehicles_needed=None if days is not None else fleet.vehicles_needed(target / 100, confidence, power),
    )


def information_wanted(target: float, vehicles: int, confidence: float, power: float) -> float:
    """Information at which a shift of the target size is found with the stated power, looked at once.

    The quantile is Student's with k - 1, as in the interval; the power is taken as for a normal estimate.
    """
    return ((t_quantile(confidence, vehicles - 1) + float(ndtri(power))) / target) ** 2


def _contributions(members: Sequence[_Member], found: RandomEffects) -> tuple[Contribution, ...]:
    total = float(found.weights.sum())
    each = [
        Contribution(
            vehicle=vehicle,
            shift_percent=answer.shift_percent or 0.0,
            standard_error_percent=answer.standard_error_percent or 0.0,
            weight_percent=100 * float(weight) / total,
            gain_percent=100 * _gain(_Path(answer.ahead), found.between) / total if len(answer.ahead) > 1 else None,
        )
        for (vehicle, answer), weight in zip(members, found.weights, strict=True)
    ]
    return tuple(sorted(each, key=lambda one: -(one.gain_percent or 0.0)))


def _gain(path: _Path, between: float) -> float:
    """What the vehicle's next 1,000 km add to the pooled information."""
    before, after = (1 / (1 / path.information_at_km(km) + between) for km in (0.0, _NEXT_KM))
    return after - before


@dataclass(frozen=True)
class _Path:
    """A vehicle's own information along its road; it grows in proportion to distance between milestones."""

    milestones: Sequence[Milestone]

    def information_at_km(self, km: float) -> float:
        return float(np.interp(km, self._column("distance_km"), self._information))

    def information_on(self, days: float) -> float:
        return float(np.interp(days, self._column("days"), self._information))

    def driven_by(self, days: float) -> float:
        return float(np.interp(days, self._column("days"), self._column("distance_km")))

    @property
    def horizon_days(self) -> float:
        return self.milestones[-1].days

    @property
    def at_best(self) -> float:
        return 1 / self.milestones[-1].variance

    @property
    def _information(self) -> Array:
        return 1 / self._column("variance")

    def _column(self, name: str) -> Array:
        return np.array([getattr(each, name) for each in self.milestones], dtype=np.float64)


@dataclass(frozen=True)
class _Fleet:
    """Vehicles that drive on together, each by its own habit."""

    paths: Sequence[_Path]
    between: float  # variance between vehicles

    def information(self, days: float) -> float:
        return sum(1 / (1 / path.information_on(days) + self.between) for path in self.paths)

    def distance(self, days: float) -> float:
        return sum(path.driven_by(days) for path in self.paths)

    def days_until(self, wanted: float) -> float | None:
        """By bisection, as information grows with every day; None beyond the horizon."""
        low, high = 0.0, max(path.horizon_days for path in self.paths)
        if self.information(high) < wanted:
            return None
        for _ in range(_ROUNDS):
            middle = (low + high) / 2
            low, high = (middle, high) if self.information(middle) < wanted else (low, middle)
        return high

    def vehicles_needed(self, target: float, confidence: float, power: float) -> int | None:
        """With more vehicles like the typical one, all driven to the horizon; None where no number would do."""
        typical = float(np.median([1 / (1 / path.at_best + self.between) for path in self.paths]))
        counts = range(len(self.paths) + 1, _MOST_VEHICLES + 1)
        short = takewhile(lambda k: k * typical < information_wanted(target, k, confidence, power), counts)
        needed = len(self.paths) + 1 + sum(1 for _ in short)
        return needed if needed <= _MOST_VEHICLES else None
