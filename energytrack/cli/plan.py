"""`plan`: how far each way of running a test would take."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Annotated

import typer

from energytrack.cli import options
from energytrack.cli import questions as asking
from energytrack.cli.context import readable, say_json

if TYPE_CHECKING:
    from energytrack.inference.results import Plan
    from energytrack.logbook.opening import Logbook
    from energytrack.logbook.records import Vehicle


def plan(
    context: typer.Context,
    vehicle: Annotated[str | None, typer.Option(help="The vehicle; all of them if left out.")] = None,
    target: Annotated[float, typer.Option(help="Smallest shift worth knowing about, in percent.")] = 3.0,
    confidence: Annotated[float, typer.Option(help="Of the range and the verdict.")] = 0.95,
    power: Annotated[float, typer.Option(help="Chance that a shift of the target size is found.")] = 0.80,
    json: options.Json = False,
) -> None:
    """Say how far a test of a modification would take. With one switch, and with taking it off and on."""
    logbook = readable(context)
    by_name = {each.name: each for each in asking.vehicles_asked(logbook, vehicle)}
    answers, refusals = asking.answered(by_name, lambda name: _plan(logbook, by_name[name], target, confidence, power))
    _print_json(answers) if json else _print(logbook, by_name, answers)
    asking.leave(refusals)


def _plan(logbook: Logbook, vehicle: Vehicle, target: float, confidence: float, power: float) -> Plan:
    from energytrack.inference.designs import plan as compare

    found = compare(**asking.tables(logbook, vehicle), target_percent=target, confidence=confidence, power=power)
    return replace(found, vehicle=vehicle.name)


def _print_json(plans: list[Plan]) -> None:
    from energytrack.presentation.as_json import without_nan

    say_json(without_nan({"plans": [found.to_dict() for found in plans]}))


def _print(logbook: Logbook, vehicles: dict[str, Vehicle], plans: list[Plan]) -> None:
    from energytrack.presentation import terminal
    from energytrack.presentation.plan import periods, render

    screen = terminal.console()
    for place, found in enumerate(plans):
        unit = vehicles[found.vehicle].distance_unit
        fitted = periods(logbook.modifications(found.vehicle), unit)
        if place:
            screen.print()
        terminal.show(render(found, unit=unit, width=screen.width, title=len(plans) > 1, fitted=fitted), screen)
