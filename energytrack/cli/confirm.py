"""`confirm`: an entry that looks odd and is right."""

from __future__ import annotations

from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import distance_unit, kilometres, say, say_json, the_vehicle, writable
from energytrack.consumption.slips import place
from energytrack.errors import EntryError
from energytrack.logbook.checks import parse_date
from energytrack.logbook.quantities import distance_text
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store

_SAME_KM = 0.55  # shown are whole km: what is shown must find its entry


def confirm(
    context: typer.Context,
    odometer: Annotated[str | None, typer.Argument(help="Odometer value of the entry.")] = None,
    vehicle: options.VehicleName = None,
    date: Annotated[
        str | None, typer.Option(metavar="YYYY-MM-DD", help="Day of the entry, in a log without odometer.")
    ] = None,
    odometer_unit: options.OdometerUnit = None,
    json: options.Json = False,
) -> None:
    """Keep an entry that looks odd and is right: `enough` sets it aside no longer."""
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    if odometer is not None:
        km = kilometres(odometer, distance_unit(odometer_unit, chosen))
        found = [entry for entry in store.entries(chosen.name) if _is_at(entry, km, chosen)]
        where = f"at {distance_text(km, chosen)}"
    elif date is not None:
        day = parse_date(date)
        found = [entry for entry in store.entries(chosen.name) if entry.date == day]
        where = f"of {day}"
    else:
        raise EntryError("say which entry: type its odometer value, or its --date")
    _keep(store, found, f"{chosen.name} has no entry {where}: `entries` lists them")
    if json:
        say_json({"confirmed": [entry.id for entry in found]})
    else:
        say([f"{chosen.name}: the entry {place(entry, chosen)}, {entry.date}, is kept" for entry in found])


def _is_at(entry: Entry, km: float, vehicle: Vehicle) -> bool:
    tolerance = _SAME_KM * (1.61 if vehicle.distance_unit == "mi" else 1.0)
    return entry.odometer_km is not None and abs(entry.odometer_km - km) < tolerance


def _keep(store: Store, found: list[Entry], missing: str) -> None:
    if not found:
        raise EntryError(missing)
    with store.transaction():
        for entry in found:
            if entry.id is not None:
                store.confirm(entry.id)
