"""`export`: the logbook as a folder of tables."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import on_file, say, say_json


def export(
    context: typer.Context,
    folder: Annotated[Path, typer.Argument(help="New folder.")],
    without_places: Annotated[
        bool, typer.Option("--without-places", help="Leave out places, notes, the history and exact times.")
    ] = False,
    force: Annotated[bool, typer.Option("--force", help="Replace an earlier export.")] = False,
    json: options.Json = False,
) -> None:
    """Write the logbook to a folder of CSV tables. History included, so that `import` brings back all of it."""
    from energytrack.logbook.exporting import export as write

    files = write(on_file(context), folder, without_places=without_places, force=force)
    if json:
        say_json({"folder": str(folder), "files": files})
    else:
        say([f"{folder}: {len(files)} files, {'without' if without_places else 'with'} places, notes and history"])
