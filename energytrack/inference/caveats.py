"""What a careful reader of the answer should know: conditions that differ, values filled in, parts taken off."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from energytrack.consumption.conditions import SPEED, TEMPERATURE
from energytrack.consumption.terms import ELECTRIC
from energytrack.inference.graded import level_terms
from energytrack.inference.model import Model
from energytrack.inference.noise import Array

_LITTLE = 0.3  # share of one phase's conditions met in the other, below which the comparison leans on the fitted curve
_ALWAYS = 0.98  # correlation of two modifications' shares
_CLEARLY = 2.0  # standard errors by which the charging of the two phases differs
_WORTH_SAYING = 1.0  # percent of consumption moved by it
_NAMES = {TEMPERATURE: ("temperatures", "°C"), SPEED: ("mean speeds", "km/h")}


def caveats(model: Model, *, on: bool, averaged: bool) -> tuple[str, ...]:
    """Warnings about an answer, most weighty first. on: fitted now; averaged: for all levels, not for the newest."""
    return (
        *_took_turns(model),
        *_not_fitted_now(model, on),
        *_charging_changed(model),
        *_little_overlap(model),
        *_several_levels(model, averaged),
        *_filled_in(model),
        *_no_weather(model),
    )


def _shares(model: Model, name: str) -> Array:
    shares: Array = model.observed.shares[:, model.observed.names.index(name)]
    return shares


def _took_turns(model: Model) -> list[str]:
    if model.modification is None:
        return []
    own = _shares(model, model.modification)
    return [
        f"{model.modification} and {other} (nearly) always took each other's place: the log cannot tell their "
        f"effects apart. Drive some full tanks with neither or both, or log the exchange as one modification."
        for other in model.others
        if np.corrcoef(own, _shares(model, other))[0, 1] < -_ALWAYS
    ]


def _not_fitted_now(model: Model, on: bool) -> list[str]:
    if on or model.modification is None:
        return []
    return [f"{model.modification} is not fitted now: any distance still to go counts from when it is fitted again"]


def _little_overlap(model: Model) -> list[str]:
    if model.modification is None:
        return []
    fitted = model.observed.fitted[:, model.observed.names.index(model.modification)] > 0
    found = []
    for condition, (plural, unit) in _NAMES.items():
        value = model.conditions.values.get(condition)
        if value is None:
            continue
        without, with_it = value[~fitted], value[fitted]
        if _overlap(without, with_it) < _LITTLE:
            found.append(
                f"{plural} hardly overlap: {_span(without)} {unit} without the modification, "
                f"{_span(with_it)} {unit} with it. Drive on into conditions both have seen."
            )
    return found


def _charging_changed(model: Model) -> list[str]:
    """Of a vehicle with tank and battery: charged more, or less, since the modification was fitted."""
    if model.modification is None or ELECTRIC not in model.terms.names:
        return []
    place = model.terms.names.index(ELECTRIC)
    fitted = model.observed.fitted[:, model.observed.names.index(model.modification)] > 0
    charged = model.conditions.values[ELECTRIC]
    without, with_it = charged[~fitted], charged[fitted]
    difference = float(with_it.mean() - without.mean())
    error = float(np.sqrt(sum(part.var() / max(len(part) - 1, 1) for part in (without, with_it))))
    slope = model.fit.coefficients[model.term_columns][place] / model.terms.scales[place]
    moved = 100 * slope * difference / model.fit.coefficients[0]
    clearly = abs(difference) > _CLEARLY * error and abs(moved) > _WORTH_SAYING
    if not clearly and _overlap(without, with_it) >= _LITTLE:
        return []
    return [
        f"the charging habit changed: {_electric_share(model, ~fitted):.0f} % of the energy came from the plug without "
        f"the modification, {_electric_share(model, fitted):.0f} % with it. That alone moved consumption by about "
        f"{moved:+.0f} %. It is allowed for, yet an error in that could pass for a shift: charge as before for some "
        f"full tanks."
    ]


def _electric_share(model: Model, chosen: NDArray[np.bool_]) -> float:
    """Percent of the energy of the chosen segments that came from the plug."""
    electric = model.observed.conditions[ELECTRIC] * model.observed.distance_km / 100
    return float(100 * electric[chosen].sum() / model.observed.energy[chosen].sum())


def _overlap(one: Array, other: Array) -> float:
    """Share of the second's values inside the range of the first, or the other way round, whichever is more."""
    inside = ((other >= one.min()) & (other <= one.max())).mean()
    outside = ((one >= other.min()) & (one <= other.max())).mean()
    return float(max(inside, outside))


def _span(values: Array) -> str:
    low, high = round(float(values.min())), round(float(values.max()))
    return f"{low}" if low == high else f"{low} to {high}"


def _several_levels(model: Model, averaged: bool) -> list[str]:
    if model.modification is None or level_terms(model.modification)[0] not in model.others:
        return []
    if not averaged:
        return ["the answer is for the newest level alone, with looks and an error rate of its own"]
    return [
        "the shift is the average over the levels driven so far, by the distance at each; an earlier look saw only the "
        "levels driven by then"
    ]


def _filled_in(model: Model) -> list[str]:
    return [
        f"{_NAMES.get(name, (name, ''))[0]} of {count} of {len(model.observed.energy)} segments were not logged and "
        f"are filled in from this vehicle's own record"
        for name, count in model.conditions.filled.items()
        if count
    ]


def _no_weather(model: Model) -> list[str]:
    if TEMPERATURE in model.conditions.values:
        return []
    return ["no temperatures logged: the time of year stands in for them, which costs distance. Log the temperature."]
