"""`backup`: a copy of the logbook."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from energytrack.cli import options
from energytrack.cli.context import on_file, say, say_json


def backup(
    context: typer.Context,
    file: Annotated[Path, typer.Argument(help="New file.")],
    force: Annotated[bool, typer.Option("--force", help="Replace an earlier backup.")] = False,
    json: options.Json = False,
) -> None:
    """Copy the logbook to a file. Others may write meanwhile."""
    from energytrack.logbook.backup import back_up

    store = on_file(context)
    back_up(store, file, force=force)
    if json:
        say_json({"backup": str(file), "bytes": file.stat().st_size})
    else:
        say([f"{store.path} copied to {file}"])
