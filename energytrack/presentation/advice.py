"""What to do next, in at most three lines."""

from __future__ import annotations

from energytrack.inference.results import Assessment
from energytrack.presentation import figures, scatter
from energytrack.presentation.answer import baseline_to_drive, contradicted, remedy
from energytrack.presentation.known import known_step
from energytrack.presentation.text import join
from energytrack.presentation.undeclared import withheld_steps

MOST = 3
_LARGE_SHARE = 0.4  # of the variance, from which a source of scatter is worth working on
_WITH_ONE_LEVEL = 2  # the reference, and the one level driven
_SHARPER = 0.5  # a question worth planning next, as a share of the target


def next_steps(a: Assessment, unit: str) -> list[str]:
    """What to do next for each verdict."""
    if a.withheld:
        return withheld_steps(a, unit)
    steps = {
        "shifted": _after_shift,
        "no-shift-of-target-size": _sharper_question,
        "not-yet": _drive_on,
        "out-of-reach": _bring_within_reach,
        "no-baseline": _build_baseline,
        "closed-unclear": _sharper_question,
    }[a.verdict](a, unit)
    known = known_step(a) if a.levels_known else None
    return steps[:MOST] if known is None else [*steps[: MOST - 1], known]


def _after_shift(a: Assessment, unit: str) -> list[str]:
    if contradicted(a) and a.level is None and a.response is not None and len(a.response.levels) > _WITH_ONE_LEVEL:
        return ["It was settled on the levels driven by then: read them one by one, under `by level`."]
    if contradicted(a):
        steps = ["Look for what else changed since: tyres, load, route, brakes."]
        off = "Take it off for a while: a true shift goes away with it and comes back with it."
        return [*steps, off] if a.reversible and a.fitted_now else steps
    steps = ["Keep logging: every further entry sharpens the figure."]
    if (a.shift_percent or 0.0) > 0 and a.known_change is None:
        or_off = ", or take it off and watch consumption fall back" if a.reversible and a.fitted_now else ""
        steps.append(f"It costs energy: check the fitting{or_off}.")
    return steps


def _sharper_question(a: Assessment, unit: str) -> list[str]:
    if contradicted(a):
        return _after_shift(a, unit)
    command = join(f"energytrack plan --target {_SHARPER * a.target_percent:.3g}")
    if not a.reversible:
        return ["It cannot be taken off again: no new test can look for less on this vehicle, but every entry helps."]
    return [
        f"To look for less, see what a new test would take: {command}",
        "Taking it off and on again tells a shift from a drift of the season better than driving on.",
    ]


def _drive_on(a: Assessment, unit: str) -> list[str]:
    first = "Drive on as usual with it fitted" if a.fitted_now else "Fit it again and log that, drive on as usual"
    steps = [f"{first}, log every entry, and ask again whenever you like."]
    alternate = next((r for r in a.remedies if r.what == "alternate" and r.distance_km is not None), None)
    if alternate is not None and (a.distance_to_go_km is None or (alternate.distance_km or 0) < a.distance_to_go_km):
        steps.append(f"Shorter: {remedy(alternate, unit)}.")
    return steps + _better_records(a)


def _bring_within_reach(a: Assessment, unit: str) -> list[str]:
    steps = [_capital(remedy(r, unit)) + "." for r in a.remedies]
    if not steps:
        steps = ["Compare other ways: " + join(f"energytrack plan --target {a.target_percent:g}")]
    if not a.reversible:
        steps.append("It cannot be taken off again, so no other way of testing is left on this vehicle.")
    return steps + _better_records(a)


def _build_baseline(a: Assessment, unit: str) -> list[str]:
    if not a.levels_known:
        return ["Measuring starts at the first entry whose level is known: from there, drive as usual without it."]
    if a.distance_modified_km > 0 and not a.reversible:
        return ["It cannot be taken off again, and too little was logged before: this log cannot say what it does."]
    if a.distance_modified_km > 0:
        first = f"Take it off when parked and log that ({join('energytrack mod removed')}), then drive your usual runs."
    else:
        first = "Leave it off, drive your usual runs, and log every entry."
    distance = figures.distance(baseline_to_drive(a), unit)
    later = f"After about {distance}, fit it and log that: {join('energytrack mod fitted')}"
    return [first, later, *_better_records(a)]


def _better_records(a: Assessment) -> list[str]:
    """What to write down, or do at the pump, to need less distance."""
    steps = []
    conditions = {covariate.condition for covariate in a.covariates.values()}
    if a.noise is not None and "temperature_c" not in conditions:
        steps.append(f"Write down the outside temperature ({join('--temperature 12')}): weather then stops hiding it.")
    filling = next((s for s in scatter.sources(a) if s.label in ("filling", "charge level")), None)
    if filling is not None and (filling.share or 0.0) > _LARGE_SHARE:
        steps.append(
            "Read the charge level after each session (--level)."
            if scatter.charges_only(a)
            else "Fill to the first click at the same pump: filling is the largest part of the scatter."
        )
    return steps


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
