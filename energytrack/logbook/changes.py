"""A logbook file that numbers its changes: what is written in one transaction is one change."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any

from energytrack.errors import UnknownNameError
from energytrack.logbook import rows
from energytrack.logbook.file import LogbookFile

_CACHE_KIB = 32_768  # holds the ends of the indexes of many vehicles


class ChangingFile(LogbookFile):
    """Every write belongs to a change: when, what was done, why. Numbers rise in the order of recording."""

    _change: int | None = None  # of the transaction that is open
    _called: str | None = None  # what that transaction does as a whole

    @contextmanager
    def transaction(self, called: str | None = None) -> Iterator[None]:
        """What happens inside is written wholly or not at all, as one change. `called`: what it does as a whole."""
        if not self._db.in_transaction:
            self._change, self._called = None, called
        with super().transaction():
            yield

    def change(self, what: str, why: str = "", undoes: int | None = None) -> int:
        """The change of the open transaction; it starts with the first that is written."""
        if self._change is None:
            values: dict[str, Any] = {"what": self._called or what, "why": why, "undoes": undoes}
            with self._guard():
                self._change = rows.insert(self._db, "change", values)
        return self._change

    def last_change(self) -> int:
        """The newest change; 0 before the first."""
        number: int = self._rows("SELECT coalesce(max(id), 0) FROM change")[0][0]
        return number

    def standing_row(self, number: int) -> int:
        """The row that holds an entry of this number now. Raises UnknownNameError where none stands."""
        chain = "SELECT ? UNION ALL SELECT id FROM entry WHERE origin = ?"
        found = self._rows(f"SELECT id FROM standing_entry WHERE id IN ({chain})", number, number)
        if not found:
            raise UnknownNameError(f"there is no entry {number}: `entries` lists them")
        row: int = found[0][0]
        return row

    def append(self, table: str, values: Mapping[str, Any]) -> int:
        """Add one row to the open change; its number. Raises LogbookError. Table and columns are ours, never typed."""
        with self._guard():
            return rows.insert(self._db, table, {**values, "change_id": self._change})

    def write(self, insert: str, *values: Any) -> int:
        """Add the rows that an INSERT of ours makes from others; how many."""
        with self._guard():
            return max(0, self._db.execute(insert, values).rowcount)

    @contextmanager
    def only_appending(self, table: str) -> Iterator[None]:
        """Inside the open transaction, many new rows: each takes a new number and supersedes none.

        The guard against replacing rows has nothing to guard then, and costs more than the row; it is back before
        anybody else sees the table.
        """
        name = f"{table}_not_replaced"
        guard = self._rows("SELECT sql FROM sqlite_schema WHERE name = ?", name)[0][0]
        with self._guard():
            self._db.execute(f"PRAGMA cache_size = -{_CACHE_KIB}")
            self._db.execute(f"DROP TRIGGER {name}")
        yield
        with self._guard():
            self._db.execute(guard)

    def defer_references(self) -> None:
        """Let rows of the open transaction refer to others that are still to come."""
        with self._guard():
            self._db.execute("PRAGMA defer_foreign_keys = ON")

    def fill(self, table: str, columns: Sequence[str], values: Iterable[Sequence[Any]]) -> int:
        """Add whole rows as they were kept before; how many. Table and columns are ours, never typed."""
        insert = f"INSERT INTO {table} ({', '.join(columns)}) VALUES ({', '.join('?' * len(columns))})"
        with self._guard():
            return max(0, self._db.executemany(insert, values).rowcount)
