"""Which entry is meant: by its odometer value, by its day, or by its number."""

from __future__ import annotations

from typing import Annotated

import typer

from energytrack.cli.context import distance_unit, kilometres
from energytrack.errors import EntryError
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.checks import parse_date
from energytrack.logbook.quantities import distance_text, energy_text
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store

_SAME_KM = 0.55  # shown are whole km: what is shown must find its entry

Named = Annotated[
    str | None,
    typer.Argument(metavar="[ENTRY]", help="Odometer value of the entry, or its day (YYYY-MM-DD).", show_default=False),
]
Number = Annotated[int | None, typer.Option("--number", metavar="N", help="Number of the entry, where several fit.")]


def the_entry(store: Store, vehicle: Vehicle, named: str | None, number: int | None, unit: str | None) -> Entry:
    """The one standing entry meant. Raises EntryError, with the numbers of those that fit where several do."""
    if number is not None:
        return store.entry(vehicle.name, number)
    found, where = entries_named(store, vehicle, named, unit)
    if not found:
        raise EntryError(f"{vehicle.name} has no entry {where}: `entries` lists them")
    if len(found) > 1:
        fitting = ", ".join(f"{each.id} ({each.kind}, {_amount(each, vehicle)})" for each in found)
        raise EntryError(f"{vehicle.name} has {len(found)} entries {where}: add --number with one of {fitting}")
    return found[0]


def entries_named(store: Store, vehicle: Vehicle, named: str | None, unit: str | None) -> tuple[list[Entry], str]:
    """The standing entries at an odometer value or of a day, and how to call that place. Raises EntryError."""
    if named is None:
        raise EntryError("say which entry: type its odometer value, its day, or its --number")
    if is_day(named):
        day = parse_date(named)
        return [entry for entry in store.entries(vehicle.name) if entry.date == day], f"of {day}"
    km = kilometres(named, distance_unit(unit, vehicle))
    low, high = near(km, vehicle)
    found = [entry for entry in store.entries(vehicle.name) if low < (entry.odometer_km or -1.0) < high]
    return found, f"at {distance_text(km, vehicle)}"


def is_day(text: str) -> bool:
    """Is this written as a day, rather than as a number?"""
    return len(text.strip()) == 10 and text.strip()[4::3] == "--"


def near(km: float, vehicle: Vehicle) -> tuple[float, float]:
    """Between which odometer values an entry is shown as standing there."""
    tolerance = _SAME_KM * (1.61 if vehicle.distance_unit == "mi" else 1.0)
    return km - tolerance, km + tolerance


def _amount(entry: Entry, vehicle: Vehicle) -> str:
    return energy_text(entry.energy, for_kind(vehicle, entry.kind))
