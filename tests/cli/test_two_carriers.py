"""Commands of a vehicle with tank and battery, as processes."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tests.cli.test_logging import Terminal
from tests.hybrids import HybridUse, hybrid_log

HYBRID = ("--carrier", "petrol", "--capacity", "40", "--second-carrier", "electricity", "--second-capacity", "12")


@pytest.fixture
def run(tmp_path: Path) -> Terminal:
    terminal = Terminal(tmp_path)
    terminal.done("new")
    terminal.done("vehicle", "add", "phev", *HYBRID)
    return terminal


def test_a_tank_is_said_in_both_carriers(run: Terminal) -> None:
    """24 L and 19 kWh over 500 km: 24 x 32/3.6 + 19 = 232.3 kWh."""
    assert "petrol + electricity" in run.done("vehicle", "list")
    run.done("fillup", "10000", "30", "--date", "2026-01-01")
    said = run.done("charge", "10100", "9.5", "--date", "2026-01-03")
    assert said == "100 km since the last entry\ncharge added up: consumption follows with the next full tank\n"
    run.done("charge", "10200", "9.5", "--date", "2026-01-05")
    said = run.done("fillup", "10500", "24", "--date", "2026-01-09")
    assert said.splitlines()[1:] == [
        "500 km since the last known level: 46.5 kWh/100 km",
        "of that 4.80 L/100 km and 3.80 kWh/100 km from the plug, 8 % of the energy",
    ]
    listed = run.done("entries").splitlines()
    assert [line.split()[3:5] for line in listed[1:4]] == [["30.00", "L"], ["9.50", "kWh"], ["9.50", "kWh"]]
    assert listed[4].endswith("46.5 kWh/100 km")


def test_each_carrier_has_its_own_unit_and_capacity(run: Terminal) -> None:
    assert "30.00 kWh is more than 1.3 times the capacity of phev, 12.00 kWh" in run.refused("charge", "10000", "30")
    assert "60.00 L is more than 1.3 times the capacity of phev, 40.00 L" in run.refused("fillup", "10000", "60")
    assert "use kWh, MJ" in run.refused("charge", "10000", "8", "--unit", "L")
    run.done("fillup", "10000", "8", "--unit", "gal-us")
    run.done("charge", "10000", "18", "--unit", "MJ")
    entries = json.loads(run.done("entries", "--json"))["entries"]
    assert {entry["kind"]: entry["energy"] for entry in entries} == pytest.approx({"charge": 5.0, "fill-up": 30.2833})


def test_tank_and_battery_may_be_filled_at_one_place_but_neither_twice(run: Terminal) -> None:
    run.done("fillup", "10000", "30", "--date", "2026-01-01")
    run.done("charge", "10000", "8", "--date", "2026-01-01")
    said = run.refused("charge", "10000", "7", "--date", "2026-01-01")
    assert "a charge of 8.00 kWh on 2026-01-01 at 10,000 km is logged already" in said
    assert "odometer stands still" in run.refused("charge", "10000", "7", "--date", "2026-01-02")


def test_impossible_vehicles_are_refused(run: Terminal) -> None:
    add = ("vehicle", "add", "other", "--carrier")
    assert "one of two carriers must be electricity" in run.refused(*add, "petrol", "--second-carrier", "lpg")
    assert "one of two carriers must be electricity" in run.refused(*add, "electricity", "--second-carrier",
                                                                    "electricity")  # fmt: skip
    assert "add --second-carrier" in run.refused(*add, "petrol", "--second-capacity", "12")
    assert "must be more than 0" in run.refused(*add, "petrol", "--second-carrier", "electricity",
                                                "--second-capacity", "0")  # fmt: skip
    assert "unknown carrier 'steam'" in run.refused(*add, "petrol", "--second-carrier", "steam")


def test_who_counts_miles_and_gallons_reads_miles_and_gallons(run: Terminal) -> None:
    """6 gal and 20 kWh over 300 mi: 6 x 3.785 x 32/3.6 + 20 = 221.9 kWh; NIST SP 811 for the gallon."""
    run.done("vehicle", "add", "us", *HYBRID[:2], "--unit", "gal-us", "--distance-unit", "mi", *HYBRID[4:])
    run.done("fillup", "10000", "6", "--vehicle", "us", "--date", "2026-01-01")
    run.done("charge", "10100", "10", "--vehicle", "us", "--date", "2026-01-03", "--partial")
    run.done("charge", "10200", "10", "--vehicle", "us", "--date", "2026-01-05", "--partial")
    said = run.done("fillup", "10300", "6", "--vehicle", "us", "--date", "2026-01-09").splitlines()
    assert said[1:] == [
        "300 mi since the last known level: 1.35 mi/kWh",
        "of that 50.0 mpg (US) and 4.14 kWh/100 km from the plug, 9 % of the energy",
    ]


def test_a_vehicle_with_one_carrier_still_takes_only_that(run: Terminal) -> None:
    run.done("vehicle", "add", "van", "--carrier", "diesel")
    assert "van runs on diesel: log it with `fillup`" in run.refused("charge", "1000", "8", "--vehicle", "van")


def test_import_and_enough(run: Terminal, tmp_path: Path) -> None:
    entries, modifications = hybrid_log(HybridUse(days=200, shift_percent=-8.0), np.random.default_rng(3))
    entries.to_csv(tmp_path / "entries.csv", index=False)
    run.done("import", str(tmp_path / "entries.csv"))
    assert "already" in run.done("import", str(tmp_path / "entries.csv"))
    assert "counted in L and kWh" in run("import", str(tmp_path / "entries.csv"), "--energy-unit", "MJ").stderr
    fitted = f"{modifications['fitted_km'].iloc[0]:.0f}"
    run.done("mod", "fitted", "part", fitted)
    (answer,) = json.loads(run.done("enough", "--json"))["assessments"]
    (other,) = json.loads(run.done("enough", "--json", "--energy-content", "petrol=9.2"))["assessments"]
    assert answer["unit"] == other["unit"] == "kWh"
    assert other["expectation"]["consumption"] > 1.02 * answer["expectation"]["consumption"]
    assert "kWh/100 km charged" in run.done("enough")
    last = entries["odometer_km"].iloc[-1]
    run.done("charge", f"{last + 100:.0f}", "9")
    said = run.done("fillup", f"{last + 200:.0f}", "14")
    assert "expected at these conditions" in said
    assert "from the plug" in said


def test_an_energy_content_of_another_fuel_is_refused(run: Terminal) -> None:
    run.done("fillup", "10000", "30", "--date", "2026-01-01")
    run.done("mod", "fitted", "part", "10000")
    assert "write one of petrol=KWH" in run.refused("enough", "--energy-content", "diesel=10")
    assert "is not a number" in run.refused("enough", "--energy-content", "petrol=much")
    assert "must be more than 0" in run.refused("enough", "--energy-content", "petrol=0")
