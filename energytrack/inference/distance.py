"""Distance still needed, its range, and what would shorten it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from math import ceil, sqrt
from typing import Literal

import numpy as np

from energytrack.inference import bounds
from energytrack.inference.ahead import Reach, Road, Schedule, always_fitted, reach, road, segments_begun
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Remedy
from energytrack.inference.schedules import alternating, off_first

_DRAWS = 40  # of the noise and the habit, for the 80 % range
_LOW, _HIGH = 0.10, 0.90
_WIDEST = 2.5  # standard deviations a draw of the noise may stray
ALTERNATIONS = (1, 2, 4)  # fill-ups between swaps
LONGER_BASELINES = (10, 20, 40, 80, 160)  # fill-ups without it first
_ALTERNATING = tuple(
    ("every fill-up" if every == 1 else f"every {every} fill-ups", alternating(every)) for every in ALTERNATIONS
)
_LONGER_BASELINE = tuple((f"{count} fill-ups without it first", off_first(count)) for count in LONGER_BASELINES)
_Options = tuple[tuple[str, Schedule], ...]


@dataclass(frozen=True)
class Course:
    """A road, and how the variance of the shift falls along it."""

    road: Road
    variances: Array  # (m + 1,) after so many of the segments ahead, the noise known
    priced: Callable[[int], float]  # the same for a test that must estimate the noise as well

    def reach(self, variance: float) -> Reach | None:
        """Where the priced variance has fallen so far; None beyond the horizon."""
        return reach(self.road, self.priced, variance)

    def price(self, count: int) -> float:
        """Factor on the variance after so many segments for not knowing the noise."""
        return self.priced(count) / float(self.variances[count])


def course(model: Model, schedule: Schedule, question: Question) -> Course:
    """The road under a schedule, with its information."""
    ahead, theta = road(model, schedule, 0, question.wait_days), model.fit.theta
    variances = ahead.variances(theta)
    freedoms = cache(lambda: ahead.freedoms(theta))  # eight times the work of the variances: only where asked for

    @cache
    def priced(count: int) -> float:
        return float(variances[count]) * bounds.price(float(freedoms()[count]), question.alpha) ** 2

    return Course(ahead, variances, priced)


@dataclass(frozen=True)
class Need:
    """What it takes to reach a variance: the best guess and its 80 % range. None: beyond the horizon."""

    central: Reach | None
    interval_km: tuple[float, float | None] | None
    expected_km: float | None  # until the test stops, if the true shift equals the target
    best_variance: float  # at the horizon


def need(model: Model, schedule: Schedule, question: Question) -> Need:
    """Distance ahead, under a schedule, until a shift of the target size can be resolved."""
    return need_along(course(model, schedule, question), model, schedule, question)


def need_along(here: Course, model: Model, schedule: Schedule, question: Question) -> Need:
    """The same where the course is known already."""
    wanted = 1 / question.information
    sooner = here.reach(wanted / bounds.expected_share(question.alpha, question.power))
    last = here.road.ahead
    central = here.reach(wanted)
    end = last if central is None else segments_begun(here.road, central.distance_km)
    price = here.price(end) if np.isfinite(here.variances[end]) else 1.0
    learnt = here.road.learnt(end)
    return Need(
        central=central,
        interval_km=_holding(central, _interval(model, schedule, wanted / price, question.wait_days, learnt)),
        expected_km=None if sooner is None else sooner.distance_km,
        best_variance=here.priced(last),
    )


def _holding(
    central: Reach | None, interval: tuple[float, float | None] | None
) -> tuple[float, float | None] | None:
    """The range, widened to the best guess where a road of few segments left it outside."""
    if central is None or interval is None:
        return interval
    low, high = interval
    return min(low, central.distance_km), None if high is None else max(high, central.distance_km)


def _interval(
    model: Model, schedule: Schedule, wanted: float, wait_days: float, learnt: Array
) -> tuple[float, float | None] | None:
    """10th and 90th percentile over what the noise may be found to be by then, and over the habit."""
    reached = []
    for seed, theta in enumerate(_thetas(model, learnt), start=1):
        ahead = road(model, schedule, seed, wait_days)
        reached.append(reach(ahead, ahead.variances(theta).__getitem__, wanted))
    ordered = sorted(float("inf") if r is None else r.distance_km for r in reached)
    low, high = (ordered[round(q * (len(ordered) - 1))] for q in (_LOW, _HIGH))
    if low == float("inf"):
        return None
    return low, None if high == float("inf") else high


def _thetas(model: Model, learnt: Array) -> Array:
    """Draws of the log standard deviations (draws, 4) as the longer log will estimate them.

    The test ends by the estimate of that day, not by the truth. Seen from today it is spread by what will have been
    learnt (law of total variance); what will still be unknown then is in the price.
    """
    rng = np.random.default_rng(20)
    values, vectors = np.linalg.eigh(learnt)
    factor = vectors * np.sqrt(np.maximum(values, 0.0))
    strays = np.clip(rng.standard_normal((_DRAWS, 4)), -_WIDEST, _WIDEST)
    draws: Array = model.fit.theta + strays @ factor.T
    return draws


def remedies(model: Model, required: Need, question: Question) -> tuple[Remedy, ...]:
    """What would bring an out-of-reach target within reach: each option that does, with its distance.

    Of a modification that cannot be taken off again, none that takes it off.
    """
    best = 100 * question.drift * sqrt(required.best_variance)
    larger = ceil(best * 1.15 * 2) / 2  # a little above the limit, which itself is never reached; in half percents
    found = []
    if larger <= 50:  # a question may not ask for more
        wider = _distance(model, always_fitted, replace(question, target=larger / 100))
        found.append(Remedy("larger-target", f"{larger:g} %", larger, wider))
    ways: tuple[tuple[Literal["alternate", "longer-baseline"], _Options], ...] = (
        ("alternate", _ALTERNATING),
        ("longer-baseline", _LONGER_BASELINE),
    )
    for what, options in ways:
        if not question.reversible and (what == "alternate" or model.modification is not None):
            continue
        reached = [(_distance(model, schedule, question), detail) for detail, schedule in options]
        within = [(distance, detail) for distance, detail in reached if distance is not None]
        if within:
            distance, detail = min(within)
            found.append(Remedy(what, detail, 100 * question.target, distance))
    return tuple(found)


def _distance(model: Model, schedule: Schedule, question: Question) -> float | None:
    found = course(model, schedule, question).reach(1 / question.information)
    return None if found is None else found.distance_km
