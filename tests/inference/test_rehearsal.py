"""The rehearsal: same seed, same figures; drawn logs are like the log; one fit serves both shifts; known rates."""

from __future__ import annotations

from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import replace
from functools import cache

import numpy as np
import pytest
from scipy.stats import binom

import energytrack as et
from energytrack.consumption.frames import observe_frames
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference import rules
from energytrack.inference.jobs import run_all
from energytrack.inference.looks import take_look
from energytrack.inference.question import Question
from energytrack.inference.rehearsal_results import Rehearsal
from energytrack.inference.stage import Stage, draw_log, set_stage, with_shift
from tests.simulation import SimulatedLog, simulate
from tests.uses import HOUSEHOLD, SLOPPY_FILLS, STEADY_COMMUTE, Use

EVERY = rules.watch("every-look", 0.05)
QUESTION = Question("part", 0.03, 0.05, 0.80)


def log_of(use: Use, fillings: int, seed: int = 1) -> SimulatedLog:
    return simulate(replace(use, fillings=fillings), np.random.default_rng(seed))


def stage_of(use: Use, fillings: int) -> Stage:
    log = log_of(use, fillings)
    observed, _ = observe_frames(log.entries, log.modifications, capacity=use.capacity)
    return set_stage(observed, QUESTION, pretended=False)


@cache
def short(runs: int = 4, seed: int = 3) -> Rehearsal:
    log = log_of(STEADY_COMMUTE, 18)
    return et.rehearse(log.entries, log.modifications, runs=runs, seed=seed, capacity=50.0)


def test_the_same_seed_gives_the_same_figures_with_any_number_of_workers():
    log = log_of(STEADY_COMMUTE, 18)
    for pool in (ThreadPoolExecutor(3), ProcessPoolExecutor(2)):
        with pool as executor:
            spread = et.rehearse(log.entries, log.modifications, runs=4, seed=3, capacity=50.0, executor=executor)
        assert spread == short()


def test_another_seed_draws_other_logs():
    stage = stage_of(STEADY_COMMUTE, 18)
    one, again, other = (draw_log(stage, np.random.default_rng(seed)).energy for seed in (1, 1, 2))
    np.testing.assert_array_equal(one, again)
    assert not np.isclose(one, other).any()


def test_drawn_logs_share_everything_but_the_energy():
    stage = stage_of(STEADY_COMMUTE, 40)
    drawn = draw_log(stage, np.random.default_rng(5))
    assert replace(drawn, energy=stage.observed.energy) == stage.observed  # the very same arrays
    mean = np.mean([draw_log(stage, np.random.default_rng(k)).energy for k in range(400)], axis=0)
    spread = np.std([draw_log(stage, np.random.default_rng(k)).energy for k in range(400)], axis=0)
    assert np.abs((mean - stage.mean) / spread * 20).max() < 4.5  # standard errors of a mean of 400


def test_the_logs_own_shift_is_taken_out():
    large = simulate(replace(STEADY_COMMUTE, fillings=60, shift_percent=-20.0), np.random.default_rng(2))
    observed, _ = observe_frames(large.entries, large.modifications, capacity=50.0)
    stage = set_stage(observed, QUESTION, pretended=False)
    fitted = observed.shares[:, 0] == 1
    per_km = stage.mean / observed.distance_km
    assert per_km[fitted].mean() == pytest.approx(per_km[~fitted].mean(), rel=0.06)  # what the season leaves
    assert (observed.energy / observed.distance_km)[fitted].mean() < 0.9 * per_km[fitted].mean()


@pytest.mark.parametrize("use", [STEADY_COMMUTE, HOUSEHOLD, SLOPPY_FILLS], ids=lambda use: use.vehicle)
def test_one_fit_serves_both_shifts(use: Use):
    """Against a log whose energies really carry the shift, fitted anew."""
    stage = stage_of(use, 60)
    drawn = draw_log(stage, np.random.default_rng(4))
    ratio = -0.03
    shifted = replace(drawn, energy=drawn.energy + ratio * stage.base * drawn.distance_km * drawn.shares[:, 0])
    for count in (40, 59):
        quick = with_shift(stage, take_look(drawn.head(count), QUESTION, None, EVERY), ratio)
        anew = take_look(shifted.head(count), QUESTION, None, EVERY)
        error = anew.shift.standard_error
        assert quick.shift.ratio == pytest.approx(anew.shift.ratio, abs=0.05 * error)
        assert quick.shift.standard_error == pytest.approx(error, rel=0.03)
        assert quick.share == pytest.approx(anew.share, rel=0.06)


def test_rates_of_a_case_whose_answer_is_known():
    """Quiet driving, 40 tanks, a target of 10 %: found almost always, and false alarms stay within their nominal 5 %
    (exceeded once in a thousand)."""
    log = log_of(STEADY_COMMUTE, 41)
    found = et.rehearse(log.entries, log.modifications, "part", 10.0, runs=16, capacity=50.0)
    assert found.no_shift.called_shifted.count <= binom.isf(1e-3, 16, 0.05)
    assert found.no_shift.covered.count >= 16 - binom.isf(1e-3, 16, 0.05)
    assert found.target_shift.covered.count >= 16 - binom.isf(1e-3, 16, 0.05)
    assert found.target_shift.called_shifted.count >= 16 - binom.isf(1e-3, 16, 0.20)
    settled = found.target_shift.settled
    assert settled is not None
    assert settled.median_km is not None
    assert 0 < settled.median_km < found.distance_modified_km
    assert found.placebo[0].segments_each_side == 10


def test_a_shift_of_the_target_is_called_so_more_often_than_none():
    found = short(12)
    assert found.target_shift.called_shifted.count >= found.no_shift.called_shifted.count
    assert found.runs == found.no_shift.covered.of == found.target_shift.not_settled.of == 12


def test_without_a_modification_one_is_pretended_at_the_middle():
    log = log_of(STEADY_COMMUTE, 15)
    found = et.rehearse(log.entries, runs=2, capacity=50.0)
    assert found.pretended
    assert found.modification == ""
    assert (found.segments_baseline, found.segments_modified, found.looks) == (7, 7, 7)
    not_driven = log.modifications.assign(fitted_km=float(log.entries["odometer_km"].iloc[-1]))
    just_fitted = et.rehearse(log.entries, not_driven, "part", runs=2, capacity=50.0)
    assert just_fitted.pretended
    assert just_fitted.modification == "part"
    assert just_fitted.no_shift == found.no_shift


def test_refusals_say_what_to_do():
    log = log_of(STEADY_COMMUTE, 18)
    with pytest.raises(UnknownNameError, match="logged: part"):
        et.rehearse(log.entries, log.modifications, "wing")
    with pytest.raises(InferenceError, match="number of runs"):
        et.rehearse(log.entries, log.modifications, runs=0)
    with pytest.raises(InferenceError, match="seed"):
        et.rehearse(log.entries, log.modifications, seed=-1)
    with pytest.raises(InferenceError, match="target"):
        et.rehearse(log.entries, log.modifications, target_percent=0)
    with pytest.raises(InferenceError, match="too short"):
        et.rehearse(log.entries.head(6))
    several = log.modifications.loc[[0, 0]].assign(name=["part", "wing"])
    with pytest.raises(UnknownNameError, match="say which"):
        et.rehearse(log.entries, several)


def test_one_failure_ends_the_work_and_is_raised():
    told: list[tuple[int, int]] = []
    with ThreadPoolExecutor(1) as executor, pytest.raises(ZeroDivisionError):
        run_all(lambda x: 1 / x, [1, 0, 2], executor, lambda done, of: told.append((done, of)))
    assert told[0] == (0, 3)
    assert run_all(lambda x: -x, [3, 1, 2]) == [-3, -1, -2]
