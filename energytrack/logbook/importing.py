"""Bringing a foreign table, or a folder of tables, into a logbook file: the whole of it or nothing, and only once."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Collection, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from energytrack.errors import EntryError, LogbookError, UnknownNameError
from energytrack.logbook import merging
from energytrack.logbook.columns import Form
from energytrack.logbook.folder import Folder
from energytrack.logbook.import_plan import ImportPlan, plan_import
from energytrack.logbook.in_order import NotPlainError, PlainTable
from energytrack.logbook.opening import open_logbook
from energytrack.logbook.quantities import ENERGY
from energytrack.logbook.records import Problem, Vehicle
from energytrack.logbook.rejected import BadRowsError, write_rejected
from energytrack.logbook.store import Store
from energytrack.logbook.tables import Reading, read_events, read_modifications, read_weather

OTHER_TABLES: dict[str, tuple[Callable[[Path, Form], Reading[Any]], Callable[[Any, Sequence[Any]], int]]] = {
    "modifications": (read_modifications, merging.merge_modifications),
    "events": (read_events, merging.merge_events),
    "weather": (read_weather, merging.merge_weather),
}


@dataclass(frozen=True, slots=True)
class Request:
    """What is to be imported, and how it is written."""

    path: Path
    form: Form
    table: str = "entries"  # or a key of OTHER_TABLES; a folder holds them all
    vehicle: str | None = None  # of all rows
    new_vehicle: Vehicle | None = None  # added where the logbook does not have it
    kind: str | None = None  # of entries that do not say
    energy_unit: str | None = None  # a key of quantities.ENERGY; None: the vehicle's unit
    again: bool = False
    skip_bad: Path | None = None  # new file for the bad rows; None: any bad row refuses the import


@dataclass(slots=True)
class Outcome:
    """What an import did."""

    file: str
    new: dict[str, int] = field(default_factory=dict)  # table -> rows added
    already: dict[str, int] = field(default_factory=dict)  # table -> rows that were there
    rejected: list[Problem] = field(default_factory=list)
    rejected_file: Path | None = None
    notes: list[str] = field(default_factory=list)

    def count(self, table: str, new: int, rows: int) -> None:
        self.new[table], self.already[table] = new, rows - new

    def to_dict(self) -> dict[str, Any]:
        return {
            "file": self.file,
            "new": self.new,
            "already": self.already,
            "rejected": [{"line": problem.line, "reason": problem.message} for problem in self.rejected],
            "rejected_file": str(self.rejected_file) if self.rejected_file else None,
            "notes": self.notes,
        }


def run_import(request: Request, logbook: Path, today: dt.date) -> Outcome:
    """Read, check and write; a logbook that does not exist is started where the request brings its vehicle.

    Raises EntryError listing every bad row, LogbookError, UnknownNameError; then nothing was written.
    """
    store = None if request.new_vehicle is not None and not logbook.exists() else open_logbook(logbook)
    if isinstance(store, Folder):
        store.refuse_writing()
    if request.path.is_dir():
        return _import_folder(request, _there(store, logbook), today)
    if request.table == "entries":
        return _import_entries(request, store, logbook, today)
    return _import_other(request, _there(store, logbook))


def _there(store: Store | None, logbook: Path) -> Store:
    if store is None:
        raise LogbookError(f"there is no logbook {logbook}; start it with 'new', or import its entries first")
    return store


def _import_entries(request: Request, store: Store | None, logbook: Path, today: dt.date) -> Outcome:
    vehicles = store.vehicles() if store else []
    added = _vehicle_to_add(request.new_vehicle, vehicles)
    known = [*vehicles, *([added] if added else [])]
    request = _with_defaults(request, known)
    if in_order := _import_in_order(request, store, logbook, added, known, today):
        return in_order
    plan = _planned(request, request.path, store, known, today)
    notes = plan.notes + _unit_notes(request, {entry.vehicle for _, entry in plan.new}, known)
    outcome = Outcome(str(request.path), rejected=plan.problems, notes=notes)
    with _rejects(request, request.path, plan.problems, outcome):
        store = store or Store.create(logbook)
        with store.transaction("imported"):
            if added:
                store.add_vehicle(added)
            _add(store, plan, request, outcome)
    return outcome


def _import_in_order(
    request: Request,
    store: Store | None,
    logbook: Path,
    added: Vehicle | None,
    known: Sequence[Vehicle],
    today: dt.date,
) -> Outcome | None:
    """The short way, for a table without fault and in driving order, of vehicles without entries; else None."""
    outcome = Outcome(str(request.path))
    starts = store is None
    try:
        table = PlainTable.open(request.path, request.form, outcome.notes)
        store = store or Store.create(logbook)
        with store.transaction("imported"):
            if added:
                store.add_vehicle(added)
            held = {vehicle.name for vehicle in store.vehicles() if store.has_entries(vehicle.name)}
            empty = {vehicle.name: vehicle for vehicle in known if vehicle.name not in held}
            rows = store.add_in_order(table.batches(empty, request.vehicle, today), request.path.name)
            _check_units(request, table.vehicles, known)
    except BaseException as error:
        if starts and store:
            store.close()
            logbook.unlink(missing_ok=True)
        if isinstance(error, NotPlainError):
            return None
        raise
    outcome.count("entries", rows, rows)
    outcome.notes += _unit_notes(request, table.vehicles, known)
    return outcome


def _import_folder(request: Request, store: Store, today: dt.date) -> Outcome:
    from energytrack.logbook import restoring  # only here: a folder seldom comes in

    left_out = restoring.why_not(store, request.path)
    if left_out is None:
        return _restored(request, store)
    folder = Folder(request.path)
    names = {vehicle.name for vehicle in store.vehicles()}
    known = [*store.vehicles(), *(vehicle for vehicle in folder.vehicles() if vehicle.name not in names)]
    request = replace(_with_defaults(request, known), again=True)
    entries = request.path / "entries.csv"
    plan = _planned(request, entries, store, known, today)
    notes = [*plan.notes, *([left_out] if left_out else [])]
    outcome = Outcome(str(request.path), rejected=plan.problems, notes=notes)
    with _rejects(request, entries, plan.problems, outcome), store.transaction("imported"):
        outcome.count("vehicles", merging.merge_vehicles(store, folder.vehicles()), len(folder.vehicles()))
        _add(store, plan, request, outcome)
        modifications = [row for vehicle in folder.vehicles() for row in folder.modifications(vehicle.name)]
        outcome.count("modifications", merging.merge_modifications(store, modifications), len(modifications))
        events = [row for vehicle in folder.vehicles() for row in folder.events(vehicle.name)]
        outcome.count("events", merging.merge_events(store, events), len(events))
        outcome.count("weather", merging.merge_weather(store, folder.weather()), len(folder.weather()))
    return outcome


def _restored(request: Request, store: Store) -> Outcome:
    """An exported folder into a new logbook: every row, the history too."""
    from energytrack.logbook.restoring import restore

    outcome = Outcome(str(request.path))
    for table, rows in restore(store, request.path).items():
        outcome.count(table, rows, rows)
    return outcome


def _import_other(request: Request, store: Store) -> Outcome:
    read, merge = OTHER_TABLES[request.table]
    vehicles = store.vehicles()
    reading = read(request.path, _with_defaults(request, vehicles).form)
    if not reading.whole:
        raise EntryError(str(reading.problems[-1]))
    rows = [record for _, record in reading.rows]
    if request.table != "weather":
        if request.vehicle is not None:
            rows = [replace(row, vehicle=request.vehicle) for row in rows]
        for name in dict.fromkeys(row.vehicle for row in rows):
            store.vehicle(name)
    outcome = Outcome(str(request.path), rejected=reading.problems, notes=reading.notes)
    with _rejects(request, request.path, reading.problems, outcome), store.transaction("imported"):
        outcome.count(request.table, merge(store, rows), len(rows))
    return outcome


def _planned(
    request: Request, path: Path, store: Store | None, known: Sequence[Vehicle], today: dt.date
) -> ImportPlan:
    held = {vehicle.name for vehicle in store.vehicles()} if store else set()
    plan = plan_import(
        path,
        request.form,
        known,
        lambda name: store.ever_logged(name) if store and name in held else [],
        lambda name: store.entries(name) if store and name in held else [],
        today=today,
        named=request.vehicle,
        again=request.again,
    )
    _check_units(request, {entry.vehicle for _, entry in plan.new + plan.known}, known)
    return plan


def _check_units(request: Request, used: Collection[str], known: Sequence[Vehicle]) -> None:
    """The unit of energy named must be one of every vehicle in the file. Raises EntryError."""
    if request.energy_unit is None:
        return
    base = ENERGY[request.energy_unit][0]
    if both := [vehicle for vehicle in known if vehicle.name in used and vehicle.second_unit is not None]:
        units = f"{both[0].unit} and {both[0].second_unit}"
        raise EntryError(f"energy of {both[0].name} is counted in {units}: convert the file, no --energy-unit")
    if wrong := [vehicle for vehicle in known if vehicle.name in used and vehicle.unit != base]:
        raise EntryError(f"energy of {wrong[0].name} is counted in {wrong[0].unit}, not in {request.energy_unit}")


def _add(store: Store, plan: ImportPlan, request: Request, outcome: Outcome) -> None:
    """Known rows too: the store counts equal ones, and it alone knows what was logged in the meantime."""
    pairs = [(entry, plan.typed.get(line, {})) for line, entry in plan.known + plan.new]
    outcome.count("entries", store.add_entries(pairs, source=request.path.name), len(pairs))


def _vehicle_to_add(wanted: Vehicle | None, known: Sequence[Vehicle]) -> Vehicle | None:
    if wanted is None:
        return None
    for vehicle in known:
        if vehicle.name == wanted.name:
            if vehicle.carrier != wanted.carrier:
                here = f"{wanted.name} is in the logbook already, with {vehicle.carrier}"
                raise EntryError(f"{here}; leave --carrier out, or name another vehicle")
            return None
    return wanted


def _with_defaults(request: Request, known: Sequence[Vehicle]) -> Request:
    """The request with the vehicle and the kind of rows that name none."""
    if request.vehicle is not None and request.vehicle not in {vehicle.name for vehicle in known}:
        have = ", ".join(vehicle.name for vehicle in known) or "none"
        raise UnknownNameError(
            f"no vehicle {request.vehicle!r} in this logbook; it has: {have}. Give --carrier to add it with this import"
        )
    electric = {vehicle.name: "charge" for vehicle in known if vehicle.carrier == "electricity"}
    only = known[0].name if len(known) == 1 else None
    default = request.vehicle or only
    kinds = {"": request.kind} if request.kind else electric | {"": electric.get(default or "", "fill-up")}
    return replace(request, form=replace(request.form, vehicle=default, kinds=kinds))


def _unit_notes(request: Request, used: Collection[str], known: Sequence[Vehicle]) -> list[str]:
    """Say what was assumed where the vehicle is usually logged in other units."""
    notes = []
    for vehicle in known:
        if vehicle.name in used and vehicle.distance_unit != "km" and "odometer_km" not in request.form.typed_units:
            notes.append(f"distances of {vehicle.name} were read as km; if they are miles, give --odometer-unit mi")
        if vehicle.name in used and vehicle.typed_unit not in (None, vehicle.unit) and request.energy_unit is None:
            notes.append(f"energy of {vehicle.name} was read as {vehicle.unit}; else give --energy-unit")
    return notes


@contextmanager
def _rejects(request: Request, path: Path, problems: Sequence[Problem], outcome: Outcome) -> Iterator[None]:
    """Refuse bad rows or set them aside; the file of rejected rows goes again if the writing inside fails."""
    if problems and request.skip_bad is None:
        raise BadRowsError(str(path), problems)
    target = request.skip_bad if problems else None
    if target is not None:
        write_rejected(target, path, request.form, problems)
        outcome.rejected_file = target
    try:
        yield
    except BaseException:
        if target is not None:
            target.unlink(missing_ok=True)
        raise
