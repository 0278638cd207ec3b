"""`enough --control`: a modification's shift beside vehicles of the same run that do not have it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import typer

from energytrack.cli import questions as asking
from energytrack.cli.context import say_json

if TYPE_CHECKING:
    from energytrack.inference.fleet.results import ControlledShift
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle


def controlled(
    logbook: Logbook,
    vehicles: Sequence[Vehicle],
    name: str | None,
    *,
    controls: Sequence[str],
    target: float | None,
    confidence: float,
    power: float,
    as_json: bool,
) -> None:
    """Answer for each modification of one vehicle, or for the one named."""
    from energytrack.inference.fleet.controls import assess_with_controls
    from energytrack.inference.fleet.logs import fleet_logs

    beside = list(dict.fromkeys(controls))
    others = vehicles if len(vehicles) == 1 else [each for each in vehicles if each.name not in beside]
    if len(others) != 1:
        raise typer.BadParameter("--control takes one vehicle asked about: name it with --vehicle")
    questions = asking.questions(logbook, others, name, target)
    test, *logs = fleet_logs(logbook, [others[0], *(logbook.vehicle(each) for each in beside)])
    found, refusals = asking.answered(
        questions,
        lambda question: assess_with_controls(
            test,
            logs,
            question.modification,
            target_percent=question.target_percent,
            confidence=confidence,
            power=power,
        ),
    )
    _print_json(found) if as_json else _print(found, others[0])
    asking.leave(refusals)


def _print_json(found: Sequence[ControlledShift]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"controlled": [each.to_dict() for each in found]}))


def _print(found: Sequence[ControlledShift], vehicle: Vehicle) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.controlled import render

    screen = terminal.console()
    for place, each in enumerate(found):
        if place:
            screen.print()
        terminal.show(render(each, vehicle.distance_unit, screen.width), screen)
