"""Ways to run a test before anything is fitted, compared in km: from a log, or from stated figures."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from energytrack.consumption.frames import observe_log
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.inference.ahead import always_fitted
from energytrack.inference.describe import noise_of
from energytrack.inference.distance import course
from energytrack.inference.graded import averaged
from energytrack.inference.looks import FEWEST_BASELINE
from energytrack.inference.model import fit_model
from energytrack.inference.question import Question
from energytrack.inference.results import Design, LongerBaseline, Plan
from energytrack.inference.stated import Stated, stated_model
from energytrack.inference.ways import designs, left_out

if TYPE_CHECKING:
    import pandas as pd


_FAR_KM = 10_000.0
_TIMES_THE_BASELINE = (2, 4, 8, 16)


def plan(
    entries: pd.DataFrame,
    target_percent: float = 3.0,
    *,
    confidence: float = 0.95,
    power: float = 0.80,
    modifications: pd.DataFrame | None = None,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    weather: pd.DataFrame | None = None,
    events: pd.DataFrame | None = None,
    reversible: bool = True,
    two_carriers: TwoCarriers | None = None,
    today: dt.date | None = None,
) -> Plan:
    """Distance to the target for each way to run the test, from the log's own noise, habit and seasons.

    Tables and errors as for `assess`. Modifications already logged are allowed for, and stay as they are now.
    reversible: whether the part can be taken off again; if not, only ways that never do are compared.
    today: the day from which distances, days and dates count, if later than the log's last one; what drifts has
    drifted on until then. None: the log's last day.
    """
    further = tuple(covariates or ())
    question = Question("", float(target_percent) / 100, 1 - confidence, power, further, reversible=reversible)
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
    usual = set_aside(observed, question.covariates).kept  # odd entries are no part of the noise to plan with
    ready = len(usual) >= FEWEST_BASELINE
    model = fit_model(averaged(usual), None, covariates=question.covariates) if ready else None
    question, waited = _from_today(question, observed, today)
    found = () if model is None else designs(model, question)
    return Plan(
        vehicle=vehicle,
        unit=observed.unit,
        target_percent=100 * question.target,
        confidence=confidence,
        power=power,
        distance_baseline_km=float(observed.distance_km.sum()),
        segments_baseline=len(observed.energy),
        noise=None if model is None else noise_of(model),
        designs=found,
        warnings=(*waited, *left_out(found, question), *notes),
        reversible=reversible,
        levels_known=not segmented.lacks_levels,
    )


def _from_today(question: Question, observed: Observations, today: dt.date | None) -> tuple[Question, list[str]]:
    """The question asked `today`, and a warning where the log ended longer ago than it ever paused."""
    if today is None or not len(observed):
        return question, []
    last = int(observed.end_day[-1])
    wait = max(0, today.toordinal() - last)
    if wait <= max(int(days) for days in np.diff(observed.end_day, prepend=observed.mid_day[0])):
        return replace(question, wait_days=wait), []
    ended = dt.date.fromordinal(last).isoformat()
    said = (
        f"the log ended on {ended}: the plan counts from {today.isoformat()}, with what may have drifted since. A few "
        f"entries before the start make it surer."
    )
    return replace(question, wait_days=wait), [said]


def plan_from(
    stated: Stated,
    target_percent: float = 3.0,
    *,
    confidence: float = 0.95,
    power: float = 0.80,
    reversible: bool = True,
) -> Plan:
    """The same comparison without a log: driving and noise as stated. Distances count from after the baseline.

    Raises InferenceError for a target, confidence or power outside its range.
    """
    question = Question("", float(target_percent) / 100, 1 - confidence, power, reversible=reversible)
    model = stated_model(stated)
    found = designs(model, question)
    return Plan(
        vehicle="",
        unit=stated.unit,
        target_percent=100 * question.target,
        confidence=confidence,
        power=power,
        distance_baseline_km=float(model.observed.distance_km.sum()),
        segments_baseline=len(model.observed),
        noise=noise_of(model),
        designs=found,
        warnings=(*left_out(found, question), *_left_open(stated)),
        reversible=reversible,
        stated=True,
        with_longer_baseline=_longer_baseline(stated, question, found),
    )


def _longer_baseline(stated: Stated, question: Question, found: tuple[Design, ...]) -> LongerBaseline | None:
    """Of some longer baselines the one with the shortest way in all, where one switch is far or out of reach."""
    now = next((design.distance_km for design in found if design.name == "one-switch"), None)
    if now is not None and now <= _FAR_KM:
        return None
    tried = []
    for factor in _TIMES_THE_BASELINE:
        longer = replace(stated, baseline_km=factor * stated.baseline_km)
        reached = course(stated_model(longer), always_fitted, question).reach(1 / question.information)
        if reached is not None:
            tried.append(LongerBaseline(longer.baseline_km, reached.distance_km))
    best = min(tried, key=lambda each: each.baseline_km + each.distance_km, default=None)
    if best is None or now is None:
        return best
    return best if best.baseline_km - stated.baseline_km + best.distance_km < now else None


def _left_open(stated: Stated) -> tuple[str, ...]:
    """What was not stated and is taken as usual."""
    figures = {"drift over weeks": stated.drift, "drift over seasons": stated.season_drift, "filling": stated.filling}
    open_ = [name for name, value in figures.items() if value is None]
    return (f"not stated, taken as usual: {', '.join(open_)}",) if open_ else ()
