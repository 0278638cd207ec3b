"""`check`: is the logbook sound?"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.app import ExitStatus
from energytrack.cli.context import logbook_path, readable, say, say_json
from energytrack.errors import LogbookError
from energytrack.logbook.store import Store
from energytrack.presentation.columns import aligned


def check(
    context: typer.Context,
    repair_from: Annotated[
        Path | None, typer.Option(metavar="BACKUP", help="Put this backup in the place of a damaged logbook.")
    ] = None,
    json: options.Json = False,
) -> None:
    """Say what is wrong with the logbook file. Exit status 1 if anything is.

    A repair renames the damaged file and keeps it.
    """
    from energytrack.logbook.backup import repair
    from energytrack.logbook.checking import counted, faults

    path = logbook_path(context)
    if path.is_dir():
        raise LogbookError(f"{path} is a folder of tables: `entries` names its bad rows")
    aside = None if repair_from is None else repair(path, repair_from)
    found = faults(path)
    if json:
        told = [{"what": fault.what, "remedy": fault.remedy} for fault in found]
        say_json({"faults": told, "damaged_kept_as": None if aside is None else str(aside)})
    else:
        if aside is not None:
            say([f"{path} is now as in {repair_from}", f"the damaged file is kept as {aside}"])
            say(["what was recorded after the backup is in that file only"])
        say(line for fault in found for line in (fault.what, f"    {fault.remedy}"))
    if found:
        raise typer.Exit(ExitStatus.REFUSED)
    store = readable(context)
    if isinstance(store, Store) and not json:
        rows = [(name, f"{count:,}") for name, count in counted(store).items()]
        say([f"{path}: no fault", *aligned(rows, right=(1,))])
