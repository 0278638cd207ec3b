"""The command line: one short function a command, errors turned into exit status in one place."""

from __future__ import annotations

import io
import os
import signal
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from enum import IntEnum
from importlib import import_module
from pathlib import Path
from typing import Annotated, Any

import typer
import typer.core
import typer.main

from energytrack.cli.context import LOGBOOK_VARIABLE
from energytrack.cli.options import NegativeNumbers
from energytrack.cli.threads import one_thread
from energytrack.errors import EnergytrackError
from energytrack.logbook import file
from energytrack.presentation.plain import in_a_line

COMMANDS = {  # name -> module of energytrack.cli, and the function or group of commands in it
    "new": ("new", "new"),
    "vehicle": ("vehicle", "vehicle_commands"),
    "fillup": ("fillup", "fillup"),
    "charge": ("fillup", "charge"),
    "mod": ("mod", "mod_commands"),
    "event": ("event", "event"),
    "entries": ("entries", "entries"),
    "confirm": ("confirm", "confirm"),
    "amend": ("amend", "amend"),
    "strike": ("amend", "strike"),
    "undo": ("undo", "undo"),
    "history": ("history", "history"),
    "import": ("import_", "import_table"),
    "export": ("export", "export"),
    "backup": ("backup", "backup"),
    "check": ("check", "check"),
    "weather": ("weather", "weather"),
    "enough": ("enough", "enough"),
    "plan": ("plan", "plan"),
    "regimes": ("regimes", "regimes"),
    "rehearse": ("rehearse", "rehearse"),
    "review": ("review", "review"),
    "report": ("report", "report"),
}


_USAGE_ERROR: type[Exception] = typer.BadParameter.__bases__[0]  # of the parser typer carries, or of its own package


@contextmanager
def _safely_told() -> Iterator[None]:
    """What the parser of arguments says of a wrong one repeats it: on one line, with nothing a terminal obeys."""
    try:
        yield
    except _USAGE_ERROR as error:
        told: Any = error
        said = in_a_line(told.format_message())
        told.format_message = lambda: said
        raise


class LazyCommands(typer.core.TyperGroup):
    """Imports and builds only the command that is run: building all of them takes longer than `fillup` does."""

    def make_context(self, *words: Any, **more: Any) -> Any:
        with _safely_told():
            return super().make_context(*words, **more)

    def invoke(self, ctx: Any) -> Any:
        with _safely_told():
            return super().invoke(ctx)

    def list_commands(self, ctx: Any) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: Any, cmd_name: str) -> Any:
        if cmd_name not in COMMANDS:
            return None
        module, attribute = COMMANDS[cmd_name]
        found = getattr(import_module(f"energytrack.cli.{module}"), attribute)
        if not isinstance(found, typer.Typer):
            alone = typer.Typer(add_completion=False, rich_markup_mode=None)
            alone.command(cmd_name, cls=NegativeNumbers)(found)
            found = alone
        command = typer.main.get_command(found)
        command.name = cmd_name
        return command


class ExitStatus(IntEnum):
    """What the process tells its caller."""

    DONE = 0
    REFUSED = 1
    USAGE = 2
    NOT_YET = 10


app = typer.Typer(
    name="energytrack",
    cls=LazyCommands,
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
        typer.Option(
            help=f"Logbook file, or folder of CSV tables. Otherwise {LOGBOOK_VARIABLE} names it.",
            readable=False,  # whoever opens it says what to do
        ),
    ] = None,
) -> None:
    """Did a vehicle modification shift its consumption, by how much, and was the distance enough to say so?"""
    named = os.environ.get(LOGBOOK_VARIABLE)
    context.obj = logbook or (Path(named) if named else None)


def main() -> None:
    """Run a command; a refusal is one line on stderr and exit status 1."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")  # a terminal without some character shows ? for it
    file.tell = _remark
    one_thread()
    try:
        try:
            app(prog_name="energytrack")
        finally:
            sys.stdout.flush()
    except BrokenPipeError:  # whoever read the output has seen enough; the interpreter must not flush again
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(ExitStatus.REFUSED)
    except (EnergytrackError, OSError) as refusal:
        _remark(_said(refusal))
        sys.exit(ExitStatus.REFUSED)
    except KeyboardInterrupt:
        sys.exit(128 + signal.SIGINT)


def _said(refusal: Exception) -> str:
    if isinstance(refusal, OSError) and refusal.filename is not None:
        return f"{refusal.filename} cannot be used: {refusal.strerror}; name another"
    return str(refusal)


def _remark(text: str) -> None:
    """One line on stderr."""
    print(f"energytrack: {in_a_line(text)}", file=sys.stderr, flush=True)
