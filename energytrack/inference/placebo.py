"""A change pretended where nothing was fitted or removed: how often would it have been called a shift?

No model of the noise is assumed: these are the vehicle's own segments. Beside it stands what most people do, the two
plain averages, held apart by Welch's (1947) t-test on the consumption of each segment.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import ttest_ind

from energytrack.consumption.observations import Observations
from energytrack.inference.bounds import mixture_quantile
from energytrack.inference.looks import finding, take_looks
from energytrack.inference.question import Question
from energytrack.inference.rehearsal_results import Placebo

PRETENDED = "a pretended change"
SIDES = (10, 20, 40)  # segments before and after the pretended change
_MOST_PLACES = 40  # for each of them, evenly spread over the eligible ones
_FEWEST_AVERAGED = 2  # segments a standard deviation needs


@dataclass(frozen=True)
class Place:
    """A stretch of the log, the change pretended at its middle."""

    stretch: Observations
    question: Question


@dataclass(frozen=True)
class Called:
    """Whether a stretch would have been called a shift, in each way of looking."""

    every_look: bool
    one_look: bool
    averages_every_look: bool
    averages_one_look: bool
    at_km: float


def places(observed: Observations, question: Question) -> dict[int, list[Place]]:
    """The places to try, by the number of segments on each side; none where the log is too short for one."""
    return {
        side: [place(observed, start, side, question) for start in _spread(starts(observed, side))] for side in SIDES
    }


def starts(observed: Observations, side: int) -> list[int]:
    """First segments of every stretch of 2 x `side` in which nothing was fitted, removed or set differently."""
    state = np.hstack([observed.shares, observed.fitted])
    changed = np.concatenate([[0], np.cumsum(np.any(np.diff(state, axis=0) != 0, axis=1))])
    return [start for start in range(len(observed) - 2 * side + 1) if changed[start] == changed[start + 2 * side - 1]]


def separate(candidates: Sequence[int], side: int) -> int:
    """How many stretches fit beside each other without sharing a segment."""
    count, free_from = 0, 0
    for start in candidates:
        if start >= free_from:
            count, free_from = count + 1, start + 2 * side
    return count


def _spread(candidates: list[int]) -> list[int]:
    if len(candidates) <= _MOST_PLACES:
        return candidates
    return [candidates[k] for k in np.linspace(0, len(candidates) - 1, _MOST_PLACES).round().astype(int)]


def place(observed: Observations, start: int, side: int, question: Question) -> Place:
    """The stretch of `side` segments from `start` on, and as many with the change pretended."""
    stretch = observed.keeping(()).part(start, start + 2 * side)  # what is fitted throughout is the vehicle itself
    linked = stretch.linked.copy()
    linked[0] = False  # the segment it shares a level with is not in the stretch
    pretended = replace(stretch, linked=linked).adding(PRETENDED, np.repeat([0.0, 1.0], side))
    return Place(pretended, replace(question, modification=PRETENDED))


def call(place: Place) -> Called:
    """Hold one pretended change against both methods."""
    observed, question = place.stretch, place.question
    states = take_looks(observed, question, every=True)
    found, last = finding(states, question.target), states[-1].shift
    consumption = observed.energy / observed.distance_km
    side = len(observed) // 2
    tests = [
        _averages_differ(consumption[:side], consumption[side : side + after], question.alpha)
        for after in range(_FEWEST_AVERAGED, side + 1)
    ]
    return Called(
        every_look=found is not None and found[0] == "shifted",
        one_look=abs(last.z) > mixture_quantile(question.alpha / 2, last.freedom),
        averages_every_look=any(tests),
        averages_one_look=tests[-1],
        at_km=float(observed.start_km[side]),
    )


def _averages_differ(before: np.ndarray, after: np.ndarray, alpha: float) -> bool:
    return bool(ttest_ind(before, after, equal_var=False).pvalue < alpha)


def summary(side: int, candidates: Sequence[int], called: Sequence[Called]) -> Placebo:
    """The counts over all places tried."""
    return Placebo(
        segments_each_side=side,
        places=len(called),
        separate=separate(candidates, side),
        called_every_look=sum(each.every_look for each in called),
        called_one_look=sum(each.one_look for each in called),
        averages_every_look=sum(each.averages_every_look for each in called),
        averages_one_look=sum(each.averages_one_look for each in called),
        called_at_km=tuple(each.at_km for each in called if each.every_look),
    )
