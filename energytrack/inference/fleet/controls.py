"""A modification's shift beside control vehicles of the same run, in the spirit of SAE J1321's ratio of test vehicle to
control vehicle: weather, traffic and season that all of them meet drop out.

Which vehicles are controls is stated, never guessed. With controls that share nothing with the vehicle the answer is
that of the vehicle alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from energytrack.consumption.observations import Observations, observe
from energytrack.consumption.oddities import set_aside
from energytrack.consumption.two_carriers import close_vehicle
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference import bounds, rules
from energytrack.inference.ahead import Road, always_fitted, road
from energytrack.inference.fleet.joint import Estimate, Joint, Part, part_of
from energytrack.inference.fleet.logs import VehicleLog
from energytrack.inference.fleet.results import Alone, ControlledShift
from energytrack.inference.graded import averaged
from energytrack.inference.looks import (
    FEWEST_BASELINE,
    State,
    finding,
    held_against,
    kept_so_far,
    look_points,
    percent,
    shown,
)
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array, structure
from energytrack.inference.question import Question
from energytrack.inference.results import Verdict
from energytrack.inference.shift import shift_of

MOST_SEGMENTS = 1000  # of all vehicles together
_ROUNDS = 9  # of the search for the distance


def assess_with_controls(
    test: VehicleLog,
    controls: Sequence[VehicleLog],
    name: str,
    *,
    target_percent: float = 3.0,
    confidence: float = 0.95,
    power: float = 0.80,
) -> ControlledShift:
    """Answer the main question for one modification with the help of vehicles that do not have it.

    Raises InferenceError for no control, a control that has the modification, too many segments, or a target,
    confidence or power out of range; UnknownNameError for a modification the vehicle does not have; ConsumptionError
    for logs that hold no measurable driving.
    """
    question = Question(name, target_percent / 100, 1 - confidence, power)
    observed = _observed(test)
    if name not in observed.names:
        raise UnknownNameError(f"no modification named {name!r}; logged: {', '.join(observed.names) or 'none'}")
    beside = _checked(test, controls, name)
    if len(observed) + sum(map(len, beside)) > MOST_SEGMENTS:
        raise InferenceError(f"at most {MOST_SEGMENTS} segments can be compared at once: name fewer controls")
    states, alone, last = _looks(observed, beside, question)
    blank = ControlledShift(
        vehicle=test.vehicle.name,
        modification=name,
        controls=tuple(log.vehicle.name for log in controls),
        verdict="no-baseline",
        shift_percent=None,
        interval_percent=None,
        standard_error_percent=None,
        degrees_of_freedom=None,
        confidence=confidence,
        target_percent=target_percent,
        information_fraction=None,
        distance_modified_km=float(observed.distance_km @ observed.fitted[:, observed.names.index(name)]),
        distance_to_go_km=None,
        common_share=None,
        common_share_sd=None,
        alone=None,
        looks=(),
    )
    return blank if last is None else _answer(blank, states, alone, last, question)


def _observed(log: VehicleLog) -> Observations:
    return observe(close_vehicle(log.vehicle, log.entries, log.events), log.modifications, (), log.weather)


def _checked(test: VehicleLog, controls: Sequence[VehicleLog], name: str) -> list[Observations]:
    if not controls:
        raise InferenceError("name at least one control: a vehicle of the same run without the modification")
    for log in controls:
        if log.vehicle.name == test.vehicle.name:
            raise InferenceError(f"{log.vehicle.name} cannot be its own control: name another vehicle")
        if any(row.name == name for row in log.modifications):
            raise InferenceError(f"{log.vehicle.name} has {name!r} itself: a control is a vehicle without it")
    return [_observed(log) for log in controls]


@dataclass(frozen=True)
class Beside:
    """A look at a vehicle beside its controls: every vehicle's model, and what they say together."""

    models: list[Model]
    estimate: Estimate


Guesses = dict[int, Array]  # of the noise, by place: the last look's


def look_beside(
    observed: Observations, beside: Sequence[Observations], question: Question, count: int, guesses: Guesses
) -> Beside | None:
    """The first `count` segments, beside the controls as they stood on that day; None where the newest one is odd."""
    kept = kept_so_far(observed.head(count), question)
    if kept is None:
        return None
    models = [fit_model(averaged(kept), question.modification, start=guesses.get(0))]
    guesses[0] = models[0].fit.theta
    for place, other in enumerate(beside, start=1):
        known = other.head(int(np.searchsorted(other.end_day, kept.end_day[-1], side="right")))
        if len(known) >= FEWEST_BASELINE:
            models.append(fit_model(averaged(set_aside(known).kept), None, start=guesses.get(place)))
            guesses[place] = models[-1].fit.theta
    return Beside(models, Joint([part_of(each) for each in models]).estimate())


def _looks(
    observed: Observations, beside: Sequence[Observations], question: Question
) -> tuple[list[State], State | None, Beside | None]:
    """Every look with the controls; the newest one without them."""
    watch, alone_watch = (rules.watch(question.rule, question.alpha) for _ in range(2))
    states: list[State] = []
    alone, last = None, None
    guesses: Guesses = {}
    for count in look_points(observed, question.modification):
        seen = look_beside(observed, beside, question, count, guesses)
        if seen is None:
            continue
        last, model = seen, seen.models[0]
        states.append(held_against(model, seen.estimate.shift, question, watch))
        alone = held_against(model, shift_of(model.fit), question, alone_watch)
    return states, alone, last


def _answer(
    blank: ControlledShift, states: list[State], alone: State | None, last: Beside, question: Question
) -> ControlledShift:
    now, found = states[-1], finding(states, question.target)
    answer = replace(
        blank,
        shift_percent=100 * now.shift.ratio,
        interval_percent=percent(now.interval),
        standard_error_percent=100 * now.shift.standard_error,
        degrees_of_freedom=now.shift.freedom,
        information_fraction=now.share,
        common_share=last.estimate.common if len(last.models) > 1 else None,
        common_share_sd=last.estimate.common_sd if len(last.models) > 1 else None,
        alone=None
        if alone is None
        else Alone(100 * alone.shift.ratio, 100 * alone.shift.standard_error, alone.share),
        looks=tuple(shown(state) for state in states),
    )
    if found is not None:
        return replace(answer, verdict=found[0], distance_to_go_km=0.0)
    to_go = _distance_to_go(last, question)
    verdict: Verdict = "out-of-reach" if to_go is None else "not-yet"
    return replace(answer, verdict=verdict, distance_to_go_km=to_go)


def _distance_to_go(last: Beside, question: Question) -> float | None:
    """How far the vehicle still has to drive while its controls drive on as they do; None within no reasonable size."""
    never = partial(np.zeros_like, dtype=np.float64)
    roads = [road(last.models[0], always_fitted, 0), *(road(model, never, 0) for model in last.models[1:])]
    ahead, shift = roads[0], last.estimate.shift
    price = bounds.price(shift.freedom, question.alpha)

    def variance(days: float) -> float:
        pairs = enumerate(zip(last.models, roads, strict=True))
        parts = [_continued(model, each, days, place) for place, (model, each) in pairs]
        return Joint(parts).variance(last.estimate.common, shift.ratio, shift.base) * price**2

    low, high = 0.0, _longest(roads)
    if variance(high) > 1 / question.information:
        return None
    for _ in range(_ROUNDS):
        middle = (low + high) / 2
        low, high = (middle, high) if variance(middle) > 1 / question.information else (low, middle)
    driven = np.concatenate([[0.0], np.cumsum(ahead.distance[ahead.past :]) * ahead.kilometre])
    return float(np.interp(high, np.concatenate([[0.0], ahead.ends]), driven))


def _longest(roads: Sequence[Road]) -> float:
    """Days ahead in which the vehicles together close no more segments than can be compared at once."""
    ends = np.sort(np.concatenate([each.ends for each in roads]))
    room = max(MOST_SEGMENTS - sum(each.past for each in roads), 1)
    return float(ends[min(room, len(ends)) - 1])


def _continued(model: Model, ahead: Road, days: float, place: int) -> Part:
    """A vehicle's log and so many days more. What it will have used does not matter for the variance."""
    count = ahead.past + int(np.searchsorted(ahead.ends, days, side="right"))
    shape = structure(
        ahead.distance[:count],
        ahead.day[:count],
        ahead.linked[:count],
        ahead.start_weight[:count],
        ahead.end_weight[:count],
        extra=ahead.extra[:count],
    )
    columns, precision = ahead.columns[:count], ahead.precision
    if place:  # a control has no column of the modification
        columns, precision = np.delete(columns, 1, axis=1), np.delete(precision, 1)
    fit = model.fit
    return Part(shape, float(ahead.day[0]), columns, np.zeros(count), precision, fit.theta, fit.theta_covariance)
