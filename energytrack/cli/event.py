"""`event`: what happened to a vehicle and is not under test."""

from __future__ import annotations

import datetime as dt
import math
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import (
    distance_unit,
    kilometres,
    say,
    say_json,
    the_date,
    the_vehicle,
    writable,
)
from energytrack.errors import EntryError
from energytrack.logbook.checks import check_date, check_odometer, check_reading, check_text
from energytrack.logbook.quantities import distance_text, parse_number
from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.store import Store

SMALLEST_FACTOR, LARGEST_FACTOR = 0.5, 2.0


def event(
    context: typer.Context,
    what: Annotated[str, typer.Argument(help="What happened, e.g. 'winter tyres'.")],
    odometer: Annotated[str | None, typer.Argument(help="Odometer value.")] = None,
    vehicle: options.VehicleName = None,
    date: options.Date = None,
    odometer_unit: options.OdometerUnit = None,
    odometer_factor: Annotated[
        str | None, typer.Option(help="True distance per distance the odometer shows, from here on.")
    ] = None,
    note: options.Note = "",
    json: options.Json = False,
) -> None:
    """Log what else may shift consumption: a service, other tyres. It is not under test."""
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    day = the_date(date)
    km = None if odometer is None else kilometres(odometer, distance_unit(odometer_unit, chosen))
    happened = Event(chosen.name, day, what, km, _factor(odometer_factor), note)
    with store.transaction():
        _check(happened, chosen, store)
        store.add_event(happened)
    if json:
        columns = {name: getattr(happened, name) for name in Event.__dataclass_fields__}
        say_json({**columns, "date": day.isoformat()})
    else:
        place = "" if km is None else f", {distance_text(km, chosen)}"
        say([f"{chosen.name}: {what}{place}, {day}"])


def _check(happened: Event, vehicle: Vehicle, store: Store) -> None:
    check_date(happened.date, dt.date.today())
    check_text(happened.what, "text")
    check_text(happened.note, "note")
    if not happened.what.strip():
        raise EntryError("say what happened, such as 'winter tyres'")
    if happened.odometer_km is not None:
        check_odometer(happened.odometer_km, vehicle)
        before, after = store.neighbours(Entry(vehicle.name, happened.date, math.nan, happened.odometer_km))
        check_reading(happened.date, happened.odometer_km, vehicle, before, after)
    elif happened.odometer_factor is not None:
        last = next(iter(store.last_entries(vehicle.name, 1)), None)
        if last is not None and last.odometer_km is not None:
            raise EntryError("an odometer factor needs the odometer value from which it holds: type it")


def _factor(text: str | None) -> float | None:
    if text is None:
        return None
    value = parse_number(text, "odometer factor")
    if not SMALLEST_FACTOR <= value <= LARGEST_FACTOR:
        raise EntryError(f"odometer factor {value:g} is outside {SMALLEST_FACTOR:g} to {LARGEST_FACTOR:g}: correct it")
    return value
