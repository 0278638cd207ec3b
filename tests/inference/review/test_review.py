"""A vehicle's month from its tables, against the truth its log was drawn from."""

from __future__ import annotations

import datetime as dt
import json
from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from energytrack.consumption.two_carriers import TwoCarriers
from energytrack.errors import ConsumptionError, InferenceError, UnknownNameError
from energytrack.inference.review.results import Review
from energytrack.inference.review.review import review
from tests.hybrids import BATTERY_KWH, TANK_L, HybridUse, hybrid_log
from tests.simulation import SimulatedLog, simulate
from tests.uses import STEADY_COMMUTE, USES, Use

TODAY = dt.date(2040, 1, 1)
WINTER = replace(STEADY_COMMUTE, heating=1.5, fillings=75, shift_percent=0.0)


def drawn(use: Use, seed: int, start: dt.date = dt.date(2023, 6, 1)) -> SimulatedLog:
    return simulate(use, np.random.default_rng(seed), start=start)


def reviewed(log: SimulatedLog, month: str | None, **options: Any) -> Review:
    use = log.truth.use
    return review(log.entries, month=month, capacity=use.capacity, unit=use.unit, today=TODAY, **options)


def against(found: Review, what: str) -> Any:
    return next(each for each in found.differences if each.against == what)


def test_a_cold_month_is_not_blamed_on_the_driver() -> None:
    found = reviewed(drawn(WINTER, 11), "2024-01")
    autumn = against(found, "baseline")
    assert autumn.measured_percent > 6.0
    assert abs(autumn.percent) < autumn.measured_percent / 2
    assert autumn.interval_percent[0] < 0.0 < autumn.interval_percent[1]


def test_a_month_after_a_real_change_is_told_from_the_baseline() -> None:
    log = drawn(replace(STEADY_COMMUTE, shift_percent=-8.0, fillings=80, switches=(0.5,)), 3)
    found = reviewed(log, None, modifications=log.modifications)
    baseline = against(found, "baseline")
    assert baseline.interval_percent[0] < -8.0 < baseline.interval_percent[1] < 0.0
    assert "nothing fitted" in baseline.what
    assert found.level is not None
    assert found.level.interval is not None
    assert found.level.interval[0] < 0.92 * log.truth.b0 * 1.02
    (part,) = found.modifications
    assert part.verdict == "shifted"
    assert not part.is_open


def test_months_without_a_change_are_seldom_told_apart() -> None:
    """At 95 % one in twenty; two logs of each of seven kinds, of other draws, up to three differences each."""
    told = []
    for number, use in enumerate(USES):
        for seed in range(2):
            log = drawn(replace(use, fillings=60, shift_percent=0.0), 100 * number + seed, dt.date(2023, 3, 1))
            month = sorted(log.entries["date"].dt.strftime("%Y-%m").unique())[-2]
            spans = [each.interval_percent for each in reviewed(log, month).differences]
            told += [span is not None and not span[0] <= 0 <= span[1] for span in spans]
    assert len(told) > 25
    assert np.mean(told) <= 0.15


def test_later_entries_change_nothing_of_an_earlier_month() -> None:
    log = drawn(WINTER, 5)
    early = replace(log, entries=log.entries[log.entries["date"] < "2024-03-15"])
    assert reviewed(log, "2024-01") == reviewed(early, "2024-01")


def test_a_part_fitted_later_is_no_part_of_an_earlier_month() -> None:
    log = drawn(replace(WINTER, switches=(0.9,)), 5)
    assert reviewed(log, "2024-01", modifications=log.modifications).modifications == ()


def test_without_a_month_the_newest_is_reviewed() -> None:
    log = drawn(WINTER, 5)
    newest = log.entries["date"].max()
    found = reviewed(log, None)
    assert found.month == newest.strftime("%Y-%m")
    assert found.counted_until == newest.date().isoformat()


def test_thirteen_months_are_shown_and_fewer_where_there_are_fewer() -> None:
    log = drawn(replace(WINTER, fillings=90), 5)
    assert [level.month for level in reviewed(log, "2023-09").levels] == ["2023-06", "2023-07", "2023-08", "2023-09"]
    assert len(reviewed(log, "2024-08").levels) == 13


def test_everything_is_plain_json() -> None:
    log = drawn(WINTER, 5)
    told = reviewed(log, None, modifications=log.modifications).to_dict()
    assert json.loads(json.dumps(told, allow_nan=False)) == told


@pytest.mark.parametrize(
    ("month", "said"),
    [
        ("2024-13", "write it as YYYY-MM"),
        ("2041-01", "has not begun: today is 2040-01-01"),
        ("2019-05", "has no entry in 2019-05: its entries run from 2023-06"),
    ],
)
def test_a_month_that_cannot_be_reviewed(month: str, said: str) -> None:
    with pytest.raises(InferenceError, match=said):
        reviewed(drawn(WINTER, 5), month)


def test_a_vehicle_bought_this_month_gets_what_can_be_said() -> None:
    log = drawn(WINTER, 5)
    few = replace(log, entries=log.entries.iloc[:3])
    found = reviewed(few, None)
    assert found.this.consumption is not None
    assert found.level is None
    assert found.level_note == (
        "weather and speed can be taken out from 6 full tanks or charges on, 3 of them outside this month; 2 so far"
    )
    one = reviewed(replace(log, entries=log.entries.iloc[:1]), None)
    assert (one.this.consumption, one.this.distance_km, one.carbon) == (None, 0.0, ())


def test_a_log_within_one_month_has_no_outside_to_compare_with() -> None:
    log = drawn(replace(WINTER, days_per_fill=(1, 2)), 5, dt.date(2023, 6, 1))
    within = replace(log, entries=log.entries[log.entries["date"] < "2023-07-01"])
    found = reviewed(within, None)
    assert len(within.entries) > 8
    assert found.level is None
    assert found.level_note == "3 full tanks or charges outside this month are needed to tell what weather and speed do"


def test_carbon_of_tank_and_battery_apart() -> None:
    entries, modifications = hybrid_log(HybridUse(days=400), np.random.default_rng(2))
    both = TwoCarriers("petrol", TANK_L, BATTERY_KWH)
    found = review(entries, modifications, two_carriers=both, today=TODAY, co2_kg_per_unit={"petrol": 2.3})
    petrol, electric = found.carbon
    assert petrol.kg == pytest.approx(2.3 * petrol.energy)
    assert (electric.carrier, electric.kg) == ("electricity", None)
    assert petrol.energy * both.kwh_per_unit + electric.energy == pytest.approx(found.this.energy)
    assert found.reference_conditions["electric_kwh_per_100km"] == 0.0


def test_costs_in_two_currencies_give_no_money_and_say_which_entries() -> None:
    log = drawn(WINTER, 5)
    paid = log.entries.assign(cost=50.0, currency="EUR")
    paid.loc[paid.index[-1], "currency"] = "CHF"
    found = reviewed(replace(log, entries=paid), None)
    assert found.price is None
    assert found.this.cost is None
    assert found.price_note is not None
    assert "not added up" in found.price_note
    assert f"CHF: {paid['date'].iloc[-1].date()}" in found.price_note


def test_lacking_records_are_counted() -> None:
    log = drawn(WINTER, 5)
    entries = log.entries.reset_index(drop=True).assign(cost=50.0)
    last = entries["date"].max()
    own = entries.index[entries["date"] >= pd.Timestamp(last.year, last.month, 1)]
    entries.loc[own[0], "temperature_c"] = np.nan
    entries.loc[own[-1], ["cost", "speed_kmh"]] = np.nan
    quality = reviewed(replace(log, entries=entries), None).quality
    lacking = int(entries.loc[own, "temperature_c"].isna().sum())
    assert (quality.entries, quality.without_temperature) == (len(own), lacking)
    assert (quality.without_cost, quality.without_speed) == (1, 1)


def test_refusals() -> None:
    log = drawn(WINTER, 5)
    with pytest.raises(UnknownNameError, match="no modification named 'roof'; logged: part"):
        reviewed(log, None, modifications=log.modifications, part_costs={"roof": 3.0})
    with pytest.raises(InferenceError, match="cost of 'part' must be more than 0"):
        reviewed(log, None, modifications=log.modifications, part_costs={"part": 0.0})
    with pytest.raises(ConsumptionError, match="must be 0 or more"):
        reviewed(log, None, co2_kg_per_unit={"diesel": -1.0})
    with pytest.raises(InferenceError, match="confidence"):
        reviewed(log, None, confidence=1.0)
    with pytest.raises(InferenceError, match="no entry yet"):
        review(log.entries.iloc[:0])
