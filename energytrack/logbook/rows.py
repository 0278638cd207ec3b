"""Rows of the logbook file as records, and records as rows."""

from __future__ import annotations

import datetime as dt
import json
import math
import sqlite3
from collections.abc import Mapping, Sequence
from itertools import repeat
from types import MappingProxyType
from typing import Any

from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.switches import Switch

VEHICLE_COLUMNS = (
    "name, carrier, unit, capacity, distance_unit, display, note, typed_unit, "
    "second_carrier, second_unit, second_capacity, co2_kg, second_co2_kg"
)
ENTRY_COLUMNS = (
    "date, energy, odometer_km, kind, full, level_percent, missed, distance_km, cost, currency, "
    "temperature_c, speed_kmh, place, note, extra"
)
NUMBER = "coalesce(origin, id)"  # of an entry, through all its corrections
ENTRY_SELECT = f"{ENTRY_COLUMNS}, {NUMBER}, EXISTS (SELECT 1 FROM confirmation WHERE entry_id = id)"
SWITCH_COLUMNS = (
    "modification, action, date, odometer_km, level, target_percent, note, "
    "known_low_percent, known_high_percent, reversible"
)
EVENT_COLUMNS = "date, what, odometer_km, odometer_factor, note"


def vehicle_of(row: tuple[Any, ...]) -> Vehicle:
    return Vehicle(*row)


def entry_of(vehicle: str, row: tuple[Any, ...]) -> Entry:
    values = dict(zip((*ENTRY_COLUMNS.split(", "), "id", "confirmed"), row, strict=True))
    values["date"] = dt.date.fromisoformat(values["date"])
    values["energy"] = math.nan if values["energy"] is None else values["energy"]
    values |= {name: bool(values[name]) for name in ("full", "missed", "confirmed")}
    values["extra"] = MappingProxyType(json.loads(values["extra"]))
    return Entry(vehicle, **values)


def switch_of(row: tuple[Any, ...]) -> Switch:
    name, action, date, km, level, target, note, low, high, reversible = row
    known = None if low is None else (low, high)
    day = dt.date.fromisoformat(date) if date else None
    return Switch(name, action == "fitted", day, km, level, target, note, known, bool(reversible))


def event_of(vehicle: str, row: tuple[Any, ...]) -> Event:
    date, what, odometer, factor, note = row
    return Event(vehicle, dt.date.fromisoformat(date), what, odometer, factor, note)


def switch_values(switch: Switch) -> dict[str, Any]:
    """Column -> value."""
    low, high = switch.known or (None, None)
    return {
        "modification": switch.modification,
        "action": "fitted" if switch.fitted else "removed",
        "date": switch.date.isoformat() if switch.date else None,
        "odometer_km": switch.km,
        "level": switch.level,
        "target_percent": switch.target_percent,
        "note": switch.note,
        "known_low_percent": low,
        "known_high_percent": high,
        "reversible": int(switch.reversible),
    }


def entry_values(entry: Entry) -> dict[str, Any]:
    """Column -> value; an amount that is not known is null."""
    return {
        "date": entry.date.isoformat(),
        "odometer_km": entry.odometer_km,
        "distance_km": entry.distance_km,
        "energy": None if math.isnan(entry.energy) else entry.energy,
        "kind": entry.kind,
        "full": int(entry.full),
        "level_percent": entry.level_percent,
        "missed": int(entry.missed),
        "cost": entry.cost,
        "currency": entry.currency,
        "temperature_c": entry.temperature_c,
        "speed_kmh": entry.speed_kmh,
        "place": entry.place,
        "note": entry.note,
        "extra": json.dumps(dict(entry.extra)) if entry.extra else "{}",
    }


def insert(connection: sqlite3.Connection, table: str, values: Mapping[str, Any]) -> int:
    """Append one row, stamped with the time of recording (UTC); its number. Table and columns are ours, never typed."""
    stamped = _stamped([values])[0]
    return connection.execute(_statement(table, stamped), stamped).lastrowid or 0


def insert_all(connection: sqlite3.Connection, table: str, values: Sequence[Mapping[str, Any]]) -> None:
    """Append many rows of the same columns, like `insert`."""
    if values:
        stamped = _stamped(values)
        connection.executemany(_statement(table, stamped[0]), stamped)


def insert_columns(
    connection: sqlite3.Connection, table: str, columns: Mapping[str, Sequence[Any]], constants: Mapping[str, Any]
) -> int:
    """Append rows given as columns of equal length, with what is the same in all of them; how many."""
    same = {**constants, "recorded_at": moment_of(dt.datetime.now(dt.UTC))}
    names = [*columns, *same]
    statement = f"INSERT INTO {table} ({', '.join(names)}) VALUES ({', '.join('?' * len(names))})"
    return connection.executemany(statement, zip(*columns.values(), *map(repeat, same.values()), strict=False)).rowcount


def moment_of(time: dt.datetime) -> str:
    """A moment as it is kept: UTC, to the second, so that texts compare as moments do."""
    return time.astimezone(dt.UTC).isoformat(timespec="seconds")


def _stamped(values: Sequence[Mapping[str, Any]]) -> list[dict[str, Any]]:
    now = moment_of(dt.datetime.now(dt.UTC))
    return [{**row, "recorded_at": now} for row in values]


def _statement(table: str, columns: Mapping[str, Any]) -> str:
    return f"INSERT INTO {table} ({', '.join(columns)}) VALUES ({', '.join(f':{column}' for column in columns)})"
