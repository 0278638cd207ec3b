"""The sizes of the four noise sources by penalised REML, and the coefficients they imply.

Restricted likelihood (Patterson and Thompson, 1971) of log standard deviations with weak normal priors, maximised by
Newton's method on one finite-difference stencil. The same stencil gives the gradient of the coefficients' covariance,
which is all that Satterthwaite's degrees of freedom need.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from energytrack.errors import InferenceError
from energytrack.inference.noise import Array, Scatter, Structure, products

_STEP = 0.02  # of the stencil, in log standard deviation
_LONGEST = 1.5  # of one Newton step
_CLOSE = 0.01  # a step shorter than this ends the search
_ROUNDS = 40
_FLATTEST = 0.05  # curvature taken at least, so that a flat direction cannot throw the search away
_SMALLEST, _LARGEST = np.log(1e-6), np.log(20.0)


@dataclass(frozen=True)
class Prior:
    """Normal prior on one direction of the log standard deviations (trip, level, weeks, seasons)."""

    direction: tuple[float, float, float, float]
    median: float  # of the log
    log_sd: float


@dataclass(frozen=True)
class Problem:
    """Energy y (n,) explained by columns X (n, p); `precision` (p,) of the coefficients' own priors, 0 where none."""

    shape: Structure
    columns: Array
    energy: Array
    precision: Array
    priors: tuple[Prior, ...]
    free: tuple[int, ...] = (0, 1, 2, 3)  # which of the four log standard deviations are estimated

    @cached_property
    def stacked(self) -> Array:
        return np.column_stack([self.columns, self.energy])

    @property
    def prior_precision(self) -> Array:
        """Of theta (4, 4), from the priors alone."""
        directions = np.array([prior.direction for prior in self.priors], dtype=np.float64).reshape(-1, 4)
        widths = np.array([prior.log_sd for prior in self.priors])
        precision: Array = directions.T @ (directions / widths[:, None] ** 2)
        return precision


@dataclass(frozen=True)
class Point:
    """The model at given log standard deviations."""

    cost: float  # minus log restricted posterior, up to a constant
    coefficients: Array  # (p,)
    covariance: Array  # (p, p)


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


def evaluate(problem: Problem, theta: Array) -> Point:
    """Coefficients by generalised least squares (Aitken, 1935) and the restricted likelihood at theta (4,)."""
    cross, log_det = products(problem.shape, Scatter(*np.exp(theta)), problem.stacked)
    normal = cross[:-1, :-1] + np.diag(problem.precision)
    factor = np.linalg.cholesky(normal)
    half = np.linalg.solve(factor, np.column_stack([np.eye(len(normal)), cross[:-1, -1]]))
    inverse_factor, projected = half[:, :-1], half[:, -1]
    covariance = inverse_factor.T @ inverse_factor
    unexplained = cross[-1, -1] - projected @ projected
    cost = 0.5 * (log_det + 2 * np.log(np.diag(factor)).sum() + unexplained)
    for prior in problem.priors:
        cost += 0.5 * ((np.dot(prior.direction, theta) - prior.median) / prior.log_sd) ** 2
    return Point(float(cost), inverse_factor.T @ projected, covariance)


def fit(problem: Problem, start: Array) -> Fit:
    """Newton's method from `start` (4,). InferenceError where the columns cannot be told apart."""
    theta: Array = np.array(start, dtype=np.float64)
    try:
        here = evaluate(problem, theta)
        for _ in range(_ROUNDS):
            slope, curvature, gradient = _stencil(problem, theta, here)
            step = _newton_step(slope, curvature)
            theta, here, moved = _descend(problem, theta, here, step)
            if moved < _CLOSE:
                break
    except np.linalg.LinAlgError as fault:
        raise InferenceError(
            "two of the effects asked for cannot be told apart in this log: leave one covariate out"
        ) from fault
    free = list(problem.free)
    spread = np.zeros((4, 4))
    spread[np.ix_(free, free)] = np.linalg.inv(_convex(curvature))
    return Fit(theta, spread, here.coefficients, here.covariance, gradient)


def _stencil(problem: Problem, theta: Array, here: Point) -> tuple[Array, Array, Array]:
    """Slope (f,), curvature (f, f) of the cost over the free directions, and the covariance's gradient (4, p, p)."""
    free = problem.free
    count = len(free)
    ahead, behind = [], []
    gradient = np.zeros((4, *here.covariance.shape))
    for k in free:
        up, down = (evaluate(problem, _moved(theta, (k,), sign)) for sign in (+1, -1))
        gradient[k] = (up.covariance - down.covariance) / (2 * _STEP)
        ahead.append(up.cost)
        behind.append(down.cost)
    slope = (np.array(ahead) - np.array(behind)) / (2 * _STEP)
    curvature = np.diag((np.array(ahead) + np.array(behind) - 2 * here.cost) / _STEP**2)
    for i in range(count):
        for j in range(i):
            corners = sum(evaluate(problem, _moved(theta, (free[i], free[j]), sign)).cost for sign in (+1, -1))
            bend = curvature[i, i] + curvature[j, j]
            curvature[i, j] = curvature[j, i] = ((corners - 2 * here.cost) / _STEP**2 - bend) / 2
    return slope, curvature, gradient


def _moved(theta: Array, directions: tuple[int, ...], sign: int) -> Array:
    moved = theta.copy()
    moved[list(directions)] += sign * _STEP
    return moved


def _convex(curvature: Array) -> Array:
    values, vectors = np.linalg.eigh(curvature)
    convex: Array = (vectors * np.maximum(values, _FLATTEST)) @ vectors.T
    return convex


def _newton_step(slope: Array, curvature: Array) -> Array:
    step: Array = -np.linalg.solve(_convex(curvature), slope).astype(np.float64)
    longest = float(np.abs(step).max())
    return step if longest <= _LONGEST else step * (_LONGEST / longest)


def _descend(problem: Problem, theta: Array, here: Point, step: Array) -> tuple[Array, Point, float]:
    """The first of step, step/2, ... that lowers the cost, and how far it went."""
    for _ in range(8):
        if np.abs(step).max() < _CLOSE / 4:
            break
        there = theta.copy()
        there[list(problem.free)] += step
        np.clip(there, _SMALLEST, _LARGEST, out=there)
        point = evaluate(problem, there)
        if point.cost < here.cost:
            return there, point, float(np.abs(step).max())
        step = step / 2
    return theta, here, 0.0
