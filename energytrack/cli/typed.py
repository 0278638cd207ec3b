"""What was typed for an entry, and the entry it means."""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass
from typing import Any

from energytrack.cli.context import distance_unit, kilometres, the_date
from energytrack.errors import EntryError
from energytrack.logbook.carriers import kinds_of
from energytrack.logbook.quantities import ENERGY, base_unit, parse_number, parse_temperature, to_base
from energytrack.logbook.records import Entry, Vehicle


@dataclass
class Typed:
    """The texts of one entry, as typed; None: not typed."""

    kind: str
    odometer: str | None
    amount: str | None
    distance: str | None
    date: str | None
    unit: str | None
    odometer_unit: str | None
    level: str | None
    temperature: str | None
    speed: str | None
    cost: str | None
    currency: str | None
    partial: bool
    missed: bool
    place: str
    note: str
    extra: list[str]


def check_kind(kind: str, vehicle: Vehicle) -> None:
    """A charge is for a battery, a fill-up for a tank. Raises EntryError."""
    right = kinds_of(vehicle)[0]
    if kind not in kinds_of(vehicle):
        raise EntryError(f"{vehicle.name} runs on {vehicle.carrier}: log it with `{right.replace('-', '')}`")


def unit_of(typed: Typed, vehicle: Vehicle) -> str:
    """The unit of the amount. Raises EntryError for one that cannot measure this vehicle's energy."""
    unit = typed.unit or vehicle.typed_unit or vehicle.unit
    if unit not in ENERGY or base_unit(unit) != vehicle.unit:
        fitting = [name for name in ENERGY if base_unit(name) == vehicle.unit]
        raise EntryError(f"{vehicle.name} is not measured in {unit!r}: use {', '.join(fitting)}")
    return unit


def entry_from(typed: Typed, vehicle: Vehicle) -> Entry:
    """The entry in base units; odometer or distance, and the amount, must be there. Raises EntryError."""
    values = values_of(typed, vehicle)
    if "energy" not in values:
        values["energy"] = parse_number("", "amount")
    return Entry(
        vehicle=vehicle.name,
        date=the_date(typed.date),
        kind=typed.kind,
        full=not typed.partial,
        missed=typed.missed,
        place=typed.place,
        note=typed.note,
        **values,
    )


def values_of(typed: Typed, vehicle: Vehicle) -> dict[str, Any]:
    """The figures that were typed, in base units, by the entry's own names. Raises EntryError."""
    unit = distance_unit(typed.odometer_unit, vehicle)
    own = vehicle.distance_unit
    amount = _number(typed.amount, "amount")
    values = {
        "energy": None if amount is None else to_base(amount, unit_of(typed, vehicle)),
        "odometer_km": None if typed.odometer is None else kilometres(typed.odometer, unit),
        "level_percent": _number(typed.level, "level"),
        "distance_km": None if typed.distance is None else kilometres(typed.distance, own, "distance"),
        "cost": _number(typed.cost, "cost"),
        "currency": _currency(typed.currency),
        "temperature_c": None if typed.temperature is None else parse_temperature(typed.temperature),
        "speed_kmh": None if typed.speed is None else kilometres(typed.speed, own, "speed"),
        "extra": _extra(typed.extra) or None,
    }
    return {name: value for name, value in values.items() if value is not None}


def as_typed(typed: Typed, vehicle: Vehicle, date: dt.date) -> dict[str, Any]:
    """What is kept of the typing: each value as text, with its unit where it has one."""
    distance = vehicle.distance_unit
    units = {
        "odometer": distance_unit(typed.odometer_unit, vehicle),
        "amount": unit_of(typed, vehicle),
        "distance": distance,
        "level": "%",
        "temperature": "F" if (typed.temperature or "").strip().upper().endswith("F") else "C",
        "speed": f"{distance}/h",
        "cost": typed.currency or "",
    }
    kept: dict[str, Any] = {"date": date.isoformat()}
    for name, unit in units.items():
        value = getattr(typed, name)
        if value is not None:
            kept[name] = {"value": value, "unit": unit}
    return kept | ({"set": typed.extra} if typed.extra else {})


def _number(text: str | None, what: str) -> float | None:
    return None if text is None else parse_number(text, what)


def _currency(text: str | None) -> str | None:
    if text is not None and not (len(text) == 3 and text.isascii() and text.isalpha()):
        raise EntryError(f"currency {text!r} is not a code of three letters (ISO 4217), such as EUR")
    return text.upper() if text else None


def _extra(pairs: list[str]) -> dict[str, float]:
    """`name=value` pairs as further numeric columns."""
    ours = set(Entry.__dataclass_fields__) | {"vehicle", "energy"}
    values: dict[str, float] = {}
    for pair in pairs:
        name, equals, value = pair.partition("=")
        name = name.strip()
        if not equals or not name.isidentifier():
            raise EntryError(f"--set {pair!r} is not name=value in letters, digits and _, such as payload=300")
        if name in ours or name in values:
            raise EntryError(f"--set {name}: the name is taken, choose another")
        values[name] = parse_number(value, name)
    return values
