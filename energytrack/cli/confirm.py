"""`confirm`: an entry that looks odd and is right."""

from __future__ import annotations

from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import say, say_json, the_vehicle, writable
from energytrack.cli.which import entries_named
from energytrack.consumption.slips import place
from energytrack.errors import EntryError
from energytrack.logbook.records import Entry
from energytrack.logbook.store import Store


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
    """Keep an entry that looks odd and is right. `enough` sets it aside no longer."""
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    if odometer is None and date is None:
        raise EntryError("say which entry: type its odometer value, or its --date")
    found, where = entries_named(store, chosen, odometer or date, odometer_unit)
    _keep(store, found, f"{chosen.name} has no entry {where}: `entries` lists them")
    if json:
        say_json({"confirmed": [entry.id for entry in found]})
    else:
        say([f"{chosen.name}: the entry {place(entry, chosen)}, {entry.date}, is kept" for entry in found])


def _keep(store: Store, found: list[Entry], missing: str) -> None:
    if not found:
        raise EntryError(missing)
    with store.transaction():
        for entry in found:
            if entry.id is not None:
                store.confirm(entry.id)
