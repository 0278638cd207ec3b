"""How long a one-sided cumulative sum runs until its alarm: the Markov chain of Brook and Evans (1972).

The sum's range below the threshold is cut into cells; from the middle of each, the next normal error leads to the
others with known chances. Everything is in standard deviations of one prediction error.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import exp, inf, log

import numpy as np
from scipy.optimize import brentq
from scipy.special import ndtr

from energytrack.inference.noise import Array

_CELLS = 60
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(9)
_WEIGHTS = _WEIGHTS / _WEIGHTS.sum()
_LONGEST = 1e12
_NONE_LEFT = 1e-4
_LOWEST, _HIGHEST = log(0.05), log(60.0)  # thresholds tried


def average_run_length(reference: float, threshold: float, mean: float = 0.0, sd: float = 1.0,
                       largest: float = inf) -> float:  # fmt: skip
    """Mean number of errors, N(mean, sd^2), until max(0, S + error - reference) passes the threshold, from zero.

    largest: what one error adds at most.
    """
    stays = _transitions(reference, threshold, mean, sd, largest)
    length = float(np.linalg.solve(np.eye(_CELLS) - stays, np.ones(_CELLS))[0])
    return length if 1 <= length < _LONGEST else _LONGEST  # beyond it the equations are singular to rounding


def chances_to_run(reference: float, threshold: float, means: Sequence[float], largest: float = inf) -> Array:
    """Chance of no alarm after 0, 1, ... errors whose means are given one by one, sd 1, until hardly any is left."""
    state = np.zeros(_CELLS)
    state[0] = 1.0
    running = [1.0]
    for mean in means:
        state = state @ _transitions(reference, threshold, mean, 1.0, largest)
        running.append(float(state.sum()))
        if running[-1] < _NONE_LEFT:
            break
    return np.array(running)


def _transitions(reference: float, threshold: float, mean: float, sd: float, largest: float) -> Array:
    """From each cell to each, (cells, cells); what is missing from a row's sum passes the threshold.

    Cells are centred on 0, w, 2 w, ... with the last edge on the threshold.
    """
    width = 2 * threshold / (2 * _CELLS - 1)
    centres = width * np.arange(_CELLS)
    steps = centres[None, :] + width / 2 - centres[:, None]
    below = np.where(steps >= largest, 1.0, ndtr((steps + reference - mean) / sd))
    stays: Array = np.diff(below, axis=1, prepend=0.0)
    return stays


def threshold_for(reference: float, run_length: float, doubt: float = 0.0, largest_share: float = inf) -> float:
    """The threshold at which two sums together give a false alarm every `run_length` errors on average.

    Two sums alarm as often as both alone (Kemp, 1961). doubt: sd of the log of the errors' standard deviation, which
    was estimated; rates are averaged over it. largest_share: what one error adds at most, as a share of the threshold.
    """

    def rate(log_threshold: float) -> float:
        threshold = exp(log_threshold)
        each = [
            2 / average_run_length(reference, threshold, sd=exp(doubt * node), largest=largest_share * threshold)
            for node in (_NODES if doubt > 0 else np.zeros(1))
        ]
        return log(float(np.dot(_WEIGHTS if doubt > 0 else np.ones(1), each)) * run_length)

    if rate(_LOWEST) < 0:
        return exp(_LOWEST)
    return exp(_HIGHEST) if rate(_HIGHEST) > 0 else exp(float(brentq(rate, _LOWEST, _HIGHEST, xtol=1e-3)))
