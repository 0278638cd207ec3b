"""The command line: one short function a command, errors turned into exit status in one place."""

from __future__ import annotations

import os
import sys
from enum import IntEnum
from pathlib import Path
from typing import Annotated

import typer

from energytrack.errors import EnergytrackError

LOGBOOK_VARIABLE = "ENERGYTRACK_LOGBOOK"


class ExitStatus(IntEnum):
    """What the process tells its caller."""

    DONE = 0
    REFUSED = 1
    USAGE = 2
    NOT_YET = 10


app = typer.Typer(
    name="energytrack",
    add_completion=False,
    no_args_is_help=True,
    rich_markup_mode=None,  # plain help: rich costs 50 ms on every command
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)


@app.callback()
def choose_logbook(
    context: typer.Context,
    logbook: Annotated[
        Path | None,
        typer.Option(help=f"Logbook file, or folder of CSV tables. Otherwise {LOGBOOK_VARIABLE} names it."),
    ] = None,
) -> None:
    """Did a vehicle modification shift its consumption, by how much, and was the distance enough to say so?"""
    named = os.environ.get(LOGBOOK_VARIABLE)
    context.obj = logbook or (Path(named) if named else None)


def main() -> None:
    """Run a command; a refusal is one line on stderr and exit status 1."""
    try:
        app()
    except EnergytrackError as refusal:
        print(f"energytrack: {refusal}", file=sys.stderr)
        sys.exit(ExitStatus.REFUSED)
