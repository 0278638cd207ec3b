"""The road ahead: what a longer log would tell."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from energytrack.consumption.frames import observe_frames
from energytrack.inference.ahead import always_fitted, reach, road
from energytrack.inference.model import Model, fit_model
from energytrack.inference.schedules import off_first
from tests.simulation import simulate
from tests.uses import HOUSEHOLD, STEADY_COMMUTE, Use


def fitted_model(use: Use, seed: int, *, keep: int) -> Model:
    """A log that ends `keep` entries after the part was fitted."""
    log = simulate(replace(use, shift_percent=0.0), np.random.default_rng(seed))
    after = log.entries["odometer_km"] > log.modifications["fitted_km"].iloc[0]
    entries = log.entries[~after | (after.cumsum() <= keep)]
    observed, _ = observe_frames(entries, log.modifications, capacity=use.capacity, unit=use.unit)
    return fit_model(observed, "part" if keep else None)


@pytest.mark.parametrize("use", [STEADY_COMMUTE, HOUSEHOLD])
@pytest.mark.parametrize("seed", range(4))
def test_a_longer_log_tells_no_less_of_the_noise(use: Use, seed: int) -> None:
    """The precision of the noise's sizes never falls below that of their priors, in any direction."""
    ahead = road(fitted_model(use, seed, keep=4), always_fitted, 0)
    assert np.linalg.eigvalsh(ahead.noise_known).min() > -1e-6


@pytest.mark.parametrize("use", [STEADY_COMMUTE, HOUSEHOLD])
def test_what_will_be_learnt_of_the_noise_grows_up_to_what_is_unknown_now(use: Use) -> None:
    ahead = road(fitted_model(use, 1, keep=4), always_fitted, 0)
    unknown = np.linalg.inv(ahead.noise_prior + ahead.noise_known)
    np.testing.assert_allclose(ahead.learnt(0), 0, atol=1e-12)
    soon, later = ahead.learnt(10), ahead.learnt(100)
    assert 0 < np.trace(soon) < np.trace(later) < np.trace(unknown)
    for less in (soon, later - soon, unknown - later):
        assert np.linalg.eigvalsh(less).min() > -1e-9


@pytest.mark.parametrize(("keep", "since_it_was_fitted"), [(4, False), (20, True)])
def test_what_lies_ahead_is_the_habit_since_the_part_was_fitted(keep: int, since_it_was_fitted: bool) -> None:
    """Once there are eight segments of it: the driving often changes with the part."""
    model = fitted_model(STEADY_COMMUTE, 2, keep=keep)
    ahead = road(model, always_fitted, 0)
    drawn = set(np.round(ahead.distance[ahead.past :] * ahead.kilometre, 6))
    with_it = set(np.round(model.observed.distance_km[model.observed.fitted[:, 0] > 0], 6))
    assert (drawn <= with_it) == since_it_was_fitted


def test_a_plan_draws_on_the_last_segments_whatever_was_fitted_in_them() -> None:
    log = simulate(replace(STEADY_COMMUTE, switches=(0.8,)), np.random.default_rng(2))
    observed, _ = observe_frames(log.entries, log.modifications, capacity=50.0)
    ahead = road(fit_model(observed, None), always_fitted, 0)
    drawn = set(np.round(ahead.distance[ahead.past :] * ahead.kilometre, 6))
    assert drawn <= set(np.round(observed.distance_km[-40:], 6))
    assert not drawn <= set(np.round(observed.distance_km[observed.fitted[:, 0] > 0], 6))


def test_nothing_is_reached_before_the_part_is_driven_with() -> None:
    ahead = road(fitted_model(STEADY_COMMUTE, 1, keep=0), off_first(10), 0)
    theta = np.log([0.05, 0.02, 0.01, 0.01])
    reached = reach(ahead, lambda count: ahead.variance(count, theta), 0.05**2)
    assert reached is not None
    without = float(ahead.distance[ahead.past : ahead.past + 10].sum()) * ahead.kilometre
    assert reached.distance_km > without


def test_a_part_never_driven_with_reaches_nothing() -> None:
    ahead = road(fitted_model(STEADY_COMMUTE, 1, keep=0), off_first(10_000), 0)
    assert reach(ahead, lambda count: 0.0, 1.0) is None
