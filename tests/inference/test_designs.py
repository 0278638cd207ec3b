"""Plans: what a design costs in km, held against facts of the trade and against itself."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import energytrack as et
from energytrack.errors import InferenceError
from tests.simulation import SimulatedLog, simulate
from tests.uses import DELIVERY_VAN, DRIFTING, ELECTRIC, STEADY_COMMUTE

# Unchanged short tests vary by 10 to 15 %: trips of 40 km that scatter by 12 % (common practice, no source)
SHORT_TRIPS = replace(
    ELECTRIC,
    vehicle="short-trips",
    km_per_day=40,
    days_per_fill=(1, 1),
    fillings=200,
    trip_percent=12.0,
    level_error_percent=0.3,
    reading_share=1.0,
    drift_weeks_percent=0.5,
    drift_seasons_percent=0.3,
)


def baseline(log: SimulatedLog) -> pd.DataFrame:
    return log.entries[log.entries["odometer_km"] <= log.modifications["fitted_km"].iloc[0]]


def drawn(use, seed: int = 0, **changes: object) -> SimulatedLog:  # type: ignore[no-untyped-def]
    return simulate(replace(use, **changes), np.random.default_rng(seed))


@pytest.mark.parametrize("seed", range(3))
def test_a_few_kilometres_tell_nothing_and_a_thousand_begin_to(seed: int) -> None:
    """Common practice, no source. Open windows raise consumption by 10 to 15 %: the largest change anyone makes."""
    log = drawn(SHORT_TRIPS, seed)
    fitted = log.modifications["fitted_km"].iloc[0]

    def resolvable(km: float) -> float:
        until = log.entries[log.entries["odometer_km"] <= fitted + km]
        answer = et.assess(until, log.modifications, "part", unit="kWh", capacity=62.0, every_look=False)
        return answer.resolvable_now_percent

    assert resolvable(60) > 25
    assert resolvable(1_000) < 15


@pytest.mark.parametrize("seed", range(3))
def test_no_short_test_shows_one_percent(seed: int) -> None:
    """The change sought may be 1 % (common practice, no source): no design resolves it within 1,000 km."""
    designs = et.plan(baseline(drawn(SHORT_TRIPS, seed)), 1.0, unit="kWh", capacity=62.0).designs
    resolvable = [design.resolvable_percent["1000"] for design in designs]
    assert min(shift for shift in resolvable if shift is not None) > 5
    assert all(design.distance_km is None or design.distance_km > 5_000 for design in designs)


@pytest.mark.parametrize("seed", range(4))
def test_four_weeks_of_one_commute_are_a_usable_baseline(seed: int) -> None:
    """160 km a day for four weeks (common practice, no source): 5 % is within reach of some design."""
    commute = drawn(STEADY_COMMUTE, seed, km_per_day=160, days_per_fill=(2, 3), fillings=12, switches=(0.85,))
    four_weeks = commute.entries[commute.entries["date"] <= commute.entries["date"].iloc[0] + pd.Timedelta(days=28)]
    plan = et.plan(four_weeks, 5.0, capacity=50.0)
    assert plan.segments_baseline >= 6
    assert plan.noise is not None
    assert min(design.distance_km for design in plan.designs if design.distance_km is not None) < 30_000


def test_alternating_beats_one_switch_where_the_log_drifts() -> None:
    plan = et.plan(baseline(drawn(DRIFTING, 1)), 4.0, capacity=50.0)
    one_switch, *others = plan
    alternating = [design for design in others if design.name == "alternate"]
    shortest = min(design.distance_km for design in alternating if design.distance_km is not None)
    assert one_switch.distance_km is None or shortest < one_switch.distance_km


def test_one_switch_suffices_where_it_does_not_drift() -> None:
    steady = drawn(DELIVERY_VAN, 2, drift_weeks_percent=0.1, drift_seasons_percent=0.1)
    plan = et.plan(baseline(steady), 3.0, capacity=75.0)
    one_switch = plan.designs[0]
    every_fillup = next(design for design in plan if design.every_fillups == 1)
    assert one_switch.distance_km < every_fillup.distance_km


def test_smaller_targets_and_more_certainty_cost_more() -> None:
    entries = baseline(drawn(DELIVERY_VAN, 3))
    distances = [et.plan(entries, target, capacity=75.0).designs[-1].distance_km for target in (6.0, 4.0, 3.0)]
    assert distances == sorted(distances)
    careful = et.plan(entries, 4.0, capacity=75.0, confidence=0.99, power=0.9).designs[-1].distance_km
    assert careful > 1.2 * distances[1]


def test_resolvable_shift_shrinks_with_distance_and_meets_the_target_at_its_distance() -> None:
    for design in et.plan(baseline(drawn(DELIVERY_VAN, 3)), 3.0, capacity=75.0).designs:
        known = {km: shift for km, shift in design.resolvable_percent.items() if shift is not None}
        assert list(known.values()) == sorted(known.values(), reverse=True)
        assert known
        for km, shift in known.items():
            if design.distance_km is not None and abs(int(km) - design.distance_km) > 1_000:  # beyond one segment
                assert (shift < 3.0) == (int(km) > design.distance_km)


def test_too_short_a_log_gives_no_designs() -> None:
    plan = et.plan(drawn(STEADY_COMMUTE).entries.head(3), 3.0)
    assert plan.designs == ()
    assert plan.noise is None


def test_impossible_target_is_refused() -> None:
    with pytest.raises(InferenceError, match="target"):
        et.plan(drawn(STEADY_COMMUTE).entries, 0.0)


def test_an_old_log_plans_from_today_with_what_may_have_drifted_since() -> None:
    entries = baseline(drawn(DRIFTING))
    last = dt.date.fromisoformat(str(entries["date"].max())[:10])
    then, now = et.plan(entries, 10.0, today=last), et.plan(entries, 10.0, today=last + dt.timedelta(days=2 * 365))
    assert et.plan(entries, 10.0) == then
    assert et.plan(entries, 10.0, today=last - dt.timedelta(days=9)) == then
    best = next(design for design in now if design.name == "best-date")
    assert dt.date.fromisoformat(best.start or "") > last + dt.timedelta(days=2 * 365)
    assert now.warnings[0].startswith(f"the log ended on {last}: the plan counts from {last + dt.timedelta(days=730)}")
    one = [next(design for design in each if design.name == "one-switch") for each in (then, now)]
    soonest, aged = (design.resolvable_percent["10000"] or np.inf for design in one)
    assert aged > 1.1 * soonest  # the baseline has drifted away
    assert (one[1].days or 0.0) < 365  # counted from today


def test_the_days_since_the_last_entry_are_no_gap() -> None:
    entries = baseline(drawn(STEADY_COMMUTE))
    last = dt.date.fromisoformat(str(entries["date"].max())[:10])
    found = et.plan(entries, 3.0, today=last + dt.timedelta(days=1))
    assert not any("the log ended" in warning for warning in found.warnings)
