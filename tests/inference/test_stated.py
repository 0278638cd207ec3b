"""Plans from stated noise: facts of the trade, formulas of a plain comparison, and what costs the most."""

from __future__ import annotations

import datetime as dt
import math
from dataclasses import replace

import numpy as np
import pytest

import energytrack as et
from energytrack.errors import InferenceError
from energytrack.inference import bounds
from energytrack.inference.ahead import always_fitted
from energytrack.inference.distance import course
from energytrack.inference.question import Question
from energytrack.inference.results import Design, Plan
from energytrack.inference.stated import Stated, stated_model
from energytrack.inference.ways import months_after

SPRING = dt.date(2026, 3, 1)
NO_DRIFT = Stated(4.0, 0.0, 0.0, filling=0.0, baseline_km=22_000, january_c=20.0, july_c=20.0, date=SPRING)
# trips of 160 km a day, filled up every third day, four weeks of them
FOUR_WEEKS = Stated(2.5, 0.5, km_per_fill=480, days_per_fill=3, baseline_km=28 * 160, date=SPRING)


def the(plan: Plan, name: str, every: int | None = None) -> Design:
    (found,) = [design for design in plan if design.name == name and design.every_fillups == every]
    return found


def test_four_weeks_of_160_km_a_day_are_a_usable_baseline() -> None:
    """Common practice, no source."""
    assert FOUR_WEEKS.fills >= 5
    reached = [design.distance_km for design in et.plan_from(FOUR_WEEKS, 5.0) if design.distance_km is not None]
    assert min(reached) < 10_000


@pytest.mark.parametrize("month", range(1, 13))
def test_the_example_of_the_readme_is_within_reach_of_one_switch(month: int) -> None:
    """In whatever month somebody tries it: a steady commute with five months of baseline."""
    steady = Stated(2.0, 0.5, baseline_km=12_000, date=dt.date(2026, month, 1))
    question = Question("", 0.03, 0.05, 0.80)
    assert course(stated_model(steady), always_fitted, question).reach(1 / question.information) is not None


def test_a_comparison_over_a_few_km_cannot_be_told_from_noise() -> None:
    """Common practice, no source: short tests vary by 10 to 15 % while the change sought may be 1 %."""
    short = Stated(12.0, 0.5, km_per_fill=10, days_per_fill=1, baseline_km=100, capacity=5, date=SPRING)
    plan = et.plan_from(short, 1.0)
    assert all(design.distance_km is None or design.distance_km > 5_000 for design in plan)
    assert min(shift for d in plan if (shift := d.resolvable_percent["1000"]) is not None) > 2


def test_smallest_shift_is_that_of_two_averages_where_nothing_drifts() -> None:
    """sd^2 (1/n + 1/m) of two means, times theta: the noise all but known, the weather always the same."""
    design = the(et.plan_from(NO_DRIFT, 3.0), "one-switch")
    with_it = int(10_000 / 550)
    plain = 100 * bounds.drift(0.05, 0.80) * 0.04 * math.sqrt(1 / NO_DRIFT.fills + 1 / with_it)
    assert plain < design.resolvable_percent["10000"] < 1.15 * plain


def test_more_baseline_less_distance() -> None:
    needed = [
        the(et.plan_from(replace(NO_DRIFT, baseline_km=km), 3.0), "one-switch").distance_km or math.inf
        for km in (5_500, 22_000, 88_000)
    ]
    assert needed == sorted(needed, reverse=True)
    assert needed[0] > 1.2 * needed[-1]


def test_by_week_is_every_fill_up_where_a_fill_up_is_a_week() -> None:
    plan = et.plan_from(Stated(4.0, 1.0, baseline_km=11_000, date=SPRING), 4.0)
    week, fillup = the(plan, "alternate-weekly"), the(plan, "alternate", 1)
    assert week.distance_km == pytest.approx(fillup.distance_km, rel=1e-6)
    assert week.swaps == fillup.swaps


@pytest.mark.parametrize(
    ("stated", "name", "costliest"),
    [
        (replace(NO_DRIFT, trip_noise=6.0), "one-switch", "trip"),
        (replace(NO_DRIFT, trip_noise=3.0, drift=3.0, season_drift=0.2), "one-switch", "drift-weeks"),
        (replace(NO_DRIFT, trip_noise=3.0, drift=0.2, season_drift=3.0), "one-switch", "drift-seasons"),
        (replace(NO_DRIFT, trip_noise=1.0, filling=3.0), "alternate", "filling"),
    ],
)
def test_what_costs_the_most(stated: Stated, name: str, costliest: str) -> None:
    design = the(et.plan_from(stated, 3.0), name, 1 if name == "alternate" else None)
    assert design.costliest == costliest
    assert 0.4 < (design.costliest_share or 0.0) <= 1.0


def test_temperature_costs_where_the_weather_turns_with_the_part() -> None:
    """Winter baseline, then spring and summer; beside it the same where it is as warm all year."""
    winter = Stated(2.0, 0.2, 0.2, baseline_km=3_300, january_c=-20, july_c=17, date=dt.date(2026, 2, 15))
    design = the(et.plan_from(winter, 5.6), "one-switch")
    steady = the(et.plan_from(replace(winter, january_c=0.0, july_c=0.0), 5.6), "one-switch")
    assert design.cost_shares["temperature_c"] > 2 * steady.cost_shares["temperature_c"]
    assert design.cost_shares["temperature_c"] > 0.3
    assert (steady.resolvable_percent["5000"] or 0.0) < 0.8 * (design.resolvable_percent["5000"] or 0.0)


def test_alternating_beats_one_switch_where_it_drifts() -> None:
    plan = et.plan_from(Stated(3.0, 2.0, 2.0, baseline_km=11_000, date=SPRING), 3.0)
    assert the(plan, "one-switch").distance_km is None
    assert the(plan, "alternate", 2).distance_km is not None


def test_on_off_on_has_three_phases_and_three_swaps() -> None:
    design = the(et.plan_from(NO_DRIFT, 3.0), "on-off-on")
    assert len(design.phases) == 2
    assert design.swaps == 3
    assert (design.distance_km or 0.0) > 550 * sum(design.phases)


@pytest.mark.parametrize("target", [3.0, 20.0, 50.0])
def test_ways_that_swap_do_so_before_the_target_is_covered(target: float) -> None:
    found = et.plan_from(NO_DRIFT, target)
    swapping = [each for each in found if each.name in ("on-off-on", "alternate", "alternate-weekly")]
    assert all((each.swaps or 0) > 1 for each in swapping)
    said = [warning for warning in found.warnings if "the same as one switch, and left out" in warning]
    assert len(said) == (len(swapping) < 5)  # on-off-on, every 1, 2 and 4 fill-ups, every week
    assert (target > 3.0) == (not swapping)


def test_best_date_is_a_first_of_a_month_within_a_year() -> None:
    start = dt.date.fromisoformat(the(et.plan_from(NO_DRIFT, 3.0), "best-date").start or "")
    assert start in months_after(SPRING)
    assert months_after(dt.date(2026, 12, 31))[0] == dt.date(2027, 1, 1)
    assert len(set(months_after(SPRING))) == 12


def test_a_part_that_stays_on_gets_only_ways_that_leave_it_on() -> None:
    plan = et.plan_from(NO_DRIFT, 3.0, reversible=False)
    assert [design.name for design in plan] == ["one-switch", "best-date", "longer-baseline"]
    assert all(design.swaps == 1 for design in plan)


def test_nothing_is_resolved_before_it_is_fitted() -> None:
    design = the(et.plan_from(NO_DRIFT, 1.0), "longer-baseline")
    assert design.phases[0] * 550 > 5_000
    assert design.resolvable_percent["5000"] is None


def test_noise_of_the_plan_is_the_noise_stated() -> None:
    noise = et.plan_from(Stated(5.0, 1.0, 0.4, filling=0.7, date=SPRING)).noise
    assert noise is not None
    figures = (noise.trip_percent, noise.drift_weeks_percent, noise.drift_seasons_percent, noise.level_error)
    np.testing.assert_allclose(figures, (5.0, 1.0, 0.4, 0.7))


def test_what_a_log_tells_of_trips_alone_is_two_a_fill_up() -> None:
    """Fisher's information on a log standard deviation: 2 a degree of freedom (any text book of statistics)."""
    model = stated_model(NO_DRIFT)
    told = np.linalg.inv(model.fit.theta_covariance) - model.problem.prior_precision
    assert told[0, 0] / len(model.observed) == pytest.approx(2.0, rel=0.1)


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"trip_noise": 0.0}, "trip noise"),
        ({"trip_noise": math.nan}, "trip noise"),
        ({"drift": -1.0}, "drift"),
        ({"km_per_fill": 0.0}, "km per fill"),
        ({"days_per_fill": -7.0}, "days per fill"),
        ({"baseline_km": 100.0}, "2750 km or more"),
        ({"july_c": 200.0}, "july c"),
        ({"unit": "gallon"}, "gallon"),
    ],
)
def test_impossible_figures_are_refused(change: dict[str, float], says: str) -> None:
    with pytest.raises(InferenceError, match=says):
        replace(Stated(5.0, 1.0), **change)  # type: ignore[arg-type]


def test_a_longer_baseline_is_offered_where_it_brings_one_switch_within_reach() -> None:
    noisy = Stated(5.0, drift=1.0, date=SPRING)
    short = et.plan_from(noisy, 5.0)
    assert the(short, "one-switch").distance_km is None
    offered = short.with_longer_baseline
    assert offered is not None
    then = the(et.plan_from(replace(noisy, baseline_km=offered.baseline_km), 5.0), "one-switch").distance_km
    assert then == pytest.approx(offered.distance_km)
    assert short.to_dict()["with_longer_baseline"]["baseline_km"] == offered.baseline_km
    assert et.plan_from(noisy, 3.0).with_longer_baseline is None  # however long it is
    assert et.plan_from(NO_DRIFT, 5.0).with_longer_baseline is None  # near already
