"""The sizes of the four noise sources by penalised REML, and the coefficients they imply.

Restricted likelihood of log standard deviations with weak normal priors, maximised by Newton's method. The gradient of
the coefficients' covariance is all that Satterthwaite's degrees of freedom need.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from energytrack.errors import InferenceError
from energytrack.inference.derivatives import Local, local
from energytrack.inference.likelihood import Problem
from energytrack.inference.noise import Array, Scatter

_LONGEST = 1.5  # of one Newton step
_CLOSE = 0.004  # a step shorter than this is not worth taking
_STEADY = 0.05  # after a step shorter than this the curvature is as good as it was
_ROUNDS = 40
_FLATTEST = 0.05  # curvature taken at least, so that a flat direction cannot throw the search away
_SMALLEST, _LARGEST = np.log(1e-6), np.log(20.0)


@dataclass(frozen=True)
class Fit:
    """The most probable noise, and the coefficients at it."""

    theta: Array  # (4,) log standard deviations
    theta_covariance: Array  # (4, 4), zero where not free
    coefficients: Array  # (p,)
    covariance: Array  # (p, p)
    covariance_gradient: Array  # (4, p, p) with respect to theta

    @property
    def scatter(self) -> Scatter:
        return Scatter(*np.exp(self.theta).tolist())


def fit(problem: Problem, start: Array) -> Fit:
    """Newton's method from `start` (4,). InferenceError where the columns cannot be told apart."""
    theta: Array = np.array(start, dtype=np.float64)
    try:
        here = local(problem, theta)
        for _ in range(_ROUNDS):
            step = _newton_step(here)
            if np.abs(step).max() < _CLOSE:
                break
            found = _descend(problem, theta, here, step)
            if found is None:
                break
            theta, here = found
    except np.linalg.LinAlgError as fault:
        raise InferenceError(
            "two of the effects asked for cannot be told apart in this log: leave one covariate out"
        ) from fault
    free, point = list(problem.free), here.point
    spread = np.zeros((4, 4))
    spread[np.ix_(free, free)] = np.linalg.inv(_convex(here.curvature))
    return Fit(theta, spread, point.coefficients, point.covariance, here.gradient)


def _convex(curvature: Array) -> Array:
    values, vectors = np.linalg.eigh(curvature)
    convex: Array = (vectors * np.maximum(values, _FLATTEST)) @ vectors.T
    return convex


def _newton_step(here: Local) -> Array:
    step: Array = -np.linalg.solve(_convex(here.curvature), here.slope).astype(np.float64)
    longest = float(np.abs(step).max())
    return step if longest <= _LONGEST else step * (_LONGEST / longest)


def _descend(problem: Problem, theta: Array, here: Local, step: Array) -> tuple[Array, Local] | None:
    """The first of step, step/2, ... that lowers the cost; None where all that are worth it have been tried."""
    while np.abs(step).max() >= _CLOSE:
        there = theta.copy()
        there[list(problem.free)] += step
        np.clip(there, _SMALLEST, _LARGEST, out=there)
        if np.array_equal(there, theta):  # a log without any scatter: at the edge already
            return None
        steady = np.abs(step).max() < _STEADY
        found = local(problem, there, here.curvature if steady else None)
        if found.point.cost < here.point.cost:
            return there, found
        step = step / 2
    return None
