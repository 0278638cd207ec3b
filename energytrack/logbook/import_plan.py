"""What importing a table of entries would do: what is new, what is there already, what cannot be true."""

from __future__ import annotations

import dataclasses
import datetime as dt
import math
from bisect import bisect_left, bisect_right
from collections import Counter
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from energytrack.errors import EntryError, UnknownNameError
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.checks import check_date, check_values
from energytrack.logbook.columns import Form
from energytrack.logbook.order import Row, driving_order, jumps, misfits, newest_first
from energytrack.logbook.records import Entry, Problem, Vehicle
from energytrack.logbook.tables import Reading, read_entries


@dataclass(slots=True)
class ImportPlan:
    """What an import would do, before anything is written."""

    file: str
    new: list[Row] = field(default_factory=list)  # in driving order, vehicle by vehicle
    typed: dict[int, dict[str, str]] = field(default_factory=dict)  # line -> what stood there, in the file's units
    known: list[Row] = field(default_factory=list)  # rows the logbook holds already
    problems: list[Problem] = field(default_factory=list)  # by line
    notes: list[str] = field(default_factory=list)


def plan_import(
    path: Path,
    form: Form,
    vehicles: Sequence[Vehicle],
    recorded: Callable[[str], Iterable[Entry]],
    standing: Callable[[str], Sequence[Entry]],
    *,
    today: dt.date,
    named: str | None = None,
    again: bool = False,
) -> ImportPlan:
    """Read the table and hold it against the logbook.

    `named`: the vehicle of all rows, whatever the file calls it. `recorded`: every entry of a vehicle as first written,
    so that one amended or struck since does not come back. `standing`: those that count. `again`: several entries at
    one odometer value are meant. Raises EntryError where the table cannot be read, UnknownNameError where it names
    vehicles the logbook lacks.
    """
    reading = read_entries(path, form)
    if not reading.whole:
        raise EntryError(str(reading.problems[-1]))
    by_name = {vehicle.name: vehicle for vehicle in vehicles}
    rows_of = _by_vehicle(reading, named, by_name)
    plan = ImportPlan(reading.file, typed=reading.typed, problems=list(reading.problems), notes=list(reading.notes))
    refused = dict(reading.refused)
    for name, rows in rows_of.items():
        if any(entry.odometer_km is None for _, entry in rows) and newest_first(rows):
            plan.notes.append("the newest entry stands first; read from the bottom up")
        bad = _implausible(rows, by_name[name], reading.file, today)
        blamed = {problem.line for problem in bad}
        equal = again or by_name[name].second_carrier is not None  # tank and battery may be filled at one place
        ordered, unordered = driving_order([row for row in rows if row[0] not in blamed], reading.file, again=equal)
        new, known = _unknown_rows(ordered, recorded(name))
        held = standing(name) if new else []
        unfit = misfits(new, held, reading.file, again=equal) + jumps(new, held, reading.file)
        problems = bad + unordered + unfit
        unfitting = {problem.line for problem in unfit}
        new = [row for row in new if row[0] not in unfitting]
        rejected = {problem.line for problem in problems}
        lost = _lost([row for row in rows if row[0] in rejected], [*held, *(entry for _, entry in new + known)])
        refused |= dict.fromkeys(lost, name)
        plan.new += new
        plan.known += known
        plan.problems += problems
    plan.problems.sort(key=lambda problem: problem.line or 0)
    _mark_missed(plan, refused, named, rows_of)
    return plan


def _by_vehicle(reading: Reading[Entry], named: str | None, known: Mapping[str, Vehicle]) -> dict[str, list[Row]]:
    """The rows of each vehicle; all of them of the one that was named."""
    names = list(dict.fromkeys(entry.vehicle for _, entry in reading.rows))
    if named is not None and len(names) > 1:
        raise EntryError(
            f"{reading.file} holds several vehicles ({', '.join(names[:10])}); leave --vehicle out to import them all"
        )
    if named is not None and names:
        if names != [named]:
            reading.rows = [(line, dataclasses.replace(entry, vehicle=named)) for line, entry in reading.rows]
        names = [named]
    if lacking := [name for name in names if name not in known]:
        have = ", ".join(known) or "none"
        raise UnknownNameError(
            f"the logbook has no vehicle {', '.join(map(repr, lacking[:10]))} (it has: {have}); add it with "
            "'vehicle add', or import with --vehicle and --carrier to add it now"
        )
    rows: dict[str, list[Row]] = {name: [] for name in names}
    for row in reading.rows:
        rows[row[1].vehicle].append(row)
    return rows


def _implausible(rows: Sequence[Row], vehicle: Vehicle, file: str, today: dt.date) -> list[Problem]:
    """Rows that cannot be true by themselves; an amount that is not known is no fault."""
    problems = []
    for line, entry in rows:
        try:
            if math.isnan(entry.energy):
                check_date(entry.date, today)
            else:
                check_values(entry, for_kind(vehicle, entry.kind), today)
        except EntryError as error:
            problems.append(Problem(str(error), file, line))
    return problems


def _unknown_rows(rows: Sequence[Row], recorded: Iterable[Entry]) -> tuple[list[Row], list[Row]]:
    """The rows not recorded yet, and those that are; equal rows count as often as they occur."""
    left = Counter(fingerprint(entry) for entry in recorded)
    new: list[Row] = []
    known: list[Row] = []
    for row in rows:
        mark = fingerprint(row[1])
        if left[mark] > 0:
            left[mark] -= 1
            known.append(row)
        else:
            new.append(row)
    return new, known


def fingerprint(entry: Entry) -> tuple[object, ...]:
    """What makes an entry this entry, as the store counts it: the moment and the amounts, no notes."""
    energy = None if math.isnan(entry.energy) else entry.energy
    return (entry.vehicle, entry.date, entry.odometer_km, entry.distance_km, energy)


def _lost(rejected: Iterable[Row], kept: Iterable[Entry]) -> list[int]:
    """Lines of rejected rows whose moment is nowhere else: a second row at one odometer value leaves no gap."""
    moments = {(entry.date, entry.odometer_km) for entry in kept if entry.odometer_km is not None}
    return [line for line, entry in rejected if (entry.date, entry.odometer_km) not in moments]


def _mark_missed(
    plan: ImportPlan, refused: Mapping[int, str | None], named: str | None, rows_of: Mapping[str, list[Row]]
) -> None:
    """An entry after a rejected row has an entry missing before it: without the mark its energy would look too low."""
    if not refused:
        return
    following: set[int] = set()
    for name, rows in rows_of.items():
        backwards = newest_first(rows)
        good = sorted(line for line, entry in plan.new + plan.known if entry.vehicle == name)
        for line, of in refused.items():
            if named is not None or of is None or of == name:
                place = bisect_left(good, line) - 1 if backwards else bisect_right(good, line)
                if 0 <= place < len(good):
                    following.add(good[place])
                else:
                    plan.notes.append(f"line {line} is rejected and no new row of {name} follows it; see that the next "
                                      "entry of this vehicle is logged with --missed")  # fmt: skip
    marked = following.intersection(line for line, _ in plan.new)
    plan.new = [(n, dataclasses.replace(entry, missed=True) if n in marked else entry) for n, entry in plan.new]
    if marked:
        plan.notes.append(f"entries after a rejected row, marked as having one missing before them: {len(marked)}")
