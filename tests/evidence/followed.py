"""Long tests of a true shift as large as the target, followed entry by entry until the information is complete."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import ndtr, stdtrit

from energytrack.inference import bounds
from energytrack.inference.ahead import always_fitted
from energytrack.inference.distance import need
from energytrack.inference.looks import State, take_looks
from tests.evidence.logs import QUESTION, Job, drawn
from tests.uses import Use

FIRST_SEED = 30_000
LONGER = 2  # times as many fillings as tests/uses.py says, all of the further ones with the part
SMALLEST_TAIL = 1e-200
TOLD_AFTER = (6, 12, 24)  # segments driven with the part
Quantile = Callable[[float, float], float]  # of a tail and a freedom


@dataclass(frozen=True)
class Ending:
    """Where a test closed: at the first look that crosses its bound or completes the information."""

    found: bool  # it crossed
    driven_km: float  # with the part


@dataclass(frozen=True)
class Told:
    """A forecast of the distance with the part at which the information is complete. None: beyond the horizon."""

    after: int  # segments driven with the part
    already: bool  # complete by then: nothing was forecast
    needed_km: float | None
    low_km: float | None
    high_km: float | None


@dataclass(frozen=True)
class Followed:
    """One test. None: it did not get that far within the log."""

    use: str
    ours: Ending | None  # as energytrack counts information and sets its bound
    unpriced: Ending | None  # information as 1 / variance, as if the noise were known
    student: Ending | None  # bound and price by Student's t
    complete_km: float | None  # with the part, when the information was first complete
    held: bool  # the true shift lay in the look-proof range of every look
    told: tuple[Told, ...]


def lengthened(use: Use) -> Use:
    """The same baseline, and three times the distance with the part."""
    return replace(use, fillings=LONGER * use.fillings, switches=(use.switches[0] / LONGER,))


def follow(job: Job) -> Followed:
    states = take_looks(drawn(Job(lengthened(job.use), job.seed)), QUESTION, every=True)
    truth = job.use.shift_percent / 100
    return Followed(
        job.use.vehicle,
        _ending(states, bounds.mixture_quantile, priced=True),
        _ending(states, bounds.mixture_quantile, priced=False),
        _ending(states, _student_quantile, priced=True),
        _complete_km(states),
        all(state.interval is None or state.interval[0] <= truth <= state.interval[1] for state in states),
        tuple(_told(states, after) for after in TOLD_AFTER),
    )


def _student_quantile(tail: float, freedom: float) -> float:
    return -float(stdtrit(freedom, tail))


def _ending(states: Sequence[State], quantile: Quantile, *, priced: bool) -> Ending | None:
    """The test as in looks.py and bounds.py, with another quantile, or with information as if the noise were known."""
    level = bounds.level(QUESTION.alpha)
    for state in states:
        freedom = state.shift.freedom
        price = quantile(float(ndtr(-level)), freedom) / level if priced else 1.0
        share = min(1.0, 1 / (state.shift.standard_error * price) ** 2 / QUESTION.information)
        tail = float(ndtr(-level / np.sqrt(share)))
        crossed = tail > SMALLEST_TAIL and abs(state.shift.z) > quantile(tail, freedom)
        if crossed or share >= 1:
            return Ending(crossed, _driven(state))
    return None


def _complete_km(states: Sequence[State]) -> float | None:
    """Between two looks the information is taken to grow in proportion to the distance, as a forecast does."""
    first = next((k for k, state in enumerate(states) if state.complete), None)
    if first is None:
        return None
    if first == 0:
        return _driven(states[0])
    before, at = states[first - 1], states[first]
    part = (1 - before.share) / (_information(at) / QUESTION.information - before.share)
    return _driven(before) + part * (_driven(at) - _driven(before))


def _information(state: State) -> float:
    """Priced as in energytrack, and not cut off when complete."""
    return (state.shift.standard_error * bounds.price(state.shift.freedom, QUESTION.alpha)) ** -2


def _told(states: Sequence[State], after: int) -> Told:
    state = next(state for state in states if _segments_with(state) >= after)
    driven = _driven(state)
    if any(earlier.complete for earlier in states[: states.index(state) + 1]):
        return Told(after, True, None, None, None)
    required = need(state.model, always_fitted, QUESTION)
    low, high = required.interval_km or (None, None)
    return Told(
        after,
        False,
        None if required.central is None else driven + required.central.distance_km,
        None if low is None else driven + low,
        None if high is None else driven + high,
    )


def _segments_with(state: State) -> int:
    return int(np.count_nonzero(state.model.observed.shares[:, 0]))


def _driven(state: State) -> float:
    observed = state.model.observed
    return float(observed.distance_km @ observed.shares[:, 0])
