"""`history`: what was recorded, changed, struck and taken back."""

from __future__ import annotations

import datetime as dt
from typing import Annotated

import typer

from energytrack.cli import options, told, which
from energytrack.cli.context import distance_unit, kilometres, readable, say, say_json, the_vehicle
from energytrack.cli.entries import MOST_ENTRIES
from energytrack.errors import EntryError, LogbookError
from energytrack.logbook import history as recorded
from energytrack.logbook.checks import parse_date
from energytrack.logbook.store import Store


def history(
    context: typer.Context,
    entry: which.Named = None,
    vehicle: options.VehicleName = None,
    number: which.Number = None,
    odometer_unit: options.OdometerUnit = None,
    last: Annotated[int, typer.Option(min=1, max=MOST_ENTRIES, metavar="N", help="How many of the newest.")] = 20,
    json: options.Json = False,
) -> None:
    """List what was recorded, the newest last. Of one entry: everything it ever said."""
    store = readable(context)
    if not isinstance(store, Store):
        raise LogbookError(f"{store.path} is a folder of tables and keeps no history: import it into a logbook file")
    if entry is None and number is None:
        changes = recorded.last_changes(store, last)
    else:
        changes = _of_entry(store, entry, vehicle, number, odometer_unit)[-last:]
    if json:
        say_json({"changes": [told.columns(change) for change in changes]})
        return
    vehicles = store.vehicles()
    for change in changes:
        say(told.lines(change, vehicles, _local(change.recorded_at)))
    if not changes:
        say(["nothing was recorded yet"])


def _of_entry(
    store: Store, named: str | None, vehicle: str | None, number: int | None, unit: str | None
) -> list[recorded.Change]:
    """Changes of every entry that ever stood there, struck ones too."""
    chosen = the_vehicle(store, vehicle)
    if number is not None:
        numbers, where = [number], f"with the number {number}"
    elif named is not None and which.is_day(named):
        day = parse_date(named)
        numbers, where = recorded.ever_of(store, chosen, day.isoformat()), f"of {day}"
    else:
        km = kilometres(named or "", distance_unit(unit, chosen))
        numbers, where = recorded.ever_at(store, chosen, *which.near(km, chosen)), f"at {named}"
    changes = recorded.changes_of(store, numbers)
    if not changes:
        raise EntryError(f"{chosen.name} never had an entry {where}: `history` without an entry lists all")
    return changes


def _local(recorded_at: str) -> str:
    """Day and time where the reader is, to the minute; empty where it was never noted."""
    try:
        return dt.datetime.fromisoformat(recorded_at).astimezone().strftime("%Y-%m-%d %H:%M")
    except ValueError:
        return recorded_at
