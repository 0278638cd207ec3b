"""One log drawn like the user's own, looked at after every entry, with no shift and with the target shift.

The column of the modification has no prior, so the noise a look fits does not depend on how large the shift is: one
drawn log and one fit a look serve both. Only its coefficient differs, by exactly the shift put in.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference import rules
from energytrack.inference.drawing import draw_noise, draw_sizes
from energytrack.inference.graded import averaged, level_terms
from energytrack.inference.looks import State, finding, judged, take_looks
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Verdict
from energytrack.inference.shift import LEVEL, SHIFT


@dataclass(frozen=True)
class Stage:
    """The user's log as the fitted model sees it: everything a drawn log shares with it."""

    observed: Observations
    question: Question
    model: Model
    mean: Array  # (n,) energy of each segment without the modification, in the log's unit

    @property
    def base(self) -> float:
        """Energy per km at the reference conditions."""
        return float(self.model.fit.coefficients[LEVEL]) * self.model.scale.consumption

    @property
    def fitted(self) -> Array:
        """Share of each segment (n,) driven with the modification, at whatever level."""
        share: Array = self.observed.fitted[:, self.observed.names.index(self.question.modification)]
        return share

    @property
    def driven(self) -> Array:
        """Distance driven with the modification up to each segment (n,), km."""
        total: Array = np.cumsum(self.observed.distance_km * self.fitted)
        return total


@dataclass(frozen=True)
class Outcome:
    """What the looks at one drawn log came to."""

    verdict: Verdict | None  # None: still open at its end
    saves: bool  # the estimate that settled it, or the last one, is negative
    settled_km: float | None  # driven with the modification by then; None while open or unclear
    covered: bool
    covered_at_end: bool


def set_stage(observed: Observations, question: Question, *, pretended: bool) -> Stage:
    """Fit the user's log; its own shift, if it has one, is taken out of the mean and so kept out of the noise."""
    bare = observed.keeping([n for n in observed.names if n != question.modification]) if pretended else observed
    model = fit_model(averaged(bare), None if pretended else question.modification, covariates=question.covariates)
    coefficients = model.fit.coefficients.copy()
    if not pretended:
        coefficients[SHIFT] = 0.0
        own = level_terms(question.modification)
        coefficients[[model.term_columns.stop + k for k, name in enumerate(model.others) if name in own]] = 0.0
    mean: Array = model.problem.columns @ coefficients * model.scale.energy
    return Stage(observed, question, model, mean)


def perform(stage: Stage, seed: np.random.SeedSequence) -> tuple[Outcome, Outcome]:
    """Outcomes of one drawn log without a shift, and with a saving of the target size."""
    drawn = draw_log(stage, np.random.default_rng(seed))
    states = take_looks(drawn, stage.question, every=True, odd=False)
    target = -stage.question.target
    return _outcome(stage, states, 0.0), _outcome(stage, [with_shift(stage, s, target) for s in states], target)


def draw_log(stage: Stage, rng: np.random.Generator) -> Observations:
    """The log with other energies: the fitted mean without shift, and noise of sizes the log leaves possible."""
    fit = stage.model.fit
    sizes = draw_sizes(fit.theta, fit.theta_covariance, rng)
    noise = draw_noise(stage.model.problem.shape, sizes, rng)[0] * stage.model.scale.energy
    return replace(stage.observed, energy=stage.mean + noise)


def with_shift(stage: Stage, state: State, ratio: float) -> State:
    """The same look, had the modification truly shifted consumption by `ratio`, at whatever level."""
    model = state.model
    coefficients = model.fit.coefficients.copy()
    coefficients[SHIFT] += ratio * stage.base / model.scale.consumption
    moved = replace(model, fit=replace(model.fit, coefficients=coefficients))
    return judged(moved, stage.question, rules.watch("every-look", stage.question.alpha))


def _outcome(stage: Stage, states: Sequence[State], ratio: float) -> Outcome:
    found = finding(states, stage.question.target)
    settled = found is not None and found[0] != "closed-unclear"
    deciding = found[1] if found is not None else states[-1]
    complete = next((k for k, state in enumerate(states) if state.complete), len(states) - 1)
    return Outcome(
        verdict=None if found is None else found[0],
        saves=deciding.shift.ratio < 0,
        settled_km=float(stage.driven[deciding.segments - 1]) if settled else None,
        covered=all(_holds(state, ratio) for state in states[: complete + 1]),
        covered_at_end=_holds(states[-1], ratio),
    )


def _holds(state: State, ratio: float) -> bool:
    """Whether the range holds a shift; one without ends holds all."""
    return state.interval is None or bool(state.interval[0] <= ratio <= state.interval[1])
