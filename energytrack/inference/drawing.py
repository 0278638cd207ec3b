"""Noise drawn exactly as the fitted model has it."""

from __future__ import annotations

import numpy as np
from scipy.linalg import cholesky_banded, solve_banded

from energytrack.inference.noise import Array, Scatter, Structure

_WIDEST = 2.5  # standard deviations a draw of the noise sizes may stray


def draw_sizes(theta: Array, covariance: Array, rng: np.random.Generator) -> Scatter:
    """Noise sizes as uncertain as the log leaves them: log standard deviations (4,) around theta, covariance (4, 4)."""
    strays = np.clip(rng.standard_normal(4), -_WIDEST, _WIDEST)
    return Scatter(*np.exp(theta + np.linalg.cholesky(covariance) @ strays).tolist())


def draw_noise(shape: Structure, scatter: Scatter, rng: np.random.Generator, count: int = 1) -> Array:
    """Draws u (count, n) of the scatter of n segments, in relative units."""
    n = shape.distance.size
    own_sd = np.sqrt(scatter.trip**2 * shape.trip_shape + shape.extra)
    drawn: Array = own_sd * rng.standard_normal((count, n))
    ends, fresh = rng.standard_normal((2, count, n))
    starts = np.where(shape.linked, np.roll(ends, 1, axis=1), fresh)  # a level is shared by the two that meet there
    starts[:, 0] = fresh[:, 0]
    drawn += scatter.level * (shape.end_weight * ends - shape.start_weight * starts)
    for size, (diagonal, beside) in zip((scatter.weeks, scatter.seasons), shape.drift, strict=True):
        drawn += size * shape.distance * _drift(diagonal, beside, rng.standard_normal((count, n)))
    return drawn


def _drift(diagonal: Array, beside: Array, independent: Array) -> Array:
    """Unit Ornstein-Uhlenbeck paths (count, n) from their tri-diagonal precision Q = U'U: x solves U x = z, which is
    the process's own recursion, last segment first (Rue and Held, 2005, algorithm 2.4).
    """
    factor = cholesky_banded(np.vstack([np.append(0.0, beside), diagonal]))
    paths: Array = solve_banded((0, 1), factor, independent.T).T
    return paths
