"""The looks that decide, without taking those that cannot.

Between two looks the standardised path is a Brownian bridge (Lan and Wittes, 1988). From s to u, both shares of the
bound b, over a stretch dt of the information it reaches the bound in between with probability
exp(-2 b^2 (1 - s)(1 - u) / dt) (Siegmund, 1985). Looks between two that make this all but impossible, and that agree
on the noise, are left out. The others are taken, so that the verdict is the one of a look at every entry; where it is
a close call, every look is taken.
"""

from __future__ import annotations

from math import exp
from typing import Literal

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference import bounds, rules
from energytrack.inference.graded import newest_level
from energytrack.inference.looks import State, kept_so_far, look_points, take_look, take_looks
from energytrack.inference.question import Question

_STRIDE = 8  # looks between two that are taken, at most
_NEVER = 1e-8  # chance of a look left out having crossed
_LEAST_STRETCH = 0.05  # of the information: its share is estimated too, and moves
_NEARLY_COMPLETE = 0.9
_SAME_NOISE = 0.15  # in log standard deviation; where the noise was found anew, the path may have leapt
_CLEARLY = 0.05  # of the bound: nearer to it a look depends on where the search for the noise began
_CLEARLY_INSIDE = 0.03  # of the target, and of complete information
_FAR = 1.25  # targets that a range reaches, beyond which the next few do not lie inside it


def deciding_looks(observed: Observations, question: Question) -> list[State]:
    """States in driving order, the last one as of today: `looks.finding` decides as it does with every look."""
    if newest_level(observed, question.modification) is not None:  # each level a question with looks of its own
        return take_looks(observed, question, every=True)
    return _Looks(observed, question).decide() or take_looks(observed, question, every=True)


class _Looks:
    """Looks of one log, each taken when it is asked for."""

    def __init__(self, observed: Observations, question: Question) -> None:
        self.observed, self.question = observed, question
        self.counts = look_points(observed, question.modification)
        self.watch = rules.watch(question.rule, question.alpha)
        self.taken: dict[int, State | None] = {}

    def decide(self) -> list[State]:
        """The looks that decide; none where it is a close call."""
        last, low = len(self.counts) - 1, 0
        if last < 0:
            return []
        while low < last and standing(self._states(), self.question) == "open":
            high = min(low + _STRIDE, last)
            self._between(low, high)
            low = high
        if standing(self._states(), self.question) == "close" or self._look(last) is None:
            return []
        states = self._states()
        return states if standing(states, self.question, at_last=True) != "close" else []

    def _look(self, place: int) -> State | None:
        if place not in self.taken:
            seen = kept_so_far(self.observed.head(self.counts[place]), self.question)
            before = [state for at, state in sorted(self.taken.items()) if at < place and state is not None]
            start = before[-1].model.fit.theta if before else None
            self.taken[place] = None if seen is None else take_look(seen, self.question, start, self.watch)
        return self.taken[place]

    def _between(self, low: int, high: int) -> None:
        """Take both looks, and those between them that could decide, earlier ones first."""
        first, second = self._look(low), self._look(high)
        if high - low < 2 or _nothing_between(first, second, self.question):
            return
        middle = (low + high) // 2
        self._between(low, middle)
        self._between(middle, high)

    def _states(self) -> list[State]:
        return [state for _, state in sorted(self.taken.items()) if state is not None]


def standing(states: list[State], question: Question, *, at_last: bool = False) -> Literal["clear", "open", "close"]:
    """Whether these looks say clearly how the test ends, leave it open, or are too close to call.

    at_last: no more will follow, so that what is merely near is too close.
    """
    near, full = False, False  # a look near its bound; one with all but complete information
    for k, state in enumerate(states):
        part = abs(_of_the_bound(state))
        if part > 1 + _CLEARLY:
            return "close" if full else "clear"
        near = near or part > 1 - _CLEARLY
        full = full or state.share > 1 - _CLEARLY_INSIDE
        if full and near:
            return "close"
        if state.complete and _information(state, question) > 1 + _CLEARLY_INSIDE:
            return _closed(states[k:], question)
    return "close" if at_last and (near or full) else "open"


def _closed(states: list[State], question: Question) -> Literal["clear", "open", "close"]:
    """Of looks from the first with clearly complete information on: does a range lie inside the target?"""
    nearest = min(_reach(state, question) for state in states)
    if nearest < 1 - _CLEARLY_INSIDE:
        return "clear"
    return "open" if nearest > 1 + _CLEARLY_INSIDE else "close"


def _reach(state: State, question: Question) -> float:
    """The further end of a look's range, in targets."""
    return float("inf") if state.interval is None else max(map(abs, state.interval)) / question.target


def _information(state: State, question: Question) -> float:
    """Share of the information, not cut at 1."""
    priced = state.shift.standard_error * bounds.price(state.shift.freedom, question.alpha)
    return 1 / priced**2 / question.information


def _of_the_bound(state: State) -> float:
    return 0.0 if state.bound is None else state.shift.z / state.bound


def _nothing_between(first: State | None, second: State | None, question: Question) -> bool:
    if first is None or second is None:
        return False
    if np.abs(second.model.fit.theta - first.model.fit.theta).max() > _SAME_NOISE:
        return False
    if first.complete and second.complete:
        return min(_reach(first, question), _reach(second, question)) > _FAR
    s, u = _of_the_bound(first), _of_the_bound(second)
    if max(first.share, second.share) > _NEARLY_COMPLETE or max(abs(s), abs(u)) >= 1:
        return False
    stretch, b = max(abs(second.share - first.share), _LEAST_STRETCH), bounds.level(question.alpha)
    return all(exp(-2 * b**2 * (1 - side * s) * (1 - side * u) / stretch) < _NEVER for side in (1, -1))
