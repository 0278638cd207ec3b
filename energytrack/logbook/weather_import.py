"""Daily temperatures into a logbook, and how many entries they reach."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from energytrack.errors import EntryError
from energytrack.logbook.columns import Form
from energytrack.logbook.merging import merge_weather
from energytrack.logbook.records import Entry
from energytrack.logbook.rejected import BadRowsError
from energytrack.logbook.store import Store
from energytrack.logbook.weather_files import read_weather_file


@dataclass(frozen=True, slots=True)
class Reach:
    """How many of a vehicle's entries have a temperature."""

    vehicle: str
    entries: int
    own: int  # logged with the entry
    filled: int  # from the weather table


@dataclass(frozen=True, slots=True)
class Outcome:
    """What was brought in."""

    file: str
    new: int  # days that were not there, or had another temperature
    already: int
    first: str | None
    last: str | None
    left_out: tuple[str, ...]  # bad rows
    notes: tuple[str, ...]
    vehicles: tuple[Reach, ...]

    def to_dict(self) -> dict[str, Any]:
        return asdict(self)

    def lines(self) -> list[str]:
        span = "" if self.first is None else f" ({self.first} to {self.last})"
        days = "day" if self.new == 1 else "days"
        told = [f"{self.file}: {self.new} {days} added, {self.already} already there{span}"]
        told += [f"left out: {problem}" for problem in self.left_out]
        told += [f"note: {note}" for note in self.notes]
        return told + [
            f"{each.vehicle}: {each.own + each.filled} of {each.entries} entries have a temperature, "
            f"{each.filled} of them from the weather"
            for each in self.vehicles
        ]


def import_weather(
    store: Store, path: Path, form: Form, station: str | None = None, *, skip_bad: bool = False, advice: str = ""
) -> Outcome:
    """Read the file and add its days in one transaction. Raises EntryError where a row is bad and none is skipped."""
    reading = read_weather_file(path, form, station)
    if not reading.whole:
        raise EntryError(str(reading.problems[-1]))
    if reading.problems and not skip_bad:
        raise BadRowsError(str(path), reading.problems, advice)
    days = [weather for _, weather in reading.rows]
    with store.transaction("imported"):
        before = {day.date: day.temperature_c for day in store.weather()}
        new = merge_weather(store, days)
    replaced = sum(before.get(day.date, day.temperature_c) != day.temperature_c for day in days)
    dates = sorted(day.date.isoformat() for day in days)
    known = sorted(day.date.toordinal() for day in store.weather())
    return Outcome(
        str(path),
        new,
        len(days) - new,
        dates[0] if dates else None,
        dates[-1] if dates else None,
        tuple(str(problem) for problem in reading.problems),
        (*reading.notes, *_replaced(replaced)),
        tuple(_reach(vehicle.name, store.entries(vehicle.name), known) for vehicle in store.vehicles()),
    )


def _replaced(count: int) -> list[str]:
    days = "1 day" if count == 1 else f"{count} days"
    return [f"{days} had another temperature in this logbook, which is replaced"] if count else []


def _reach(name: str, entries: Sequence[Entry], known: Sequence[int]) -> Reach:
    """Entries with a temperature of their own, and those with a known day since the entry before."""
    own = filled = 0
    for place, entry in enumerate(entries):
        since = entries[max(place - 1, 0)].date.toordinal()
        if entry.temperature_c is not None:
            own += 1
        else:
            at = bisect_left(known, since)
            filled += at < len(known) and known[at] <= entry.date.toordinal()
    return Reach(name, len(entries), own, filled)
