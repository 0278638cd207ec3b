"""A graded modification: how consumption answers to its level, and the level of least consumption.

Levels are counted from a reference: none fitted where something was driven so, else the level driven first. Two levels
give a line, three or more a parabola. The level of least consumption is a ratio of two coefficients, so its range is
Fieller's (1954).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Literal

import numpy as np

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.consumption.oddities import set_aside as sort_out
from energytrack.consumption.segments import SegmentedLog
from energytrack.consumption.shares import fitted_shares, shares
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference import bounds
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import LevelEffect, Response
from energytrack.inference.several import effect_of
from energytrack.inference.shift import SHIFT, ratio_interval, shift_along
from energytrack.logbook.records import Modification

if TYPE_CHECKING:
    import pandas as pd

_SQUARED, _FITTED = " (level squared)", " (fitted)"
_FOR_A_PARABOLA = 3  # distinct levels, the reference among them
_MOSTLY = 0.5  # share of a segment driven without the part that counts as driven without it
_APART = 0.1  # of the tried range: a level nearer than this to one already driven is not worth a trial


def respond(
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
    set_aside: Literal["odd", "none"] = "odd",
) -> Response:
    """The response of consumption to the level of one modification. Tables, `set_aside` and
    errors as for `assess`.

    InferenceError where a fitting has no level, or fewer than two levels were driven.
    """
    question = Question(name, float(target_percent) / 100, 1 - confidence, power, tuple(covariates or ()))
    observed, notes = observe_frames(
        entries,
        _expanded(modifications, name),
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    if set_aside == "odd":
        observed = sort_out(observed, question.covariates).kept
    graded, levels, reference = _graded(observed, modifications, name)
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    model = fit_model(graded, name, covariates=question.covariates)
    curved = name + _SQUARED in model.others
    return Response(
        vehicle=vehicle,
        modification=name,
        form="parabola" if curved else "line",
        reference_level=reference,
        levels=tuple(_at_level(model, question, float(level), reference, curved) for level in levels),
        per_level=effect_of(name, shift_along(model.fit, _weights(model, name, 1.0, curved=False)), question),
        best_level=_best(model, question, levels, reference)[0] if curved else None,
        best_level_interval=_best(model, question, levels, reference)[1] if curved else None,
        next_level=_next(model, question, levels, reference, curved),
        confidence=confidence,
        warnings=notes,
    )


def from_first_level(
    observed: Observations, segmented: SegmentedLog, rows: Sequence[Modification], name: str
) -> Observations:
    """Where something like a tyre pressure always has a level, the first one driven takes the place of a baseline."""
    column = observed.names.index(name)
    levels = observed.shares[:, column]
    if not len(levels) or observed.fitted[:, column].min() < 1 or np.ptp(levels) == 0:
        return observed
    own = [replace(row, level=1.0 if row.level is None else row.level) for row in rows if row.name == name]
    first = min((row.level or 0.0 for row in own), key=lambda level: abs(level - levels[0]))
    counted = [replace(row, level=(row.level or 0.0) - first) for row in own]
    column_of, fitted = (np.array(measure(segmented, counted)) for measure in (shares, fitted_shares))
    return observed.leaving_out([name]).adding(name, column_of, fitted)


def _counted(observed: Observations, name: str, column: Array) -> Observations:
    """The part's column counted from its reference level: on where it differs from that."""
    return observed.leaving_out([name]).adding(name, column, (column != 0).astype(float))


def has_levels(modifications: pd.DataFrame, name: str) -> bool:
    """Every fitting of this part has a level, and they differ from none or from each other."""
    own = modifications.loc[modifications["name"] == name]
    if "level" not in own or own["level"].isna().any():
        return False
    levels = set(own["level"].astype(float))
    return len(levels) > 1 or not levels <= {0.0, 1.0}


def _expanded(modifications: pd.DataFrame, name: str) -> pd.DataFrame:
    """The table with two more columns' worth of rows for this part: its level squared, and whether it is fitted."""
    import pandas as pd

    own = modifications[modifications["name"] == name]
    if own.empty:
        known = ", ".join(dict.fromkeys(modifications["name"].astype(str))) or "none"
        raise UnknownNameError(f"no modification named {name!r}; logged: {known}")
    if "level" not in own or own["level"].isna().any():
        raise InferenceError(f"{name} has fittings without a level: log each with its level, such as --level 2.4")
    squared = own.assign(name=name + _SQUARED, level=own["level"].astype(float) ** 2)
    return pd.concat([modifications, squared, own.assign(name=name + _FITTED, level=1.0)], ignore_index=True)


def _graded(
    observed: Observations, modifications: pd.DataFrame, name: str
) -> tuple[Observations, tuple[float, ...], float]:
    """Shares times levels counted from the reference; the levels driven; the reference."""
    by_name = {other: observed.shares[:, k] for k, other in enumerate(observed.names)}
    linear, squared, fitted = by_name[name], by_name[name + _SQUARED], by_name[name + _FITTED]
    levels = set(modifications.loc[modifications["name"] == name, "level"].astype(float))
    bare = bool((fitted < _MOSTLY).any())
    reference = 0.0 if bare else min(levels, key=lambda level: abs(level - linear[0]))
    tried = tuple(sorted(levels | {0.0} if bare else levels))
    counted = linear - reference * fitted
    if np.ptp(counted) == 0:
        raise InferenceError(f"{name} was driven at one level only: log a second level, or drive without it")
    graded = _counted(observed.leaving_out([name + _SQUARED, name + _FITTED]), name, counted)
    if len(tried) >= _FOR_A_PARABOLA:
        curve = squared - 2 * reference * linear + reference**2 * fitted
        graded = _counted(graded, name + _SQUARED, curve)
    return graded, tried, reference


def _weights(model: Model, name: str, level: float, *, curved: bool) -> Array:
    """Combination of coefficients that is the effect of a level counted from the reference."""
    weights = np.zeros(len(model.fit.coefficients))
    weights[SHIFT] = level / model.levels[name]
    if curved:
        column = model.term_columns.stop + model.others.index(name + _SQUARED)
        weights[column] = level**2 / model.levels[name + _SQUARED]
    return weights


def _at_level(model: Model, question: Question, level: float, reference: float, curved: bool) -> LevelEffect:
    name = question.modification
    if level == reference:
        return LevelEffect(level, 0.0, (0.0, 0.0))
    weights = _weights(model, name, level - reference, curved=curved)
    effect = effect_of(name, shift_along(model.fit, weights), question)
    return LevelEffect(level, effect.shift_percent, effect.interval_percent)


def _best(
    model: Model, question: Question, levels: Sequence[float], reference: float
) -> tuple[float | None, tuple[float, float] | None]:
    """Level of least consumption inside the tried range, with its range; None where the parabola has none there."""
    name = question.modification
    column = model.term_columns.stop + model.others.index(name + _SQUARED)
    scale, scale_squared = model.levels[name], model.levels[name + _SQUARED]
    slope, bend = model.fit.coefficients[SHIFT] / scale, model.fit.coefficients[column] / scale_squared
    if bend <= 0 or not min(levels) <= reference - slope / (2 * bend) <= max(levels):
        return None, None
    covariance = model.fit.covariance
    freedom = shift_along(model.fit, _weights(model, name, 1.0, curved=False)).freedom
    interval = ratio_interval(
        -float(slope),
        2 * float(bend),
        float(covariance[SHIFT, SHIFT]) / scale**2,
        4 * float(covariance[column, column]) / scale_squared**2,
        -2 * float(covariance[SHIFT, column]) / scale / scale_squared,
        bounds.level(question.alpha) * bounds.price(freedom, question.alpha),
    )
    best = reference - float(slope / (2 * bend))
    return best, None if interval is None else (reference + interval[0], reference + interval[1])


def _next(
    model: Model, question: Question, levels: Sequence[float], reference: float, curved: bool
) -> float | None:
    """The level worth trying next: the fitted best where it has not been driven, else beyond the better end."""
    low, high = min(levels), max(levels)
    best = _best(model, question, levels, reference)[0] if curved else None
    if best is not None:
        nearest = min(abs(best - level) for level in levels)
        return best if nearest > _APART * (high - low) else None
    shifts = {level: _at_level(model, question, level, reference, curved).shift_percent for level in (low, high)}
    step = (high - low) / (len(levels) - 1)
    return high + step if shifts[high] < shifts[low] else low - step
