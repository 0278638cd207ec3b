"""A part at several levels: its shift is the average over them, whatever the response, and the rest holds with that."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

import energytrack as et
from energytrack.consumption.frames import observe_frames
from energytrack.inference.ahead import always_fitted, road
from energytrack.inference.designs import plan
from energytrack.inference.graded import averaged, level_terms, parts
from energytrack.inference.model import Model, fit_model
from energytrack.inference.question import Question
from energytrack.inference.rehearsal import rehearse
from energytrack.inference.stage import set_stage
from energytrack.presentation.answer import sentence
from tests.dense import dense_covariance
from tests.fitted import Period, fit_parts
from tests.inference.test_response import parabola, wing
from tests.inference.test_several import plain_log

LEVELS = (5.0, 10.0, 20.0)
UNEVEN = {5.0: -0.08, 10.0: -0.04, 20.0: 0.04}.__getitem__
Tables = tuple[pd.DataFrame, pd.DataFrame]


def fitted_model(tables: Tables) -> Model:
    observed, _ = observe_frames(*tables, capacity=75.0)
    return fit_model(averaged(observed), "wing")


def true_average(tables: Tables, effect: Callable[[float], float]) -> float:
    """Percent, over the distance driven with the part."""
    entries, rows = tables
    km = entries["odometer_km"].iloc[-1]
    lengths = rows["removed_km"].fillna(km) - rows["fitted_km"]
    return float(100 * np.average([effect(level) for level in rows["level"]], weights=lengths))


@pytest.mark.parametrize(
    ("levels", "effect"),
    [
        (LEVELS, parabola),
        (LEVELS, UNEVEN),
        (LEVELS, lambda _: -0.05),
        ((2.4, 2.7), lambda _: -0.05),
        ((-5.0, 5.0), lambda _: -0.05),
    ],
    ids=["bent", "uneven", "the same at all", "far from 0", "both sides of 0"],
)
def test_the_shift_is_the_average_over_the_levels(
    levels: tuple[float, ...], effect: Callable[[float], float]
) -> None:
    tables = wing(levels, effect)
    answer = et.assess(*tables, "wing", capacity=75.0, every_look=False)
    low, high = answer.interval_percent
    truth = true_average(tables, effect)
    assert low < truth < high
    assert answer.shift_percent == pytest.approx(truth, abs=1.5)
    assert "average over the levels driven" in sentence(answer)
    assert any("average over the levels driven so far" in warning for warning in answer.warnings)


def test_average_and_its_error_are_those_of_one_dummy_a_level() -> None:
    """statsmodels GLS with a dummy for each level, at the noise found: three levels fix the curve."""
    tables = wing(LEVELS, UNEVEN)
    model = fitted_model(tables)
    observed, _ = observe_frames(*tables, capacity=75.0)
    fitted, shares = observed.fitted[:, 0], observed.shares[:, 0]
    clean = np.isin(np.round(np.divide(shares, fitted, out=np.zeros(len(shares)), where=fitted > 0), 6), (0, *LEVELS))
    assert clean.all()  # switched at entries
    relative = observed.distance_km / model.scale.distance_km
    dummies = np.array([relative * fitted * (np.isclose(shares, level * fitted) & (fitted > 0)) for level in LEVELS]).T
    terms = model.problem.columns[:, model.term_columns]
    design = np.hstack([model.problem.columns[:, :1], dummies, terms])
    covariance = dense_covariance(model.problem.shape, model.fit.scatter, observed.mid_day)
    fit = sm.GLS(observed.energy / model.scale.energy, design, sigma=covariance).fit(cov_type="fixed scale")
    driven = observed.distance_km @ (dummies / relative[:, None])
    weights = np.concatenate([[0.0], driven / driven.sum(), np.zeros(terms.shape[1])])
    assert model.fit.coefficients[1] == pytest.approx(float(weights @ fit.params), abs=0.002)
    error = float(np.sqrt(weights @ fit.cov_params() @ weights))
    assert np.sqrt(model.fit.covariance[1, 1]) == pytest.approx(error, rel=0.03)


def test_level_terms_average_zero_and_know_their_part() -> None:
    observed, _ = observe_frames(*wing(LEVELS, parabola), capacity=75.0)
    found = averaged(observed)
    assert found.names == ("wing", *level_terms("wing"))
    assert parts(found.names) == ("wing",)
    assert found.distance_km @ found.shares[:, 1:] == pytest.approx(np.zeros(2), abs=1e-6)
    np.testing.assert_array_equal(found.shares[:, 0], observed.fitted[:, 0])


def test_one_level_needs_no_level_terms() -> None:
    observed, _ = observe_frames(*wing((5.0,), lambda _: -0.05), capacity=75.0)
    assert averaged(observed).names == ("wing",)


def test_a_pressure_that_always_has_a_level_counts_from_the_first() -> None:
    """Changed half-way through a tank: that tank counts by its share."""
    entries, rows = fit_parts(plain_log(7), [Period("p", 0, 60, 0.0, 2.4), Period("p", 60, 119, -0.05, 2.7)])
    middle = entries["odometer_km"].iloc[[60, 61]].mean()
    rows.loc[0, "removed_km"] = rows.loc[1, "fitted_km"] = middle
    answer = et.assess(entries, rows, "p", capacity=75.0, every_look=False)
    assert answer.distance_modified_km == pytest.approx(entries["odometer_km"].iloc[-1] - middle)
    low, high = answer.interval_percent
    assert low < -5 < high < 0


def test_levels_ahead_are_mixed_as_they_were() -> None:
    model = fitted_model(wing(LEVELS, parabola))
    ahead = road(model, always_fitted, 0)
    columns = [model.term_columns.stop + model.others.index(name) for name in level_terms("wing")]
    assert not ahead.columns[ahead.past :, columns].any()
    assert ahead.columns[ahead.past :, 1] == pytest.approx(ahead.distance[ahead.past :])


def test_what_a_rehearsal_draws_without_a_shift_has_none_at_any_level() -> None:
    observed, _ = observe_frames(*wing(LEVELS, UNEVEN), capacity=75.0)
    stage = set_stage(observed, Question("wing", 0.03, 0.05, 0.8), pretended=False)
    quiet = replace(observed, energy=stage.mean)
    found = fit_model(averaged(quiet), "wing")
    columns = [1, *(found.term_columns.stop + k for k in range(len(found.others)))]
    assert found.fit.coefficients[columns] == pytest.approx(np.zeros(3), abs=1e-3)


def test_rehearsal_of_a_pressure_that_always_has_a_level() -> None:
    entries, rows = fit_parts(plain_log(7, 60), [Period("p", 0, 30, 0.0, 2.4), Period("p", 30, 59, -0.03, 2.7)])
    found = rehearse(entries, rows, "p", 10.0, runs=4, seed=3, capacity=75.0)
    assert not found.pretended
    assert 25 <= found.segments_baseline <= 30
    assert found.no_shift.called_shifted.of == 4


def test_a_plan_beside_a_graded_part_does_not_take_its_levels_for_noise() -> None:
    """A log with levels of uneven effect plans as the same log without them."""
    graded = plan(wing(LEVELS, UNEVEN)[0], modifications=wing(LEVELS, UNEVEN)[1], capacity=75.0)
    bare = plan(wing(LEVELS, lambda _: 0.0)[0], capacity=75.0)
    ends = [found.noise for found in (graded, bare)]
    totals = [np.hypot(noise.drift_weeks_percent, noise.drift_seasons_percent) for noise in ends]
    assert totals[0] < 1.5 * totals[1]


def test_another_graded_part_stands_beside_as_its_average() -> None:
    tables = wing(LEVELS, UNEVEN)
    entries, rows = tables
    log = replace(plain_log(6), entries=entries)
    entries, skirts = fit_parts(log, [Period("skirts", 60, 119, -0.05)])
    both = et.assess(entries, pd.concat([rows, skirts]), "skirts", capacity=75.0, every_look=False)
    assert [effect.name for effect in both.together.each] == ["skirts", "wing"]
    low, high = both.together.each[1].interval_percent
    assert low < true_average(tables, UNEVEN) < high
    assert both.interval_percent[0] < -5 < both.interval_percent[1]
