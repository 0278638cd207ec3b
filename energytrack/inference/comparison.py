"""Several variants of a part: every pairwise shift with a familywise range, which is best, and how sure.

The ranges hold for all pairs and all looks together. Over pairs: the equicoordinate quantile of the estimates' joint
normal distribution, which for equal lengths is that of Tukey (1953) and Kramer (1956). Over looks: that quantile's
tail probability takes the place of alpha in the look-proof bound.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import TYPE_CHECKING, Literal

import numpy as np
from scipy.special import ndtr

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.oddities import set_aside as sort_out
from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference import bounds
from energytrack.inference.graded import averaged
from energytrack.inference.model import Model, fit_model
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.results import Comparison, PairwiseShift, Standing
from energytrack.inference.several import never_apart
from energytrack.inference.shift import SHIFT, Shift, shift_along

if TYPE_CHECKING:
    import pandas as pd

NOTHING = "nothing fitted"
_DRAWS = 200_000  # of the joint distribution: the quantile's own error is below 0.01


def compare(
    entries: pd.DataFrame,
    modifications: pd.DataFrame,
    names: Sequence[str] | None = None,
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
) -> Comparison:
    """Pairwise shifts between variants of a part and the bare vehicle, simultaneous over pairs and looks.

    names: at least two modifications, all of the table where left out. Tables, `set_aside` and errors as for `assess`;
    InferenceError where two of the variants were never apart, or too little was driven with or without them.
    """
    observed, notes = observe_frames(
        entries,
        modifications,
        events=events,
        weather=weather,
        capacity=capacity,
        unit=unit,
        covariates=covariates,
        two_carriers=two_carriers,
    )
    chosen = tuple(observed.names if names is None else dict.fromkeys(names))
    unknown = [name for name in chosen if name not in observed.names]
    if unknown:
        raise UnknownNameError(f"no modification named {unknown[0]!r}; logged: {', '.join(observed.names) or 'none'}")
    if len(chosen) < 2:
        raise InferenceError("a comparison takes at least two variants: log each under its own name")
    for name in chosen:
        same = [other for other in never_apart(observed, name) if other in chosen]
        if same:
            raise InferenceError(f"{name} and {same[0]} were never apart: drive some full tanks with only one of them")
    question = Question(chosen[0], float(target_percent) / 100, 1 - confidence, power, tuple(covariates or ()))
    if set_aside == "odd":
        found = sort_out(observed, question.covariates)
        observed, notes = found.kept, (*notes, *_left_out(len(found.odd)))
    model = fit_model(averaged(observed), chosen[0], covariates=question.covariates)
    missing = [name for name in chosen[1:] if name not in model.others]
    if missing:
        raise InferenceError(f"nothing, or everything, was driven with {missing[0]}: there is nothing to compare")
    vehicle = str(entries["vehicle"].iloc[0]) if "vehicle" in entries and len(entries) else ""
    return _compared(vehicle, model, chosen, question, notes)


def _left_out(count: int) -> list[str]:
    things = "1 odd entry" if count == 1 else f"{count} odd entries"
    return [f"{things} set aside; energytrack enough says which, --keep-all keeps them in"] if count else []


def _compared(
    vehicle: str, model: Model, chosen: tuple[str, ...], question: Question, notes: tuple[str, ...]
) -> Comparison:
    size = len(model.fit.coefficients)
    weights = {}
    for name in chosen:
        column = SHIFT if name == model.modification else model.term_columns.stop + model.others.index(name)
        weights[name] = np.eye(size)[column]
    weights[NOTHING] = np.zeros(size)
    pairs = list(combinations(weights, 2))
    contrasts = np.array([weights[one] - weights[other] for one, other in pairs])
    quantile = equicoordinate_quantile(contrasts @ model.fit.covariance @ contrasts.T, question.alpha)
    each = 2 * float(ndtr(-quantile))
    rows = [
        _pair(one, other, shift_along(model.fit, contrast), question, each)
        for (one, other), contrast in zip(pairs, contrasts, strict=True)
    ]
    return Comparison(
        vehicle=vehicle,
        confidence=1 - question.alpha,
        pairs=tuple(rows),
        standings=_standings(model, weights),
        warnings=notes,
    )


def equicoordinate_quantile(covariance: Array, alpha: float) -> float:
    """q with P(every |Z_k| <= q) = 1 - alpha for Z normal with this covariance (m, m), standardised; by simulation."""
    values, vectors = np.linalg.eigh(covariance)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    draws = np.random.default_rng(77).standard_normal((_DRAWS, len(values))) @ root.T
    largest = np.abs(draws / np.sqrt(np.diag(covariance))).max(axis=1)
    return float(np.quantile(largest, 1 - alpha))


def _pair(one: str, other: str, shift: Shift, question: Question, each: float) -> PairwiseShift:
    priced = shift.standard_error * bounds.price(shift.freedom, each)
    share = min(1.0, 1 / priced**2 / question.information)
    interval = shift.interval(bounds.critical(share, shift.freedom, each))
    return PairwiseShift(
        one=one,
        other=other,
        shift_percent=100 * shift.ratio,
        interval_percent=None if interval is None else (100 * interval[0], 100 * interval[1]),
        information_fraction=share,
        differs=interval is not None and not interval[0] <= 0 <= interval[1],
    )


def _standings(model: Model, weights: dict[str, Array]) -> tuple[Standing, ...]:
    """How likely each variant is the one that uses least, over the joint uncertainty; most likely first."""
    names = list(weights)
    effects = np.array(list(weights.values()))
    mean, covariance = effects @ model.fit.coefficients, effects @ model.fit.covariance @ effects.T
    values, vectors = np.linalg.eigh(covariance)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    draws = mean + np.random.default_rng(78).standard_normal((_DRAWS, len(mean))) @ root.T
    best = np.bincount(draws.argmin(axis=1), minlength=len(names)) / _DRAWS
    base = float(model.fit.coefficients[0])
    rows = [Standing(name, 100 * float(m) / base, float(p)) for name, m, p in zip(names, mean, best, strict=True)]
    return tuple(sorted(rows, key=lambda row: -row.chance_best))
