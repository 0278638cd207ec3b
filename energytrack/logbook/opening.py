"""Open a logbook, whichever form it has."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

from energytrack.logbook.records import Entry, Event, Modification, Vehicle, Weather
from energytrack.logbook.store import Store

if TYPE_CHECKING:
    from energytrack.logbook.folder import Folder


class Logbook(Protocol):
    """What can be read from any logbook."""

    @property
    def path(self) -> Path: ...
    @property
    def writable(self) -> bool: ...
    def vehicles(self) -> list[Vehicle]: ...
    def vehicle(self, name: str) -> Vehicle: ...
    def entries(self, vehicle_name: str) -> list[Entry]: ...
    def last_entries(self, vehicle_name: str, count: int) -> list[Entry]: ...
    def modifications(self, vehicle_name: str) -> list[Modification]: ...
    def events(self, vehicle_name: str) -> list[Event]: ...
    def weather(self) -> list[Weather]: ...
    def assessments(self, vehicle_name: str) -> list[dict[str, Any]]: ...
    def looks(self, vehicle_name: str, modification: str) -> list[float]: ...


def open_logbook(path: str | Path, *, create: bool = False) -> Store | Folder:
    """Open a logbook file, or a folder of CSV tables; with `create`, start a new file.

    Raises LogbookError where nothing is there, where it is no logbook, or where a newer version wrote it.
    """
    path = Path(path)
    if create:
        return Store.create(path)
    if path.is_dir():
        from energytrack.logbook.folder import Folder  # only here: most commands open a file

        return Folder(path)
    return Store(path)
