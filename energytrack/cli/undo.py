"""`undo`: take back what was done last."""

from __future__ import annotations

from typing import Annotated

import typer

from energytrack.cli import options, told
from energytrack.cli.context import say, say_json, writable
from energytrack.cli.reanswer import answer_lines, reanswered
from energytrack.logbook import revisions
from energytrack.logbook.checks import check_text
from energytrack.logbook.history import change_of


def undo(
    context: typer.Context,
    why: Annotated[str, typer.Option("--why", metavar="TEXT", help="Why; kept in the history.")] = "",
    json: options.Json = False,
) -> None:
    """Take back the last change. Again: the one before. All stay in the history."""
    store = writable(context)
    check_text(why, "reason")
    number = revisions.undo(store, why)
    done = change_of(store, number)
    touched = {revision.vehicle for revision in done.revisions}
    if done.weather_days:
        touched = {vehicle.name for vehicle in store.vehicles()}
    if not json:
        say(told.lines(done, store.vehicles()))
    answers = reanswered(store, [vehicle for vehicle in store.vehicles() if vehicle.name in touched], number)
    if json:
        say_json({"change": told.columns(done), "answers": answers})
    else:
        say(answer_lines(answers))
