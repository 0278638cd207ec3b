"""A table that is in driving order and without fault, brought in batch by batch: whatever its size, little memory.

Every other table is read whole (`import_plan`), which can say what is wrong with it, put it in order and find the rows
that are known. Both ways apply the same readers and rules.
"""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Iterator, Sequence
from itertools import islice
from pathlib import Path
from typing import Any

from energytrack.errors import EntryError
from energytrack.logbook import columns
from energytrack.logbook.carriers import for_kind
from energytrack.logbook.cells import CellError
from energytrack.logbook.checks import FARTHEST_DAY_KM, check_values
from energytrack.logbook.columns import Form, Reader
from energytrack.logbook.csvfile import CsvFile, UnreadableTableError
from energytrack.logbook.records import Entry, Vehicle
from energytrack.logbook.tables import open_table, typed_in

BATCH = 10_000  # rows
REMEMBERED = 20_000  # texts of a column
Column = Sequence[Any]
_KEPT = ("odometer_km", "distance_km", "energy", "level_percent", "cost", "currency", "temperature_c", "speed_kmh")
_RANGES = ("date", "odometer_km", "distance_km", "energy", "level_percent", "cost", "temperature_c", "speed_kmh")
COLUMNS = ("vehicle", "date", *_KEPT, "kind", "full", "missed", "place", "note", "extra", "typed")


class NotPlainError(Exception):
    """The table must be read whole."""


class PlainTable:
    """The rows of an entries table, for as long as they are plain: complete, possible, each after the one before it."""

    def __init__(self, table: CsvFile, wanted: list[tuple[str, int, Reader]], form: Form) -> None:
        self._table, self._wanted, self._form = table, wanted, form
        self._last: dict[str, tuple[dt.date, float]] = {}  # vehicle -> where its newest row stands
        self._seen: dict[str, dict[str, Any]] = {}  # column -> text -> what it means
        self._names: set[str] = set()  # of vehicles, as the file has them

    @classmethod
    def open(cls, path: Path, form: Form, notes: list[str]) -> PlainTable:
        """Raises NotPlainError where the table cannot be read."""
        try:
            return cls(*open_table(path, form, columns.entry_readers(form), ("date", "energy"), notes), form)
        except UnreadableTableError:
            raise NotPlainError from None

    @property
    def vehicles(self) -> list[str]:
        """Those met so far."""
        return list(self._last)

    def batches(self, known: dict[str, Vehicle], named: str | None, today: dt.date) -> Iterator[dict[str, Column]]:
        """Column -> values, in the order of COLUMNS, batch after batch. `named`: the vehicle of all rows.

        Raises NotPlainError, for a vehicle that is not known too.
        """
        rows = self._table.rows()
        try:
            while batch := list(islice(rows, BATCH)):
                values = self._read([cells for _, cells in batch])
                self._names.update(values["vehicle"])
                if named is not None:
                    if len(self._names) > 1:
                        raise NotPlainError
                    values["vehicle"] = [named] * len(batch)
                self._check_order(values, known)
                _check_ranges(values, known, today)
                yield _stored(values)
        except (UnreadableTableError, CellError, EntryError):
            raise NotPlainError from None

    def _read(self, rows: list[list[str]]) -> dict[str, Column]:
        """Every column through its reader; a text that was met lately is not read again."""
        if set(map(len, rows)) != {len(self._table.header)}:
            raise NotPlainError
        cells = list(zip(*rows, strict=True))
        values: dict[str, Column] = {name: self._column(name, cells[place], read) for name, place, read in self._wanted}
        count = len(rows)
        if self._form.typed_units:
            values["typed"] = [json.dumps(typed_in(row, self._wanted, self._form.typed_units)) for row in rows]
        values["extra"] = _extra({name[1:]: values.pop(name) for name in list(values) if name[0] == "+"}, count)
        return self._filled(values, count)

    def _column(self, name: str, texts: Sequence[str], read: Reader) -> list[Any]:
        """Each value of a column; None for an empty cell."""
        seen = self._seen.setdefault(name, {})
        if len(seen) > REMEMBERED:
            seen.clear()
        for text in set(texts).difference(seen):
            stripped = text.strip()
            seen[text] = read(stripped) if stripped else None
        return list(map(seen.__getitem__, texts))

    def _filled(self, values: dict[str, Column], count: int) -> dict[str, Column]:
        """What a row that does not say stands for, as for a table that is read whole."""
        form = self._form
        none = [None] * count
        if any(None in values.get(name, none) for name in ("date", "energy", "odometer_km")):
            raise NotPlainError
        if any(values.pop("confirmed", ())):
            raise NotPlainError
        vehicles = values["vehicle"] = _default(values.get("vehicle", none), form.vehicle)
        if None in vehicles:
            raise NotPlainError
        usual = {name: form.kinds.get(name) or form.kinds.get("", "fill-up") for name in set(vehicles)}
        kinds = values.get("kind", none)
        values["kind"] = [kind or usual[name] for kind, name in zip(kinds, vehicles, strict=True)]
        if form.currency:
            paid = zip(values.get("currency", none), values.get("cost", none), strict=True)
            values["currency"] = [form.currency if own is None and cost is not None else own for own, cost in paid]
        for name, usually in (("full", True), ("missed", False), ("place", ""), ("note", ""), ("typed", "{}")):
            values[name] = _default(values.get(name, none), usually)
        return values

    def _check_order(self, values: dict[str, Column], known: dict[str, Vehicle]) -> None:
        """Date and odometer of each vehicle rise, by no more than a vehicle drives in that time."""
        last = self._last
        for name, date, km in zip(values["vehicle"], values["date"], values["odometer_km"], strict=True):
            if name in last:
                before, there = last[name]
                if not (before <= date and there < km):
                    raise NotPlainError
                if km - there > FARTHEST_DAY_KM and km - there > FARTHEST_DAY_KM * ((date - before).days + 1):
                    raise NotPlainError
            elif name not in known:
                raise NotPlainError
            last[name] = date, km


def _default(column: Column, value: Any) -> Column:
    return [value if each is None else each for each in column] if None in column else column


def _extra(further: dict[str, Column], count: int) -> list[str]:
    if not further:
        return ["{}"] * count
    rows = zip(*further.values(), strict=True)
    return [json.dumps({n: v for n, v in zip(further, row, strict=True) if v is not None}) for row in rows]


def _check_ranges(values: dict[str, Column], known: dict[str, Vehicle], today: dt.date) -> None:
    """The rules of an entry alone hold for all rows of a vehicle and kind if they hold for the extremes.

    Each of them is a range of one value. Raises EntryError.
    """
    groups: dict[tuple[str, str], list[int]] = {}
    pairs = list(zip(values["vehicle"], values["kind"], strict=True))
    if len(set(pairs)) == 1:
        groups[pairs[0]] = []  # all rows
    else:
        for place, pair in enumerate(pairs):
            groups.setdefault(pair, []).append(place)
    for (name, kind), places in groups.items():
        given: dict[str, list[Any]] = {}
        for column in filter(values.__contains__, _RANGES):
            whole = values[column]
            own = [whole[place] for place in places] if places else whole
            given[column] = [value for value in own if value is not None] if None in own else list(own)
        for extreme in (min, max):
            entry = Entry(name, kind=kind, **{column: extreme(own) for column, own in given.items() if own})
            check_values(entry, for_kind(known[name], kind), today)


def _stored(values: dict[str, Column]) -> dict[str, Column]:
    days = {day: day.isoformat() for day in set(values["date"])}
    stored = {**values, "date": [days[day] for day in values["date"]]}
    return {name: stored[name] for name in COLUMNS if name in stored}
