"""A finished file under its name: whole or not at all, readable by its owner alone, over nothing unless told to."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from energytrack.errors import ReportError
from energytrack.logbook.copying import give_name


def place(data: bytes, path: Path, *, force: bool = False) -> None:
    """Write a new file, or over an earlier one with `force`; a link there is never followed. Raises ReportError."""
    refuse_link(path)
    try:
        number, name = tempfile.mkstemp(prefix=f".{path.name}-", dir=path.absolute().parent)  # mode 0600
        beside = Path(name)
        try:
            with os.fdopen(number, "wb") as file:
                file.write(data)
            if force:
                beside.replace(path)
            else:
                give_name(beside, path)
        finally:
            beside.unlink(missing_ok=True)
    except FileExistsError:
        raise ReportError(taken(path)) from None
    except OSError as failure:
        raise ReportError(f"cannot write {path}: {failure.strerror}; name another place") from None


def refuse_link(path: Path) -> None:
    """A link may lead where its maker wants the data. Raises ReportError."""
    if path.is_symlink():
        raise ReportError(f"cannot write {path}: it is a link; name the place itself")


def taken(path: Path) -> str:
    """What is said of a name that is not free."""
    return f"{path} is there already: name another file, or replace it with --force"
