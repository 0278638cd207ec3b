"""The test rehearsed on the user's own log before it is trusted: a parametric bootstrap, and a placebo.

Logs are drawn from the fitted model (Efron and Tibshirani, 1993, chapter 6): same dates, distances, conditions and
ways of filling, fresh noise. Each draws its noise sizes from what the user's log leaves possible, so that a log which
knows its drift poorly is not rehearsed as if it knew it well.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from typing import TYPE_CHECKING

import numpy as np

from energytrack.consumption.frames import modifications_from_frame, observe_log
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference import placebo
from energytrack.inference.describe import noise_of
from energytrack.inference.jobs import Progress, run_all
from energytrack.inference.looks import FEWEST_BASELINE, look_points, looks_now
from energytrack.inference.question import Question
from energytrack.inference.rates import rate, settled
from energytrack.inference.rehearsal_results import Placebo, Rehearsal, Scenario
from energytrack.inference.response import from_first_level
from energytrack.inference.stage import Outcome, Stage, perform, set_stage

if TYPE_CHECKING:
    import pandas as pd

_MOST_RUNS = 100_000
_Job = tuple[Stage, np.random.SeedSequence] | placebo.Place
_Done = tuple[Outcome, Outcome] | placebo.Called


def rehearse(
    entries: pd.DataFrame,
    modifications: pd.DataFrame | None = None,
    name: str | None = None,
    target_percent: float = 3.0,
    *,
    runs: int = 200,
    seed: int = 0,
    confidence: float = 0.95,
    power: float = 0.80,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    events: pd.DataFrame | None = None,
    two_carriers: TwoCarriers | None = None,
    weather: pd.DataFrame | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> Rehearsal:
    """What `assess` would say of `runs` logs like this one without a shift, and with a saving of the target size.

    Tables as for `assess`. `name` may be left out where there is one modification or none. Where nothing was driven
    with it yet, one is pretended at the middle of the log. `executor` (concurrent.futures) spreads the work; the
    result is the same with any, or none, for a given `seed`. `progress(done, of)` is called as the work goes on.

    Raises ConsumptionError and UnknownNameError as `assess` does, InferenceError for a log too short to be looked at
    or for a number of runs, seed, target, confidence or power outside its range.
    """
    if not 1 <= runs <= _MOST_RUNS:
        raise InferenceError(f"the number of runs must lie between 1 and {_MOST_RUNS:,}, not {runs:,}: 200 is usual")
    if seed < 0:
        raise InferenceError(f"the seed must not be negative, but is {seed}: any whole number from 0 on will do")
    question = Question("", float(target_percent) / 100, 1 - confidence, power, tuple(covariates or ()))
    observed, notes, segmented = observe_log(
        entries,
        modifications,
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    meant = _meant(observed, name)
    if meant is not None and modifications is not None:
        rows = modifications_from_frame(modifications, vehicle or None)
        observed, _ = from_first_level(observed, segmented, rows, meant)
    usual = set_aside(observed, question.covariates).kept  # odd entries are no part of the noise to be drawn
    stage, named = _stage(usual, question, meant)
    pretended = placebo.places(observed, question)
    jobs: list[_Job] = [(stage, each) for each in np.random.SeedSequence(seed).spawn(runs)]
    jobs += [place for some in pretended.values() for place in some]
    done = run_all(_do, jobs, executor, progress)
    outcomes = [each for each in done if isinstance(each, tuple)]
    return Rehearsal(
        vehicle=vehicle,
        modification=named or "",
        pretended=stage.question.modification == placebo.PRETENDED,
        unit=observed.unit,
        target_percent=100 * question.target,
        confidence=confidence,
        power=power,
        runs=runs,
        seed=seed,
        segments_baseline=int((stage.fitted == 0).sum()),
        segments_modified=int((stage.fitted > 0).sum()),
        distance_modified_km=float(stage.driven[-1]),
        looks=looks_now(stage.observed, stage.question.modification),
        noise=noise_of(stage.model),
        no_shift=_scenario([first for first, _ in outcomes], 0.0),
        target_shift=_scenario([second for _, second in outcomes], -100 * question.target),
        placebo=_placebo(observed, pretended, [each for each in done if isinstance(each, placebo.Called)]),
        warnings=notes,
    )


def _do(job: _Job) -> _Done:
    return placebo.call(job) if isinstance(job, placebo.Place) else perform(*job)


def _meant(observed: Observations, name: str | None) -> str | None:
    """The modification named, or the only one, or None where there is none."""
    logged = ", ".join(observed.names) or "none"
    if name is None and len(observed.names) > 1:
        raise UnknownNameError(f"say which modification; logged: {logged}")
    if name is not None and name not in observed.names:
        raise UnknownNameError(f"no modification named {name!r}; logged: {logged}")
    return name or next(iter(observed.names), None)


def _stage(observed: Observations, question: Question, name: str | None) -> tuple[Stage, str | None]:
    """The log with the modification where it was fitted, or pretended from the middle on."""
    pretended = name is None or not observed.fitted[:, observed.names.index(name)].any()
    asked = placebo.PRETENDED if name is None or pretended else name
    if pretended:
        middle = len(observed) // 2
        observed = observed.adding(placebo.PRETENDED, np.repeat([0.0, 1.0], [middle, len(observed) - middle]))
    if not look_points(observed, asked):
        raise InferenceError(
            f"too short to rehearse: it takes {FEWEST_BASELINE} segments without the modification and one with it, "
            f"or {2 * FEWEST_BASELINE} where none was driven with; this log has {len(observed)}. Log more full tanks."
        )
    question = Question(asked, question.target, question.alpha, question.power, question.covariates)
    return set_stage(observed, question, pretended=pretended), name


def _scenario(outcomes: Sequence[Outcome], shift_percent: float) -> Scenario:
    count = len(outcomes)
    shifted = [o.verdict == "shifted" and (shift_percent == 0 or o.saves) for o in outcomes]
    return Scenario(
        shift_percent=shift_percent,
        called_shifted=rate(sum(shifted), count),
        called_no_shift=rate(sum(o.verdict == "no-shift-of-target-size" for o in outcomes), count),
        not_settled=rate(sum(o.settled_km is None for o in outcomes), count),
        covered=rate(sum(o.covered for o in outcomes), count),
        covered_at_end=rate(sum(o.covered_at_end for o in outcomes), count),
        settled=settled([o.settled_km for o in outcomes]),
    )


def _placebo(
    observed: Observations, pretended: dict[int, list[placebo.Place]], called: Sequence[placebo.Called]
) -> tuple[Placebo, ...]:
    """Summaries by the number of segments on each side, where the log has a place for it."""
    found, left = [], iter(called)
    for side, some in pretended.items():
        if some:
            of_side = [next(left) for _ in some]
            found.append(placebo.summary(side, placebo.starts(observed, side), of_side))
    return tuple(found)
