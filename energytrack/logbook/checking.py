"""What is wrong with a logbook file: SQLite's own checks, then the logbook's rules. Each fault has its remedy."""

from __future__ import annotations

import datetime as dt
import math
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

from energytrack.errors import EnergytrackError, EntryError
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.checks import check_date, check_values
from energytrack.logbook.file import connect
from energytrack.logbook.order import driving_order, jumps
from energytrack.logbook.records import Vehicle
from energytrack.logbook.store import Store

MOST = 20  # faults of one kind
_RESTORE = "restore a backup, keeping this file: energytrack check --repair-from BACKUP"
_CHAINED = ("entry", "switch", "event")


@dataclass(frozen=True, slots=True)
class Fault:
    """What is wrong, and what to do about it."""

    what: str
    remedy: str


def faults(path: Path) -> list[Fault]:
    """Every fault of a logbook file; [] for a sound one. Never changes an entry."""
    if damage := list(_damage(path)):
        return damage
    try:
        store = Store(path)
    except EnergytrackError as refusal:
        return [Fault(str(refusal), _RESTORE)]
    try:
        return [*_chains(store), *_contents(store)]
    finally:
        store.close()


def _damage(path: Path) -> Iterator[Fault]:
    """What SQLite finds: pages, indexes, constraints, and rows that refer to none."""
    if not path.is_file():
        yield Fault(f"there is no logbook {path}", "name a logbook file")
        return
    try:
        with closing(connect(path)) as connection:
            for (said,) in connection.execute(f"PRAGMA integrity_check({MOST})").fetchall():
                if said != "ok":
                    yield Fault(f"SQLite finds: {said}", _RESTORE)
            for table, row, other, _ in connection.execute("PRAGMA foreign_key_check").fetchmany(MOST):
                yield Fault(f"row {row} of {table} refers to a row of {other} that is not there", _RESTORE)
    except sqlite3.Error as error:
        yield Fault(f"SQLite cannot read it: {error}", _RESTORE)


def _chains(store: Store) -> Iterator[Fault]:
    """Corrections follow what they correct, and keep to their vehicle and their first row."""
    for table in _CHAINED:
        select = (
            f"SELECT this.id FROM {table} AS this JOIN {table} AS earlier ON earlier.id = this.supersedes "
            "WHERE earlier.id >= this.id OR earlier.vehicle_id <> this.vehicle_id"
        )
        for (row,) in store.query(f"{select} LIMIT {MOST}"):
            yield Fault(f"row {row} of {table} corrects what it cannot correct", _RESTORE)
    select = (
        "SELECT this.id FROM entry AS this LEFT JOIN entry AS earlier ON earlier.id = this.supersedes "
        f"WHERE this.origin IS NOT coalesce(earlier.origin, earlier.id) LIMIT {MOST}"
    )
    for (row,) in store.query(select):
        yield Fault(f"row {row} of entry has lost the number of its entry", _RESTORE)


def _contents(store: Store) -> Iterator[Fault]:
    try:
        for vehicle in store.vehicles():
            yield from _entries(store, vehicle)
            store.modifications(vehicle.name)
            store.events(vehicle.name)
            store.assessments(vehicle.name)
        store.weather()
    except EnergytrackError as refusal:
        yield Fault(str(refusal), _RESTORE)


def _entries(store: Store, vehicle: Vehicle) -> Iterator[Fault]:
    """The rules a new entry meets, for all that stand."""
    entries, today = store.entries(vehicle.name), _latest_day(store)
    for entry in entries:
        try:
            if math.isnan(entry.energy):
                check_date(entry.date, today)
            else:
                check_values(entry, for_kind(vehicle, entry.kind), today)
        except EntryError as refusal:
            yield _at(vehicle, entry.id or 0, str(refusal))
    rows = [(entry.id or 0, entry) for entry in entries]
    ordered, problems = driving_order(rows, again=True)
    for problem in [*problems, *jumps(ordered, [])]:
        yield _at(vehicle, problem.line or 0, problem.message)


def _latest_day(store: Store) -> dt.date:
    """Today, or the latest day of recording: a clock that was set back makes no entry one of the future."""
    latest = store.query("SELECT max(recorded_at) FROM change")[0][0]
    today = dt.date.today()
    return max(today, dt.datetime.fromisoformat(latest).astimezone().date()) if latest else today


def _at(vehicle: Vehicle, number: int, message: str) -> Fault:
    return Fault(
        f"{vehicle.name}, entry {number}: {message.replace('(line ', '(entry ')}",
        f"energytrack amend --vehicle {vehicle.name!r} --number {number}, or strike it",
    )


def counted(store: Store) -> dict[str, int]:
    """What stands in the logbook."""
    found = {"vehicles": store.query("SELECT count(*) FROM vehicle")[0][0]}
    found["entries"] = store.query("SELECT count(*) FROM standing_entry")[0][0]
    found["changes"] = store.query("SELECT count(*) FROM change")[0][0]
    return found

