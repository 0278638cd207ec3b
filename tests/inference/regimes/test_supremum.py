"""The chance of the best of many correlated statistics against plain simulation and known limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import chi2

from energytrack.inference.regimes.supremum import as_if_known, chance


def correlated(count: int, width: int, seed: int) -> np.ndarray:
    """Rows (count, width, m), orthonormal within each group, neighbours alike."""
    rng = np.random.default_rng(seed)
    drawn = np.cumsum(rng.standard_normal((count, width, 3 * width)), axis=0)
    return np.linalg.solve(np.linalg.cholesky(drawn @ drawn.transpose(0, 2, 1)), drawn)


@pytest.mark.parametrize("width", [1, 2])
@pytest.mark.parametrize("bound", [4.0, 9.0])
def test_equals_plain_simulation(width: int, bound: float) -> None:
    rows = correlated(12, width, seed=3)
    noise = np.random.default_rng(0).standard_normal((200_000, rows.shape[2]))
    reached = ((noise @ rows.reshape(-1, rows.shape[2]).T).reshape(len(noise), 12, width) ** 2).sum(axis=2).max(axis=1)
    assert chance(rows, bound) == pytest.approx((reached > bound).mean(), rel=0.10)


@settings(max_examples=40, deadline=None)
@given(st.integers(2, 30), st.integers(1, 3), st.floats(0.5, 200.0))
def test_lies_between_that_of_one_and_the_sum_of_all(count: int, width: int, bound: float) -> None:
    alone = chi2.sf(bound, width)
    found = chance(correlated(count, width, seed=count), bound)
    assert alone * (1 - 1e-9) <= found <= min(1.0, count * alone) * (1 + 1e-9)


def test_independent_statistics_multiply() -> None:
    rows = np.eye(20)[:, None, :]
    bound = chi2.isf(0.002, 1)
    assert chance(rows, bound) == pytest.approx(1 - (1 - 0.002) ** 20, rel=0.01)


def test_the_same_statistic_many_times_is_one() -> None:
    rows = np.repeat(np.eye(2)[:1], 30, axis=0)[:, None, :]
    assert chance(rows, 6.0) == pytest.approx(chi2.sf(6.0, 1), rel=1e-9)


def test_estimated_noise_makes_a_statistic_less_unusual() -> None:
    known = [as_if_known(16.0, 1, freedom) for freedom in (5.0, 20.0, 100.0, 1e6)]
    assert known == sorted(known)
    assert known[-1] == pytest.approx(16.0, rel=1e-3)
    assert known[0] < 10.0
