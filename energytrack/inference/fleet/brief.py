"""The verdict of `assess` for one modification, and only the figures a row of a fleet needs."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.consumption.segments import SegmentedLog
from energytrack.inference.ahead import always_fitted
from energytrack.inference.distance import Course, course
from energytrack.inference.fleet.few_looks import deciding_looks
from energytrack.inference.fleet.results import BriefAnswer, Milestone
from energytrack.inference.graded import averaged
from energytrack.inference.looks import FEWEST_BASELINE, State, finding, percent
from energytrack.inference.model import fit_model
from energytrack.inference.question import Question
from energytrack.inference.response import from_first_level
from energytrack.inference.several import never_apart
from energytrack.inference.undeclared import Logged, inside, undeclared, with_events

_MILESTONES = 24  # of a road that is sent back from a worker


def brief(observed: Observations, segmented: SegmentedLog, logged: Logged, question: Question) -> BriefAnswer:
    """The answer for one modification of an observed log; `logged` is all that was declared of the vehicle."""
    name = question.modification
    observed, _ = from_first_level(observed, segmented, logged.modifications, name)
    partners = never_apart(observed, name)
    observed, _ = with_events(observed.leaving_out(partners), segmented, question, logged)
    states = deciding_looks(observed, question)
    kept = set_aside(observed, question.covariates).kept
    fitted = kept.fitted[:, kept.names.index(name)]
    blank = BriefAnswer(
        modification=name,
        verdict="no-baseline",
        target_percent=100 * question.target,
        shift_percent=None,
        interval_percent=None,
        standard_error_percent=None,
        degrees_of_freedom=None,
        information_fraction=None,
        distance_modified_km=float(kept.distance_km @ fitted),
        distance_to_go_km=None,
        days_to_go=None,
        never_apart=partners,
    )
    if states:
        return _answer(blank, states, question, logged)
    if fitted.any() or len(fitted) < FEWEST_BASELINE:
        return blank
    model = fit_model(averaged(kept), None, covariates=question.covariates)
    return _open(replace(blank, information_fraction=0.0), course(model, always_fitted, question), question)


def _answer(blank: BriefAnswer, states: list[State], question: Question, logged: Logged) -> BriefAnswer:
    now, found = states[-1], finding(states, question.target)
    road = course(now.model, always_fitted, question)
    answer = replace(
        blank,
        shift_percent=100 * now.shift.ratio,
        interval_percent=percent(now.interval),
        standard_error_percent=100 * now.shift.standard_error,
        degrees_of_freedom=now.shift.freedom,
        information_fraction=now.share,
        ahead=_milestones(road),
    )
    if found is None:
        return _open(answer, road, question)
    if found[0] == "shifted" and inside(undeclared(now.model, question, logged), found[1]):
        return replace(answer, verdict="not-yet", withheld=True)
    return replace(answer, verdict=found[0], distance_to_go_km=0.0, days_to_go=0.0)


def _open(answer: BriefAnswer, road: Course, question: Question) -> BriefAnswer:
    reached = road.reach(1 / question.information)
    return replace(
        answer,
        verdict="out-of-reach" if reached is None and question.has_end else "not-yet",
        distance_to_go_km=None if reached is None else reached.distance_km,
        days_to_go=None if reached is None else reached.days,
    )


def _milestones(here: Course) -> tuple[Milestone, ...]:
    """The road at ever wider steps."""
    road = here.road
    driven = np.concatenate([[0.0], np.cumsum(road.distance[road.past :]) * road.kilometre])
    days = np.concatenate([[0.0], road.ends])
    places = np.unique(np.rint(np.geomspace(1, road.ahead + 1, _MILESTONES)).astype(int) - 1)
    return tuple(Milestone(float(driven[k]), float(days[k]), float(here.variances[k])) for k in places)
