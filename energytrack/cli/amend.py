"""`amend` and `strike`: correct an entry, or let it count no more. What it said before is kept."""

from __future__ import annotations

import datetime as dt
import math
import shlex
from dataclasses import replace
from typing import Annotated, Any

import typer

from energytrack.cli import options, told, which
from energytrack.cli.context import say, say_json, the_vehicle, writable
from energytrack.cli.reanswer import answer_lines, reanswered
from energytrack.cli.typed import Typed, as_typed, values_of
from energytrack.consumption.slips import named
from energytrack.errors import EntryError
from energytrack.logbook import revisions
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.checks import check_date, check_measure, check_place, check_text, check_values, parse_date
from energytrack.logbook.history import change_of
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store

Why = Annotated[str, typer.Option("--why", metavar="TEXT", help="Why; kept in the history.")]
Text = str | None
_EMPTY: dict[str, tuple[str, Any]] = {  # what can be cleared -> field, and its value then
    "level": ("level_percent", None),
    "temperature": ("temperature_c", None),
    "speed": ("speed_kmh", None),
    "cost": ("cost", None),
    "currency": ("currency", None),
    "place": ("place", ""),
    "note": ("note", ""),
}


def amend(
    context: typer.Context,
    entry: which.Named = None,
    vehicle: options.VehicleName = None,
    number: which.Number = None,
    odometer: Annotated[Text, typer.Option(help="What the odometer showed.")] = None,
    amount: Annotated[Text, typer.Option(help="What was bought.")] = None,
    date: Annotated[Text, typer.Option(metavar="YYYY-MM-DD", help="Day.")] = None,
    unit: Annotated[Text, typer.Option(help="Unit of the amount: L, gal-us, gal-imp, kg, kWh ...")] = None,
    odometer_unit: options.OdometerUnit = None,
    distance: Annotated[Text, typer.Option(help="Distance since the last entry, without odometer.")] = None,
    full: Annotated[bool | None, typer.Option("--full/--partial", help="Filled to the usual full mark.")] = None,
    level: Annotated[Text, typer.Option(help="Gauge or state of charge afterwards, in %.")] = None,
    missed: Annotated[
        bool | None, typer.Option("--missed/--not-missed", help="Entries before this one are missing.")
    ] = None,
    temperature: Annotated[Text, typer.Option(help="Outside while driving, degrees C, or 54F.")] = None,
    speed: Annotated[Text, typer.Option(help="Mean speed, km/h; mi/h where the vehicle counts mi.")] = None,
    cost: Annotated[Text, typer.Option(help="Total paid.")] = None,
    currency: Annotated[Text, typer.Option(help="Three letters (ISO 4217).")] = None,
    place: Annotated[Text, typer.Option(help="Where.")] = None,
    note: Annotated[Text, typer.Option(help="Anything worth remembering.")] = None,
    extra: Annotated[
        list[str] | None, typer.Option("--set", metavar="NAME=VALUE", help="A further number, e.g. payload=300.")
    ] = None,
    clear: Annotated[
        list[str] | None, typer.Option(metavar="NAME", help="Leave empty: level, temperature, speed, cost, note ...")
    ] = None,
    why: Why = "",
    again: Annotated[bool, typer.Option("--again", help="Keep it though one like it is there.")] = False,
    json: options.Json = False,
) -> None:
    """Correct an entry. What it said before is kept, and answers that change are told."""
    typed = Typed(
        "", odometer, amount, distance, date, unit, odometer_unit, level, temperature, speed,
        cost, currency, False, False, place or "", note or "", extra or [],
    )  # fmt: skip
    flags = {"full": full, "missed": missed, "place": place, "note": note}
    check_text(why, "reason")
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    with store.transaction():
        before = which.the_entry(store, chosen, entry, number, odometer_unit)
        seen = for_kind(chosen, before.kind)
        amended = _amended(before, typed, seen, flags, clear or [])
        _check(amended, store, seen, again)
        change = revisions.amend(store, amended, as_typed(typed, seen, amended.date), why)
    _tell(store, chosen, change, json)


def strike(
    context: typer.Context,
    entry: which.Named = None,
    vehicle: options.VehicleName = None,
    number: which.Number = None,
    odometer_unit: options.OdometerUnit = None,
    why: Why = "",
    json: options.Json = False,
) -> None:
    """Let an entry count no more. It stays in the history, and answers that change are told."""
    check_text(why, "reason")
    store = writable(context)
    chosen = the_vehicle(store, vehicle)
    with store.transaction():
        before = which.the_entry(store, chosen, entry, number, odometer_unit)
        _, after = store.neighbours(before)
        change = revisions.strike(store, before, why)
    _tell(store, chosen, change, json, [] if after is None else [_mark(after, chosen, len(store.vehicles()) > 1)])


def _mark(after: Entry, vehicle: Vehicle, several: bool) -> str:
    whose = f" --vehicle {shlex.quote(vehicle.name)}" if several else ""
    return f"if it was bought all the same: energytrack amend {named(after, vehicle)} --missed{whose}"


def _amended(before: Entry, typed: Typed, vehicle: Vehicle, flags: dict[str, Any], clear: list[str]) -> Entry:
    if typed.distance is not None and before.odometer_km is not None:
        raise EntryError("this entry has an odometer value: amend that, not --distance")
    values = values_of(typed, vehicle)
    extra = {**before.extra, **values.pop("extra", {})}
    for name in clear:
        if name in _EMPTY:
            field, empty = _EMPTY[name]
            values[field] = empty
        elif name in extra:
            del extra[name]
        else:
            raise EntryError(f"--clear {name!r} is not one of: {', '.join([*_EMPTY, *extra])}")
    values |= {name: value for name, value in flags.items() if value is not None}
    date = before.date if typed.date is None else parse_date(typed.date)
    return replace(before, date=date, extra=extra, **values)


def _check(amended: Entry, store: Store, vehicle: Vehicle, again: bool) -> None:
    """The rules for a new entry; an amount that was never known stays allowed."""
    if math.isnan(amended.energy):
        check_date(amended.date, dt.date.today())
    else:
        check_values(amended, vehicle, dt.date.today())
    others = [entry for entry in store.last_entries(vehicle.name, 2) if entry.id != amended.id]
    check_measure(amended, others[-1] if others else None)
    before, after = store.neighbours(amended)
    check_place(amended, vehicle, before, after, store.twin(amended), again=again)


def _tell(store: Store, vehicle: Vehicle, change: int, json: bool, hints: list[str] | None = None) -> None:
    done = change_of(store, change)
    vehicles = store.vehicles()
    if not json:
        say([*told.lines(done, vehicles), *(hints or [])])
    answers = reanswered(store, [vehicle], change)
    if json:
        say_json({"change": told.columns(done), "answers": answers})
    else:
        say(answer_lines(answers))
