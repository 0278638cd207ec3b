"""The look-proof bound against published constants and against simulated Brownian motion."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import norm, t

from energytrack.errors import InferenceError
from energytrack.inference.bounds import critical, drift, expected_share, level, mixture_quantile, price
from tests.outside.values import reference


def test_level_of_brownian_motion() -> None:
    """P(sup |B| > b) = 0.05 at b = 2.2414 (reflection principle; Feller 1971)."""
    assert level(0.05) == pytest.approx(2.2414, abs=5e-5)


def test_drift_found_with_power() -> None:
    """theta = 2.8807 at 80 %: 5.7 % more information than the single look's 2.8016 (normal quantiles)."""
    assert drift(0.05, 0.80) == pytest.approx(2.8807, abs=5e-5)
    single = norm.ppf(0.975) + norm.ppf(0.8)
    assert (drift(0.05, 0.80) / single) ** 2 == pytest.approx(1.057, abs=5e-4)


def test_discrete_look_constants_approach_the_bound_from_below() -> None:
    """O'Brien-Fleming constants for K = 2..10 looks (Jennison and Turnbull 2000, Table 2.3; computed with R rpact)."""
    constants = np.array([reference(f"jt.OF.K{k}").values["C"] for k in range(2, 11)])
    gaps = level(0.05) - constants
    assert (gaps > 0).all()
    assert (np.diff(gaps) < 0).all()
    assert gaps[-1] < 0.16
    looks = np.sqrt(1 / np.arange(2, 11))  # the gap of a discretely watched Brownian motion shrinks like 1 / sqrt(K)
    extrapolated = np.polynomial.polynomial.polyfit(looks[-4:], constants[-4:], 2)[0]
    assert extrapolated == pytest.approx(level(0.05), abs=0.02)


def paths(theta: float, rng: np.random.Generator, count: int = 20_000, steps: int = 1_000) -> tuple[float, float]:
    """Share of Brownian paths with drift that leave (-b, b) by time 1, and the mean time they take."""
    b, x, stopped = level(0.05), np.zeros(count), np.ones(count)
    inside = np.ones(count, dtype=bool)
    for step in range(1, steps + 1):
        x += theta / steps + rng.normal(size=count) / np.sqrt(steps)
        out = inside & (np.abs(x) > b - 0.5826 / np.sqrt(steps))  # discrete watching, corrected (Siegmund 1985)
        stopped[out] = step / steps
        inside &= ~out
    return 1 - inside.mean(), float(stopped.mean())


def test_simulated_paths_cross_as_often_as_promised() -> None:
    rng = np.random.default_rng(11)
    false, _ = paths(0.0, rng)
    found, mean_time = paths(drift(0.05, 0.80), rng)
    assert false == pytest.approx(0.05, abs=0.006)
    assert found == pytest.approx(0.80, abs=0.012)
    assert mean_time == pytest.approx(expected_share(0.05, 0.80), abs=0.006)


def test_bound_at_known_noise_is_the_bound_of_brownian_motion() -> None:
    assert critical(1.0, 1e8, 0.05) == pytest.approx(level(0.05), rel=1e-6)
    assert critical(0.25, 1e9, 0.05) == pytest.approx(2 * level(0.05), rel=1e-4)
    assert price(1e9, 0.05) == pytest.approx(1.0, rel=1e-6)


@pytest.mark.parametrize("freedom", [2.0, 5.0, 12.0])
def test_quantile_of_the_mixture_against_draws(freedom: float) -> None:
    rng = np.random.default_rng(int(freedom))
    draws = rng.standard_normal(1_000_000) * np.exp(rng.standard_normal(1_000_000) * np.sqrt(2 / freedom) / 2)
    for tail in (0.0125, 0.001):
        assert (draws > mixture_quantile(tail, freedom)).mean() == pytest.approx(tail, rel=0.06)


def test_quantile_of_the_mixture_against_integration() -> None:
    """scipy.integrate.quad over the log variance."""
    c, half = mixture_quantile(1e-6, 8.0), np.sqrt(2 / 8.0) / 2
    exact, _ = quad(lambda x: norm.sf(c * np.exp(-half * x)) * norm.pdf(x), -12, 12, epsabs=1e-14, limit=400)
    assert exact == pytest.approx(1e-6, rel=1e-6)


def test_mixture_lies_between_the_normal_and_students_t() -> None:
    """Same tail probability, same matched variance of the variance."""
    for freedom in (3.0, 6.0, 20.0):
        for tail in (0.0125, 1e-4):
            assert norm.isf(tail) < mixture_quantile(tail, freedom) < t.isf(tail, freedom)


def test_bound_widens_with_less_information_and_fewer_degrees_of_freedom() -> None:
    bounds = [critical(share, 10.0, 0.05) for share in (1.0, 0.5, 0.25, 0.1)]
    assert bounds == sorted(bounds)  # type: ignore[type-var]
    assert critical(0.5, 5.0, 0.05) > critical(0.5, 50.0, 0.05)  # type: ignore[operator]
    assert critical(0.0, 10.0, 0.05) is None
    assert critical(1e-4, 3.0, 0.05) is None


@pytest.mark.parametrize(("alpha", "power"), [(0.0, 0.8), (1.0, 0.8), (0.05, 0.0), (0.05, 1.0), (0.05, 0.04)])
def test_impossible_promises_are_refused(alpha: float, power: float) -> None:
    with pytest.raises(InferenceError, match="usual"):
        drift(alpha, power)
