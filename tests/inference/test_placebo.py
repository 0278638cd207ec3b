"""Pretended changes: where they may be tried, and that an unchanged vehicle does not fool the test."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import binom

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.inference import placebo
from energytrack.inference.question import Question
from tests.simulation import simulate
from tests.uses import STEADY_COMMUTE

QUESTION = Question("part", 0.03, 0.05, 0.80)


def observed(seed: int, *, fillings: int = 46, shift: float = 0.0, fitted: bool = False) -> Observations:
    use = replace(STEADY_COMMUTE, fillings=fillings, shift_percent=shift)
    log = simulate(use, np.random.default_rng(seed))
    return observe_frames(log.entries, log.modifications if fitted else None, capacity=use.capacity)[0]


def test_places_keep_clear_of_real_changes():
    found = observed(1, fillings=61, fitted=True)
    share = found.shares[:, 0]
    starts = placebo.starts(found, 10)
    assert starts
    for start in starts:
        assert np.ptp(share[start : start + 20]) == 0
    first_fitted = int(np.flatnonzero(share > 0)[0])
    assert max(start for start in starts if start < first_fitted) == first_fitted - 20
    assert len(placebo.starts(observed(1, fillings=61), 10)) == 60 - 20 + 1


def test_separate_stretches_share_no_segment():
    assert placebo.separate([0, 1, 2, 19, 20, 21, 40, 60], 10) == 4
    assert placebo.separate([], 10) == 0


def test_a_stretch_is_cut_off_from_what_came_before():
    found = observed(2)
    some = placebo.places(found, QUESTION)[10]
    assert len(some) == len(found) - 19
    last = some[-1].stretch
    assert len(last) == 20
    assert last.linked.tolist() == [False, *found.linked[-19:].tolist()]
    assert last.shares[:, 0].tolist() == [0.0] * 10 + [1.0] * 10
    np.testing.assert_array_equal(last.energy, found.energy[-20:])


def test_the_unchanged_vehicle_does_not_fool_the_test_but_fools_two_averages():
    """One separate stretch a log, so that the counts are binomial: the nominal 5 % is exceeded once in a thousand."""
    called = [placebo.call(placebo.places(observed(seed, fillings=41), QUESTION)[20][0]) for seed in range(16)]
    most = binom.isf(1e-3, len(called), 0.05)
    assert sum(each.every_look for each in called) <= most
    assert sum(each.one_look for each in called) <= most
    assert sum(each.averages_every_look for each in called) > most
    assert all(each.averages_every_look >= each.averages_one_look for each in called)


def test_a_large_real_change_nobody_logged_is_seen():
    """Otherwise a placebo that calls nothing would prove nothing."""
    log = observed(3, fillings=81, shift=-15.0)  # fitted at the middle, but not logged
    called = placebo.call(placebo.place(log, 20, 20, QUESTION))
    assert called.every_look
    assert called.at_km == log.start_km[40]


@pytest.mark.parametrize("side", placebo.SIDES)
def test_counts_are_summed(side: int):
    called = [placebo.Called(k < 2, k < 3, k < 5, k < 4, 100.0 * k) for k in range(8)]
    found = placebo.summary(side, range(8), called)
    assert (found.called_every_look, found.called_one_look) == (2, 3)
    assert (found.averages_every_look, found.averages_one_look) == (5, 4)
    assert (found.places, found.separate, found.called_at_km) == (8, 1, (0.0, 100.0))
