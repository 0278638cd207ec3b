"""Whole copies of a logbook file: made beside their place, sound, readable by their owner alone, then named."""

from __future__ import annotations

import os
import sqlite3
import tempfile
from contextlib import closing, suppress
from itertools import count
from pathlib import Path

from energytrack.errors import LogbookError
from energytrack.logbook.file import connect, remedy_of


def copy_beside(source: Path, target: Path) -> Path:
    """A whole copy beside `target`, by SQLite's online backup; sound, or refused. Raises LogbookError."""
    try:
        number, name = tempfile.mkstemp(prefix=f".{target.name}-", dir=target.absolute().parent)  # mode 0600
        os.close(number)
    except OSError as error:
        raise LogbookError(f"{target} cannot be written: {error.strerror}; name another place") from None
    beside = Path(name)
    try:
        with closing(connect(source)) as original, closing(sqlite3.connect(beside)) as copy:
            original.backup(copy)
            sound = copy.execute("PRAGMA quick_check(1)").fetchone()[0]
        if sound != "ok":
            raise LogbookError(f"{source} is damaged ({sound}): energytrack check says more; nothing was written")
    except BaseException as error:
        for end in ("", "-journal", "-wal", "-shm"):
            with suppress(OSError):
                Path(f"{beside}{end}").unlink(missing_ok=True)
        if isinstance(error, sqlite3.Error):
            raise LogbookError(f"{source} cannot be copied to {target}: {remedy_of(error)}") from None
        raise
    return beside


def keep_beside(path: Path, word: str) -> Path:
    """A copy of the file beside it, its name followed by a word, and a number where that is taken."""
    beside = copy_beside(path, path)
    try:
        for number in count(1):
            kept = path.with_name(f"{path.name}.{word}" + (f"-{number}" if number > 1 else ""))
            with suppress(FileExistsError):
                give_name(beside, kept)
                return kept
    except OSError as error:
        raise LogbookError(f"{path} cannot be copied before it is changed: {error.strerror}; make room") from None
    finally:
        beside.unlink(missing_ok=True)
    raise AssertionError("numbers do not end")


def give_name(beside: Path, target: Path) -> None:
    """Give the copy its name, which must still be free: a link fails where it is not, renaming would replace."""
    try:
        os.link(beside, target)
    except FileExistsError:
        raise
    except OSError:  # a file system without links
        if target.exists():
            raise FileExistsError from None
        beside.rename(target)
