"""Did the modification shift consumption, by how much, and was the distance enough to say so? Decided only here."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import replace
from math import sqrt
from typing import TYPE_CHECKING, Literal

from energytrack.consumption.columns import flags
from energytrack.consumption.frames import events_from_frame, modifications_from_frame, observe_log
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside as sort_out
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import UnknownNameError
from energytrack.inference import bounds
from energytrack.inference.ahead import always_fitted
from energytrack.inference.caveats import caveats
from energytrack.inference.coincidence import coincidences
from energytrack.inference.confounding import with_confounders
from energytrack.inference.describe import covariates_of, expectation_of, noise_of
from energytrack.inference.distance import need, remedies
from energytrack.inference.graded import averaged
from energytrack.inference.known import with_known_change
from energytrack.inference.looks import FEWEST_BASELINE, State, finding, percent, shown, take_looks
from energytrack.inference.model import Model, fit_model
from energytrack.inference.question import Question
from energytrack.inference.response import from_first_level, has_levels, respond
from energytrack.inference.results import Assessment, Rule, Verdict, WithAll
from energytrack.inference.several import never_apart, refusal, together
from energytrack.inference.suspects import suspects
from energytrack.inference.undeclared import Logged, agreeing, inside, undeclared, with_events
from energytrack.logbook.records import Modification, Vehicle

if TYPE_CHECKING:
    import pandas as pd


def assess(
    entries: pd.DataFrame,
    modifications: pd.DataFrame,
    name: str,
    *,
    target_percent: float = 3.0,
    confidence: float = 0.95,
    power: float = 0.80,
    capacity: float | None = None,
    unit: str = "L",
    covariates: Sequence[str] | None = None,
    weather: pd.DataFrame | None = None,
    events: pd.DataFrame | None = None,
    two_carriers: TwoCarriers | None = None,
    every_look: bool = True,
    rule: Rule = "every-look",
    looks_taken: Sequence[float] = (),
    set_aside: Literal["odd", "none"] = "odd",
    typed_in: tuple[str, str | None] = ("km", None),
) -> Assessment:
    """Answer the main question for one modification of one vehicle.

    entries, modifications, weather, events: tables as in docs/reference.md, of one vehicle. `capacity` in `unit`
    (L, kg, kWh) is estimated from the log where it is not given. `covariates` names numeric columns used besides
    temperature and speed. `every_look=False` looks only once, at the end, as if nobody had looked before.
    `rule`: "every-look", whose bound holds however often someone looks; "counted", where only the looks taken count:
    those at the odometer positions `looks_taken` (km) and this one; "open-ended", a watch that never closes.
    `set_aside="none"` keeps what stands out from its neighbours. `typed_in`: units of distance and energy in which the
    log was typed, for naming slips of digits (energy None: as `unit`).
    `two_carriers` is of a vehicle with tank and battery: its fill-ups are in the fuel's unit, charges and answers in
    kWh, and `capacity` and `unit` do not count.

    Raises ConsumptionError for tables that hold no measurable driving, UnknownNameError for a modification that is
    not in the table, InferenceError for a target, confidence or power outside its range, or an unknown rule.
    """
    further, reversible = tuple(covariates or ()), _reversible(modifications, name)
    question = Question(name, float(target_percent) / 100, 1 - confidence, power, further, rule, reversible)
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
    if name not in observed.names:
        raise UnknownNameError(f"no modification named {name!r}; logged: {', '.join(observed.names) or 'none'}")
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    rows = modifications_from_frame(modifications, vehicle or None)
    logged = Logged(rows, () if events is None else events_from_frame(events, vehicle or None))
    notes = (*coincidences(logged.events, rows, name), *notes)
    observed, first = from_first_level(observed, segmented, rows, name)
    on = _fitted_now(rows, name, first)
    partners = never_apart(observed, name)
    if partners:
        observed, notes = observed.leaving_out(partners), (refusal(name, partners), *notes)
    observed, apart = with_events(observed, segmented, question, logged)
    notes = (*apart, *notes)
    found = sort_out(observed, question.covariates) if set_aside == "odd" else None

    def decided(odd: bool) -> Assessment:
        kept = found.kept if odd and found is not None else observed
        blank = _blank(vehicle, kept, question, notes)
        blank = replace(blank, never_apart=partners, levels_known=not segmented.lacks_levels, fitted_now=on)
        states = take_looks(observed, question, every=every_look, taken=looks_taken, odd=odd)
        return _answer(blank, question, logged, states) if states else _before_the_first_look(blank, kept, question)

    answer = with_known_change(decided(found is not None), rows)
    answer = answer if answer.level is None else replace(answer, level=answer.level + first)
    if found is not None and found.odd:
        whole = decided(odd=False)
        typist = Vehicle(vehicle, "", unit, capacity, typed_in[0], typed_unit=typed_in[1])
        answer = replace(
            answer,
            set_aside=suspects(segmented, found, typist, as_typed=two_carriers is None),
            verdict_with_all=WithAll(whole.verdict, whole.shift_percent, whole.interval_percent),
        )
    if not answer.looks or not has_levels(modifications, name):
        return answer
    graded = respond(
        entries,
        modifications,
        name,
        target_percent=target_percent,
        confidence=confidence,
        power=power,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        weather=weather,
        events=events,
        two_carriers=two_carriers,
        set_aside=set_aside,
    )
    return replace(answer, response=graded)


def _answer(blank: Assessment, question: Question, logged: Logged, states: list[State]) -> Assessment:
    now, found = states[-1], finding(states, question.target)
    shift, theta, newest = now.shift, question.drift, now.newest
    answer = replace(
        blank,
        shift_percent=100 * shift.ratio,
        interval_percent=percent(now.interval),
        standard_error_percent=100 * shift.standard_error,
        degrees_of_freedom=shift.freedom,
        information_fraction=now.share,
        resolvable_now_percent=100 * theta * shift.standard_error * bounds.price(shift.freedom, question.alpha),
        noise=noise_of(now.model),
        covariates=covariates_of(now.model),
        looks=tuple(shown(state) for state in states),
        expectation=expectation_of(now.model),
        together=together(now.model, question, {row.name for row in logged.modifications}),
        warnings=(*blank.warnings, *caveats(now.model, on=blank.fitted_now, averaged=now.newest is None)),
        level=newest.level if newest is not None and newest.others else None,
        level_since_km=newest.since_km if newest is not None and newest.others else None,
        undeclared=undeclared(now.model, question, logged),
    )
    if found is not None and found[0] == "shifted":
        if inside(answer.undeclared, found[1]):
            return replace(answer, verdict="not-yet", withheld=True)
        answer = replace(answer, agreeing=agreeing(now.model, question, logged))
    if found is not None:
        return _closed(answer, *found, question)
    return with_confounders(_open(answer, now.model, question), now.model, question)


def _before_the_first_look(blank: Assessment, observed: Observations, question: Question) -> Assessment:
    """Without a baseline, or with nothing driven since the modification was fitted."""
    fitted = observed.fitted[:, observed.names.index(question.modification)]
    if fitted.any() or len(fitted) < FEWEST_BASELINE:
        return blank
    model = fit_model(averaged(observed), None, covariates=question.covariates)
    answer = replace(
        blank,
        information_fraction=0.0,
        noise=noise_of(model),
        covariates=covariates_of(model),
        expectation=expectation_of(model),
    )
    return _open(answer, model, question)


def _open(answer: Assessment, model: Model, question: Question) -> Assessment:
    """The test goes on: how far, or why not and what would help."""
    required = need(model, always_fitted, question)
    driven, central = answer.distance_modified_km, required.central
    expected = required.expected_km if question.has_end else None  # known for the bound that ends at this distance
    return replace(
        answer,
        verdict="out-of-reach" if central is None and question.has_end else "not-yet",
        distance_needed_km=None if central is None else driven + central.distance_km,
        distance_to_go_km=None if central is None else central.distance_km,
        distance_to_go_interval_km=required.interval_km,
        days_to_go=None if central is None else central.days,
        distance_expected_km=None if expected is None else driven + expected,
        resolvable_at_best_percent=100 * question.drift * sqrt(required.best_variance),
        remedies=() if central else remedies(model, required, question),
    )


def _closed(answer: Assessment, verdict: Verdict, look: State, question: Question) -> Assessment:
    """The test is over: what it found, and where."""
    then = look.model.observed
    return replace(
        answer,
        verdict=verdict,
        distance_needed_km=_driven_with(then, question.modification),
        distance_to_go_km=0.0,
        distance_to_go_interval_km=(0.0, 0.0),
        days_to_go=0.0,
        settled_at_km=float(then.end_km[-1]),
        settled_on=dt.date.fromordinal(int(then.end_day[-1])).isoformat(),
    )


def _blank(vehicle: str, observed: Observations, question: Question, notes: tuple[str, ...]) -> Assessment:
    """What is known before any fit."""
    share = observed.fitted[:, observed.names.index(question.modification)]
    return Assessment(
        vehicle=vehicle,
        modification=question.modification,
        unit=observed.unit,
        verdict="no-baseline",
        shift_percent=None,
        interval_percent=None,
        standard_error_percent=None,
        degrees_of_freedom=None,
        confidence=1 - question.alpha,
        power=question.power,
        target_percent=100 * question.target,
        information_fraction=None,
        distance_baseline_km=float(observed.distance_km[share == 0].sum()),
        distance_modified_km=_driven_with(observed, question.modification),
        segments_baseline=int((share == 0).sum()),
        segments_modified=int((share > 0).sum()),
        distance_needed_km=None,
        distance_to_go_km=None,
        distance_to_go_interval_km=None,
        days_to_go=None,
        distance_expected_km=None,
        settled_at_km=None,
        settled_on=None,
        resolvable_now_percent=None,
        resolvable_at_best_percent=None,
        noise=None,
        covariates={},
        looks=(),
        remedies=(),
        expectation=None,
        warnings=notes,
        rule=question.rule,
        reversible=question.reversible,
    )


def _driven_with(observed: Observations, modification: str) -> float:
    """Distance driven with the modification fitted, at whatever level (km)."""
    return float(observed.distance_km @ observed.fitted[:, observed.names.index(modification)])


def _fitted_now(rows: Sequence[Modification], name: str, first: float) -> bool:
    """On at the end of the log, at another level than that of the baseline."""
    still_on = [row for row in rows if row.name == name and row.removed_date is None and row.removed_km is None]
    return any((1.0 if row.level is None else row.level) != first for row in still_on)


def _reversible(modifications: pd.DataFrame, name: str) -> bool:
    """False where any row of the modification says so, in an optional column `reversible`."""
    own = modifications[modifications["name"] == name] if "name" in modifications else modifications[:0]
    return all(flags(own, "reversible", True))
