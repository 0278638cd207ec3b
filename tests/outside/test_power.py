"""Power at a planned test against statsmodels, where nothing drifts and the response to the weather is known."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import norm
from statsmodels.stats.power import NormalIndPower, TTestIndPower

from energytrack.inference import bounds
from energytrack.inference.ahead import always_fitted
from energytrack.inference.distance import course
from energytrack.inference.noise import Array
from energytrack.inference.question import Question
from energytrack.inference.stated import Stated, stated_model

TRIPS, BASELINE, TARGET = 0.04, 60, 0.03
EFFECT = TARGET / TRIPS
STATED = Stated(
    100 * TRIPS, 0.0, 0.0, filling=0.0, baseline_km=BASELINE * 550, january_c=20, july_c=20, date=dt.date(2026, 3, 1)
)
MODEL = stated_model(STATED)
COURSE = course(MODEL, always_fitted, Question("", TARGET, 0.05, 0.80))


@pytest.fixture(scope="module")
def variances() -> Array:
    """Of the shift after so many fill-ups with the part; level and part alone are to be estimated."""
    road = COURSE.road
    known = replace(road, columns=road.columns[:, :2], precision=road.precision[:2])
    return known.variances(MODEL.fit.theta)


def single_look(with_it: int) -> float:
    """statsmodels NormalIndPower: two means, standard deviation known."""
    return float(NormalIndPower().power(EFFECT, BASELINE, 0.05, ratio=with_it / BASELINE))


@pytest.mark.parametrize("with_it", [5, 10, 20, 40, 80])
def test_power_of_a_single_look_is_that_of_two_means(variances: Array, with_it: int) -> None:
    z, critical = TARGET / np.sqrt(variances[with_it]), norm.isf(0.025)
    assert norm.sf(critical - z) + norm.cdf(-critical - z) == pytest.approx(single_look(with_it), abs=0.003)


def test_unknown_weather_costs_power_and_little_of_it() -> None:
    """Two slopes more to estimate, in weather that is always much the same: at most a tenth of the power."""
    for with_it in (10, 20, 40):
        z = TARGET / np.sqrt(COURSE.variances[with_it])
        assert 0.9 * single_look(with_it) < norm.sf(norm.isf(0.025) - z) < single_look(with_it)


def test_looking_all_the_time_costs_six_percent_more(variances: Array) -> None:
    """Information at 80 % power over that of a single look: (2.8807 / 2.8016)^2 = 1.057 (normal quantiles)."""
    single = next(count for count in range(1, 80) if single_look(count) >= 0.80)
    always = int(np.flatnonzero(variances <= (TARGET / bounds.drift(0.05, 0.80)) ** 2)[0])

    def information(count: int) -> float:
        return 1 / (1 / BASELINE + 1 / count)

    assert information(always - 1) < 1.057 * information(single)
    assert information(always) > 1.057 * information(single - 1)


def test_the_price_of_unknown_noise_lies_above_that_of_students_t() -> None:
    """statsmodels TTestIndPower has one variance to estimate; ours tells four apart."""
    ratio = 20 / BASELINE
    as_known = TTestIndPower().solve_power(None, BASELINE, 0.05, single_look(20), ratio=ratio)
    assert 1 < (as_known / EFFECT) ** 2 < COURSE.price(20) < 1.25
