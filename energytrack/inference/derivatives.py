"""How the restricted likelihood, and the coefficients' covariance, change with the noise sizes.

A short log has them exactly, from the n x n covariance itself (Harville, 1977): one factorisation and a few products
of small matrices. A long one has them from finite differences on one stencil, each point of it in linear time.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from energytrack.inference.likelihood import Point, Problem, evaluate
from energytrack.inference.noise import Array

DENSE = 160  # segments up to which the cubic cost is the smaller one
_STEP = 0.02  # of the stencil, in log standard deviation


@dataclass(frozen=True)
class Local:
    """The model at given log standard deviations, and how it changes with the f free ones of them."""

    point: Point
    slope: Array  # (f,) of the cost
    curvature: Array  # (f, f)
    gradient: Array  # (4, p, p) of the coefficients' covariance, zero where theta is not free


def local(problem: Problem, theta: Array, curvature: Array | None = None) -> Local:
    """At theta (4,). A curvature found close by may stand in for the one here. LinAlgError where columns coincide."""
    way = exact if len(problem.energy) <= DENSE else differences
    return way(problem, theta, curvature)


def exact(problem: Problem, theta: Array, curvature: Array | None = None) -> Local:
    """Everything in closed form, O(n^3).

    With D_k the derivative of V, C the coefficients' covariance and P = V^-1 - V^-1 X C X' V^-1: the slope is
    (tr P D_k - y'P D_k P y) / 2 and the curvature y'P D_k P D_l P y - tr(P D_k P D_l) / 2, plus twice the slope where
    k = l, for D_k doubles as V's own second derivative. C changes by C X'V^-1 D_k V^-1 X C.
    """
    free = list(problem.free)
    n, variances = len(problem.energy), np.exp(2 * theta)
    covariance = (variances @ problem.sources.reshape(4, -1)).reshape(n, n) + np.diag(problem.shape.extra)
    changes = 2 * variances[:, None, None] * problem.sources  # D_k (4, n, n)
    inverse, log_det = _inverse(covariance)
    weighted = inverse @ problem.columns
    gain, normal_log_det = _inverse(problem.columns.T @ weighted + np.diag(problem.precision))
    found = weighted @ gain  # V^-1 X C
    projection = inverse - found @ weighted.T
    residual = projection @ problem.energy
    cost = (log_det + normal_log_det + float(problem.energy @ residual)) / 2 + problem.prior_cost(theta)
    moved = changes @ residual  # D_k P y (4, n)
    slope = (changes.reshape(4, -1) @ projection.ravel() - moved @ residual) / 2
    gradient = np.zeros((4, *gain.shape))
    gradient[free] = (found.T @ changes @ found)[free]
    if curvature is None:
        products = projection @ changes  # P D_k (4, n, n)
        traces = products.reshape(4, -1) @ products.transpose(0, 2, 1).reshape(4, -1).T
        bend = moved @ projection @ moved.T - traces / 2 + np.diag(2 * slope)
        curvature = (bend + problem.prior_precision)[np.ix_(free, free)]
    point = Point(cost, found.T @ problem.energy, gain)
    return Local(point, (slope + problem.prior_slope(theta))[free], curvature, gradient)


def _inverse(matrix: Array) -> tuple[Array, float]:
    """Of a symmetric positive definite matrix, and the log of its determinant."""
    factor, fault = lapack.dpotrf(matrix, lower=1)
    if fault:
        raise np.linalg.LinAlgError("the matrix is not positive definite")
    half, _ = lapack.dpotri(factor, lower=1)
    whole: Array = half + half.T  # above its diagonal there is nothing
    np.einsum("ii->i", whole)[:] /= 2  # its diagonal, as a view
    return whole, 2 * float(np.log(np.diag(factor)).sum())


def differences(problem: Problem, theta: Array, curvature: Array | None = None) -> Local:
    """Central differences; the mixed ones need one corner on each side of the diagonal."""
    here = evaluate(problem, theta)
    ahead, behind = [], []
    gradient = np.zeros((4, *here.covariance.shape))
    for k in problem.free:
        up, down = (evaluate(problem, _moved(theta, (k,), sign)) for sign in (+1, -1))
        gradient[k] = (up.covariance - down.covariance) / (2 * _STEP)
        ahead.append(up.cost)
        behind.append(down.cost)
    slope = (np.array(ahead) - np.array(behind)) / (2 * _STEP)
    if curvature is None:
        bends = (np.array(ahead) + np.array(behind) - 2 * here.cost) / _STEP**2
        curvature = _mixed(problem, theta, here, bends)
    return Local(here, slope, curvature, gradient)


def _mixed(problem: Problem, theta: Array, here: Point, bends: Array) -> Array:
    """The curvature (f, f) with these bends (f,) on its diagonal."""
    free, curvature = problem.free, np.diag(bends)
    for i in range(len(free)):
        for j in range(i):
            corners = sum(evaluate(problem, _moved(theta, (free[i], free[j]), sign)).cost for sign in (+1, -1))
            both = (corners - 2 * here.cost) / _STEP**2
            curvature[i, j] = curvature[j, i] = (both - bends[i] - bends[j]) / 2
    return curvature


def _moved(theta: Array, directions: tuple[int, ...], sign: int) -> Array:
    moved = theta.copy()
    moved[list(directions)] += sign * _STEP
    return moved
