"""`vehicle`: the vehicles of a logbook."""

from __future__ import annotations

from dataclasses import replace
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import distance_unit, readable, say, say_json, writable
from energytrack.errors import EntryError
from energytrack.logbook.carriers import for_kind, in_total, kind_of
from energytrack.logbook.checks import check_name, check_text
from energytrack.logbook.quantities import (
    CONSUMPTION,
    ENERGY,
    base_unit,
    consumption_unit,
    energy_text,
    parse_number,
    to_base,
)
from energytrack.logbook.records import CARRIERS, UNIT_OF_CARRIER, Vehicle
from energytrack.presentation.columns import aligned

vehicle_commands = typer.Typer(
    no_args_is_help=True, add_completion=False, rich_markup_mode=None, help="Add and list vehicles."
)
_USUAL_DISPLAY_IN_MILES = {"gal-us": "mpg-us", "gal-imp": "mpg-imp", "kg": "mi/kg", "kWh": "mi/kWh"}


@vehicle_commands.command("add", cls=options.NegativeNumbers)
def add(
    context: typer.Context,
    name: Annotated[str, typer.Argument(help="What you call it.")],
    carrier: Annotated[str, typer.Option(help=", ".join(CARRIERS))],
    capacity: Annotated[str | None, typer.Option(help="Tank or usable battery capacity, in --unit.")] = None,
    unit: Annotated[
        str | None,
        typer.Option(help=f"Unit amounts are typed in: {', '.join(ENERGY)}.", callback=options.any_case),
    ] = None,
    distance_unit_typed: Annotated[
        str,
        typer.Option(
            "--distance-unit",
            metavar="km|mi",
            help="Unit the odometer counts.",
            callback=options.any_case,
        ),
    ] = "km",
    display: Annotated[
        str | None,
        typer.Option(help=f"Consumption shown as: {', '.join(CONSUMPTION)}.", callback=options.any_case),
    ] = None,
    second_carrier: Annotated[
        str | None, typer.Option(help="Of a plug-in hybrid: electricity beside a fuel, or a fuel beside electricity.")
    ] = None,
    second_capacity: Annotated[str | None, typer.Option(help="Of the second carrier, in L, kg or kWh.")] = None,
    co2: Annotated[
        str | None,
        typer.Option(metavar="KG", help="CO2 of a L, kg or kWh it takes, if not the usual; of the grid for a battery."),
    ] = None,
    second_co2: Annotated[str | None, typer.Option(metavar="KG", help="The same of the second carrier.")] = None,
    note: options.Note = "",
    json: options.Json = False,
) -> None:
    """Add a vehicle."""
    vehicle = described(name, carrier, capacity, unit, distance_unit_typed, display, note)
    vehicle = _with_second(vehicle, second_carrier, second_capacity)
    vehicle = _with_co2(vehicle, co2, second_co2)
    writable(context).add_vehicle(vehicle)
    if json:
        say_json(_columns(vehicle))
    else:
        say([f"added {'  '.join(cell for cell in _cells(vehicle) if cell)}"])


@vehicle_commands.command("list")
def list_vehicles(context: typer.Context, json: options.Json = False) -> None:
    """List the vehicles."""
    vehicles = readable(context).vehicles()
    if json:
        say_json({"vehicles": [_columns(vehicle) for vehicle in vehicles]})
    elif vehicles:
        header = ("vehicle", "carrier", "capacity", "odometer in", "shown as", "note")
        say(aligned([header, *(_cells(vehicle) for vehicle in vehicles)], right=(2,)))
    else:
        say(["no vehicles yet: add one with `vehicle add`"])


def described(
    name: str, carrier: str, capacity: str | None, unit: str | None, distance: str, display: str | None, note: str
) -> Vehicle:
    """A vehicle from what was typed, with what is usual where nothing was. Raises EntryError."""
    check_name(name, "vehicle")
    check_text(note, "note")
    if carrier not in CARRIERS:
        raise EntryError(f"unknown carrier {carrier!r}: use one of {', '.join(CARRIERS)}")
    typed_unit = unit or UNIT_OF_CARRIER[carrier]
    if typed_unit not in ENERGY:
        raise EntryError(f"unknown unit {typed_unit!r}: use one of {', '.join(ENERGY)}")
    base = base_unit(typed_unit)
    if (base == "kWh") != (carrier == "electricity"):
        raise EntryError(f"{carrier} is not measured in {typed_unit}: use another --unit")
    room = None if capacity is None else to_base(parse_number(capacity, "capacity"), typed_unit)
    if room is not None and room <= 0:
        raise EntryError(f"capacity {capacity} must be more than 0: type what tank or battery holds")
    if display is None and distance == "mi":
        display = _USUAL_DISPLAY_IN_MILES.get(typed_unit)
    vehicle = Vehicle(name.strip(), carrier, base, room, distance, display, note, typed_unit)
    _check_shown(vehicle)
    return vehicle


def _with_second(vehicle: Vehicle, carrier: str | None, capacity: str | None) -> Vehicle:
    """The vehicle with its second carrier, if it has one. Raises EntryError."""
    if carrier is None:
        if capacity is not None:
            raise EntryError("a second capacity needs its carrier: add --second-carrier")
        return vehicle
    if carrier not in CARRIERS:
        raise EntryError(f"unknown carrier {carrier!r}: use one of {', '.join(CARRIERS)}")
    if (carrier == "electricity") == (vehicle.carrier == "electricity"):
        raise EntryError(f"{vehicle.carrier} and {carrier}: one of two carriers must be electricity, the other a fuel")
    room = None if capacity is None else parse_number(capacity, "second capacity")
    if room is not None and room <= 0:
        raise EntryError(f"second capacity {capacity} must be more than 0: type what tank or battery holds")
    return replace(vehicle, second_carrier=carrier, second_unit=UNIT_OF_CARRIER[carrier], second_capacity=room)


def _with_co2(vehicle: Vehicle, co2: str | None, second: str | None) -> Vehicle:
    """The vehicle with CO2 factors of its own, if any. Raises EntryError."""
    if second is not None and vehicle.second_carrier is None:
        raise EntryError("a second CO2 factor needs its carrier: add --second-carrier")
    factors = [None if typed is None else parse_number(typed, "CO2 factor") for typed in (co2, second)]
    wrong = next((factor for factor in factors if factor is not None and factor < 0), None)
    if wrong is not None:
        raise EntryError(f"CO2 factor {wrong:g} must be 0 or more: type kg per L, kg or kWh")
    return replace(vehicle, co2_kg=factors[0], second_co2_kg=factors[1])


def _check_shown(vehicle: Vehicle) -> None:
    distance_unit(None, vehicle)
    fitting = [key for key, shown in CONSUMPTION.items() if base_unit(shown.energy) == vehicle.unit]
    if vehicle.display is not None and vehicle.display not in fitting:
        raise EntryError(f"cannot show consumption in {vehicle.unit} as {vehicle.display!r}: use {', '.join(fitting)}")


def _cells(vehicle: Vehicle) -> tuple[str, ...]:
    carriers, capacity = vehicle.carrier, _capacity(vehicle)
    if vehicle.second_carrier is not None:
        carriers += f" + {vehicle.second_carrier}"
        second = _capacity(for_kind(vehicle, kind_of(vehicle.second_carrier)))
        capacity = " + ".join(part for part in (capacity, second) if part)
    shown = consumption_unit(in_total(vehicle)).label
    return (vehicle.name, carriers, capacity, vehicle.distance_unit, shown, vehicle.note)


def _capacity(vehicle: Vehicle) -> str:
    return "" if vehicle.capacity is None else energy_text(vehicle.capacity, vehicle)


def _columns(vehicle: Vehicle) -> dict[str, object]:
    return {
        "vehicle": vehicle.name,
        "carrier": vehicle.carrier,
        "unit": vehicle.unit,
        "capacity": vehicle.capacity,
        "distance_unit": vehicle.distance_unit,
        "display": vehicle.display,
        "typed_unit": vehicle.typed_unit,
        "second_carrier": vehicle.second_carrier,
        "second_unit": vehicle.second_unit,
        "second_capacity": vehicle.second_capacity,
        "co2_kg": vehicle.co2_kg,
        "second_co2_kg": vehicle.second_co2_kg,
        "note": vehicle.note,
    }
