"""Vehicles of an older file get room for CO2 factors, and keep what they had."""

from __future__ import annotations

import sqlite3
from pathlib import Path

import pytest

from energytrack.errors import LogbookError
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.records import Vehicle
from energytrack.logbook.schema import MIGRATIONS, migrate
from energytrack.logbook.store import Store
from energytrack.logbook.tables import read_vehicles


def test_a_file_of_version_3_is_read_and_takes_factors(tmp_path: Path) -> None:
    path = tmp_path / "old.logbook"
    with sqlite3.connect(path, isolation_level=None) as old:
        migrate(old, MIGRATIONS[:3])
        old.execute(
            "INSERT INTO vehicle (name, carrier, unit, distance_unit, note, recorded_at) "
            "VALUES ('van', 'diesel', 'L', 'km', '', '2026-01-01T00:00:00+00:00')"
        )
    old.close()
    store = open_logbook(path)
    assert isinstance(store, Store)
    assert store.vehicle("van") == Vehicle("van", "diesel", "L")
    store.add_vehicle(Vehicle("cart", "electricity", "kWh", co2_kg=0.35))
    assert store.vehicle("cart").co2_kg == 0.35
    with pytest.raises(LogbookError):
        store.add_vehicle(Vehicle("bad", "electricity", "kWh", co2_kg=-0.35))
    store.close()


def test_a_folder_states_factors_and_refuses_wrong_ones(tmp_path: Path) -> None:
    table = tmp_path / "vehicles.csv"
    table.write_text("vehicle,carrier,co2_kg,second_co2_kg\ncart,electricity,0.35,\nbad,electricity,-1,\nx,petrol,,1\n")
    reading = read_vehicles(table)
    assert [(each.name, each.co2_kg) for _, each in reading.rows] == [("cart", 0.35)]
    assert len(reading.problems) == 2
