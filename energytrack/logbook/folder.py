"""A folder of CSV tables opened as a read-only logbook."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from pathlib import Path
from typing import Any, NoReturn, TypeVar

from energytrack.errors import LogbookError, UnknownNameError
from energytrack.logbook.columns import Form
from energytrack.logbook.order import driving_order
from energytrack.logbook.records import Entry, Event, Modification, Problem, Vehicle, Weather
from energytrack.logbook.tables import (
    Reading,
    read_entries,
    read_events,
    read_modifications,
    read_vehicles,
    read_weather,
)

Record = TypeVar("Record")
PROBLEMS_SHOWN = 5


class Folder:
    """vehicles.csv and entries.csv, and modifications.csv, events.csv, weather.csv where they exist.

    Tables are read once, when first asked for. Raises LogbookError where a table is missing or has bad rows.
    """

    writable = False

    def __init__(self, path: Path) -> None:
        self.path = path
        for needed in ("vehicles.csv", "entries.csv"):
            if not (path / needed).is_file():
                raise LogbookError(f"{path} is no logbook folder: it has no {needed}; see the reference of tables")
        self._vehicles = {vehicle.name: vehicle for vehicle in self._read("vehicles.csv", read_vehicles)}
        self._entries: dict[str, list[Entry]] | None = None

    def vehicles(self) -> list[Vehicle]:
        """In the order of the file."""
        return list(self._vehicles.values())

    def vehicle(self, name: str) -> Vehicle:
        """Raises UnknownNameError, which lists those that exist."""
        if name not in self._vehicles:
            raise UnknownNameError(f"no vehicle {name!r} in {self.path}; it has {', '.join(self._vehicles) or 'none'}")
        return self._vehicles[name]

    def entries(self, vehicle_name: str) -> list[Entry]:
        """In driving order."""
        self.vehicle(vehicle_name)
        if self._entries is None:
            self._entries = self._read_entries()
        return list(self._entries[vehicle_name])

    def last_entries(self, vehicle_name: str, count: int) -> list[Entry]:
        """The newest `count`, in driving order."""
        return self.entries(vehicle_name)[-count:] if count > 0 else []

    def modifications(self, vehicle_name: str) -> list[Modification]:
        """In the order of the file."""
        return self._of_vehicle(vehicle_name, "modifications.csv", read_modifications)

    def events(self, vehicle_name: str) -> list[Event]:
        """In the order of the file."""
        return self._of_vehicle(vehicle_name, "events.csv", read_events)

    def weather(self) -> list[Weather]:
        """By date."""
        return sorted(self._read("weather.csv", read_weather), key=lambda day: day.date)

    def assessments(self, vehicle_name: str) -> list[dict[str, Any]]:
        """None: a folder keeps no answers."""
        self.vehicle(vehicle_name)
        return []

    def looks(self, vehicle_name: str, modification: str) -> list[float]:
        """None: a folder keeps no looks."""
        self.vehicle(vehicle_name)
        return []

    def close(self) -> None:
        """Nothing to let go of: tables are read whole."""

    def refuse_writing(self, *_: object, **__: object) -> NoReturn:
        """What every attempt to write meets."""
        raise LogbookError(
            f"{self.path} is a folder of tables and read-only; to write, bring it into a logbook file: "
            f"energytrack --logbook my.logbook new, then energytrack --logbook my.logbook import {self.path}"
        )

    add_vehicle = add_entry = add_entries = fit = remove = add_event = add_weather = keep_assessment = refuse_writing
    record_look = confirm = refuse_writing

    def _of_vehicle(self, name: str, file: str, read: Callable[[Path, Form], Reading[Any]]) -> list[Any]:
        self.vehicle(name)
        return [record for record in self._read(file, read) if record.vehicle == name]

    def _read_entries(self) -> dict[str, list[Entry]]:
        reading = self._reading("entries.csv", read_entries)
        by_vehicle: dict[str, list[tuple[int, Entry]]] = {name: [] for name in self._vehicles}
        for line, entry in reading.rows:
            by_vehicle[entry.vehicle].append((line, entry))
        ordered: dict[str, list[Entry]] = {}
        for name, rows in by_vehicle.items():
            good, problems = driving_order(rows, reading.file, again=True)
            reading.problems += problems
            ordered[name] = [entry for _, entry in good]
        _refuse_problems(reading.problems)
        return ordered

    def _read(self, file: str, read: Callable[[Path, Form], Reading[Record]]) -> list[Record]:
        reading = self._reading(file, read)
        _refuse_problems(reading.problems)
        return [record for _, record in reading.rows]

    def _reading(self, file: str, read: Callable[[Path, Form], Reading[Record]]) -> Reading[Record]:
        """A table, its rows of unknown vehicles turned into problems. An optional table that is absent is empty."""
        path = self.path / file
        if not path.exists():
            return Reading(str(path))
        if file in ("vehicles.csv", "weather.csv"):
            return read(path, Form())
        kinds = {vehicle.name: "charge" for vehicle in self.vehicles() if vehicle.carrier == "electricity"}
        only = next(iter(self._vehicles)) if len(self._vehicles) == 1 else None
        reading = read(path, Form(vehicle=only, kinds=kinds))
        known = [row for row in reading.rows if row[1].vehicle in self._vehicles]  # type: ignore[attr-defined]
        for line, record in reading.rows:
            if record.vehicle not in self._vehicles:  # type: ignore[attr-defined]
                message = f"no vehicle {record.vehicle!r} in vehicles.csv"  # type: ignore[attr-defined]
                reading.problems.append(Problem(message, str(path), line))
        return dataclasses.replace(reading, rows=known)


def _refuse_problems(problems: list[Problem]) -> None:
    if not problems:
        return
    problems.sort(key=lambda problem: problem.line or 0)
    shown = " | ".join(str(problem) for problem in problems[:PROBLEMS_SHOWN])
    more = f" | and {len(problems) - PROBLEMS_SHOWN} more problems" if len(problems) > PROBLEMS_SHOWN else ""
    raise LogbookError(f"{shown}{more}")
