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
from energytrack.inference.graded import averaged, level_terms, newest_level, parts
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


def mixed(levels: tuple[float, ...], effect: Callable[[float], float], rounds: int = 2) -> Tables:
    """The levels in turns, and again."""
    step = 100 // (rounds * len(levels))
    turns = [19 + k * step for k in range(rounds * len(levels))]
    periods = [
        Period("wing", first, last, effect(level), level)
        for first, last, level in zip(turns, [*turns[1:], 119], rounds * levels, strict=True)
    ]
    return fit_parts(plain_log(6), periods)


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
def test_the_shift_of_mixed_levels_is_their_average(
    levels: tuple[float, ...], effect: Callable[[float], float]
) -> None:
    tables = mixed(levels, effect)
    answer = et.assess(*tables, "wing", capacity=75.0, every_look=False)
    low, high = answer.interval_percent
    truth = true_average(tables, effect)
    assert low < truth < high
    assert answer.shift_percent == pytest.approx(truth, abs=1.5)
    assert "average over the levels driven" in sentence(answer)
    assert any("average over the levels driven so far" in warning for warning in answer.warnings)
    assert answer.level is None


def test_a_part_driven_in_blocks_is_asked_about_at_its_newest_level() -> None:
    """Nothing at level 5, ruled out in time; then 8 % less at level 10, which is a question of its own."""
    tables = wing((5.0, 10.0), {5.0: 0.0, 10.0: -0.08}.__getitem__)
    entries, rows = tables
    changed = rows["fitted_km"].iloc[1]
    first = et.assess(entries[entries["odometer_km"] <= changed], rows[:1], "wing", capacity=75.0, target_percent=5)
    assert first.verdict == "no-shift-of-target-size"
    answer = et.assess(*tables, "wing", capacity=75.0, target_percent=5)
    assert (answer.verdict, answer.level, answer.level_since_km) == ("shifted", 10.0, changed)
    assert answer.settled_at_km > changed
    assert min(look.odometer_km for look in answer.looks) > changed
    low, high = answer.interval_percent
    assert low < -8 < high < 0
    at_10 = next(effect for effect in answer.response.levels if effect.level == 10)
    assert at_10.shift_percent == pytest.approx(answer.shift_percent, abs=0.1)
    assert "That is at level 10, driven since" in sentence(answer)
    assert any("newest level alone" in warning for warning in answer.warnings)


def test_a_new_level_begins_anew_where_looks_are_counted() -> None:
    """Having looked at the earlier level costs nothing of the error allowed."""
    tables = wing((5.0, 10.0), lambda _: 0.0)
    taken = tables[0]["odometer_km"][30:60].tolist()
    looked = et.assess(*tables, "wing", capacity=75.0, rule="counted", looks_taken=taken)
    fresh = et.assess(*tables, "wing", capacity=75.0, rule="counted")
    assert len(looked.looks) == len(fresh.looks) == 1
    assert looked.looks[0].bound == pytest.approx(fresh.looks[0].bound, rel=0.01)  # the fit starts elsewhere


def test_which_level_is_asked_about() -> None:
    def newest(levels: list[float], fitted: list[float] | None = None) -> float | None:
        observed, _ = observe_frames(*wing((5.0,), lambda _: 0.0), capacity=75.0)
        share = np.array([1.0] * len(levels) if fitted is None else fitted)
        bare = observed.head(len(levels)).leaving_out(["wing"])
        found = newest_level(bare.adding("wing", share * np.array(levels), share), "wing")
        return None if found is None else found.level

    assert newest([0, 0, 5], [0, 0, 1]) == 5  # the first segment of an only level
    assert newest([5, 5, 10, 10]) == 10
    assert newest([5, 5, 0, 10, 10], [1, 1, 0, 1, 0.4]) == 10  # off in between
    assert newest([5, 5, 7.3, 10, 10]) == 10  # met in mid-tank
    assert newest([5, 5, 7.3]) == 5  # may yet turn out to be one
    assert newest([5, 5, 10]) == 5
    assert newest([5, 5, 10, 10, 5]) is None
    assert newest([5, 10, 5, 10]) is None
    assert newest([5, 10, 15, 20]) is None


def test_the_newest_level_and_its_error_are_those_of_its_dummy() -> None:
    """statsmodels GLS with a dummy for each level, at the noise found: three levels fix the curve."""
    tables = wing(LEVELS, UNEVEN)
    model = fitted_model(tables)
    fit = _dummies(tables, model)[0]
    assert model.fit.coefficients[1] == pytest.approx(float(fit.params[3]), abs=0.002)
    assert np.sqrt(model.fit.covariance[1, 1]) == pytest.approx(float(fit.bse[3]), rel=0.03)


def test_a_rehearsal_looks_at_the_newest_level_alone() -> None:
    entries, rows = wing((5.0, 10.0), lambda _: 0.0)
    found = rehearse(entries, rows, "wing", 10.0, runs=2, seed=3, capacity=75.0)
    answer = et.assess(entries, rows, "wing", target_percent=10.0, capacity=75.0, set_aside="none")
    assert found.looks == len(answer.looks)
    assert 40 <= found.looks <= 50


def test_average_and_its_error_are_those_of_one_dummy_a_level() -> None:
    """statsmodels GLS with a dummy for each level, at the noise found: three levels fix the curve."""
    tables = mixed(LEVELS, UNEVEN)
    model = fitted_model(tables)
    fit, driven = _dummies(tables, model)
    weights = np.concatenate([[0.0], driven / driven.sum(), np.zeros(len(fit.params) - 4)])
    assert model.fit.coefficients[1] == pytest.approx(float(weights @ fit.params), abs=0.002)
    error = float(np.sqrt(weights @ fit.cov_params() @ weights))
    assert np.sqrt(model.fit.covariance[1, 1]) == pytest.approx(error, rel=0.03)


def _dummies(tables: Tables, model: Model):  # type: ignore[no-untyped-def]
    """The fit with a column a level after that of the baseline, and the distance at each level."""
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
    return fit, observed.distance_km @ (dummies / relative[:, None])


def test_level_terms_average_zero_and_know_their_part() -> None:
    observed, _ = observe_frames(*mixed(LEVELS, parabola), capacity=75.0)
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


@pytest.mark.parametrize("drive", [wing, mixed])
def test_levels_ahead_are_the_newest_or_mixed_as_they_were(drive: Callable[..., Tables]) -> None:
    model = fitted_model(drive(LEVELS, parabola))
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
    tables = mixed(LEVELS, UNEVEN)
    entries, rows = tables
    log = replace(plain_log(6), entries=entries)
    entries, skirts = fit_parts(log, [Period("skirts", 60, 119, -0.05)])
    both = et.assess(entries, pd.concat([rows, skirts]), "skirts", capacity=75.0, every_look=False)
    assert [effect.name for effect in both.together.each] == ["skirts", "wing"]
    low, high = both.together.each[1].interval_percent
    assert low < true_average(tables, UNEVEN) < high
    assert both.interval_percent[0] < -5 < both.interval_percent[1]
