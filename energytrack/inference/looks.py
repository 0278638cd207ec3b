"""One look after every closed segment, and the first that settles the question."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.inference import bounds, rules
from energytrack.inference.graded import Newest, averaged, newest_level
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Look, Verdict
from energytrack.inference.shift import Shift, shift_of

FEWEST_BASELINE = 5  # segments without the modification before anything is said
_EACH = 80  # looks taken one by one; then ever more sparsely, so that the cost stays linear in the log
_SPARSER = 1.05
_SAME_PLACE_KM = 0.5  # no odometer shows less


@dataclass(frozen=True)
class State:
    """The test after one look."""

    segments: int  # of the log, up to this look
    model: Model
    shift: Shift
    share: float  # of the information needed, counted after the price of not knowing the noise; 1 at most
    has_end: bool  # complete information closes the test
    bound: float | None
    interval: tuple[float, float] | None
    newest: Newest | None = None  # level asked about; None: the average over mixed levels

    @property
    def crossed(self) -> bool:
        return self.bound is not None and self.interval is not None and abs(self.shift.z) > self.bound

    @property
    def complete(self) -> bool:
        return self.has_end and self.share >= 1.0


def take_look(observed: Observations, question: Question, start: Array | None, watch: rules.Watch) -> State:
    """Fit what is known so far and hold the shift against the bound of the rule at work."""
    model = fit_model(averaged(observed), question.modification, covariates=question.covariates, start=start)
    return replace(judged(model, question, watch), newest=newest_level(observed, question.modification))


def judged(model: Model, question: Question, watch: rules.Watch) -> State:
    """The test as a fitted model has it."""
    return held_against(model, shift_of(model.fit), question, watch)


def held_against(model: Model, shift: Shift, question: Question, watch: rules.Watch) -> State:
    """A shift of a fitted model against the bound of the rule at work."""
    priced = shift.standard_error * bounds.price(shift.freedom, question.alpha)
    share = 1 / priced**2 / question.information
    known = watch(share)
    bound = None if known is None else bounds.widened(known, shift.freedom)
    return State(len(model.observed), model, shift, min(1.0, share), question.has_end, bound, shift.interval(bound))


def take_looks(
    observed: Observations, question: Question, *, every: bool, taken: Sequence[float] = (), odd: bool = True
) -> list[State]:
    """States in driving order; only the last one where `every` is False. Empty without a baseline or a test phase.

    taken: how far the log had come (km) at the looks taken before, where looks are counted.
    odd: what stands out is set aside, at each look by the segments up to it. A look is only taken where its newest
    segment is kept: one that stands out is held back until the next one agrees with it.
    A new level of a graded part begins a new question, with looks of its own: only its looks are returned.
    """
    counts = look_points(observed, question.modification)
    if question.rule == "counted":
        counts = _counted(observed, question.modification, taken)
    watch = rules.watch(question.rule, question.alpha)
    states: list[State] = []
    for count in counts if every else reversed(counts):
        seen = kept_so_far(observed.head(count), question) if odd else observed.head(count)
        if seen is None:
            continue
        start = states[-1].model.fit.theta if states else None
        if states and _level(newest_level(seen, question.modification)) != _level(states[-1].newest):
            states, watch = [], rules.watch(question.rule, question.alpha)
        states.append(take_look(seen, question, start, watch))
        if not every:
            break
    return states


def _level(newest: Newest | None) -> float | None:
    return None if newest is None else newest.level


def kept_so_far(observed: Observations, question: Question) -> Observations | None:
    """What is not odd in it; None where the newest segment is, or too little is left to compare."""
    sorted_out = set_aside(observed, question.covariates)
    left = sorted_out.kept
    ready = sorted_out.newest_kept and len(look_points(left, question.modification)) > 0
    return left if ready else None


def look_points(observed: Observations, modification: str) -> list[int]:
    """Numbers of segments at which to look: from the first one driven with the modification, given a baseline."""
    counts = _ready(observed, modification)
    if not counts:
        return []
    points, step = counts[:_EACH], 1.0
    position = float(len(points))
    while position < len(counts):
        points.append(counts[int(position)])
        step *= _SPARSER
        position += step
    return points if points[-1] == counts[-1] else [*points, counts[-1]]


def looks_now(observed: Observations, modification: str) -> int:
    """How many of those looks are at the question asked now: all but those at earlier levels of a graded part."""
    now = _level(newest_level(observed, modification))
    asked = [_level(newest_level(observed.head(count), modification)) for count in look_points(observed, modification)]
    return next((k for k, level in enumerate(reversed(asked)) if level != now), len(asked))


def _ready(observed: Observations, modification: str) -> list[int]:
    """Every number of segments that holds a baseline and something driven with the modification."""
    fitted = observed.fitted[:, observed.names.index(modification)] > 0
    ready = np.flatnonzero((np.cumsum(~fitted) >= FEWEST_BASELINE) & (np.cumsum(fitted) >= 1))
    counts: list[int] = (ready + 1).tolist()
    return counts


def _counted(observed: Observations, modification: str, taken: Sequence[float]) -> list[int]:
    """Numbers of segments closed at the looks that were taken, and now."""
    ready = _ready(observed, modification)
    closed = np.searchsorted(observed.end_km, np.asarray(taken, dtype=np.float64) + _SAME_PLACE_KM, side="right")
    seen = set(closed.tolist())
    return [count for count in ready if count in seen or count == ready[-1]]


def finding(states: Sequence[State], target: float) -> tuple[Verdict, State] | None:
    """What the looks found, and the look that found it; None while the test is open.

    The first look that crosses its bound or completes the information closes the test. Closed without a shift, it
    stays unclear until a range, then or later, lies inside the target on both sides.
    """
    closing = next((k for k, state in enumerate(states) if state.crossed or state.complete), None)
    if closing is None:
        return None
    if states[closing].crossed:
        return "shifted", states[closing]
    for state in states[closing:]:
        if state.interval is not None and -target <= state.interval[0] and state.interval[1] <= target:
            return "no-shift-of-target-size", state
    return "closed-unclear", states[closing]


def shown(state: State) -> Look:
    """A look as a result."""
    last = state.model.observed
    return Look(
        odometer_km=float(last.end_km[-1]),
        date=dt.date.fromordinal(int(last.end_day[-1])).isoformat(),
        information_fraction=state.share,
        shift_percent=100 * state.shift.ratio,
        interval_percent=percent(state.interval),
        bound=state.bound,
    )


def percent(interval: tuple[float, float] | None) -> tuple[float, float] | None:
    return None if interval is None else (100 * float(interval[0]), 100 * float(interval[1]))
