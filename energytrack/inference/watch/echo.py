"""The kept monitor carried on by the entry just logged. Standard library only."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

from energytrack.consumption.meaning import RECENT_ENTRIES, EchoLogbook, segmented_of
from energytrack.errors import EnergytrackError
from energytrack.inference.watch.kept import alarm_lines, as_json, carried_on, from_json
from energytrack.logbook.records import Vehicle

_KEPT_EVERY = 20  # segments: far less than are looked at for one echo


class WatchedLogbook(EchoLogbook, Protocol):
    """What keeps a monitor."""

    def keep_watch(self, vehicle_name: str, state: Mapping[str, Any] | None) -> None: ...


def watch_lines(logbook: WatchedLogbook, vehicle: Vehicle, kept: Mapping[str, Any]) -> list[str]:
    """A line where consumption has moved. The state is kept again from time to time, so that a log may grow."""
    recent = logbook.last_entries(vehicle.name, RECENT_ENTRIES)
    if all(row.odometer_km is None for row in recent):
        recent = logbook.entries(vehicle.name)  # without an odometer, positions count from the first entry
    try:
        before = from_json(kept)
        log = segmented_of(vehicle, recent, logbook.events(vehicle.name))
        watch = carried_on(before, log, logbook.modifications(vehicle.name))
        if watch is None:
            return []
        if watch.segments >= before.segments + _KEPT_EVERY:
            logbook.keep_watch(vehicle.name, as_json(watch))
        return alarm_lines(watch, vehicle)
    except (EnergytrackError, KeyError, TypeError):  # contradictory periods, told elsewhere; another version's state
        return []
