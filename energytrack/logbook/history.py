"""What was recorded, in the order of recording: every change with what it was, what it became, and why."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from energytrack.logbook import rows
from energytrack.logbook.records import Entry, Event, Vehicle
from energytrack.logbook.store import Store
from energytrack.logbook.switches import Switch

TOLD = 5  # entries of one change that are told one by one; of an import the rest is only counted

Record = Entry | Switch | Event


@dataclass(frozen=True, slots=True)
class Revision:
    """One thing a change did: None before it was first written, None after it was struck."""

    vehicle: str
    was: Record | None
    became: Record | None


@dataclass(frozen=True, slots=True)
class Change:
    """What was recorded in one go."""

    number: int
    recorded_at: str  # UTC
    what: str
    why: str
    undoes: int | None
    revisions: tuple[Revision, ...]  # of entries at most `TOLD`
    entries: int  # of which there were so many
    vehicles: tuple[str, ...]  # added
    weather_days: int


def last_changes(store: Store, count: int) -> list[Change]:
    """The newest `count` changes, the newest last."""
    found = store.query("SELECT id FROM change ORDER BY id DESC LIMIT ?", count)
    return [_change(store, number) for (number,) in reversed(found)]


def change_of(store: Store, number: int) -> Change:
    """The change of that number, which must exist."""
    return _change(store, number)


def changes_of(store: Store, entries: Sequence[int]) -> list[Change]:
    """Every change that touched the entries of these numbers, and only what it did to them."""
    found: dict[int, list[int]] = {}
    for number in entries:
        chain = store.query("SELECT change_id, id FROM entry WHERE id = ? OR origin = ? ORDER BY id", number, number)
        confirmed = (
            "SELECT change_id, entry_id FROM confirmation WHERE entry_id IN "
            "(SELECT ? UNION ALL SELECT id FROM entry WHERE origin = ?)"
        )
        for change, row in chain:
            found.setdefault(change, []).append(row)
        for change, _ in store.query(confirmed, number, number):
            found.setdefault(change, [])
    return [_change(store, number, only) for number, only in sorted(found.items())]


def ever_at(store: Store, vehicle: Vehicle, low_km: float, high_km: float) -> list[int]:
    """Numbers of the entries that stood between two odometer values at any time, struck ones too."""
    where = "odometer_km > ? AND odometer_km < ?"
    return _ever(store, vehicle, where, low_km, high_km)


def ever_of(store: Store, vehicle: Vehicle, day: str) -> list[int]:
    """Numbers of the entries that were of this day at any time, struck ones too."""
    return _ever(store, vehicle, "date = ?", day)


def _ever(store: Store, vehicle: Vehicle, where: str, *values: float | str) -> list[int]:
    own = "vehicle_id = (SELECT id FROM vehicle WHERE name = ?)"
    select = f"SELECT DISTINCT {rows.NUMBER} AS number FROM entry WHERE {own} AND {where} ORDER BY number"
    return [row[0] for row in store.query(select, vehicle.name, *values)]


def _change(store: Store, number: int, only: Sequence[int] | None = None) -> Change:
    select = "SELECT recorded_at, what, why, undoes FROM change WHERE id = ?"
    recorded_at, what, why, undoes = store.query(select, number)[0]
    if only is not None:
        told = _entries(store, only) or _confirmed(store, number)
        return Change(number, recorded_at, what, why, undoes, tuple(told), len(only), (), 0)
    found = [row[0] for row in store.query("SELECT id FROM entry WHERE change_id = ? ORDER BY id", number)]
    revisions = [*_entries(store, found[:TOLD]), *_switches(store, number), *_events(store, number)]
    vehicles = store.query("SELECT name FROM vehicle WHERE change_id = ? ORDER BY id", number)
    weather = store.query("SELECT count(*) FROM weather WHERE change_id = ?", number)[0][0]
    confirmed = [] if found else _confirmed(store, number)
    names = tuple(name for (name,) in vehicles)
    every = (*revisions, *confirmed)
    return Change(number, recorded_at, what, why, undoes, every, len(found), names, weather)


def _entries(store: Store, numbers: Sequence[int]) -> list[Revision]:
    found = []
    for number in numbers:
        struck, earlier = store.query("SELECT struck, supersedes FROM entry WHERE id = ?", number)[0]
        vehicle, now = _entry(store, number)
        found.append(Revision(vehicle, _standing(store, earlier), None if struck else now))
    return found


def _standing(store: Store, row: int | None) -> Entry | None:
    if row is None or store.query("SELECT struck FROM entry WHERE id = ?", row)[0][0]:
        return None
    return _entry(store, row)[1]


def _entry(store: Store, row: int) -> tuple[str, Entry]:
    name = "(SELECT name FROM vehicle WHERE vehicle.id = vehicle_id)"
    vehicle, *values = store.query(f"SELECT {name}, {rows.ENTRY_SELECT} FROM entry WHERE id = ?", row)[0]
    return vehicle, rows.entry_of(vehicle, tuple(values))


def _confirmed(store: Store, change: int) -> list[Revision]:
    """Confirmations that came without their entry: nothing but that was changed."""
    found = store.query("SELECT entry_id FROM confirmation WHERE change_id = ? ORDER BY entry_id", change)
    entries = [_entry(store, row) for (row,) in found[:TOLD]]
    return [Revision(vehicle, entry, entry) for vehicle, entry in entries]


def _switches(store: Store, change: int) -> list[Revision]:
    found = []
    for vehicle, struck, earlier, *values in _chained(store, "switch", rows.SWITCH_COLUMNS, change):
        switch = rows.switch_of(tuple(values))
        found.append(_taken_or_restored(store, "switch", vehicle, switch, struck, earlier))
    return found


def _events(store: Store, change: int) -> list[Revision]:
    found = []
    for vehicle, struck, earlier, *values in _chained(store, "event", rows.EVENT_COLUMNS, change):
        event = rows.event_of(vehicle, tuple(values))
        found.append(_taken_or_restored(store, "event", vehicle, event, struck, earlier))
    return found


def _chained(store: Store, table: str, columns: str, change: int) -> list[tuple[Any, ...]]:
    name = "(SELECT name FROM vehicle WHERE vehicle.id = vehicle_id)"
    select = f"SELECT {name}, struck, supersedes, {columns} FROM {table} WHERE change_id = ? ORDER BY id"
    return store.query(select, change)


def _taken_or_restored(
    store: Store, table: str, vehicle: str, record: Record, struck: int, earlier: int | None
) -> Revision:
    """Parts and events are never amended: what stood before, if anything, said the same."""
    stood = earlier is not None and not store.query(f"SELECT struck FROM {table} WHERE id = ?", earlier)[0][0]
    return Revision(vehicle, record if stood else None, None if struck else record)
