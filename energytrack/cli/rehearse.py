"""`rehearse`: would this log be told the truth, if the truth were known?"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Annotated, Any

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json
from energytrack.cli.workers import workers

if TYPE_CHECKING:
    from concurrent.futures import Executor

    from energytrack.inference.rehearsal_results import Rehearsal
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle

_Asked = tuple["Vehicle", str | None, float]


def rehearse(
    context: typer.Context,
    name: Annotated[str | None, typer.Argument(help="The modification; all of them if left out.")] = None,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; all of them if left out.")] = None,
    runs: Annotated[int, typer.Option("--runs", "-n", help="Logs to draw.")] = 200,
    seed: Annotated[int, typer.Option(help="Of the random numbers: the same seed draws the same logs.")] = 0,
    target: Annotated[
        float | None, typer.Option(help="Smallest shift worth knowing about, in percent. Otherwise as logged, or 3.")
    ] = None,
    json: options.Json = False,
) -> None:
    """Say how often logs like yours would fool the test.

    Draws logs whose truth is known, and pretends changes in yours that never happened.
    """
    if name is not None and name.startswith("-"):
        raise typer.BadParameter(f"no such option: {name}")
    logbook = readable(context)
    vehicles = asking.vehicles_asked(logbook, vehicle)
    asked = {_title(each): each for each in _asked(logbook, vehicles, name, target)}
    with workers() as executor:
        answers, refusals = asking.answered(
            asked, lambda title: _rehearse(logbook, title, asked[title], runs, seed, executor)
        )
    _print_json(answers) if json else _print({each.name: each.distance_unit for each in vehicles}, answers)
    asking.leave(refusals)


def _asked(logbook: Logbook, vehicles: list[Vehicle], name: str | None, target: float | None) -> list[_Asked]:
    """Each modification, or the one named; a vehicle without any is asked about a pretended one."""
    if name is not None:
        return [_of(question) for question in asking.questions(logbook, vehicles, name, target)]
    asked: list[_Asked] = []
    for vehicle in vehicles:
        if logbook.modifications(vehicle.name):
            asked += [_of(question) for question in asking.questions(logbook, [vehicle], None, target)]
        else:
            asked.append((vehicle, None, asking.USUAL_TARGET if target is None else target))
    return asked


def _of(question: asking.Question) -> _Asked:
    return question.vehicle, question.modification, question.target_percent


def _title(asked: _Asked) -> str:
    return asked[0].name if asked[1] is None else f"{asked[0].name}, {asked[1]}"


def _rehearse(logbook: Logbook, title: str, asked: _Asked, runs: int, seed: int, executor: Executor) -> Rehearsal:
    from energytrack.inference.rehearsal import rehearse
    from energytrack.presentation.progress import progress

    vehicle, name, target = asked
    tables: dict[str, Any] = asking.tables(logbook, vehicle)
    with progress(title) as tell:
        found = rehearse(
            **tables, name=name, target_percent=target, runs=runs, seed=seed, executor=executor, progress=tell
        )
    return replace(found, vehicle=vehicle.name)


def _print_json(answers: list[Rehearsal]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"rehearsals": [answer.to_dict() for answer in answers]}))


def _print(units: dict[str, str], answers: list[Rehearsal]) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.rehearsal import render

    screen = terminal.console()
    for place, answer in enumerate(answers):
        if place:
            screen.print()
        terminal.show(render(answer, unit=units[answer.vehicle], width=screen.width, title=len(answers) > 1), screen)
