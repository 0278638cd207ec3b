"""A plug-in hybrid whose truth is known: a changed charging habit is no shift, and a shift is found through it."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

import energytrack as et
from energytrack.consumption.terms import ELECTRIC
from energytrack.inference.results import Assessment
from tests.hybrids import BATTERY_KWH, TANK_L, HybridUse, hybrid_log

BOTH = et.TwoCarriers("petrol", tank_capacity=TANK_L, battery_capacity=BATTERY_KWH)


def asked(seed: int = 3, **use: float) -> Assessment:
    entries, modifications = hybrid_log(HybridUse(**use), np.random.default_rng(seed))  # type: ignore[arg-type]
    answer: Assessment = et.assess(entries, modifications, "part", two_carriers=BOTH)
    return answer


def warned(answer: Assessment) -> bool:
    return any("charging habit changed" in warning for warning in answer.warnings)


@pytest.mark.parametrize(("before", "after"), [(0.2, 0.7), (0.8, 0.3)])
def test_a_changed_charging_habit_is_warned_of_and_not_called_a_shift(before: float, after: float) -> None:
    answer = asked(charge_before=before, charge_after=after)
    assert answer.verdict != "shifted"
    assert answer.interval_percent[0] < 0 < answer.interval_percent[1]
    assert warned(answer)


def test_two_averages_would_have_called_it_a_shift() -> None:
    """The trap is real: plain kWh per km differs by more than a tenth."""
    entries, modifications = hybrid_log(HybridUse(charge_before=0.2, charge_after=0.7), np.random.default_rng(3))
    kwh = entries["energy"] * np.where(entries["kind"] == "charge", 1.0, 32.0 / 3.6)
    fitted = entries["odometer_km"] > modifications["fitted_km"].iloc[0]
    km = entries["odometer_km"].groupby(fitted).agg(np.ptp)
    mean = kwh.groupby(fitted).sum() / km
    assert mean[True] / mean[False] < 0.9


def test_a_true_shift_is_found_at_its_size() -> None:
    answer = asked(shift_percent=-8.0)
    assert answer.verdict == "shifted"
    assert answer.interval_percent[0] < -8.0 < answer.interval_percent[1] < 0
    assert answer.shift_percent == pytest.approx(-8.0, abs=2.0)
    assert answer.unit == "kWh"
    assert not warned(answer)


def test_a_true_shift_beside_a_changed_habit_has_its_size_in_range() -> None:
    answer = asked(shift_percent=-8.0, charge_before=0.3, charge_after=0.7)
    assert answer.interval_percent[0] < -8.0 < answer.interval_percent[1]
    assert warned(answer)


def test_the_estimate_is_unbiased_though_a_kwh_of_either_drives_differently_far() -> None:
    """Mean of 10 logs; one has a standard deviation of about 0.8 percent."""
    shifts = []
    for seed in range(10):
        entries, modifications = hybrid_log(HybridUse(shift_percent=-8.0), np.random.default_rng(seed))
        shifts.append(et.assess(entries, modifications, "part", two_carriers=BOTH, every_look=False).shift_percent)
    assert np.mean(shifts) == pytest.approx(-8.0, abs=0.8)


def test_the_response_to_charging_is_that_of_the_vehicle() -> None:
    """A kWh from the plug replaces 0.55 / 0.18 of fuel, in percent of 55 kWh/100 km on fuel alone."""
    found = asked().covariates[ELECTRIC]
    assert found.estimate == pytest.approx(100 * (1 - 0.55 / 0.18) / 55, abs=3 * found.standard_error)


def test_a_vehicle_that_is_never_charged_has_no_such_term() -> None:
    answer = asked(charge_before=0.0, charge_after=0.0)
    assert ELECTRIC not in answer.covariates
    assert not warned(answer)


def test_the_energy_content_scales_the_consumption_and_hardly_the_shift() -> None:
    entries, modifications = hybrid_log(HybridUse(shift_percent=-8.0), np.random.default_rng(3))
    other = et.TwoCarriers("petrol", TANK_L, BATTERY_KWH, energy_content=9.2)
    one, two = (et.assess(entries, modifications, "part", two_carriers=b, every_look=False) for b in (BOTH, other))
    assert two.expectation.consumption / one.expectation.consumption == pytest.approx(9.2 * 3.6 / 32.0, rel=0.01)
    assert two.shift_percent == pytest.approx(one.shift_percent, abs=0.3)


def test_plan_takes_tank_and_battery_too() -> None:
    entries, _ = hybrid_log(HybridUse(), np.random.default_rng(3))
    found = et.plan(entries, 5.0, two_carriers=BOTH)
    assert found.unit == "kWh"
    assert any(design.distance_km for design in found.designs)


def test_every_question_takes_tank_and_battery() -> None:
    entries, modifications = hybrid_log(HybridUse(shift_percent=-8.0), np.random.default_rng(3))
    rehearsed = et.rehearse(entries, modifications, "part", 8.0, runs=2, two_carriers=BOTH)
    assert rehearsed.unit == "kWh"
    wing = modifications.assign(level=5.0)
    assert et.respond(entries, wing, "part", two_carriers=BOTH).levels
    later = modifications.assign(name="other", fitted_km=modifications["fitted_km"] + 5000)
    both_parts = pd.concat([modifications.assign(removed_km=later["fitted_km"]), later])
    compared = et.compare(entries, both_parts, two_carriers=BOTH)
    assert len(compared.pairs) == 3  # each part against the other and against nothing fitted
