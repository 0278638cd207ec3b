"""A graded modification: how consumption answers to its level, and the level of least consumption.

Levels are counted from a reference: none fitted where something was driven so, else the level driven first. Two levels
give a line, three or more a parabola. A part that was driven at several levels and without need not be at level 0 when
it is off: it has an effect as such, and the line or parabola runs through its levels alone, unless a level of 0 was
logged. The level of least consumption is a ratio of two coefficients, so its range is Fieller's (1954).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
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
from energytrack.inference.graded import averaged, centre, level_terms
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
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    curve = _curve(observed, modifications, question)
    best, best_range = curve.best()
    return Response(
        vehicle=vehicle,
        modification=name,
        form="line" if curve.squared is None else "parabola",
        reference_level=curve.reference,
        levels=tuple(curve.at(level) for level in curve.levels),
        per_level=effect_of(name, shift_along(curve.model.fit, curve.slope_weights()), question),
        best_level=best,
        best_level_interval=best_range,
        next_level=_next(curve),
        confidence=confidence,
        warnings=notes,
    )


def from_first_level(
    observed: Observations, segmented: SegmentedLog, rows: Sequence[Modification], name: str
) -> tuple[Observations, float]:
    """Where something like a tyre pressure always has a level, the first one driven takes the place of a baseline.

    With the level that levels are then counted from: 0 where not fitted is the baseline.
    """
    column = observed.names.index(name)
    levels = observed.shares[:, column]
    if not len(levels) or observed.fitted[:, column].min() < 1 or np.ptp(levels) == 0:
        return observed, 0.0
    own = [replace(row, level=1.0 if row.level is None else row.level) for row in rows if row.name == name]
    first = min((row.level or 0.0 for row in own), key=lambda level: abs(level - levels[0]))
    counted = [replace(row, level=(row.level or 0.0) - first) for row in own]
    column_of, fitted = (np.array(measure(segmented, counted)) for measure in (shares, fitted_shares))
    return observed.leaving_out([name]).adding(name, column_of, fitted), first


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


def _curve(observed: Observations, modifications: pd.DataFrame, question: Question) -> _Curve:
    """The fitted response. Where not fitted is no level, the part as such has an effect of its own."""
    name = question.modification
    fitted = observed.fitted[:, observed.names.index(name + _FITTED)]
    levels = set(modifications.loc[modifications["name"] == name, "level"].astype(float))
    bare = bool((fitted < _MOSTLY).any())
    if bare and 0.0 not in levels and len(levels) > 1:
        return _with_a_step(observed.leaving_out([name + _SQUARED, name + _FITTED]), sorted(levels), question)
    graded, tried, reference = _graded(observed, levels, name, bare=bare)
    model = fit_model(graded, name, covariates=question.covariates)
    squared = _column(model, name + _SQUARED)
    return _Curve(model, question, tried, tried, reference, reference, 0.0, (SHIFT, model.levels[name]), squared)


def _with_a_step(observed: Observations, levels: Sequence[float], question: Question) -> _Curve:
    name = question.modification
    model = fit_model(averaged(observed), name, covariates=question.covariates)
    linear, squared = (_column(model, term) for term in level_terms(name))
    if linear is None:
        raise InferenceError(f"{name} was driven at one level only: log a second level, or drive without it")
    middle, spread = centre(observed, name)
    return _Curve(model, question, (0.0, *levels), tuple(levels), 0.0, middle, spread, linear, squared, step=True)


def _column(model: Model, name: str) -> tuple[int, float] | None:
    """Number of a column beside that of the part, and what its coefficient is divided by; None where there is none."""
    if name not in model.others:
        return None
    return model.term_columns.stop + model.others.index(name), model.levels[name]


def _graded(
    observed: Observations, levels: set[float], name: str, *, bare: bool
) -> tuple[Observations, tuple[float, ...], float]:
    """Shares times levels counted from the reference; the levels driven; the reference."""
    by_name = {other: observed.shares[:, k] for k, other in enumerate(observed.names)}
    linear, squared, fitted = by_name[name], by_name[name + _SQUARED], by_name[name + _FITTED]
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


@dataclass(frozen=True)
class _Curve:
    """Effect of a level: that of the part as such, if it has one, a slope and a bend around the middle."""

    model: Model
    question: Question
    levels: tuple[float, ...]  # driven, the reference among them
    tried: tuple[float, ...]  # those that lie on the curve
    reference: float
    middle: float
    spread: float  # mean square of the deviation from the middle, which the bend is counted from
    linear: tuple[int, float]  # column and scale
    squared: tuple[int, float] | None
    step: bool = False

    def slope_weights(self) -> Array:
        """Combination of coefficients that is the effect of one unit more, at the middle."""
        weights = np.zeros(len(self.model.fit.coefficients))
        weights[self.linear[0]] = 1 / self.linear[1]
        return weights

    def weights(self, level: float) -> Array:
        """Combination of coefficients that is the effect of a level."""
        weights = self.slope_weights() * (level - self.middle)
        if self.squared is not None:
            weights[self.squared[0]] = ((level - self.middle) ** 2 - self.spread) / self.squared[1]
        if self.step:
            weights[SHIFT] = 1.0
        return weights

    def at(self, level: float) -> LevelEffect:
        if level == self.reference:
            return LevelEffect(level, 0.0, (0.0, 0.0))
        name = self.question.modification
        effect = effect_of(name, shift_along(self.model.fit, self.weights(level)), self.question)
        return LevelEffect(level, effect.shift_percent, effect.interval_percent)

    def best(self) -> tuple[float | None, tuple[float, float] | None]:
        """Level of least consumption inside the tried range, with its range; None where there is none."""
        if self.squared is None:
            return None, None
        (one, scale), (two, scale_squared), fit = self.linear, self.squared, self.model.fit
        slope, bend = fit.coefficients[one] / scale, fit.coefficients[two] / scale_squared
        if bend <= 0 or not min(self.tried) <= self.middle - slope / (2 * bend) <= max(self.tried):
            return None, None
        freedom = shift_along(fit, self.slope_weights()).freedom
        interval = ratio_interval(
            -float(slope),
            2 * float(bend),
            float(fit.covariance[one, one]) / scale**2,
            4 * float(fit.covariance[two, two]) / scale_squared**2,
            -2 * float(fit.covariance[one, two]) / scale / scale_squared,
            bounds.level(self.question.alpha) * bounds.price(freedom, self.question.alpha),
        )
        best = self.middle - float(slope / (2 * bend))
        return best, None if interval is None else (self.middle + interval[0], self.middle + interval[1])


def _next(curve: _Curve) -> float | None:
    """The level worth trying next: the fitted best where it has not been driven, else beyond the better end."""
    low, high = min(curve.tried), max(curve.tried)
    best = curve.best()[0]
    if best is not None:
        nearest = min(abs(best - level) for level in curve.tried)
        return best if nearest > _APART * (high - low) else None
    step = (high - low) / (len(curve.tried) - 1)
    if curve.at(high).shift_percent < curve.at(low).shift_percent:
        return high + step
    return max(low - step, low / 2) if low > 0 else low - step  # what was never 0, as a pressure, stays above it
