"""The covariance of the noise model written down cell by cell: an oracle for the linear-time solver, O(n^2)."""

from __future__ import annotations

import numpy as np

from energytrack.inference.noise import HALF_LIFE_DAYS, Array, Scatter, Structure


def dense_covariance(shape: Structure, scatter: Scatter, day: Array) -> Array:
    """V itself (n, n), written down from the table of sources: for checks only, it costs O(n^2)."""
    n = shape.distance.size
    gaps = np.abs(day[:, None] - day[None, :])
    drift = scatter.weeks**2 * np.exp2(-gaps / HALF_LIFE_DAYS[0]) + scatter.seasons**2 * np.exp2(
        -gaps / HALF_LIFE_DAYS[1]
    )
    covariance = np.outer(shape.distance, shape.distance) * drift
    ends, starts = scatter.level * shape.end_weight, scatter.level * shape.start_weight
    covariance[np.diag_indices(n)] += scatter.trip**2 * shape.trip_shape + shape.extra + ends**2 + starts**2
    for i in range(1, n):
        if shape.linked[i]:
            covariance[i, i - 1] -= ends[i - 1] * starts[i]
            covariance[i - 1, i] -= ends[i - 1] * starts[i]
    return covariance
