"""A logbook in one SQLite file. Each change is one transaction; what was logged is never overwritten."""

from __future__ import annotations

import datetime as dt
import json
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from energytrack.errors import LogbookError, UnknownNameError
from energytrack.logbook import rows
from energytrack.logbook.changes import ChangingFile
from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from energytrack.logbook.switches import Switch, check_switch, pair

TYPED = "terminal"  # source of entries that were typed
SAME_PLACE_KM = 0.5  # no odometer shows less
_NO_REPEAT = (  # of a chain of corrections, those that changed what makes an entry this entry, and the first
    "(this.origin IS NULL OR NOT EXISTS (SELECT 1 FROM entry AS earlier WHERE earlier.id < this.id "
    "AND earlier.id IN (SELECT this.origin UNION ALL SELECT id FROM entry WHERE origin = this.origin) "
    "AND (earlier.date, earlier.odometer_km, earlier.distance_km, earlier.energy) "
    "IS (this.date, this.odometer_km, this.distance_km, this.energy))) "
    "AND coalesce(change_id, 0) NOT IN (SELECT undoes FROM change WHERE undoes IS NOT NULL)"  # as if never logged
)


class Store(ChangingFile):
    """A logbook file, open for reading and writing. Every method raises LogbookError where the file fails it."""

    # Reading

    def vehicles(self) -> list[Vehicle]:
        """All vehicles, in the order they were added."""
        found = self._rows(f"SELECT {rows.VEHICLE_COLUMNS} FROM vehicle ORDER BY id")
        return [rows.vehicle_of(row) for row in found]

    def vehicle(self, name: str) -> Vehicle:
        """The vehicle of that name. Raises UnknownNameError with those that exist."""
        found = self._rows(f"SELECT {rows.VEHICLE_COLUMNS} FROM vehicle WHERE name = ?", name)
        if not found:
            raise self._unknown(name)
        return rows.vehicle_of(found[0])

    def entries(self, vehicle_name: str) -> list[Entry]:
        """All standing entries in driving order: by date, on one day by odometer, then as first logged."""
        return self._entries(vehicle_name, f"ORDER BY date, odometer_km, {rows.NUMBER}")

    def ever_logged(self, vehicle_name: str) -> list[Entry]:
        """Every entry as first logged, struck ones too, and every correction that changed its moment or amounts."""
        select = f"SELECT {rows.ENTRY_SELECT} FROM entry AS this WHERE vehicle_id = ? AND {_NO_REPEAT}"
        found = self._rows(select, self._number(vehicle_name))
        with self._guard():
            return [rows.entry_of(vehicle_name, row) for row in found]

    def last_entries(self, vehicle_name: str, count: int) -> list[Entry]:
        """The newest `count` standing entries in driving order, at a cost that does not grow with the logbook."""
        newest_first = f"ORDER BY date DESC, odometer_km DESC, {rows.NUMBER} DESC LIMIT ?"
        return self._entries(vehicle_name, newest_first, count)[::-1]

    def entry(self, vehicle_name: str, number: int) -> Entry:
        """The standing entry of that number. Raises UnknownNameError where there is none."""
        found = self._entries(vehicle_name, "AND id = ?", self.standing_row(number))
        if not found:
            raise UnknownNameError(f"{vehicle_name} has no entry {number}: `entries` lists them")
        return found[0]

    def neighbours(self, entry: Entry) -> tuple[Entry | None, Entry | None]:
        """The standing entries just before and after the place of another: by odometer, or by date without one.

        An entry that has a number is no neighbour of itself.
        """
        others = f"AND {rows.NUMBER} IS NOT ?"
        if entry.odometer_km is not None:
            before = f"AND odometer_km <= ? {others} ORDER BY odometer_km DESC, date DESC LIMIT 1"
            after = f"AND odometer_km > ? {others} ORDER BY odometer_km, date LIMIT 1"
            place: float | str = entry.odometer_km
        else:
            before = f"AND date <= ? {others} ORDER BY date DESC, odometer_km DESC, {rows.NUMBER} DESC LIMIT 1"
            after = f"AND date > ? {others} ORDER BY date, odometer_km, {rows.NUMBER} LIMIT 1"
            place = entry.date.isoformat()
        found = [self._entries(entry.vehicle, part, place, entry.id) for part in (before, after)]
        return next(iter(found[0]), None), next(iter(found[1]), None)

    def twin(self, entry: Entry) -> Entry | None:
        """Another entry of the same kind, day and odometer; without an odometer, of the same distance and amount."""
        part = f"AND kind = ? AND date = ? AND odometer_km IS ? AND {rows.NUMBER} IS NOT ? LIMIT 1"
        values: list[Any] = [entry.kind, entry.date.isoformat(), entry.odometer_km, entry.id]
        if entry.odometer_km is None:
            part = f"AND distance_km IS ? AND energy = ? {part}"
            values = [entry.distance_km, entry.energy, *values]
        found = self._entries(entry.vehicle, part, *values)
        return found[0] if found else None

    def modifications(self, vehicle_name: str) -> list[Modification]:
        """The periods in which each part was fitted."""
        return pair(vehicle_name, self._switches(vehicle_name))

    def events(self, vehicle_name: str) -> list[Event]:
        """All standing events by date."""
        select = f"SELECT {rows.EVENT_COLUMNS} FROM standing_event WHERE vehicle_id = ? ORDER BY date, odometer_km, id"
        with self._guard():
            return [rows.event_of(vehicle_name, row) for row in self._rows(select, self._number(vehicle_name))]

    def weather(self) -> list[Weather]:
        """Mean outside temperature by date."""
        found = self._rows("SELECT date, temperature_c FROM standing_weather ORDER BY date")
        with self._guard():
            return [Weather(dt.date.fromisoformat(date), temperature) for date, temperature in found]

    def assessments(self, vehicle_name: str) -> list[dict[str, Any]]:
        """The last answer kept for each modification, as `Assessment.to_dict()` without its looks."""
        newest = "SELECT max(id) FROM assessment WHERE vehicle_id = ? GROUP BY modification"
        select = f"SELECT result FROM assessment WHERE id IN ({newest}) ORDER BY id"
        found = self._rows(select, self._number(vehicle_name))
        with self._guard():
            return [json.loads(row[0]) for row in found]

    def looks(self, vehicle_name: str, modification: str) -> list[float]:
        """How far the log had come (km) at each look that was taken at this modification, in driving order."""
        select = "SELECT at_km FROM look WHERE vehicle_id = ? AND modification = ? ORDER BY at_km"
        return [row[0] for row in self._rows(select, self._number(vehicle_name), modification)]

    # Writing

    def add_vehicle(self, vehicle: Vehicle) -> None:
        """Add a vehicle; its name must be new."""
        with self.transaction(), self._guard():
            if self._rows("SELECT 1 FROM vehicle WHERE name = ?", vehicle.name):
                raise LogbookError(f"there is a vehicle {vehicle.name!r} already: choose another name")
            columns = rows.VEHICLE_COLUMNS.split(", ")
            values = {column: getattr(vehicle, column) for column in columns}
            rows.insert(self._db, "vehicle", {**values, "change_id": self.change("vehicle added")})

    def add_entry(self, entry: Entry, typed: Mapping[str, Any]) -> int:
        """Append one entry with what was typed for it; its number."""
        with self.transaction(), self._guard():
            values = self._written(self._number(entry.vehicle), entry, typed, TYPED)
            number = rows.insert(self._db, "entry", {**values, "change_id": self.change("logged")})
            if entry.confirmed:
                self.confirm(number)
            return number

    def add_entries(self, entries: Sequence[tuple[Entry, Mapping[str, Any]]], source: str) -> int:
        """Append the entries that were never logged before, in one transaction; how many they are.

        An entry was logged before where vehicle, day, odometer, distance and amount agree; struck and corrected ones
        count, and corrections, so that the same file adds nothing the second time, nor does the logbook's own export.
        Of n equal ones, those missing are added.
        """
        left: Counter[tuple[Any, ...]] = Counter()
        numbers: dict[str, int] = {}
        new: list[dict[str, Any]] = []
        confirmed: list[bool] = []
        with self.transaction(), self._guard():
            for entry, typed in entries:
                if entry.vehicle not in numbers:
                    numbers[entry.vehicle] = self._number(entry.vehicle)
                    left.update(self._logged(numbers[entry.vehicle]))
                values = self._written(numbers[entry.vehicle], entry, typed, source)
                key = tuple(values[name] for name in ("vehicle_id", "date", "odometer_km", "distance_km", "energy"))
                if left[key] > 0:
                    left[key] -= 1
                else:
                    new.append(values)
                    confirmed.append(entry.confirmed)
            if not new:
                return 0
            change = self.change("imported")
            for values in new:
                values["change_id"] = change
            rows.insert_all(self._db, "entry", new)
            first = self._rows("SELECT coalesce(max(id), 0) FROM entry")[0][0] - len(new) + 1  # numbers never have gaps
            kept = [{"entry_id": first + n, "change_id": change} for n, sure in enumerate(confirmed) if sure]
            rows.insert_all(self._db, "confirmation", kept)
        return len(new)

    def add_in_order(self, batches: Iterable[Mapping[str, Sequence[Any]]], source: str) -> int:
        """Append the entries of batches, columns of equal length by name; how many. None may be logged already.

        `vehicle` names the vehicle; the other columns are those of the file.
        """
        added, numbers = 0, {vehicle: number for number, vehicle in self._rows("SELECT id, name FROM vehicle")}
        with self.transaction(), self._guard(), self.only_appending("entry"):
            for batch in batches:
                columns = dict(batch)
                columns["vehicle_id"] = [numbers[name] for name in columns.pop("vehicle")]
                constants = {"source": source, "change_id": self.change("imported")}
                added += rows.insert_columns(self._db, "entry", columns, constants)
        return added

    def has_entries(self, vehicle_name: str) -> bool:
        """Was anything ever logged of this vehicle?"""
        return bool(self._rows("SELECT 1 FROM entry WHERE vehicle_id = ? LIMIT 1", self._number(vehicle_name)))

    def confirm(self, number: int) -> None:
        """Keep a standing entry that looks odd; once is enough. Raises UnknownNameError where there is none."""
        with self.transaction(), self._guard():
            row = self.standing_row(number)
            if not self._rows("SELECT 1 FROM confirmation WHERE entry_id = ?", row):
                rows.insert(self._db, "confirmation", {"entry_id": row, "change_id": self.change("confirmed")})

    def fit(
        self,
        vehicle: str,
        name: str,
        date: dt.date | None,
        km: float | None,
        target: float | None = None,
        level: float | None = None,
        note: str = "",
        known: tuple[float, float] | None = None,
        reversible: bool = True,
    ) -> None:
        """Log a part as fitted. Raises EntryError where it is on already at this level."""
        self._switch(vehicle, Switch(name, True, date, km, level, target, note, known, reversible))

    def remove(self, vehicle: str, name: str, date: dt.date | None, km: float | None) -> None:
        """Log a part as removed. Raises EntryError where it is not on, with what is."""
        self._switch(vehicle, Switch(name, False, date, km))

    def add_event(self, event: Event) -> None:
        """Append one event."""
        values = {name: getattr(event, name) for name in ("what", "odometer_km", "odometer_factor", "note")}
        with self.transaction(), self._guard():
            values |= {"vehicle_id": self._number(event.vehicle), "date": event.date.isoformat()}
            rows.insert(self._db, "event", {**values, "change_id": self.change("event logged")})

    def add_weather(self, weather: Sequence[Weather]) -> None:
        """Keep temperatures by day; of a day given again the newest counts."""
        with self.transaction(), self._guard():
            change = self.change("weather brought in")
            values = [
                {"date": day.date.isoformat(), "temperature_c": day.temperature_c, "change_id": change}
                for day in weather
            ]
            rows.insert_all(self._db, "weather", values)

    def keep_assessment(self, vehicle: str, modification: str, result: Mapping[str, Any]) -> None:
        """Keep an answer, without its looks, for the echo of the entries to come."""
        kept = json.dumps({key: value for key, value in result.items() if key != "looks"}, allow_nan=False)
        with self.transaction(), self._guard():
            values = {"vehicle_id": self._number(vehicle), "modification": modification, "result": kept}
            rows.insert(self._db, "assessment", values)

    def record_look(self, vehicle: str, modification: str, at_km: float, date: dt.date) -> None:
        """Note that someone looked when the log had come this far; once for each modification and end of a segment."""
        with self.transaction(), self._guard():
            if any(abs(at_km - taken) < SAME_PLACE_KM for taken in self.looks(vehicle, modification)):
                return
            values = {"modification": modification, "at_km": at_km, "date": date.isoformat()}
            rows.insert(self._db, "look", {"vehicle_id": self._number(vehicle), **values})

    def watch(self, vehicle_name: str) -> dict[str, Any] | None:
        """The state kept of a vehicle's monitor; None where none is, or where what it was made of has changed since:
        an entry corrected, struck or brought in among the older ones, a part fitted or removed, an event logged.
        """
        select = "SELECT state, entry_row, switch_row, event_row FROM watch WHERE vehicle_id = ?"
        number = self._number(vehicle_name)
        found = self._rows(select, number)
        if not found:
            return None
        with self._guard():
            state: dict[str, Any] = json.loads(found[0][0])
        older = "SELECT 1 FROM entry WHERE id > ? AND vehicle_id = ? AND (supersedes IS NOT NULL OR date < ?) LIMIT 1"
        changed = self._rows(older, found[0][1], number, state.get("end_date", ""))
        for table, row in zip(("switch", "event"), found[0][2:], strict=True):
            changed += self._rows(f"SELECT 1 FROM {table} WHERE id > ? AND vehicle_id = ? LIMIT 1", row, number)
        return None if changed else state

    def keep_watch(self, vehicle_name: str, state: Mapping[str, Any] | None) -> None:
        """Keep the state of a vehicle's monitor in the place of the last one, or none."""
        tables = ("entry", "switch", "event")
        with self.transaction(), self._guard():
            number = self._number(vehicle_name)
            self._db.execute("DELETE FROM watch WHERE vehicle_id = ?", (number,))
            if state is not None:
                newest = {f"{table}_row": self._rows(f"SELECT coalesce(max(id), 0) FROM {table}")[0][0]
                          for table in tables}  # fmt: skip
                kept = {"vehicle_id": number, "state": json.dumps(state, allow_nan=False), **newest}
                rows.insert(self._db, "watch", kept)

    # Inside

    def _number(self, vehicle_name: str) -> int:
        found = self._rows("SELECT id FROM vehicle WHERE name = ?", vehicle_name)
        if not found:
            raise self._unknown(vehicle_name)
        number: int = found[0][0]
        return number

    def _unknown(self, name: str) -> UnknownNameError:
        names = ", ".join(vehicle.name for vehicle in self.vehicles())
        known = f"there are: {names}" if names else "there are none yet, add one with `vehicle add`"
        return UnknownNameError(f"no vehicle {name!r} in this logbook; {known}")

    def _entries(self, vehicle_name: str, part: str, *values: Any) -> list[Entry]:
        select = f"SELECT {rows.ENTRY_SELECT} FROM standing_entry WHERE vehicle_id = ? {part}"
        found = self._rows(select, self._number(vehicle_name), *values)
        with self._guard():
            return [rows.entry_of(vehicle_name, row) for row in found]

    def _written(self, number: int, entry: Entry, typed: Mapping[str, Any], source: str) -> dict[str, Any]:
        kept = json.dumps(dict(typed)) if typed else "{}"
        return {"vehicle_id": number, **rows.entry_values(entry), "typed": kept, "source": source}

    def _logged(self, number: int) -> list[tuple[Any, ...]]:
        """What makes each entry of a vehicle this entry, those corrected or struck since among them."""
        columns = "vehicle_id, date, odometer_km, distance_km, energy"
        return self._rows(f"SELECT {columns} FROM entry AS this WHERE vehicle_id = ? AND {_NO_REPEAT}", number)

    def _switches(self, vehicle_name: str) -> list[Switch]:
        select = f"SELECT {rows.SWITCH_COLUMNS} FROM standing_switch WHERE vehicle_id = ? ORDER BY id"
        found = self._rows(select, self._number(vehicle_name))
        with self._guard():
            return [rows.switch_of(row) for row in found]

    def _switch(self, vehicle: str, switch: Switch) -> None:
        with self.transaction(), self._guard():
            check_switch(vehicle, self._switches(vehicle), switch)
            values = {"vehicle_id": self._number(vehicle), **rows.switch_values(switch)}
            action = "part fitted" if switch.fitted else "part removed"
            rows.insert(self._db, "switch", {**values, "change_id": self.change(action)})
