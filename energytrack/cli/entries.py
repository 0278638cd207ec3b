"""`entries`: what was logged."""

from __future__ import annotations

import math
from typing import Annotated, Any

import typer

from energytrack.cli import options
from energytrack.cli.context import readable, say, say_json, the_vehicles
from energytrack.logbook.quantities import distance_text, energy_text
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.rows import entry_values
from energytrack.presentation.columns import aligned

MOST_ENTRIES = 1_000_000_000


def entries(
    context: typer.Context,
    vehicle: options.VehicleName = None,
    last: Annotated[int, typer.Option(min=1, max=MOST_ENTRIES, metavar="N", help="How many of the newest.")] = 20,
    json: options.Json = False,
) -> None:
    """List the newest entries of each vehicle, oldest first, with what is special about them."""
    logbook = readable(context)
    found = {each.name: logbook.last_entries(each.name, last) for each in the_vehicles(logbook, vehicle)}
    if json:
        say_json({"entries": [entry_columns(entry) for own in found.values() for entry in own]})
        return
    for each in the_vehicles(logbook, vehicle):
        say(_table(each, found[each.name], last))


def entry_columns(entry: Entry) -> dict[str, Any]:
    """An entry under the names of the entries table, further numbers under their own."""
    values = entry_values(entry)
    del values["extra"]
    yes_or_no = {name: bool(values[name]) for name in ("full", "missed")}
    return {"id": entry.id, "vehicle": entry.vehicle, **values, **yes_or_no, **entry.extra}


def _table(vehicle: Vehicle, found: list[Entry], last: int) -> list[str]:
    if not found:
        return [f"{vehicle.name}: no entries yet"]
    title = vehicle.name + (f", the newest {last} (--last N for more)" if len(found) == last else "")
    rows = [_cells(vehicle, entry) for entry in found]
    return [title, *aligned(rows, right=(1, 2))]


def _cells(vehicle: Vehicle, entry: Entry) -> tuple[str, ...]:
    amount = "no amount" if math.isnan(entry.energy) else energy_text(entry.energy, vehicle)
    return entry.date.isoformat(), _place(vehicle, entry), amount, ", ".join(_flags(entry))


def _place(vehicle: Vehicle, entry: Entry) -> str:
    if entry.odometer_km is not None:
        return distance_text(entry.odometer_km, vehicle)
    return "" if entry.distance_km is None else f"+{distance_text(entry.distance_km, vehicle)}"


def _flags(entry: Entry) -> list[str]:
    level = [] if entry.level_percent is None else [f"level {entry.level_percent:g} %"]
    partial = ["partial"] if not entry.full and entry.level_percent is None else []
    missed = ["entries missing before"] if entry.missed else []
    return [*level, *partial, *missed, *([entry.note] if entry.note else [])]
