"""Adding the vehicles, modifications, events and weather of a table to a logbook, each only once."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Protocol

from energytrack.logbook.records import Event, Modification, Vehicle, Weather


class Writable(Protocol):
    """What merging asks of a logbook file."""

    def vehicles(self) -> list[Vehicle]: ...
    def modifications(self, vehicle_name: str) -> list[Modification]: ...
    def events(self, vehicle_name: str) -> list[Event]: ...
    def weather(self) -> list[Weather]: ...
    def add_vehicle(self, vehicle: Vehicle) -> Any: ...
    def add_event(self, event: Event) -> Any: ...
    def add_weather(self, weather: list[Weather]) -> Any: ...
    def fit(
        self, vehicle: str, name: str, date: Any, km: Any,
        target: Any, level: Any, note: str, known: Any, reversible: bool,
    ) -> Any: ...  # fmt: skip
    def remove(self, vehicle: str, name: str, date: Any, km: Any) -> Any: ...


def merge_vehicles(store: Writable, vehicles: Sequence[Vehicle]) -> int:
    """Add the vehicles whose name is new; returns their number."""
    known = {vehicle.name for vehicle in store.vehicles()}
    new = [vehicle for vehicle in vehicles if vehicle.name not in known]
    for vehicle in new:
        store.add_vehicle(vehicle)
    return len(new)


def merge_modifications(store: Writable, modifications: Sequence[Modification]) -> int:
    """Add what is new: a fitting, or the removal of one that still stands as fitted; returns the number of rows."""
    added = 0
    for row in modifications:
        removed = row.removed_date is not None or row.removed_km is not None
        known = [other for other in store.modifications(row.vehicle) if _fitting(other) == _fitting(row)]
        if not known:
            place = (row.vehicle, row.name, row.fitted_date, row.fitted_km)
            store.fit(*place, row.target_percent, row.level, row.note, row.known, row.reversible)
        elif not removed or any(other.removed_date or other.removed_km for other in known):
            continue
        if removed:
            store.remove(row.vehicle, row.name, row.removed_date, row.removed_km)
        added += 1
    return added


def _fitting(row: Modification) -> tuple[object, ...]:
    return row.name, row.fitted_date, row.fitted_km


def merge_events(store: Writable, events: Sequence[Event]) -> int:
    """Add the events that are new; returns their number."""
    new = [event for event in events if event not in store.events(event.vehicle)]
    for event in new:
        store.add_event(event)
    return len(new)


def merge_weather(store: Writable, weather: Sequence[Weather]) -> int:
    """Add the days that are new or differ; returns their number."""
    known = {day.date: day.temperature_c for day in store.weather()}
    new = [day for day in weather if known.get(day.date) != day.temperature_c]
    if new:
        store.add_weather(new)
    return len(new)
