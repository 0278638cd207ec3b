"""The law of a break's estimate around the true place."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from energytrack.inference.regimes.dates import argmax_quantile, beyond, limits


def mirrored(place: float, slope: float, variance: float) -> float:
    """P(place of the maximum < -place): the left side measured in the right side's units of time and height."""
    return beyond(place * slope**2 / variance, 1 / slope, 1 / variance)


@settings(max_examples=30, deadline=None)
@given(st.floats(0.3, 3.0), st.floats(0.3, 3.0))
def test_both_sides_make_one(slope: float, variance: float) -> None:
    assert beyond(1e-7, slope, variance) + mirrored(1e-7, slope, variance) == pytest.approx(1.0, abs=2e-3)


def test_equals_simulated_paths() -> None:
    slope, variance, step = 1.5, 2.0, 0.01
    rng = np.random.default_rng(1)
    time = step * np.arange(1, 2_001)
    left = np.cumsum(rng.normal(size=(3_000, 2_000)), axis=1) * np.sqrt(step) - time / 2
    right = np.cumsum(rng.normal(size=(3_000, 2_000)), axis=1) * np.sqrt(variance * step) - slope * time / 2
    to_the_right = right.max(axis=1) > np.maximum(left.max(axis=1), 0)
    place = np.where(to_the_right, time[right.argmax(axis=1)], 0.0)
    for bound in (0.5, 2.0, 5.0):
        assert (place > bound).mean() == pytest.approx(beyond(bound, slope, variance), abs=0.025)


@given(st.sampled_from([0.2, 0.05, 0.005]), st.floats(0.5, 2.0), st.floats(0.5, 2.0))
@settings(max_examples=20, deadline=None)
def test_quantiles_invert_the_law(tail: float, slope: float, variance: float) -> None:
    assert beyond(argmax_quantile(tail, slope, variance), slope, variance) == pytest.approx(tail, rel=1e-6)


def test_limits_swap_when_time_runs_backwards() -> None:
    early, late = limits((1.0, 2.0), (3.0, 1.0), 0.95)
    swapped = limits((2.0, 1.0), (1.0, 3.0), 0.95)
    assert swapped == pytest.approx((late, early), rel=1e-6)
    assert limits((4.0, 4.0), (1.0, 1.0), 0.95) == pytest.approx((11.033 / 16,) * 2, rel=1e-4)


def test_a_side_that_is_hardly_ever_reached_has_no_width() -> None:
    assert argmax_quantile(0.49, 100.0, 1.0) == 0.0
