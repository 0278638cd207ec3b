"""What an export holds: the tables as they stand, and in `history/` every row of the logbook file."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

from energytrack.logbook import columns
from energytrack.logbook.store import Store
from energytrack.logbook.written import cell, cells_of, lines

HISTORY = "history"
EMPTY = "'"  # of a cell: there is a text, and it is empty
_FLAGS = ("full", "missed", "confirmed", "reversible")
_DATES = ("date", "fitted_date", "removed_date")
_TEXTS = (
    *("vehicle", "kind", "currency", "place", "note", "carrier", "unit", "distance_unit", "display", "typed_unit"),
    *("second_carrier", "second_unit", "name", "what"),
)
_PRIVATE = ("place", "note")
_TYPES = {"INTEGER": "integer", "REAL": "number", "TEXT": "string"}


@dataclass(frozen=True, slots=True)
class Column:
    """A column of an exported table."""

    name: str
    type: str  # as the Table Schema standard names it
    required: bool = False


@dataclass(frozen=True, slots=True)
class Table:
    """A table of an export; `rows` yields the cells of its rows anew at every call."""

    file: str  # within the folder, with /
    columns: tuple[Column, ...]
    rows: Callable[[], Iterable[list[str]]]

    def text(self) -> Iterator[str]:
        """The file, line by line."""
        yield from lines([[cell(column.name) for column in self.columns]])
        yield from lines(self.rows())

    def digest(self) -> str:
        """SHA-256 of the file, without writing it."""
        seen = hashlib.sha256()
        for line in self.text():
            seen.update(line.encode())
        return seen.hexdigest()


def tables_of(store: Store, *, without_places: bool = False) -> list[Table]:
    """All tables of an export. Without places: no places, no notes, and no history, which knows them and the times."""
    dropped = _PRIVATE if without_places else ()
    standing = _standing(store, dropped)
    return standing if without_places else standing + history_tables(store)


def history_tables(store: Store) -> list[Table]:
    """Every table of the logbook file, row by row."""
    names = "SELECT name FROM sqlite_schema WHERE type = 'table' AND name NOT LIKE 'sqlite_%' ORDER BY name"
    return [_whole(store, name) for (name,) in store.query(names)]


def _standing(store: Store, dropped: tuple[str, ...]) -> list[Table]:
    vehicles = store.vehicles()
    extra = dict.fromkeys(name for vehicle in vehicles for each in store.entries(vehicle.name) for name in each.extra)

    def vehicle_rows(names: list[str]) -> Iterator[list[str]]:
        return ([cell(vehicle.name), *cells_of(vehicle, names[1:])] for vehicle in vehicles)

    def entry_rows(names: list[str]) -> Iterator[list[str]]:
        own = [name for name in names if name not in extra]
        for vehicle in vehicles:
            for entry in store.entries(vehicle.name):
                yield [*cells_of(entry, own), *(cell(entry.extra.get(name)) for name in extra)]

    def of_each(read: Callable[[str], Iterable[object]], names: list[str]) -> Iterator[list[str]]:
        for vehicle in vehicles:
            yield from (cells_of(record, names) for record in read(vehicle.name))

    def table(file: str, all_names: Iterable[str], rows: Callable[[list[str]], Iterable[list[str]]]) -> Table:
        names = [name for name in all_names if name not in dropped]
        return Table(file, tuple(_column(name) for name in names), lambda: rows(names))

    return [
        table("vehicles.csv", columns.VEHICLES, vehicle_rows),
        table("entries.csv", (*columns.ENTRIES, *extra), entry_rows),
        table("modifications.csv", columns.MODIFICATIONS, lambda names: of_each(store.modifications, names)),
        table("events.csv", columns.EVENTS, lambda names: of_each(store.events, names)),
        table("weather.csv", columns.WEATHER, lambda names: (cells_of(day, names) for day in store.weather())),
    ]


def _column(name: str) -> Column:
    types = {**dict.fromkeys(_FLAGS, "boolean"), **dict.fromkeys(_DATES, "date"), **dict.fromkeys(_TEXTS, "string")}
    return Column(name, types.get(name, "number"))


def _whole(store: Store, name: str) -> Table:
    """A table of the file with all its columns; an empty text that could be missing is told from a missing one."""
    shape = store.query("SELECT name, type, \"notnull\" OR pk > 0, pk FROM pragma_table_info(?) ORDER BY cid", name)
    found = tuple(Column(column, _TYPES[type_], bool(needed)) for column, type_, needed, _ in shape)
    key = next(column for column, _, _, place in shape if place == 1)
    select = f"SELECT {', '.join(column.name for column in found)} FROM {name} ORDER BY {key}"
    optional = [not column.required for column in found]

    def rows() -> Iterator[list[str]]:
        for row in store.each(select):
            yield [EMPTY if value == "" and free else cell(value) for value, free in zip(row, optional, strict=True)]

    return Table(f"{HISTORY}/{name}.csv", found, rows)

