"""A logbook as a folder of tables: whole or not at all, readable by its owner alone."""

from __future__ import annotations

import hashlib
import os
import shutil
import tempfile
from collections.abc import Iterable
from pathlib import Path

from energytrack.errors import LogbookError
from energytrack.logbook import schema
from energytrack.logbook.export_tables import HISTORY, tables_of
from energytrack.logbook.package import FILE, descriptor
from energytrack.logbook.store import Store

_OURS = ("vehicles.csv", "entries.csv", "modifications.csv", "events.csv", "weather.csv", FILE)


def export(store: Store, target: Path, *, without_places: bool = False, force: bool = False) -> list[str]:
    """Write the logbook to the folder `target`; the files written.

    Written beside it and put in its place when complete. A folder that holds something is kept, unless `force`, and
    even then where it holds anything but an earlier export. Raises LogbookError.
    """
    _check(target, force)
    try:
        beside = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.absolute().parent))  # mode 0700
    except OSError as error:
        raise LogbookError(f"{target} cannot be written: {error.strerror}; name another place") from None
    try:
        with store.snapshot():
            tables = tables_of(store, without_places=without_places)
            written = {table.file: _write(beside / table.file, table.text()) for table in tables}
        _write(beside / FILE, [descriptor(tables, written, len(schema.MIGRATIONS))])
        _put_in_place(beside, target, force)
    except OSError as error:
        raise LogbookError(f"{target} cannot be written: {error.strerror}; nothing was changed") from None
    finally:
        shutil.rmtree(beside, ignore_errors=True)
    return [*written, FILE]


def _check(target: Path, force: bool) -> None:
    if target.is_symlink():
        raise LogbookError(f"{target} is a link: name the folder itself")
    if not target.exists():
        return
    if not target.is_dir():
        raise LogbookError(f"{target} is a file: name a new folder")
    held = list(target.iterdir())
    if held and not force:
        raise LogbookError(f"{target} is not empty: name a new folder, or replace an earlier export with --force")
    foreign = [path.name for path in held if not _is_ours(path)]
    if foreign:
        raise LogbookError(f"{target} holds more than an export ({', '.join(sorted(foreign)[:3])}): name a new folder")


def _is_ours(path: Path) -> bool:
    if path.is_symlink():
        return False
    if path.name == HISTORY and path.is_dir():
        return all(each.suffix == ".csv" and each.is_file() and not each.is_symlink() for each in path.iterdir())
    return path.name in _OURS and path.is_file()


def _write(path: Path, lines: Iterable[str]) -> tuple[int, str]:
    """Write a new file; its bytes and SHA-256."""
    path.parent.mkdir(mode=0o700, exist_ok=True)
    size, digest = 0, hashlib.sha256()
    flags = os.O_CREAT | os.O_EXCL | os.O_WRONLY | getattr(os, "O_BINARY", 0)
    with os.fdopen(os.open(path, flags, 0o600), "wb") as file:
        for line in lines:
            content = line.encode()
            file.write(content)
            digest.update(content)
            size += len(content)
        file.flush()
        os.fsync(file.fileno())
    return size, digest.hexdigest()


def _put_in_place(beside: Path, target: Path, force: bool) -> None:
    """The complete folder takes the name; an earlier export goes only when it has."""
    _check(target, force)  # again: writing took a while
    if not target.exists():
        beside.rename(target)
        return
    earlier = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.absolute().parent))
    target.rename(earlier / "earlier")
    try:
        beside.rename(target)
    except OSError:
        (earlier / "earlier").rename(target)
        raise
    finally:
        shutil.rmtree(earlier, ignore_errors=True)
