"""The looks that decide, without taking those that cannot.

Between two looks the standardised path is a Brownian bridge (Lan and Wittes, 1988). From s to u, both shares of the
bound b, over a stretch dt of the information it reaches the bound in between with probability
exp(-2 b^2 (1 - s)(1 - u) / dt) (Siegmund, 1985). Looks between two that make this all but impossible, agree on the
noise, and are far from complete information, are left out. The others are taken, so that the verdict is the one of a
look at every entry.
"""

from __future__ import annotations

from math import exp

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference import bounds, rules
from energytrack.inference.looks import State, kept_so_far, look_points, take_look, take_looks
from energytrack.inference.question import Question

_STRIDE = 8  # looks between two that are taken, at most
_NEVER = 1e-8  # chance of a look left out having crossed
_LEAST_STRETCH = 0.05  # of the information: its share is estimated too, and moves
_NEARLY_COMPLETE = 0.9
_SAME_NOISE = 0.15  # in log standard deviation; where the noise was found anew, the path may have leapt
_CLEARLY = 0.05  # of the bound: nearer to it a look depends on where the search for the noise began


def deciding_looks(observed: Observations, question: Question) -> list[State]:
    """States in driving order, the last one as of today: `looks.finding` decides as it does with every look.

    Where it is a close call, every look is taken.
    """
    return _Looks(observed, question).decide() or take_looks(observed, question, every=True)


class _Looks:
    """Looks of one log, each taken when it is asked for."""

    def __init__(self, observed: Observations, question: Question) -> None:
        self.observed, self.question = observed, question
        self.counts = look_points(observed, question.modification)
        self.watch = rules.watch(question.rule, question.alpha)
        self.taken: dict[int, State | None] = {}

    def decide(self) -> list[State]:
        """The looks that decide; none where they cannot."""
        last, low = len(self.counts) - 1, 0
        while low < last and not self._found():
            high = min(low + _STRIDE, last)
            self._between(low, high)
            low = high
            if any(state.share > _NEARLY_COMPLETE for state in self._before_the_first_crossing()):
                return []
        if last < 0 or self.look(last) is None or not (self._found() or self._nowhere_near()):
            return []
        return self._states()

    def look(self, place: int) -> State | None:
        if place not in self.taken:
            seen = kept_so_far(self.observed.head(self.counts[place]), self.question)
            before = [state for at, state in sorted(self.taken.items()) if at < place and state is not None]
            start = before[-1].model.fit.theta if before else None
            self.taken[place] = None if seen is None else take_look(seen, self.question, start, self.watch)
        return self.taken[place]

    def _between(self, low: int, high: int) -> None:
        """Take both looks, and those between them that could decide, earlier ones first."""
        first, second = self.look(low), self.look(high)
        if high - low < 2 or _nothing_between(first, second, self.question):
            return
        middle = (low + high) // 2
        self._between(low, middle)
        self._between(middle, high)

    def _states(self) -> list[State]:
        return [state for _, state in sorted(self.taken.items()) if state is not None]

    def _before_the_first_crossing(self) -> list[State]:
        states = self._states()
        crossed = next((k for k, state in enumerate(states) if state.crossed), len(states))
        return states[:crossed]

    def _found(self) -> bool:
        return any(abs(_of_the_bound(state)) > 1 + _CLEARLY for state in self._states())

    def _nowhere_near(self) -> bool:
        return all(abs(_of_the_bound(state)) < 1 - _CLEARLY for state in self._states())


def _of_the_bound(state: State) -> float:
    return 0.0 if state.bound is None else state.shift.z / state.bound


def _nothing_between(first: State | None, second: State | None, question: Question) -> bool:
    if first is None or second is None or max(first.share, second.share) > _NEARLY_COMPLETE:
        return False
    if np.abs(second.model.fit.theta - first.model.fit.theta).max() > _SAME_NOISE:
        return False
    stretch = max(abs(second.share - first.share), _LEAST_STRETCH)
    b, s, u = bounds.level(question.alpha), _of_the_bound(first), _of_the_bound(second)
    if max(abs(s), abs(u)) >= 1:
        return False
    return all(exp(-2 * b**2 * (1 - side * s) * (1 - side * u) / stretch) < _NEVER for side in (1, -1))
