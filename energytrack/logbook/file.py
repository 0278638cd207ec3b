"""The SQLite file under a logbook: made, opened, guarded. Nothing here knows what an entry is."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any, Self

from energytrack.errors import LogbookError
from energytrack.logbook import schema

WAIT_SECONDS = 5.0  # for another program that is writing
OLDEST_SQLITE = (3, 37, 0)  # the first with STRICT tables


class LogbookFile:
    """A file of the project's tables, open for reading and writing."""

    def __init__(self, path: Path) -> None:
        """Open an existing logbook file, bringing older tables up to date."""
        self.path = path
        if not path.exists():
            raise LogbookError(f"there is no logbook {path}: start one with `energytrack --logbook {path} new`")
        if not path.is_file():
            raise LogbookError(f"{path} is not a file: name a logbook file, or a folder of CSV tables")
        self._connect()

    @classmethod
    def create(cls, path: Path) -> Self:
        """Start an empty logbook, readable by its owner alone. Never touches an existing path."""
        if sqlite3.sqlite_version_info < OLDEST_SQLITE:
            raise LogbookError(f"SQLite {sqlite3.sqlite_version} is too old, 3.37 is needed: use a newer Python")
        try:
            os.close(os.open(path, os.O_CREAT | os.O_EXCL | os.O_RDWR, 0o600))
        except FileExistsError:
            raise LogbookError(f"{path} exists already: open it as it is, or name another file") from None
        except OSError as error:
            raise LogbookError(f"cannot create {path}: {error.strerror}; choose a folder you can write to") from None
        try:
            connection = sqlite3.connect(path, isolation_level=None)
            try:
                connection.execute("PRAGMA journal_mode = WAL")
                schema.migrate(connection)
            finally:
                connection.close()
            return cls(path)
        except BaseException as error:
            with suppress(OSError):
                path.unlink()
            if isinstance(error, sqlite3.Error):
                raise _refusal(path, error) from None
            raise

    def _connect(self) -> None:
        with self._guard():
            self._db = sqlite3.connect(self.path, isolation_level=None, timeout=WAIT_SECONDS)
        try:
            with self._guard():
                application = self._db.execute("PRAGMA application_id").fetchone()[0]
                if application != schema.APPLICATION_ID:
                    raise LogbookError(f"{self.path} is not a logbook of this program: name another file")
                self._db.execute("PRAGMA foreign_keys = ON")
                self._db.execute("PRAGMA synchronous = FULL")
                schema.migrate(self._db)
        except BaseException:
            self._db.close()
            raise

    def close(self) -> None:
        """Let go of the file."""
        self._db.close()

    @contextmanager
    def _guard(self) -> Iterator[None]:
        """Errors of SQLite, and values in the file that nothing here wrote, as LogbookError."""
        try:
            yield
        except sqlite3.Error as error:
            raise _refusal(self.path, error) from None
        except UnicodeError:
            raise LogbookError("a text is not valid UTF-8: type it again, nothing was written") from None
        except (ValueError, TypeError) as error:
            raise LogbookError(f"{self.path} holds a value that cannot be read ({error}): restore a backup") from None

    @contextmanager
    def transaction(self) -> Iterator[None]:
        """What happens inside is written wholly or not at all, and seen by no other program before its end."""
        if self._db.in_transaction:
            yield
            return
        with self._guard():
            self._db.execute("BEGIN IMMEDIATE")
        try:
            yield
            with self._guard():
                self._db.execute("COMMIT")
        except BaseException:
            if self._db.in_transaction:
                self._db.execute("ROLLBACK")
            raise

    def query(self, select: str, *values: Any) -> list[tuple[Any, ...]]:
        """The rows a SELECT finds."""
        return self._rows(select, *values)

    def each(self, select: str) -> Iterator[tuple[Any, ...]]:
        """The rows a SELECT finds, one by one."""
        with self._guard():
            yield from self._db.execute(select)

    @contextmanager
    def snapshot(self) -> Iterator[None]:
        """What is read inside is of one moment, whoever writes meanwhile."""
        with self._guard():
            self._db.execute("BEGIN")
        try:
            yield
        finally:
            self._db.execute("ROLLBACK")

    def _rows(self, select: str, *values: Any) -> list[tuple[Any, ...]]:
        with self._guard():
            return self._db.execute(select, values).fetchall()


def _refusal(path: Path, error: sqlite3.Error) -> LogbookError:
    """What SQLite reported, with what to do about it."""
    reported = str(error)
    code = getattr(error, "sqlite_errorcode", 0) & 0xFF  # the primary code
    remedies = {
        sqlite3.SQLITE_BUSY: f"another program kept writing to it for {WAIT_SECONDS:.0f} s: try again",
        sqlite3.SQLITE_READONLY: "it cannot be written: check its permissions and those of its folder",
        sqlite3.SQLITE_CANTOPEN: "it cannot be opened: check its permissions and those of its folder",
        sqlite3.SQLITE_FULL: "the disk is full: free some space and try again",
        sqlite3.SQLITE_IOERR: f"the disk failed ({reported}): check it, and copy the logbook elsewhere",
        sqlite3.SQLITE_NOTADB: "it is not a logbook: name another file",
        sqlite3.SQLITE_CORRUPT: "it is damaged: restore a backup",
    }
    return LogbookError(f"{path}: {remedies.get(code, f'SQLite reports: {reported}; nothing was written')}")
