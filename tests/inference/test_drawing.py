"""Drawn noise has the covariance the model states."""

from __future__ import annotations

import numpy as np

from energytrack.inference.drawing import draw_noise, draw_sizes
from energytrack.inference.noise import Scatter, structure
from tests.dense import dense_covariance

DRAWS = 40_000
SIZES = Scatter(0.05, 0.03, 0.04, 0.03)


def small_log():
    """Uneven distances and dates, a gap in the chain of levels, readings, and a filled-in condition."""
    day = np.cumsum([0.0, 1.0, 4.0, 9.0, 30.0, 2.0, 90.0, 7.0])
    distance = np.array([0.5, 1.0, 1.4, 0.8, 1.0, 1.9, 0.7, 1.0])
    linked = np.array([False, True, True, True, False, True, True, True])
    end = np.array([1.0, 2.0, 1.0, 1.0, 2.0, 1.0, 1.0, 2.0])
    start = np.concatenate([[1.0], end[:-1]])
    extra = np.array([0.0, 0.0, 4e-4, 0.0, 0.0, 0.0, 1e-4, 0.0])
    return structure(distance, day, linked, start, end, extra=extra), day


def test_empirical_covariance_is_the_dense_one():
    """Oracle: the covariance written down cell by cell. Standard error of each cell by Isserlis (1918)."""
    shape, day = small_log()
    drawn = draw_noise(shape, SIZES, np.random.default_rng(1), DRAWS)
    stated = dense_covariance(shape, SIZES, day)
    found = drawn.T @ drawn / DRAWS
    variance = np.diag(stated)
    error = np.sqrt((np.outer(variance, variance) + stated**2) / DRAWS)
    assert np.abs((found - stated) / error).max() < 4.0
    assert np.abs(drawn.mean(axis=0) / np.sqrt(variance / DRAWS)).max() < 4.0


def test_each_source_alone_has_its_own_covariance():
    shape, day = small_log()
    for k in range(4):
        alone = Scatter(*(size * (j == k) for j, size in enumerate(SIZES)))
        drawn = draw_noise(shape, alone, np.random.default_rng(k), DRAWS)
        stated = dense_covariance(shape, alone, day)
        variance = np.diag(stated)
        error = np.sqrt((np.outer(variance, variance) + stated**2) / DRAWS) + 1e-12
        assert np.abs((drawn.T @ drawn / DRAWS - stated) / error).max() < 4.0


def test_a_level_error_is_paid_back_by_the_next_segment():
    """Linked levels telescope: over a whole chain only its two ends remain."""
    n = 50
    shape = structure(np.ones(n), np.arange(n, dtype=float), np.arange(n) > 0, np.ones(n), np.ones(n))
    drawn = draw_noise(shape, Scatter(0.0, 1.0, 0.0, 0.0), np.random.default_rng(2), 4_000)
    assert abs(drawn.sum(axis=1).var() / 2.0 - 1) < 4 * np.sqrt(2 / 4_000)


def test_sizes_are_drawn_around_the_fit_as_wide_as_it_is_uncertain():
    theta = np.log([0.05, 0.03, 0.02, 0.01])
    covariance = np.diag([0.01, 0.04, 0.25, 0.36])
    rng = np.random.default_rng(3)
    logs = np.log([draw_sizes(theta, covariance, rng) for _ in range(4_000)])
    np.testing.assert_allclose(logs.mean(axis=0), theta, atol=0.05)
    np.testing.assert_allclose(logs.std(axis=0), np.sqrt(np.diag(covariance)), rtol=0.06)  # strays are cut at 2.5 sd
