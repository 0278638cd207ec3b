"""An oracle that is told the sizes of the noise, to measure how much it costs to estimate them.

Generalised least squares (Aitken, 1935) with the program's own columns and priors of their coefficients, on all
segments of a log, none set aside, and with the four true sizes of the noise from which the log was drawn. The true
half-lives are the program's own. The oracle is not told the response to the conditions, nor the course of the drift.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import hypot, log, sqrt

import numpy as np

from energytrack.consumption.observations import Observations
from energytrack.inference.likelihood import evaluate
from energytrack.inference.looks import State, take_looks
from energytrack.inference.model import Scale
from energytrack.inference.noise import Array
from energytrack.inference.shift import LEVEL, SHIFT, contrast_variance
from tests.evidence.logs import QUESTION
from tests.uses import TRIP_KM, Use

READING_STEP_PERCENT = 1 / sqrt(12)  # sd of rounding to one percent of capacity, as tests/simulation.py does


@dataclass(frozen=True)
class Known:
    """The shift with the noise known, as a ratio."""

    ratio: float
    standard_error: float


def true_theta(use: Use, scale: Scale) -> Array:
    """Log standard deviations (4,) of the trips, the levels and the two drifts in the model's relative units."""
    per_reference = use.b0 / 100 / scale.consumption  # percentages of the simulation are of b0
    trip = per_reference * use.trip_percent / 100 * sqrt(TRIP_KM / scale.distance_km)
    step = READING_STEP_PERCENT if use.readings else 0.0
    level = hypot(use.level_error_percent, step) / 100 * use.capacity / scale.energy
    drifts = (per_reference * percent / 100 for percent in (use.drift_weeks_percent, use.drift_seasons_percent))
    return np.array([log(size) for size in (trip, level, *drifts)])


def with_noise_known(observed: Observations, use: Use, state: State) -> Known:
    """The oracle's answer on the log whose last look is `state`."""
    whole = len(state.model.observed) == len(observed)
    model = (state if whole else take_looks(observed, QUESTION, every=False, odd=False)[-1]).model
    point = evaluate(model.problem, true_theta(use, model.scale))
    base, effect = float(point.coefficients[LEVEL]), float(point.coefficients[SHIFT])
    return Known(effect / base, sqrt(contrast_variance(point.covariance, base, effect / base)))
