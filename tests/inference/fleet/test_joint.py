"""Several vehicles in one regression, and controls."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm

from energytrack.consumption.observations import observe
from energytrack.consumption.segments import close_segments
from energytrack.errors import InferenceError, UnknownNameError
from energytrack.inference.fleet.controls import assess_with_controls
from energytrack.inference.fleet.joint import Joint, part_of
from energytrack.inference.graded import averaged
from energytrack.inference.model import fit_model
from energytrack.inference.noise import HALF_LIFE_DAYS
from energytrack.inference.shift import shift_of
from tests.dense import dense_covariance
from tests.fleets import as_log, run
from tests.simulation import CommonDrift, simulate
from tests.uses import DRIFTING, STEADY_COMMUTE

SHORT = replace(DRIFTING, fillings=40)
SHORT_START = dt.date(2024, 1, 1)


def model_of(log, modification):
    vehicle = log.vehicle
    segmented = close_segments(log.entries, capacity=vehicle.capacity, unit=vehicle.unit)
    return fit_model(averaged(observe(segmented, log.modifications)), modification)


@pytest.fixture(scope="module")
def models():
    test, (control,) = run(SHORT, 0.9, 3)
    return [model_of(test, "part"), model_of(control, None)]


def test_nothing_in_common_is_the_vehicle_alone(models) -> None:
    joint = Joint([part_of(each) for each in models])
    solved = joint.solve([part.theta for part in joint.parts], 0.0)
    fit = models[0].fit
    assert solved.coefficients[:2] == pytest.approx(models[0].fit.coefficients[:2], rel=1e-6)
    assert solved.covariance[:2, :2] == pytest.approx(fit.covariance[:2, :2], rel=1e-5)


def test_generalised_least_squares_of_both_as_in_statsmodels(models) -> None:
    """The covariance written down cell by cell; priors are further observations (Theil and Goldberger, 1961)."""
    parts, common = [part_of(each) for each in models], 0.6
    blocks = []
    for model, part in zip(models, parts, strict=True):
        blocks.append(dense_covariance(part.shape, model.fit.scatter, model.observed.mid_day))
    first, second = (len(block) for block in blocks)
    whole = np.zeros((first + second, first + second))
    whole[:first, :first], whole[first:, first:] = blocks
    for i in range(first):
        for j in range(second):
            gap = abs(models[0].observed.mid_day[i] - models[1].observed.mid_day[j])
            sizes = [np.exp(part.theta[2:]) for part in parts]
            drift = sum(sizes[0][k] * sizes[1][k] * 2 ** (-gap / HALF_LIFE_DAYS[k]) for k in range(2))
            cell = common * drift * parts[0].shape.distance[i] * parts[1].shape.distance[j]
            whole[i, first + j] = whole[first + j, i] = cell
    columns = np.zeros((first + second, sum(part.columns.shape[1] for part in parts)))
    columns[:first, : parts[0].columns.shape[1]] = parts[0].columns
    columns[first:, parts[0].columns.shape[1] :] = parts[1].columns
    energy, precision = (np.concatenate([getattr(p, name) for p in parts]) for name in ("energy", "precision"))
    held = np.flatnonzero(precision)
    design = np.vstack([columns, np.eye(len(precision))[held]])
    sigma = np.zeros((len(design), len(design)))
    sigma[: len(whole), : len(whole)] = whole
    sigma[len(whole) :, len(whole) :] = np.diag(1 / precision[held])
    theirs = sm.GLS(np.append(energy, np.zeros(len(held))), design, sigma=sigma).fit(cov_type="fixed scale")
    ours = Joint(parts).solve([part.theta for part in parts], common)
    np.testing.assert_allclose(ours.coefficients, theirs.params, rtol=1e-4, atol=1e-7)
    np.testing.assert_allclose(np.sqrt(np.diag(ours.covariance)), theirs.bse, rtol=1e-4)


def test_a_drift_in_common_is_seen_and_makes_the_shift_surer() -> None:
    found = {}
    for share in (0.0, 0.9):
        ratios, shares = [], []
        for seed in range(6):
            test, (control,) = run(replace(DRIFTING, fillings=80), share, seed)
            each = [model_of(test, "part"), model_of(control, None)]
            estimate = Joint([part_of(model) for model in each]).estimate()
            ratios.append(estimate.shift.standard_error / shift_of(each[0].fit).standard_error)
            shares.append(estimate.common)
        found[share] = np.mean(shares), np.mean(ratios)
    assert found[0.0][0] < 0.4 < found[0.9][0]
    assert found[0.9][1] < 0.95
    assert 0.95 < found[0.0][1] < 1.05


def test_the_answer_with_every_look() -> None:
    test, controls = run(replace(STEADY_COMMUTE, fillings=60, shift_percent=-8.0), 0.5, 1)
    found = assess_with_controls(test, controls, "part")
    assert found.verdict == "shifted"
    assert found.controls == ("control-0",)
    assert found.interval_percent[0] < -8.0 < found.interval_percent[1]
    assert len(found.looks) > 20
    assert 0 <= found.common_share < 1
    assert found.distance_to_go_km == 0


def test_what_cannot_be_a_control() -> None:
    test, controls = run(replace(STEADY_COMMUTE, fillings=20), 0.5, 1)
    with pytest.raises(InferenceError, match="at least one control"):
        assess_with_controls(test, [], "part")
    with pytest.raises(InferenceError, match="its own control"):
        assess_with_controls(test, [test], "part")
    with pytest.raises(InferenceError, match="has 'part' itself"):
        assess_with_controls(test, [replace(controls[0], modifications=test.modifications)], "part")
    with pytest.raises(UnknownNameError, match="logged: part"):
        assess_with_controls(test, controls, "wing")


def test_drift_in_common_is_drawn_with_the_share_stated() -> None:
    """Correlation of two vehicles' drift, from many days."""
    rng = np.random.default_rng(1)
    common = CommonDrift.drawn(0.5, SHORT_START, 4000, rng)
    weeks, _ = common.on(np.datetime64(SHORT_START) + np.arange(4000))
    assert np.var(weeks) == pytest.approx(0.5, rel=0.35)
    drawn = simulate(SHORT, rng, start=SHORT_START, common=common)
    assert len(as_log(drawn).entries) == 40



