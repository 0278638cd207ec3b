"""What moved together with the modification, what that costs in km, and which driving would tell the two apart.

The coefficients' covariance is C = (X' V^-1 X + P)^-1. Were the response to a condition known, its rows and columns
would leave the normal matrix: the ratio of the two variances of the shift is its variance inflation (Marquardt, 1970),
here of one condition with all its terms.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from energytrack.consumption.conditions import SEASON, Conditions
from energytrack.consumption.terms import ELECTRIC, condition_of
from energytrack.inference.ahead import Road, always_fitted, reach, road
from energytrack.inference.graded import level_terms, together_named
from energytrack.inference.model import Model, stack
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Advice, Assessment, Confounder
from energytrack.inference.shift import SHIFT, contrast_variance

WORTH_SAYING = 1.25  # variance inflation
_TRIED = (10, 30, 50, 70, 90)  # percentiles of a condition among which driving is compared
_NAMES = {
    "temperature_c": "the temperature",
    "speed_kmh": "the mean speed",
    SEASON: "the season",
    ELECTRIC: "the charging",
}
_UNITS = {"temperature_c": " °C", "speed_kmh": " km/h", ELECTRIC: " kWh/100 km from the plug"}
_WORTH_SEEKING = 1.3  # times the information of usual driving


def with_confounders(answer: Assessment, model: Model, question: Question) -> Assessment:
    """While the test is open: what changed together with the part, and which driving would tell them apart."""
    moved = confounders(model, 1 / question.information if answer.distance_to_go_km else None)
    advice = {mover.condition: most_telling(model, mover.condition) for mover in moved}
    said = [in_words(mover, answer.distance_to_go_km, advice[mover.condition]) for mover in moved]
    return replace(
        answer,
        confounders=moved,
        advice=tuple(told for told in advice.values() if told is not None),
        warnings=(*answer.warnings, *said),
    )


def confounders(model: Model, variance_needed: float | None = None) -> tuple[Confounder, ...]:
    """Conditions and other modifications that inflate the variance of the shift, the costliest first.

    variance_needed: of the shift as a ratio, while the test is open; then each is also given in km of the distance
    still to go.
    """
    normal = np.linalg.inv(model.fit.covariance)
    base, ratio = float(model.fit.coefficients[0]), float(model.fit.coefficients[1] / model.fit.coefficients[0])
    now = contrast_variance(model.fit.covariance, base, ratio)
    found = []
    for name, columns in _groups(model).items():
        kept = np.delete(np.arange(len(normal)), columns)
        known: Array = np.linalg.inv(normal[np.ix_(kept, kept)]).astype(np.float64)
        inflation = now / contrast_variance(known, base, ratio)
        if inflation >= WORTH_SAYING:
            cost = None if variance_needed is None else _cost_km(model, columns, variance_needed)
            found.append(Confounder(name, float(inflation), cost))
    return tuple(sorted(found, key=lambda confounder: -confounder.inflation))


def most_telling(model: Model, condition: str) -> Advice | None:
    """The value of a condition at which a further segment tells most, None where it hardly matters."""
    value = model.conditions.values.get(condition)
    if value is None or model.modification is None:
        return None
    candidates = np.unique(np.percentile(value, _TRIED))
    gains = {
        (fitted, float(at)): _gain(model, condition, float(at), fitted) for fitted in (True, False) for at in candidates
    }
    usual = float(np.mean([_gain(model, condition, float(at), True) for at in value]))
    (fitted, at), most = max(gains.items(), key=lambda item: item[1])
    times = most / usual if usual > 0 else float("inf")
    return Advice(condition, at, fitted, float(times)) if times >= _WORTH_SEEKING else None


def _groups(model: Model) -> dict[str, list[int]]:
    """Columns of the design that belong to one condition or to one other modification."""
    groups: dict[str, list[int]] = {}
    first = model.term_columns.start
    for offset, name in enumerate(model.terms.names):
        groups.setdefault(condition_of(name), []).append(first + offset)
    own = () if model.modification is None else level_terms(model.modification)
    for offset, name in enumerate(model.others):
        if name in own:  # what was driven at another level is no confounder of this one
            continue
        groups.setdefault(together_named(name), []).append(model.term_columns.stop + offset)
    return groups


def _cost_km(model: Model, columns: list[int], variance_needed: float) -> float | None:
    """How much sooner the variance would be reached, were the response to these columns known."""
    ahead = road(model, always_fitted, seed=0)
    known = replace(
        ahead,
        columns=np.delete(ahead.columns, columns, axis=1),
        precision=np.delete(ahead.precision, columns),
    )
    with_it, without = (reach(way, _variance(way, model.fit.theta), variance_needed) for way in (ahead, known))
    return None if with_it is None or without is None else with_it.distance_km - without.distance_km


def _variance(way: Road, theta: Array) -> Callable[[int], float]:
    return lambda count: way.variance(count, theta)


def _gain(model: Model, condition: str, at: float, fitted: bool) -> float:
    """Variance of the shift that one more average segment takes away (Sherman and Morrison, 1950)."""
    values = {name: np.array([float(np.mean(value))]) for name, value in model.conditions.values.items()}
    values[condition] = np.array([at])
    still = {name: np.zeros(1) for name in values}
    there = Conditions(model.conditions.day[-1:], values, still, {}, {})
    shares = np.zeros((1, 1 + len(model.others)))
    shares[0, 0] = float(fitted)
    row = stack(model.terms.columns(there), shares, asked=True)[0]
    scatter = model.fit.scatter
    own = scatter.trip**2 + 2 * scatter.level**2 + scatter.weeks**2 + scatter.seasons**2
    projected = model.fit.covariance @ row
    return float(projected[SHIFT] ** 2 / (own + row @ projected))


def in_words(confounder: Confounder, to_go_km: float | None, advice: Advice | None) -> str:
    """A warning a driver can act on."""
    what = _NAMES.get(confounder.condition, confounder.condition)
    said = f"{what} changed together with the modification: not knowing its effect multiplies the variance "
    said += f"of the shift by {confounder.inflation:.1f}"
    if confounder.cost_km is not None and to_go_km and confounder.cost_km > 0.1 * to_go_km:
        said += f"; {100 * min(1.0, confounder.cost_km / to_go_km):.0f} % of the distance still to go is because of it"
    return said if advice is None else f"{said}. {_seek(advice)}"


def _seek(advice: Advice) -> str:
    unit = _UNITS.get(advice.condition, f" {advice.condition}")
    how = "with" if advice.fitted else "without"
    at = f"{advice.value:z.0f}{unit}"
    return f"A segment {how} it at about {at} tells {advice.times_usual:.1f} times as much as usual"
