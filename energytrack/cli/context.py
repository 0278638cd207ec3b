"""What every command needs: the logbook, the vehicle meant, and a safe way to print."""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

import typer

from energytrack.errors import EntryError, LogbookError, UnknownNameError
from energytrack.logbook.checks import parse_date
from energytrack.logbook.opening import Logbook, open_logbook
from energytrack.logbook.quantities import DISTANCE, parse_number, to_base
from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store
from energytrack.presentation.plain import plain_text

if TYPE_CHECKING:
    from pathlib import Path

LOGBOOK_VARIABLE = "ENERGYTRACK_LOGBOOK"


def logbook_path(context: typer.Context) -> Path:
    """The logbook named before the command, or in the environment. Raises LogbookError."""
    path: Path | None = context.obj
    if path is None:
        raise LogbookError(f"no logbook named: put --logbook PATH before the command, or set {LOGBOOK_VARIABLE}")
    return path


def readable(context: typer.Context) -> Logbook:
    """The logbook, closed again when the command ends."""
    logbook = open_logbook(logbook_path(context))
    if isinstance(logbook, Store):
        context.call_on_close(logbook.close)
    return logbook


def readable_as_of(context: typer.Context, day: str | None) -> Logbook:
    """The logbook as it stood at the end of a day, by what had been recorded then; as it is where no day is named."""
    if day is None:
        return readable(context)
    from energytrack.logbook.as_of import as_of

    logbook = as_of(logbook_path(context), parse_date(day))
    context.call_on_close(logbook.close)
    return logbook


def on_file(context: typer.Context) -> Store:
    """The logbook file. Raises LogbookError for a folder of tables."""
    logbook = readable(context)
    if not isinstance(logbook, Store):
        raise LogbookError(f"{logbook.path} is a folder of tables and is only read: name a logbook file to write to")
    return logbook


def writable(context: typer.Context) -> Store:
    """The logbook to write to. Raises LogbookError for a folder of tables, and for a file that is only read."""
    store = on_file(context)
    if not store.writable:
        raise LogbookError(f"{store.path} cannot be written: check its permissions and those of its folder")
    return store


def the_vehicle(logbook: Logbook, name: str | None) -> Vehicle:
    """The vehicle named, or the only one. Raises UnknownNameError with those there are."""
    if name is not None:
        return logbook.vehicle(name)
    vehicles = logbook.vehicles()
    if len(vehicles) == 1:
        return vehicles[0]
    if not vehicles:
        raise UnknownNameError("the logbook has no vehicle yet: add one with `vehicle add`")
    names = ", ".join(vehicle.name for vehicle in vehicles)
    raise UnknownNameError(f"say which vehicle with --vehicle; there are: {names}")


def the_vehicles(logbook: Logbook, name: str | None) -> list[Vehicle]:
    """The vehicle named, or all."""
    return logbook.vehicles() if name is None else [logbook.vehicle(name)]


def the_date(typed: str | None) -> dt.date:
    """The day typed, else today."""
    return dt.date.today() if typed is None else parse_date(typed)


def distance_unit(typed: str | None, vehicle: Vehicle) -> str:
    """The unit of a typed odometer value. Raises EntryError for one that does not exist."""
    unit = typed or vehicle.distance_unit
    if unit not in DISTANCE:
        raise EntryError(f"unknown distance unit {unit!r}: use {' or '.join(DISTANCE)}")
    return unit


def kilometres(typed: str, unit: str, what: str = "odometer") -> float:
    """A typed distance in km."""
    return to_base(parse_number(typed, what), unit)


def say(lines: Iterable[str]) -> None:
    """Print lines, whatever is in them."""
    for line in lines:
        print(plain_text(line).rstrip())


def say_json(value: Any) -> None:
    """Print one JSON value; ASCII only, so nothing in it is obeyed by a terminal."""
    print(json.dumps(value, allow_nan=False))
