"""An exported folder brought into a new logbook row by row, so that it is the logbook it was exported from."""

from __future__ import annotations

import csv
import hashlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from energytrack.errors import LogbookError
from energytrack.logbook import schema
from energytrack.logbook.export_tables import EMPTY, Column, Table, history_tables, tables_of
from energytrack.logbook.formulas import restored
from energytrack.logbook.package import digests, read_descriptor
from energytrack.logbook.store import Store

_LONGEST = 1 << 30  # characters of a cell: what was kept is brought back, however long


def why_not(store: Store, folder: Path) -> str | None:
    """Why the history of a folder cannot be brought into this logbook; "" where it has none, None where it can."""
    package = read_descriptor(folder)
    if package is None or not (folder / "history").is_dir():
        return ""
    if store.last_change() or store.vehicles():
        return "the history in the folder was left out: it can only be brought into a new logbook"
    if package["logbook_version"] > len(schema.MIGRATIONS):
        return "the history in the folder was left out: a newer energytrack wrote it"
    stated = digests(package)
    changed = [file for file in stated if _digest(folder, file) != stated[file]]
    if changed:
        return f"the history in the folder was left out: {', '.join(changed[:3])} changed since the export"
    return None


def restore(store: Store, folder: Path) -> dict[str, int]:
    """Fill an empty logbook with every row of the folder; rows by table. Raises LogbookError, then nothing was written.

    What the logbook then holds must be what the folder's own tables say.
    """
    package = read_descriptor(folder) or {}
    counted = {}
    with store.transaction():
        store.defer_references()
        for table in history_tables(store):
            path = folder / table.file
            counted[path.stem] = store.fill(path.stem, *_read(path, table)) if path.is_file() else 0
        if package["logbook_version"] == len(schema.MIGRATIONS):
            stated = digests(package)
            wrong = [table.file for table in tables_of(store) if table.digest() != stated.get(table.file)]
            if wrong:
                raise LogbookError(f"{folder}: {wrong[0]} and the history do not agree; import single tables instead")
    return counted


def _digest(folder: Path, file: str) -> str:
    path = folder / file
    if not path.is_file() or not path.resolve().is_relative_to(folder.resolve()):
        return ""
    seen = hashlib.sha256()
    with path.open("rb") as content:
        while block := content.read(1 << 20):
            seen.update(block)
    return seen.hexdigest()


def _read(path: Path, table: Table) -> tuple[list[str], Iterator[list[Any]]]:
    """The columns of a file, and its rows as values. Raises LogbookError."""
    known = {column.name: column for column in table.columns}
    with path.open(encoding="utf-8", newline="") as file:
        header = next(csv.reader(file), [])
    if unknown := [name for name in header if name not in known]:
        raise LogbookError(f"{path} has a column {unknown[0]!r} that no logbook has")
    return header, _rows(path, [known[name] for name in header])


def _rows(path: Path, columns: list[Column]) -> Iterator[list[Any]]:
    with path.open(encoding="utf-8", newline="") as file, _long_cells():
        reader = csv.reader(file, strict=True)
        try:
            next(reader)
            for row in reader:
                yield [_value(text, column) for text, column in zip(row, columns, strict=True)]
        except (csv.Error, ValueError) as error:
            raise LogbookError(f"{path}:{reader.line_num}: {error}; export the logbook again") from None


@contextmanager
def _long_cells() -> Iterator[None]:
    usual = csv.field_size_limit(_LONGEST)
    try:
        yield
    finally:
        csv.field_size_limit(usual)


def _value(text: str, column: Column) -> Any:
    if column.type == "string":
        if text == "":
            return "" if column.required else None
        return "" if text == EMPTY and not column.required else restored(text)
    if text == "":
        return None
    return int(text) if column.type == "integer" else float(text)
