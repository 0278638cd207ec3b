"""`new`: start a logbook."""

from __future__ import annotations

import typer

from energytrack.cli.context import logbook_path, say
from energytrack.logbook.opening import open_logbook


def new(context: typer.Context) -> None:
    """Start an empty logbook file that only you can read."""
    path = logbook_path(context)
    open_logbook(path, create=True).close()
    say([f"started {path}", f"next: energytrack --logbook {path} vehicle add NAME --carrier diesel --capacity 70"])
