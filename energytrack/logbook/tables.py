"""Tables in and out: the rows of a CSV table as records, whatever is wrong with them as Problems.

Columns as in the reference of tables; optional columns may be absent.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Generic, TypeVar

from energytrack.errors import EntryError, LogbookError
from energytrack.logbook import columns
from energytrack.logbook.carriers import kind_of
from energytrack.logbook.cells import CellError
from energytrack.logbook.checks import check_known
from energytrack.logbook.columns import Form, Reader
from energytrack.logbook.csvfile import CsvFile, UnreadableTableError, open_csv
from energytrack.logbook.matching import match_columns
from energytrack.logbook.records import UNIT_OF_CARRIER, Entry, Event, Modification, Problem, Vehicle, Weather
from energytrack.logbook.written import cell, cells_of, lines, new_file

Record = TypeVar("Record")
AS_WRITTEN_HERE = Form()


@dataclass(slots=True)
class Reading(Generic[Record]):
    """What came out of a table: records with the line each stands on, problems, and remarks on how it was read."""

    file: str
    rows: list[tuple[int, Record]] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    typed: dict[int, dict[str, str]] = field(default_factory=dict)  # line -> what stood there in other units
    refused: dict[int, str | None] = field(default_factory=dict)  # line of a bad row -> the vehicle it names, if any
    whole: bool = True  # False: the table could not be read to its end, or not at all


def read_entries(path: Path, form: Form = AS_WRITTEN_HERE) -> Reading[Entry]:
    """The entries table, in the order of the file. Unknown columns of numbers become `extra`."""

    def build(values: dict[str, Any]) -> Entry:
        vehicle = _vehicle(values, form)
        extra = {name[1:]: values.pop(name) for name in [name for name in values if name[0] == "+"]}
        if "date" not in values:
            raise CellError("has no date; write the day of the entry")
        if not values.keys() & {"energy", "odometer_km", "distance_km"}:
            raise CellError("has neither energy nor odometer nor distance; nothing can be learnt from it")
        values.setdefault("energy", math.nan)
        if "kind" not in values:
            values["kind"] = form.kinds.get(vehicle) or form.kinds.get("", "fill-up")
        if form.currency and "cost" in values:
            values.setdefault("currency", form.currency)
        return Entry(**values, extra=extra) if extra else Entry(**values)

    return read_rows(path, form, columns.entry_readers(form), ("date", "energy"), build)


def read_vehicles(path: Path, form: Form = AS_WRITTEN_HERE) -> Reading[Vehicle]:
    """The vehicles table."""

    def build(values: dict[str, Any]) -> Vehicle:
        _need(values, "vehicle", "carrier")
        values.setdefault("unit", UNIT_OF_CARRIER[values["carrier"]])
        if "second_carrier" in values:
            values.setdefault("second_unit", UNIT_OF_CARRIER[values["second_carrier"]])
            if kind_of(values["carrier"]) == kind_of(values["second_carrier"]):
                raise CellError("has two carriers of one kind; one must be electricity, the other a fuel")
        elif values.keys() & {"second_unit", "second_capacity", "second_co2_kg"}:
            raise CellError("has a second unit, capacity or CO2 factor and no second carrier; fill in second_carrier")
        return Vehicle(name=values.pop("vehicle"), **values)

    reading = read_rows(path, form, columns.vehicle_readers(form), ("vehicle", "carrier"), build)
    return without_repeats(reading, lambda vehicle: vehicle.name)


def read_modifications(path: Path, form: Form = AS_WRITTEN_HERE) -> Reading[Modification]:
    """The modifications table: a row for each time a part was fitted."""

    def build(values: dict[str, Any]) -> Modification:
        _vehicle(values, form)
        _need(values, "name")
        if not values.keys() & {"fitted_date", "fitted_km"}:
            raise CellError("does not say when it was fitted; fill in fitted_date or fitted_km")
        for fitted, removed in (("fitted_date", "removed_date"), ("fitted_km", "removed_km")):
            if fitted in values and removed in values and values[removed] < values[fitted]:
                raise CellError(f"{removed} {values[removed]} comes before {fitted} {values[fitted]}")
        ends = [values.pop(name, None) for name in ("known_low_percent", "known_high_percent")]
        if ends != [None, None]:
            values["known"] = _known(*ends)
        return Modification(**values)

    return read_rows(path, form, columns.modification_readers(form), ("name",), build)


def _known(low: float | None, high: float | None) -> tuple[float, float]:
    if low is None or high is None:
        raise CellError("has one end of a known change; fill in known_low_percent and known_high_percent")
    try:
        check_known(low, high)
    except EntryError as error:
        raise CellError(str(error)) from None
    return low, high


def read_events(path: Path, form: Form = AS_WRITTEN_HERE) -> Reading[Event]:
    """The events table."""

    def build(values: dict[str, Any]) -> Event:
        _vehicle(values, form)
        _need(values, "date", "what")
        return Event(**values)

    return read_rows(path, form, columns.event_readers(form), ("date", "what"), build)


def read_weather(path: Path, form: Form = AS_WRITTEN_HERE) -> Reading[Weather]:
    """The weather table: one mean temperature a day; days without one are left out."""

    def build(values: dict[str, Any]) -> Weather | None:
        _need(values, "date")
        return Weather(**values) if "temperature_c" in values else None

    reading = read_rows(path, form, columns.weather_readers(form), ("date", "temperature_c"), build)
    return without_repeats(reading, lambda weather: weather.date)


def _vehicle(values: dict[str, Any], form: Form) -> str:
    name: str | None = values.get("vehicle", form.vehicle)
    if name is None:
        raise CellError("names no vehicle; fill in the column vehicle")
    values["vehicle"] = name
    return name


def _need(values: Mapping[str, Any], *names: str) -> None:
    if lacking := [name for name in names if name not in values]:
        raise CellError(f"lacks {' and '.join(lacking)}; fill in")


def read_rows(
    path: Path,
    form: Form,
    readers: dict[str, Reader],
    required: tuple[str, ...],
    build: Callable[[dict[str, Any]], Record | None],
) -> Reading[Record]:
    """Every row through `readers` and `build`; all problems at once, none as an exception."""
    reading: Reading[Record] = Reading(str(path))
    try:
        table, wanted = open_table(path, form, readers, required, reading.notes)
        width = len(table.header)
        for line, cells in table.rows():
            _read_row(reading, line, cells, width, wanted, build)
            if form.typed_units:
                reading.typed[line] = typed_in(cells, wanted, form.typed_units)
    except UnreadableTableError as error:
        reading.problems.append(error.problem)
        reading.whole = False
    return reading


def open_table(
    path: Path, form: Form, readers: dict[str, Reader], required: tuple[str, ...], notes: list[str]
) -> tuple[CsvFile, list[tuple[str, int, Reader]]]:
    """The file, and its columns that are read: ours, the place in a row and the reader.

    What is left out or guessed is told in `notes`. Raises UnreadableTableError.
    """
    table = open_csv(path, delimiter=form.delimiter, encoding=form.encoding)
    if table.encoding not in ("utf-8-sig", form.encoding):
        notes.append(f"{path.name} is not UTF-8; read as {table.encoding}")
    return table, match_columns(table, form, readers, required, notes)


def _read_row(
    reading: Reading[Record],
    line: int,
    cells: list[str],
    width: int,
    wanted: list[tuple[str, int, Reader]],
    build: Callable[[dict[str, Any]], Record | None],
) -> None:
    wrong: list[str] = []
    values: dict[str, Any] = {}
    if len(cells) != width:
        wrong.append(f"has {len(cells)} cells where the header has {width}; put cells with the delimiter in quotes")
    else:
        for name, place, read in wanted:
            if text := cells[place].strip():
                try:
                    values[name] = read(text)
                except CellError as error:
                    wrong.append(f"{name.removeprefix('+')} {error}")
    if not wrong:
        try:
            record = build(values)
            if record is not None:
                reading.rows.append((line, record))
        except CellError as error:
            wrong.append(str(error))
    if wrong:
        reading.problems.append(Problem("; ".join(wrong), reading.file, line))
        reading.refused[line] = values.get("vehicle")


def typed_in(cells: list[str], wanted: list[tuple[str, int, Reader]], units: Mapping[str, str]) -> dict[str, str]:
    """Column -> what stands there with its unit, for those in other units than ours."""
    found = {name: cells[place].strip() for name, place, _ in wanted if name in units and place < len(cells)}
    return {name: f"{text} {units[name]}" for name, text in found.items() if text}


def without_repeats(reading: Reading[Record], key: Callable[[Record], Any]) -> Reading[Record]:
    first: dict[Any, int] = {}
    for line, record in reading.rows:
        if key(record) in first:
            message = f"{key(record)} stands in line {first[key(record)]} already; keep one of the two"
            reading.problems.append(Problem(message, reading.file, line))
        first.setdefault(key(record), line)
    reading.rows = [(line, record) for line, record in reading.rows if first[key(record)] == line]
    return reading


def write_entries(path: Path, entries: Sequence[Entry]) -> None:
    """Write an entries table that `read_entries` brings back. Raises LogbookError; never overwrites."""
    extra = list(dict.fromkeys(name for entry in entries for name in entry.extra))
    rows = ([*cells_of(entry, columns.ENTRIES), *(cell(entry.extra.get(name)) for name in extra)] for entry in entries)
    _write(path, (*columns.ENTRIES, *map(cell, extra)), rows)


def write_vehicles(path: Path, vehicles: Sequence[Vehicle]) -> None:
    """Write a vehicles table. Raises LogbookError; never overwrites."""
    rows = ([vehicle.name, *cells_of(vehicle, columns.VEHICLES[1:])] for vehicle in vehicles)
    _write(path, columns.VEHICLES, rows)


def write_modifications(path: Path, modifications: Sequence[Modification]) -> None:
    """Write a modifications table. Raises LogbookError; never overwrites."""
    _write(path, columns.MODIFICATIONS, (cells_of(each, columns.MODIFICATIONS) for each in modifications))


def write_events(path: Path, events: Sequence[Event]) -> None:
    """Write an events table. Raises LogbookError; never overwrites."""
    _write(path, columns.EVENTS, (cells_of(event, columns.EVENTS) for event in events))


def write_weather(path: Path, weather: Sequence[Weather]) -> None:
    """Write a weather table. Raises LogbookError; never overwrites."""
    _write(path, columns.WEATHER, (cells_of(day, columns.WEATHER) for day in weather))


def _write(path: Path, header: Sequence[str], rows: Iterable[Sequence[str]]) -> None:
    try:
        with new_file(path) as file:
            file.writelines(lines([header, *rows]))
    except FileExistsError:
        raise LogbookError(f"{path} exists already; move it away or name another place") from None
    except OSError as error:
        raise LogbookError(f"{path} cannot be written: {error.strerror}") from None
