"""The monitor: its predictions against the dense covariance, its sums, and what is kept of it."""

from __future__ import annotations

import json
from dataclasses import replace
from math import sqrt

import numpy as np
import pytest

from energytrack.consumption.frames import observe_frames
from energytrack.consumption.observations import Observations
from energytrack.inference.model import fit_model
from energytrack.inference.watch.begin import FALSE_ALARM_EVERY_KM, begin, segments_of, watched
from energytrack.inference.watch.kept import as_json, from_json
from energytrack.inference.watch.monitor import Monitor, Segment, Sum, advance, alarm, learn, predict, start
from tests.dense import dense_covariance
from tests.simulation import simulate
from tests.uses import SLOPPY_FILLS, STEADY_COMMUTE, Use


def drawn(use: Use, seed: int, fillings: int = 60) -> Observations:
    log = simulate(replace(use, fillings=fillings, shift_percent=0.0), np.random.default_rng(seed))
    return observe_frames(log.entries, log.modifications, unit=use.unit, capacity=use.capacity)[0].keeping(())


def test_prediction_errors_whiten_the_dense_covariance() -> None:
    """Their squares add up to y' V^-1 y, their variances to log det V, priors of the coefficients in V."""
    observed = drawn(SLOPPY_FILLS, 3, 30)
    model = fit_model(observed, None)
    segments = [segment._replace(extra=0.0) for segment in segments_of(observed, model, ())]
    spread = [0.5] * len(segments[0].columns)
    scatter = model.fit.scatter
    filtered = start((scatter.trip, scatter.level, scatter.weeks, scatter.seasons), [1.0] + [0.0] * (len(spread) - 1),
                     spread)  # fmt: skip
    errors = []
    for segment in segments:
        moved, error, variance, reached = predict(filtered, segment)
        assert abs(error) < 4 * sqrt(variance)
        errors.append((error, variance))
        filtered = learn(moved, error, variance, reached)
    shape = replace(model.problem.shape, extra=np.zeros(len(segments)))
    design = np.array([[segment.distance * value for value in segment.columns] for segment in segments])
    whole = dense_covariance(shape, scatter, observed.mid_day) + 0.5 * design @ design.T
    rest = np.array([segment.energy for segment in segments]) - design[:, 0]
    assert sum(error**2 / variance for error, variance in errors) == pytest.approx(rest @ np.linalg.solve(whole, rest))
    assert sum(np.log(variance) for _, variance in errors) == pytest.approx(np.linalg.slogdet(whole)[1])


def steady() -> Monitor:
    return Monitor(start((0.03, 0.001, 0.001, 0.001), [1.0], [1e-8]), Sum(), Sum(), 0.05, 1.0, 4.0)


def at(number: int, energy: float) -> Segment:
    place, date = 500.0 * number, f"2026-01-{number + 1:02}"
    return Segment(1.0, energy, 7.0 * number, [1.0], 0.0, number > 0, 1.0, 1.0, place, date)


@pytest.mark.parametrize(("size", "sign"), [(1.06, 1), (0.94, -1)])
def test_a_lasting_shift_is_told_with_its_sign_size_and_place(size: float, sign: int) -> None:
    monitor = steady()
    for number in range(4):
        monitor = advance(monitor, at(number, 1.0))
    assert alarm(monitor) is None
    for number in range(4, 10):
        monitor = advance(monitor, at(number, size))
    found = alarm(monitor)
    assert found is not None
    assert (found[0].since_km, found[0].since_date) == (2000.0, "2026-01-05")
    assert found[1] == pytest.approx(sign * 0.06, abs=0.01)


def test_one_slip_raises_no_alarm() -> None:
    monitor = steady()
    for number, energy in enumerate([1.0, 1.0, 3.0]):
        monitor = advance(monitor, at(number, energy))
    assert monitor.rise.value > 0
    assert alarm(monitor) is None


def test_what_is_kept_is_what_was_there() -> None:
    watch = begin(drawn(STEADY_COMMUTE, 4))
    assert watch is not None
    again = from_json(json.loads(json.dumps(as_json(watch))))
    assert as_json(again) == as_json(from_json(json.loads(json.dumps(as_json(again)))))
    assert again.monitor.threshold == watch.monitor.threshold


def test_too_short_a_log_is_not_watched() -> None:
    assert begin(drawn(STEADY_COMMUTE, 4, 10)) is None


def test_an_event_where_it_rose_ends_the_alarm() -> None:
    observed = drawn(STEADY_COMMUTE, 5)
    energy = observed.energy.copy()
    energy[-6:] *= 1.12
    risen = replace(observed, energy=energy)
    model = fit_model(observed, None)
    told = watched(risen, model, FALSE_ALARM_EVERY_KM)
    assert alarm(told.monitor) is not None
    explained = watched(risen, model, FALSE_ALARM_EVERY_KM, [float(observed.start_km[-6])])
    assert alarm(explained.monitor) is None
