"""`fillup` and `charge`: log an entry and say what it meant.

Annotations are values here, not strings: compiling twenty of them again, twice, takes 4 ms of every fill-up.
"""

import datetime as dt
import math
from collections.abc import Callable
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import distance_unit, kilometres, say, say_json, the_date, the_vehicle, writable
from energytrack.cli.prompts import ask, on_terminal
from energytrack.cli.typed import Typed, as_typed, check_kind, entry_from, unit_of
from energytrack.errors import EntryError
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.checks import (
    check_distance,
    check_energy,
    check_measure,
    check_odometer,
    check_place,
    check_reading,
    check_values,
)
from energytrack.logbook.quantities import distance_text, parse_number, to_base
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.store import Store


def _command(kind: str, summary: str) -> Callable[..., None]:
    """The command that logs entries of one kind; both take the same options."""

    def log(
        context: typer.Context,
        odometer: Annotated[str | None, typer.Argument(help="Odometer value; left out with --distance.")] = None,
        amount: Annotated[str | None, typer.Argument(help="What was bought.")] = None,
        vehicle: options.VehicleName = None,
        date: options.Date = None,
        unit: Annotated[
            str | None,
            typer.Option(help="Unit of the amount: L, gal-us, gal-imp, kg, kWh ...", callback=options.any_case),
        ] = None,
        odometer_unit: options.OdometerUnit = None,
        distance: Annotated[str | None, typer.Option(help="Distance since the last entry, without odometer.")] = None,
        partial: Annotated[bool, typer.Option("--partial", help="Not filled to the usual full mark.")] = False,
        level: Annotated[str | None, typer.Option(help="Gauge or state of charge afterwards, in %.")] = None,
        missed: Annotated[bool, typer.Option("--missed", help="Entries before this one are missing.")] = False,
        temperature: Annotated[str | None, typer.Option(help="Outside while driving, degrees C, or 54F.")] = None,
        speed: Annotated[str | None, typer.Option(help="Mean speed, km/h; mi/h where the vehicle counts mi.")] = None,
        cost: Annotated[str | None, typer.Option(help="Total paid.")] = None,
        currency: Annotated[str | None, typer.Option(help="Three letters (ISO 4217).")] = None,
        place: Annotated[str, typer.Option(help="Where.")] = "",
        note: options.Note = "",
        extra: Annotated[
            list[str] | None, typer.Option("--set", metavar="NAME=VALUE", help="A further number, e.g. payload=300.")
        ] = None,
        again: Annotated[bool, typer.Option("--again", help="Log it though one like it is there.")] = False,
        json: options.Json = False,
    ) -> None:
        typed = Typed(
            kind, odometer, amount, distance, date, unit, odometer_unit, level, temperature, speed,
            cost, currency, partial, missed, place, note, extra or [],
        )  # fmt: skip
        store = writable(context)
        chosen = the_vehicle(store, vehicle)
        check_kind(kind, chosen)
        seen = for_kind(chosen, kind)
        _complete(typed, store, seen)
        entry = _write(typed, store, seen, again)
        _echo(store, chosen, entry, json)

    log.__doc__ = summary
    return log


fillup = _command("fill-up", "Log a fill-up and say what it meant. Log when parked.")
charge = _command("charge", "Log a charge session and say what it meant. Log when parked.")


def _complete(typed: Typed, store: Store, vehicle: Vehicle) -> None:
    """Sort out one value given with --distance; ask for what is missing where somebody is there to answer."""
    if typed.distance is not None and typed.odometer is not None:
        if typed.amount is not None:
            raise EntryError("give the odometer value or --distance, not both")
        typed.odometer, typed.amount = None, typed.odometer
    lacks_place = typed.odometer is None and typed.distance is None
    if (lacks_place or typed.amount is None) and not on_terminal():
        what = "odometer value" if lacks_place else "amount"
        raise EntryError(f"the {what} is missing: type ODOMETER AMOUNT, such as 48230 41.32")
    if lacks_place:
        _ask_place(typed, store, vehicle)
    if typed.amount is None:
        unit = unit_of(typed, vehicle)
        typed.amount = ask(
            f"Amount in {unit}", lambda text: check_energy(to_base(parse_number(text, "amount"), unit), vehicle)
        )


def _ask_place(typed: Typed, store: Store, vehicle: Vehicle) -> None:
    """Ask for the odometer value; for the distance where that is what the vehicle's log has."""
    last = next(iter(store.last_entries(vehicle.name, 1)), None)
    unit, date = distance_unit(typed.odometer_unit, vehicle), the_date(typed.date)
    if last is not None and last.odometer_km is None:
        own = vehicle.distance_unit
        question = f"Distance since the last entry, {last.date}, in {own}"
        typed.distance = ask(question, lambda text: check_distance(kilometres(text, own, "distance"), vehicle))
        return

    def check(text: str) -> None:
        km = kilometres(text, unit)
        check_odometer(km, vehicle)
        check_reading(date, km, vehicle, *store.neighbours(Entry(vehicle.name, date, math.nan, km)))

    hint = f", last {distance_text(last.odometer_km or 0.0, vehicle)} on {last.date}" if last is not None else ""
    typed.odometer = ask(f"Odometer in {unit}{hint}", check)


def _write(typed: Typed, store: Store, vehicle: Vehicle, again: bool) -> Entry:
    """Check and append in one transaction, so that two programs cannot both be right."""
    entry = entry_from(typed, vehicle)
    check_values(entry, vehicle, dt.date.today())
    with store.transaction():
        check_measure(entry, next(iter(store.last_entries(vehicle.name, 1)), None))
        before, after = store.neighbours(entry)
        check_place(entry, vehicle, before, after, store.twin(entry), again=again)
        number = store.add_entry(entry, as_typed(typed, vehicle, entry.date))
    return store.entry(vehicle.name, number)


def _echo(store: Store, vehicle: Vehicle, entry: Entry, json: bool) -> None:
    from energytrack.consumption.meaning import echo_lines

    lines = [*echo_lines(store, vehicle, entry), *_watched(store, vehicle)]
    if json:
        from energytrack.cli.entries import entry_columns

        say_json({**entry_columns(entry), "meaning": lines})
    else:
        say(lines)


def _watched(store: Store, vehicle: Vehicle) -> list[str]:
    """What the kept monitor says with this entry; nothing where none is kept. A refusal never hides the entry."""
    kept = store.watch(vehicle.name)
    if kept is None:
        return []
    from energytrack.inference.watch.echo import watch_lines

    return watch_lines(store, vehicle, kept)
