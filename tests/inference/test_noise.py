"""The linear-time solver against the covariance written down cell by cell, and against statsmodels."""

from __future__ import annotations

from unittest import mock

import numpy as np
import pytest
import statsmodels.api as sm
from hypothesis import given, settings
from hypothesis import strategies as st

from energytrack.inference import noise
from energytrack.inference.likelihood import Problem, evaluate
from energytrack.inference.noise import Scatter, Structure, products, structure
from tests.dense import dense_covariance

SIZES = st.floats(1e-3, 0.3)


def a_log(n: int, rng: np.random.Generator) -> tuple[Structure, np.ndarray]:
    """Segments of uneven length, some on one date, a fifth of them after a gap in the chain."""
    day = np.cumsum(rng.choice([0.5, 1.0, 3.0, 9.0, 60.0], n))
    linked = rng.random(n) > 0.2
    linked[0] = False
    end = rng.choice([1.0, 2.0], n)
    start = np.concatenate([[1.0], end[:-1]])
    extra = rng.choice([0.0, 1e-4], n)
    return structure(rng.uniform(0.3, 2.0, n), day, linked, start, end, extra=extra), day


@settings(max_examples=60, deadline=None)
@given(
    n=st.integers(2, 40),
    seed=st.integers(0, 10_000),
    scatter=st.builds(Scatter, SIZES, SIZES, SIZES, SIZES),
    block=st.sampled_from([1, 7, 2_000]),
)
def test_products_equal_dense_linear_algebra(n: int, seed: int, scatter: Scatter, block: int) -> None:
    rng = np.random.default_rng(seed)
    shape, day = a_log(n, rng)
    columns = rng.normal(size=(n, 3))
    covariance = dense_covariance(shape, scatter, day)
    with mock.patch.object(noise, "_BLOCK", block):
        found = products(shape, scatter, columns)
    np.testing.assert_allclose(found.cross, columns.T @ np.linalg.solve(covariance, columns), rtol=1e-6, atol=1e-6)
    assert found.log_det == pytest.approx(np.linalg.slogdet(covariance)[1], abs=1e-6)


def test_coefficients_equal_statsmodels_gls() -> None:
    """Oracle: statsmodels GLS with the dense covariance."""
    rng = np.random.default_rng(3)
    shape, day = a_log(120, rng)
    scatter = Scatter(0.05, 0.03, 0.02, 0.015)
    columns = shape.distance[:, None] * np.column_stack([np.ones(120), rng.normal(size=(120, 3))])
    energy = columns @ [1.0, 0.03, -0.02, 0.01] + rng.normal(0, 0.05, 120)
    ours = evaluate(Problem(shape, columns, energy, np.zeros(4), ()), np.log(scatter))
    theirs = sm.GLS(energy, columns, sigma=dense_covariance(shape, scatter, day)).fit(cov_type="fixed scale")
    np.testing.assert_allclose(ours.coefficients, theirs.params, rtol=1e-9)
    np.testing.assert_allclose(np.sqrt(np.diag(ours.covariance)), theirs.bse, rtol=1e-9)


def test_a_prior_on_a_coefficient_is_one_more_observation() -> None:
    """Bayes' rule for a normal prior, checked by writing the prior down as data."""
    rng = np.random.default_rng(8)
    shape, day = a_log(30, rng)
    columns, energy = rng.normal(size=(30, 2)), rng.normal(size=30)
    scatter, precision = Scatter(0.2, 0.05, 0.03, 0.02), np.array([0.0, 4.0])
    ours = evaluate(Problem(shape, columns, energy, precision, ()), np.log(scatter))
    covariance = np.zeros((31, 31))
    covariance[:30, :30], covariance[30, 30] = dense_covariance(shape, scatter, day), 1 / 4.0
    theirs = sm.GLS(np.append(energy, 0.0), np.vstack([columns, [0.0, 1.0]]), sigma=covariance)
    result = theirs.fit(cov_type="fixed scale")
    np.testing.assert_allclose(ours.coefficients, result.params, rtol=1e-9)
    np.testing.assert_allclose(ours.covariance, result.cov_params(), rtol=1e-8)
