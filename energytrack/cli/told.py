"""A change to the logbook in words, and as JSON: what it was, what it became, why."""

from __future__ import annotations

import datetime as dt
import math
import textwrap
from collections.abc import Iterator, Sequence
from typing import Any

from energytrack.cli.entries import entry_columns
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.history import TOLD, Change, Record, Revision
from energytrack.logbook.quantities import distance_text, energy_text, from_base, speed_text
from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.switches import Switch
from energytrack.presentation.plain import plain_text

INDENT = "    "
WIDTH = 80


def lines(change: Change, vehicles: Sequence[Vehicle], moment: str = "") -> list[str]:
    """A title, and a line for each thing that was done."""
    by_name = {vehicle.name: vehicle for vehicle in vehicles}
    what = change.what if change.undoes is None else f"{change.what} (change {change.undoes})"
    title = "  ".join(part for part in (f"{change.number}", moment, what) if part)
    told = [_line(each, by_name[each.vehicle], change.undoes is not None) for each in change.revisions]
    told += [f"vehicle {name}" for name in change.vehicles]
    if change.entries > TOLD:
        told.append(f"... {change.entries} entries in all")
    if change.weather_days:
        told.append(f"weather: {change.weather_days} {'day' if change.weather_days == 1 else 'days'}")
    return [title + (f": {change.why}" if change.why else ""), *(part for line in told for part in _wrapped(line))]


def _wrapped(line: str) -> list[str]:
    return textwrap.wrap(plain_text(line), WIDTH, initial_indent=INDENT, subsequent_indent=2 * INDENT)


def columns(change: Change) -> dict[str, Any]:
    """The change for JSON; a record that did not stand is null."""
    return {
        "change": change.number,
        "recorded_at": change.recorded_at,
        "what": change.what,
        "why": change.why,
        "undoes": change.undoes,
        "revisions": [
            {"vehicle": each.vehicle, "was": _columns(each.was), "became": _columns(each.became)}
            for each in change.revisions
        ],
        "entries": change.entries,
        "vehicles": list(change.vehicles),
        "weather_days": change.weather_days,
    }


def _line(each: Revision, vehicle: Vehicle, undoes: bool) -> str:
    said = each.became or each.was
    place = f"{vehicle.name}, {_place(said, vehicle)}"
    if isinstance(each.was, Entry) and isinstance(each.became, Entry):
        differences = list(_differences(each.was, each.became, vehicle))
        return f"{vehicle.name}, {_place(each.was, vehicle)}: {'; '.join(differences) or 'kept as it is'}"
    if each.became is None:
        return f"{place}: {_what(said, vehicle)}, counts no more"
    return f"{place}: {_what(said, vehicle)}" + (", counts again" if undoes else "")


def _place(record: Record | None, vehicle: Vehicle) -> str:
    km = record.km if isinstance(record, Switch) else None if record is None else record.odometer_km
    day = None if record is None or record.date is None else record.date.isoformat()
    return ", ".join(part for part in (None if km is None else distance_text(km, vehicle), day) if part)


def _what(record: Record | None, vehicle: Vehicle) -> str:
    if isinstance(record, Switch):
        return f"{record.modification} {'fitted' if record.fitted else 'removed'}"
    if isinstance(record, Event):
        return record.what
    return "" if record is None else f"{record.kind} of {_amount(record, vehicle)}"


def _differences(was: Entry, became: Entry, vehicle: Vehicle) -> Iterator[str]:
    old, new = _fields(was, vehicle), _fields(became, vehicle)
    for name in dict.fromkeys([*old, *new]):
        before, after = old.get(name, "none"), new.get(name, "none")
        if before != after:
            yield f"{name} {before} -> {after}"


def _fields(entry: Entry, vehicle: Vehicle) -> dict[str, str]:
    """What an entry says, by the names of the options that would say it; what is empty is left out."""
    values = {
        "date": entry.date.isoformat(),
        "odometer": _exact(entry.odometer_km, vehicle),
        "distance": _exact(entry.distance_km, vehicle),
        "amount": _amount(entry, vehicle),
        "fill": "full" if entry.full else "partial",
        "level": None if entry.level_percent is None else f"{entry.level_percent:g} %",
        "missed": "yes" if entry.missed else "no",
        "temperature": None if entry.temperature_c is None else f"{entry.temperature_c:.3g} °C",
        "speed": None if entry.speed_kmh is None else speed_text(entry.speed_kmh, vehicle),
        "cost": None if entry.cost is None else f"{entry.cost:.2f}",
        "currency": entry.currency,
        "place": repr(entry.place) if entry.place else None,
        "note": repr(entry.note) if entry.note else None,
        "confirmed": "yes" if entry.confirmed else "no",
        **{name: f"{value:g}" for name, value in entry.extra.items()},
    }
    return {name: value for name, value in values.items() if value is not None}


def _exact(km: float | None, vehicle: Vehicle) -> str | None:
    """A distance to a tenth: two odometer values that differ must look different."""
    if km is None:
        return None
    return f"{round(from_base(km, vehicle.distance_unit), 1):,.10g} {vehicle.distance_unit}"


def _amount(entry: Entry, vehicle: Vehicle) -> str:
    return "no amount" if math.isnan(entry.energy) else energy_text(entry.energy, for_kind(vehicle, entry.kind))


def _columns(record: Record | None) -> dict[str, Any] | None:
    if record is None:
        return None
    if isinstance(record, Entry):
        return {**entry_columns(record), "confirmed": record.confirmed}
    if isinstance(record, Switch):
        values: dict[str, Any] = record._asdict()
    else:
        values = {name: getattr(record, name) for name in Event.__dataclass_fields__}
    return {name: value.isoformat() if isinstance(value, dt.date) else value for name, value in values.items()}
