"""One vehicle's log as it travels to a worker: records with only what measuring needs. Standard library only."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, NamedTuple

from energytrack.logbook.opening import Logbook, open_logbook
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather


@dataclass(frozen=True)
class VehicleLog:
    """A vehicle and all that was written down about it."""

    vehicle: Vehicle
    entries: tuple[Entry, ...]
    modifications: tuple[Modification, ...] = ()
    events: tuple[Event, ...] = ()
    weather: tuple[Weather, ...] = ()


class Packed(NamedTuple):
    """A log as plain tuples: a tenth of the bytes of the records, and nothing a serialiser stumbles over."""

    vehicle: Vehicle
    entries: tuple[tuple[Any, ...], ...]
    modifications: tuple[Modification, ...]
    events: tuple[Event, ...]
    weather: tuple[Weather, ...]


_NOTHING = Entry("", dt.date.min, 0.0).extra


def fleet_logs(logbook: Logbook | str | Path, vehicles: Sequence[Vehicle] | None = None) -> list[VehicleLog]:
    """The logs of these vehicles, or of all. logbook: an open one, or the path of one. Raises LogbookError."""
    logbook = open_logbook(logbook) if isinstance(logbook, (str, Path)) else logbook
    weather = tuple(logbook.weather())
    return [
        VehicleLog(
            vehicle,
            tuple(logbook.entries(vehicle.name)),
            tuple(logbook.modifications(vehicle.name)),
            tuple(logbook.events(vehicle.name)),
            weather,
        )
        for vehicle in (logbook.vehicles() if vehicles is None else vehicles)
    ]


def pack(log: VehicleLog) -> Packed:
    """What a worker needs of a log."""
    vehicle = replace(log.vehicle, note="")
    modifications = tuple(replace(row, note="") for row in log.modifications)
    return Packed(vehicle, tuple(map(_fields, log.entries)), modifications, log.events, log.weather)


def _fields(entry: Entry) -> tuple[Any, ...]:
    return (
        entry.date.toordinal(),
        entry.energy,
        entry.odometer_km,
        entry.kind,
        entry.full,
        entry.level_percent,
        entry.missed,
        entry.distance_km,
        entry.temperature_c,
        entry.speed_kmh,
        dict(entry.extra) or None,
        entry.confirmed,
    )


def unpack(packed: Packed) -> VehicleLog:
    """The log again, without costs, places and notes."""
    name = packed.vehicle.name
    entries = tuple(_entry(name, row) for row in packed.entries)
    return VehicleLog(packed.vehicle, entries, packed.modifications, packed.events, packed.weather)


def _entry(vehicle: str, row: tuple[Any, ...]) -> Entry:
    day, energy, odometer, kind, full, level, missed, distance, temperature, speed, extra, confirmed = row
    return Entry(
        vehicle,
        dt.date.fromordinal(day),
        energy,
        odometer,
        kind,
        full,
        level,
        missed,
        distance,
        temperature_c=temperature,
        speed_kmh=speed,
        extra=extra or _NOTHING,
        confirmed=confirmed,
    )
