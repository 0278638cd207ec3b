"""A copy of a logbook, taken while others may write; and a damaged logbook replaced by one, never destroyed."""

from __future__ import annotations

from contextlib import suppress
from pathlib import Path

from energytrack.errors import LogbookError
from energytrack.logbook import schema
from energytrack.logbook.checking import faults
from energytrack.logbook.copying import copy_beside, give_name
from energytrack.logbook.store import Store

_WITH_IT = ("-wal", "-shm")  # what SQLite keeps beside a file in use


def back_up(store: Store, target: Path, *, force: bool = False) -> None:
    """Copy the logbook as it is at one moment to a new file that only its owner can read. Raises LogbookError.

    `force` replaces an earlier backup, and nothing but a logbook.
    """
    _check_target(store.path, target, force)
    beside = copy_beside(store.path, target)
    try:
        if force:
            _let_go(target)
            beside.replace(target)
        else:
            give_name(beside, target)
    except FileExistsError:
        raise LogbookError(f"{target} exists already: name a new file, or replace it with --force") from None
    except OSError as error:
        raise LogbookError(f"{target} cannot be written: {error.strerror}; name another place") from None
    finally:
        beside.unlink(missing_ok=True)


def repair(path: Path, backup: Path) -> Path:
    """Put a sound backup in the place of a damaged logbook; where the damaged one is now. Raises LogbookError."""
    if not path.is_file():
        raise LogbookError(f"there is no logbook {path}: copy the backup there instead")
    if backup.exists() and path.samefile(backup):
        raise LogbookError(f"{backup} is the logbook itself: name a backup of it")
    if not faults(path):
        raise LogbookError(f"{path} has no fault: nothing to repair, and nothing was changed")
    if found := faults(backup):
        raise LogbookError(f"the backup {backup} has a fault itself ({found[0].what}): name another one")
    beside = copy_beside(backup, path)
    aside = _free_name(path)
    moved = [(path, aside)]
    moved += [(Path(f"{path}{end}"), Path(f"{aside}{end}")) for end in _WITH_IT if Path(f"{path}{end}").exists()]
    try:
        for old, new in moved:
            old.rename(new)
        beside.rename(path)
    except OSError as error:
        for old, new in moved:
            if new.exists():
                new.rename(old)
        raise LogbookError(f"{path} cannot be replaced: {error.strerror}; nothing was changed") from None
    finally:
        beside.unlink(missing_ok=True)
    return aside


def _check_target(path: Path, target: Path, force: bool) -> None:
    if target.is_symlink():
        raise LogbookError(f"{target} is a link: name the file itself")
    if not target.exists():
        return
    if path.samefile(target):
        raise LogbookError(f"{target} is the logbook itself: name another file")
    if not force:
        raise LogbookError(f"{target} exists already: name a new file, or replace it with --force")
    if not target.is_file() or not _is_logbook(target):
        raise LogbookError(f"{target} is not a backup of a logbook: name another file")


def _is_logbook(path: Path) -> bool:
    """By the application id in the file's header (SQLite file format, offset 68)."""
    with path.open("rb") as file:
        header = file.read(72)
    return header[68:72] == schema.APPLICATION_ID.to_bytes(4, "big")


def _let_go(target: Path) -> None:
    """What SQLite left beside an earlier backup that was opened belongs to that one."""
    for end in _WITH_IT:
        with suppress(FileNotFoundError):
            Path(f"{target}{end}").unlink()


def _free_name(path: Path) -> Path:
    number = 1
    while (name := path.with_name(f"{path.name}.damaged-{number}")).exists():
        number += 1
    return name
