"""`mod`: parts fitted and removed."""

from __future__ import annotations

import datetime as dt
import math
from collections.abc import Sequence
from textwrap import wrap
from typing import Annotated, Any

import typer

from energytrack.cli import options
from energytrack.cli.cautions import CAUTIONS, caution_lines
from energytrack.cli.context import (
    distance_unit,
    kilometres,
    readable,
    say,
    say_json,
    the_vehicle,
    the_vehicles,
    writable,
)
from energytrack.errors import EntryError
from energytrack.logbook.checks import (
    LARGEST_TARGET_PERCENT,
    check_date,
    check_known,
    check_name,
    check_odometer,
    check_reading,
    check_text,
    parse_date,
)
from energytrack.logbook.quantities import distance_text, parse_number
from energytrack.logbook.records import Entry, Modification, Vehicle
from energytrack.logbook.store import Store
from energytrack.presentation.columns import aligned, folded
from energytrack.presentation.plain import plain_text

mod_commands = typer.Typer(
    no_args_is_help=True, add_completion=False, rich_markup_mode=None, help="Log parts fitted and removed."
)

WIDTH = 80

Name = Annotated[str, typer.Argument(help="What you call the part or setting.")]
Odometer = Annotated[str | None, typer.Argument(help="Odometer value; may be left out with --date.")]


@mod_commands.command("fitted", cls=options.NegativeNumbers)
def fitted(
    context: typer.Context,
    name: Name,
    odometer: Odometer = None,
    vehicle: options.VehicleName = None,
    date: options.Date = None,
    odometer_unit: options.OdometerUnit = None,
    target: Annotated[str | None, typer.Option(help="Shift worth knowing, in percent.")] = None,
    level: Annotated[str | None, typer.Option(help="Setting of a graded part, e.g. a pressure.")] = None,
    known: Annotated[
        str | None, typer.Option(metavar="LOW:HIGH", help="A known change: the shift expected, in percent, e.g. 4:9.")
    ] = None,
    not_reversible: Annotated[bool, typer.Option("--not-reversible", help="It cannot be taken off again.")] = False,
    note: options.Note = "",
    json: options.Json = False,
) -> None:
    """Log that a part was fitted. Log when parked."""
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    with store.transaction():
        day, km = _place(store, chosen, odometer, odometer_unit, date)
        graded = None if level is None else parse_number(level, "level")
        check_name(name, "modification")
        check_text(note, "note")
        expected = _known(known)
        store.fit(chosen.name, name, day, km, _target(target), graded, note, expected, not not_reversible)
    _echo(chosen, "fitted", name, day, km, json, _declared(graded, expected))


@mod_commands.command("removed", cls=options.NegativeNumbers)
def removed(
    context: typer.Context,
    name: Name,
    odometer: Odometer = None,
    vehicle: options.VehicleName = None,
    date: options.Date = None,
    odometer_unit: options.OdometerUnit = None,
    json: options.Json = False,
) -> None:
    """Log that a part was removed. Log when parked."""
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    with store.transaction():
        day, km = _place(store, chosen, odometer, odometer_unit, date)
        store.remove(chosen.name, name, day, km)
    _echo(chosen, "removed", name, day, km, json)


@mod_commands.command("list")
def list_modifications(
    context: typer.Context, vehicle: options.VehicleName = None, json: options.Json = False
) -> None:
    """List the periods in which parts were fitted."""
    logbook = readable(context)
    found = [(each, logbook.modifications(each.name)) for each in the_vehicles(logbook, vehicle)]
    if json:
        say_json({"modifications": [_columns(period) for _, own in found for period in own]})
        return
    rows = [(each, period) for each, own in found for period in own]
    if not rows:
        say(["no modifications yet: log one with `mod fitted`"])
        return
    heads = aligned([(each.name, period.name) for each, period in rows])
    say(folded(heads, [_period(each, period) for each, period in rows], WIDTH))


def _place(
    store: Store, vehicle: Vehicle, odometer: str | None, unit: str | None, date: str | None
) -> tuple[dt.date | None, float | None]:
    """Day and odometer of a switch, checked against the entries around it."""
    if odometer is None and date is None:
        raise EntryError("say where: the odometer value, --date, or both")
    day = None if date is None else parse_date(date)
    if day is not None:
        check_date(day, dt.date.today())
    if odometer is None:
        return day, None
    km = kilometres(odometer, distance_unit(unit, vehicle))
    check_odometer(km, vehicle)
    here = Entry(vehicle.name, day or dt.date.today(), math.nan, km)
    before, after = store.neighbours(here)
    if day is None and after is not None:  # logged after the fact: the day is not known, and today would be wrong
        return None, km
    check_reading(here.date, km, vehicle, before, after)
    return here.date, km


def _target(text: str | None) -> float | None:
    if text is None:
        return None
    value = parse_number(text, "target")
    if not 0 < value <= LARGEST_TARGET_PERCENT:
        raise EntryError(f"target {value:g} is not above 0 and at most 50 %: type the shift worth knowing, such as 3")
    return value


def _known(text: str | None) -> tuple[float, float] | None:
    if text is None:
        return None
    low, mark, high = text.partition(":")
    if not mark:
        raise EntryError(f"known change {text!r} is not written as LOW:HIGH, such as 4:9 for 4 to 9 % more")
    ends = parse_number(low, "known change"), parse_number(high, "known change")
    check_known(*ends)
    return ends


def _declared(level: float | None, known: tuple[float, float] | None) -> list[str]:
    """What was said of the part beside where it was fitted."""
    at_level = [] if level is None else [f"level {level:g}"]
    return at_level + ([] if known is None else [f"a known change, {known[0]:+g} to {known[1]:+g} % expected"])


def _echo(
    vehicle: Vehicle,
    action: str,
    name: str,
    day: dt.date | None,
    km: float | None,
    json: bool,
    declared: Sequence[str] = (),
) -> None:
    cautions = list(CAUTIONS) if action == "fitted" else []
    if json:
        date = None if day is None else day.isoformat()
        place: dict[str, Any] = {"date": date, "odometer_km": km}
        say_json({"vehicle": vehicle.name, "name": name, "action": action, **place, "cautions": cautions})
        return
    said = "; ".join([f"{vehicle.name}: {name} {action}, {_where(vehicle, day, km)}", *declared])
    say(wrap(plain_text(said), WIDTH, subsequent_indent="  "))
    if cautions:
        say(["", *caution_lines()])


def _where(vehicle: Vehicle, day: dt.date | None, km: float | None) -> str:
    parts = ([distance_text(km, vehicle)] if km is not None else []) + ([day.isoformat()] if day else [])
    return ", ".join(parts)


def _period(vehicle: Vehicle, period: Modification) -> str:
    """Where a part was on, and what was said of it."""
    start = _where(vehicle, period.fitted_date, period.fitted_km)
    end = _where(vehicle, period.removed_date, period.removed_km)
    span = f"{start} to {end}" if end else f"{start}, still on"
    target = [] if period.target_percent is None else [f"target {period.target_percent:g} %"]
    return "; ".join([span, *target, *_declared(period.level, period.known)])


def _columns(period: Modification) -> dict[str, Any]:
    values = {name: getattr(period, name) for name in Modification.__dataclass_fields__}
    return {name: value.isoformat() if isinstance(value, dt.date) else value for name, value in values.items()}
