"""The SQLite file under a logbook: made, opened, guarded. Nothing here knows what an entry is."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any, Self

from energytrack.errors import LogbookError
from energytrack.logbook import schema

WAIT_SECONDS = 10.0  # for another program that is writing
PATIENCE_SECONDS = 1.0  # of waiting without a word
OLDEST_SQLITE = (3, 37, 0)  # the first with STRICT tables


def _say_nothing(remark: str) -> None:
    """A library has nowhere to say it."""


tell: Callable[[str], None] = _say_nothing  # what an owner should know while it happens; the command line prints it


def connect(path: Path) -> sqlite3.Connection:
    """For reading and writing; for reading alone where the file or its folder does not allow more."""
    if may_write(path):
        return sqlite3.connect(path, isolation_level=None, timeout=WAIT_SECONDS)
    in_use = Path(f"{path}-wal").exists()  # else nobody writes, and SQLite need not put files beside it to see that
    address = f"{path.absolute().as_uri()}?mode=ro{'' if in_use else '&immutable=1'}"
    return sqlite3.connect(address, isolation_level=None, timeout=WAIT_SECONDS, uri=True)


def may_write(path: Path) -> bool:
    """SQLite writes the file, and others beside it."""
    return os.access(path, os.W_OK) and os.access(path.absolute().parent, os.W_OK)


class LogbookFile:
    """A file of the project's tables, open for reading, and for writing where it may be written."""

    writable: bool

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
            for end in ("", "-wal", "-shm"):
                with suppress(OSError):
                    Path(f"{path}{end}").unlink()
            if isinstance(error, sqlite3.Error):
                raise _refusal(path, error) from None
            raise

    def _connect(self) -> None:
        self.writable = may_write(self.path)
        with self._guard():
            self._db = connect(self.path)
        try:
            with self._guard():
                application = self._patiently("PRAGMA application_id").fetchone()[0]
                if application != schema.APPLICATION_ID:
                    raise LogbookError(f"{self.path} is not a logbook of this program: name another file")
                self._db.execute("PRAGMA foreign_keys = ON")
                self._db.execute("PRAGMA synchronous = FULL")
                self._db.execute("PRAGMA temp_store = MEMORY")  # nothing of a logbook in a shared temporary folder
                self._bring_up_to_date()
        except BaseException:
            self._db.close()
            raise

    def _bring_up_to_date(self) -> None:
        """Older tables become new ones, after a copy of the file as it was."""
        kept: list[Path] = []
        try:
            schema.migrate(self._db, before=lambda version: kept.append(self._keep(version)))
        except BaseException:
            for copy in kept:
                copy.unlink(missing_ok=True)
            raise
        for copy in kept:
            tell(f"{self.path} was of an earlier version and is brought up to date; as it was, it is kept as {copy}")

    def _keep(self, version: int) -> Path:
        """A copy of the file beside it, under a name that says which version it is."""
        from energytrack.logbook.copying import keep_beside  # only here: once in the life of a version

        if not self.writable:
            raise LogbookError(
                f"{self.path} has tables of version {version}, which must be brought up to date, and it cannot be "
                "written: copy it to a folder you can write to"
            )
        return keep_beside(self.path, f"version-{version}")

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
            self._patiently("BEGIN IMMEDIATE")
        try:
            yield
            with self._guard():
                self._db.execute("COMMIT")
        except BaseException:
            if self._db.in_transaction:
                with suppress(sqlite3.Error):  # what failed is told, and what is not committed never counts
                    self._db.execute("ROLLBACK")
            raise

    def _patiently(self, statement: str) -> sqlite3.Cursor:
        """Run what may have to wait for another program, and say so when it takes long."""
        quiet = min(PATIENCE_SECONDS, WAIT_SECONDS)
        self._wait_at_most(quiet)
        try:
            return self._db.execute(statement)
        except sqlite3.OperationalError as error:
            if error.sqlite_errorcode & 0xFF != sqlite3.SQLITE_BUSY:
                raise
            tell(f"another program is writing to {self.path}; waiting up to {WAIT_SECONDS:.0f} s")
            self._wait_at_most(WAIT_SECONDS - quiet)
            return self._db.execute(statement)
        finally:
            self._wait_at_most(WAIT_SECONDS)

    def _wait_at_most(self, seconds: float) -> None:
        self._db.execute(f"PRAGMA busy_timeout = {1000 * seconds:.0f}")

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
    return LogbookError(f"{path}: {remedy_of(error)}")


def remedy_of(error: sqlite3.Error) -> str:
    """What SQLite reported of a file, in words, with what to do about it."""
    reported = str(error)
    code = getattr(error, "sqlite_errorcode", 0) & 0xFF  # the primary code
    remedies = {
        sqlite3.SQLITE_BUSY: f"another program kept writing to it for {WAIT_SECONDS:.0f} s: try again",
        sqlite3.SQLITE_READONLY: "it cannot be written: check its permissions and those of its folder",
        sqlite3.SQLITE_CANTOPEN: "it cannot be opened: check its permissions and those of its folder",
        sqlite3.SQLITE_FULL: "the disk is full, nothing was written: free some space and try again",
        sqlite3.SQLITE_IOERR: f"the disk failed ({reported}), or a limit on the size of files was met, and nothing was "
        "written: check both",
        sqlite3.SQLITE_NOTADB: "it is not a logbook: name another file",
        sqlite3.SQLITE_CORRUPT: "it is damaged: restore a backup",
    }
    return remedies.get(code, f"SQLite reports: {reported}; nothing was written")
