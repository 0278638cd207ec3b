"""The demonstration logbook is what its generator draws, and contains what it is meant to show."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pytest

import energytrack as et
from tests.demo_scenario import CAR, ELECTRIC, VAN, VEHICLES, Driven
from tests.make_demo_logbook import write

COMMITTED = Path(__file__).parent.parent / "demo_logbook"


def table(name: str) -> pd.DataFrame:
    return pd.read_csv(COMMITTED / f"{name}.csv")


def entries_of(vehicle: Driven) -> pd.DataFrame:
    return table("entries").query("vehicle == @vehicle.name")


def test_generator_draws_the_committed_bytes(tmp_path: Path) -> None:
    write(tmp_path)
    drawn = {path.name: path.read_bytes() for path in tmp_path.iterdir()}
    assert drawn == {path.name: path.read_bytes() for path in COMMITTED.iterdir()}


@pytest.mark.parametrize(
    ("vehicle", "verdict"),
    [(VAN, "shifted"), (CAR, "not-yet"), (ELECTRIC, "out-of-reach")],
    ids=lambda value: getattr(value, "name", value),
)
def test_each_vehicle_shows_the_answer_it_is_there_for(vehicle: Driven, verdict: str) -> None:
    log = et.open_logbook(COMMITTED)
    answer = et.assess(
        log.entries(vehicle.name),
        log.modifications(vehicle.name),
        vehicle.part,
        target_percent=vehicle.target_percent,
        capacity=vehicle.capacity,
        unit=vehicle.unit,
        events=log.events(vehicle.name),
    )
    assert answer.verdict == verdict
    assert answer.interval_percent is not None
    assert answer.interval_percent[0] < vehicle.shift_percent < answer.interval_percent[1]


@pytest.mark.parametrize("vehicle", VEHICLES, ids=lambda vehicle: vehicle.name)
def test_entries_are_possible(vehicle: Driven) -> None:
    entries = entries_of(vehicle)
    assert entries["energy"].between(1, vehicle.capacity).all()
    assert (entries["odometer_km"].diff()[1:] > 0).all()
    assert pd.to_datetime(entries["date"]).is_monotonic_increasing
    assert entries["cost"].gt(0).all()


@pytest.mark.parametrize("vehicle", VEHICLES, ids=lambda vehicle: vehicle.name)
def test_parts_are_fitted_in_mid_tank(vehicle: Driven) -> None:
    entries = entries_of(vehicle)
    part = table("modifications").query("vehicle == @vehicle.name").iloc[0]
    assert part["fitted_km"] not in set(entries["odometer_km"])
    before, after = (entries[side] for side in (entries["date"] < part["fitted_date"],
                                                entries["date"] >= part["fitted_date"]))  # fmt: skip
    assert before["odometer_km"].max() < part["fitted_km"] < after["odometer_km"].min()


def test_sizes() -> None:
    assert {vehicle.name: len(entries_of(vehicle)) for vehicle in VEHICLES} == {
        VAN.name: pytest.approx(150, abs=15),
        CAR.name: pytest.approx(90, abs=10),
        ELECTRIC.name: pytest.approx(150, abs=15),
    }


def test_log_has_the_gaps_of_a_real_one() -> None:
    entries = table("entries")
    fuel = entries.query("kind == 'fill-up'")
    assert (fuel["full"] == "no").sum() >= 4
    assert (entries["missed"] == "yes").sum() == 2
    assert 0.02 < entries["temperature_c"].isna().mean() < 0.10
    assert set(entries["currency"]) == {"EUR"}


def test_charges_carry_readings_and_fill_ups_do_not() -> None:
    entries = table("entries")
    assert entries.query("kind == 'charge'")["level_percent"].notna().mean() > 0.9
    assert entries.query("kind == 'fill-up'")["level_percent"].isna().all()


def test_tyre_change_carries_its_odometer_factor() -> None:
    event = table("events").iloc[0]
    assert (event["vehicle"], event["odometer_factor"]) == (VAN.name, 1.014)
    odometer = entries_of(VAN)["odometer_km"]
    assert odometer.min() < event["odometer_km"] < odometer.max()
