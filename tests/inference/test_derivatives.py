"""Derivatives in closed form against finite differences of the linear-time likelihood."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from energytrack.inference.derivatives import DENSE, differences, exact
from energytrack.inference.likelihood import Prior, Problem
from energytrack.inference.noise import structure

PRIORS = (Prior((1, 0, 0, 0), -3.0, 1.5), Prior((-1, 0, 1, 0), -1.2, 0.8), Prior((-1, 0, 0, 1), -1.6, 0.8))


def problem(n: int, seed: int) -> Problem:
    rng = np.random.default_rng(seed)
    distance = rng.uniform(0.4, 1.8, n)
    linked = np.append(False, rng.random(n - 1) < 0.8)
    weights = [rng.choice([0.4, 1.0], n) for _ in range(2)]
    extra = rng.choice([0.0, 1e-4], n)
    shape = structure(distance, np.cumsum(rng.uniform(0.0, 9.0, n)), linked, *weights, extra=extra)
    columns = distance[:, None] * np.column_stack([np.ones(n), np.arange(n) > n // 2, rng.standard_normal(n)])
    energy = columns @ [1.0, -0.03, 0.02] + 0.05 * np.sqrt(distance) * rng.standard_normal(n)
    return Problem(shape, columns, energy, np.array([0.0, 0.0, 25.0]), PRIORS)


@pytest.mark.parametrize("free", [(0, 1, 2, 3), (0, 1), (2,)])
@pytest.mark.parametrize("n", [8, 40, DENSE])
def test_both_ways_agree(n: int, free: tuple[int, ...]) -> None:
    asked = replace(problem(n, n), free=free)
    theta = np.log([0.05, 0.02, 0.02, 0.015])
    closed, stepped = exact(asked, theta), differences(asked, theta)
    assert closed.point.cost == pytest.approx(stepped.point.cost, rel=1e-9, abs=1e-7)
    assert closed.point.coefficients == pytest.approx(stepped.point.coefficients, rel=1e-7, abs=1e-9)
    assert closed.point.covariance == pytest.approx(stepped.point.covariance, rel=1e-6, abs=1e-12)
    assert closed.slope == pytest.approx(stepped.slope, rel=2e-3, abs=2e-3)
    assert closed.curvature == pytest.approx(stepped.curvature, rel=2e-2, abs=2e-2)
    scale = float(np.abs(closed.point.covariance).max())
    assert closed.gradient / scale == pytest.approx(stepped.gradient / scale, abs=2e-3)
    assert not closed.gradient[[k for k in range(4) if k not in free]].any()
