"""Distance still needed, its range, and what would shorten it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache, partial
from itertools import accumulate
from math import ceil, sqrt
from typing import Literal

import numpy as np

from energytrack.inference import bounds
from energytrack.inference.ahead import (
    Reach,
    Road,
    Schedule,
    alternating,
    always_fitted,
    off_first,
    reach,
    road,
    segments_within,
)
from energytrack.inference.model import Model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Design, Remedy

_DRAWS = 40  # of the noise and the habit, for the 80 % range
_LOW, _HIGH = 0.10, 0.90
_WIDEST = 2.5  # standard deviations a draw of the noise may stray
ALTERNATIONS = (1, 2, 4)  # fill-ups between swaps
_ALTERNATING = tuple(
    ("every fill-up" if every == 1 else f"every {every} fill-ups", alternating(every)) for every in ALTERNATIONS
)
_LONGER_BASELINE = tuple((f"{count} fill-ups without it first", off_first(count)) for count in (10, 20, 40, 80, 160))
_Options = tuple[tuple[str, Schedule], ...]
DISTANCES_KM = (1_000, 2_500, 5_000, 10_000)


@dataclass(frozen=True)
class Need:
    """What it takes to reach a variance: the best guess and its 80 % range. None: beyond the horizon."""

    central: Reach | None
    interval_km: tuple[float, float | None] | None
    expected_km: float | None  # until the test stops, if the true shift equals the target
    best_variance: float  # at the horizon


def need(model: Model, schedule: Schedule, question: Question) -> Need:
    """Distance ahead, under a schedule, until a shift of the target size can be resolved."""
    ahead = road(model, schedule, seed=0)
    priced = _priced_variance(model, ahead, question)
    wanted = 1 / question.information
    central = reach(ahead, priced, wanted)
    sooner = reach(ahead, priced, wanted / bounds.expected_share(question.alpha, question.power))
    last = priced(ahead.ahead)
    price = last / ahead.variance(ahead.ahead, model.fit.theta)
    return Need(
        central=central,
        interval_km=_interval(model, schedule, wanted / price),
        expected_km=None if sooner is None else sooner.distance_km,
        best_variance=last,
    )


def _priced_variance(model: Model, ahead: Road, question: Question) -> Callable[[int], float]:
    """Variance of the shift after so many segments, raised by the price of not knowing the noise by then."""
    theta = model.fit.theta

    @cache
    def priced(count: int) -> float:
        return ahead.variance(count, theta) * bounds.price(ahead.freedom(count, theta), question.alpha) ** 2

    return priced


def _interval(model: Model, schedule: Schedule, wanted: float) -> tuple[float, float | None] | None:
    """10th and 90th percentile over the noise's own uncertainty and the habit's."""
    reached = []
    for seed, theta in enumerate(_thetas(model), start=1):
        ahead = road(model, schedule, seed)
        reached.append(reach(ahead, partial(ahead.variance, theta=theta), wanted))
    ordered = sorted(float("inf") if r is None else r.distance_km for r in reached)
    low, high = (ordered[round(q * (len(ordered) - 1))] for q in (_LOW, _HIGH))
    if low == float("inf"):
        return None
    return low, None if high == float("inf") else high


def _thetas(model: Model) -> Array:
    """Draws of the log standard deviations (draws, 4) from their normal approximation."""
    rng = np.random.default_rng(20)
    factor = np.linalg.cholesky(model.fit.theta_covariance)
    strays = np.clip(rng.standard_normal((_DRAWS, 4)), -_WIDEST, _WIDEST)
    draws: Array = model.fit.theta + strays @ factor.T
    return draws


def design(model: Model, every: int | None, question: Question) -> Design:
    """One way to run the test from here: one switch (`every` None), or alternating every so many fill-ups."""
    schedule = always_fitted if every is None else alternating(every)
    required = need(model, schedule, question)
    ahead = road(model, schedule, seed=0)
    priced = _priced_variance(model, ahead, question)
    z = question.drift
    by_then = [100 * z * sqrt(priced(segments_within(ahead, km))) for km in DISTANCES_KM]
    never_worse = accumulate(by_then, min)  # the freedom is an approximation, and may lose more than a segment brings
    return Design(
        name="one-switch" if every is None else "alternate",
        every_fillups=every,
        swaps=_swaps(ahead, every, required.central),
        distance_km=None if required.central is None else required.central.distance_km,
        distance_interval_km=required.interval_km,
        days=None if required.central is None else required.central.days,
        resolvable_percent={str(km): shift for km, shift in zip(DISTANCES_KM, never_worse, strict=True)},
    )


def _swaps(ahead: Road, every: int | None, central: Reach | None) -> int | None:
    """Times the part goes on or comes off, the first fitting included."""
    if every is None:
        return 1
    if central is None:
        return None
    return ceil((segments_within(ahead, central.distance_km) + 1) / every)


def remedies(model: Model, required: Need, question: Question) -> tuple[Remedy, ...]:
    """What would bring an out-of-reach target within reach: each option that does, with its distance."""
    best = 100 * question.drift * sqrt(required.best_variance)
    larger = ceil(best * 1.15 * 2) / 2  # a little above the limit, which itself is never reached; in half percents
    found = []
    if larger < 100:
        wider = _distance(model, always_fitted, replace(question, target=larger / 100))
        found.append(Remedy("larger-target", f"{larger:g} %", larger, wider))
    ways: tuple[tuple[Literal["alternate", "longer-baseline"], _Options], ...] = (
        ("alternate", _ALTERNATING),
        ("longer-baseline", _LONGER_BASELINE),
    )
    for what, options in ways:
        reached = [(_distance(model, schedule, question), detail) for detail, schedule in options]
        within = [(distance, detail) for distance, detail in reached if distance is not None]
        if within:
            distance, detail = min(within)
            found.append(Remedy(what, detail, 100 * question.target, distance))
    return tuple(found)


def _distance(model: Model, schedule: Schedule, question: Question) -> float | None:
    ahead = road(model, schedule, seed=0)
    found = reach(ahead, _priced_variance(model, ahead, question), 1 / question.information)
    return None if found is None else found.distance_km
